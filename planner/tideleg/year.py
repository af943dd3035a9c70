"""A year of the stage: hours, throughput and loss of every mission, and the hours of standby and parking."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np

from tideleg.contract import Point
from tideleg.outcome import MissionResult, MissionYear, Year
from tideleg.plan import Plan
from tideleg.stage import Stage

HOURS = 8766.0
"""Of a mean year of 365.25 days."""


def year_of(plan: Plan, stage: Stage, results: Iterable[MissionResult]) -> Year:
    """Return the year that the plan's missions and standby hours make.

    Raises
    ------
    PlanError
        If they do not fit into one.
    """
    rows = []
    for index, result in enumerate(results):
        hours = result.passes_per_year * float(result.steps["duration_s"].sum()) / 3600.0
        rows.append((result, hours))
        if hours > HOURS * (1.0 + 1e-9):
            what = f"{result.passes_per_year:g} passes last {hours:.5g} h; a year has {HOURS:g} h: give fewer passes"
            raise plan.fault(f"mission.{index}.passes_per_year", what)
    busy = sum(hours for _, hours in rows)
    standby = plan.year.standby_hours
    if busy + standby > HOURS * (1.0 + 1e-9):
        what = f"missions ({busy:.5g} h) and standby ({standby:.5g} h) together exceed the {HOURS:g} h of a year"
        raise plan.fault("year.standby_hours" if standby > 0.0 else "mission.0.passes_per_year", what)
    standing = standby_power(stage) * standby / 1e3
    whole = standing + sum(r.passes_per_year * r.energy.loss_j for r, _ in rows) / 3.6e6
    missions = tuple(_row(result, hours, whole) for result, hours in rows)
    share = standing / whole if whole > 0.0 else 0.0
    return Year(missions, standby, standing, share, HOURS - busy - standby)


def _row(result: MissionResult, hours: float, whole: float) -> MissionYear:
    loss = result.passes_per_year * result.energy.loss_j / 3.6e6
    return MissionYear(
        result.name,
        result.passes_per_year,
        hours,
        result.passes_per_year * result.energy.throughput_j / 3.6e6,
        loss,
        loss / whole if whole > 0.0 else 0.0,
    )


def standby_power(stage: Stage) -> float:
    """Return what the stage draws with its gates off and no current: the power of its control [W]."""
    one, none = np.ones((1, 1)), np.zeros((1, 1))
    point = Point(400.0 * one, 800.0 * one, none, none, np.zeros((1, 1), dtype=bool), np.zeros((1, 1), dtype=np.int64))
    held = stage.by_name(25.0 * np.ones((len(stage.seated), 1, 1)), np.array([25.0]), (1, 1))
    terms = stage.losses(point, held).by_term
    return float(sum(watts[0, 0] for (part, _), watts in terms.items() if part == "control"))
