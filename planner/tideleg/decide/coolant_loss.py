"""If the coolant stops at the worst instant: which part reaches its limit first, and how long that takes.

The mission is run up to the instant at which a part is hottest against its limit. There the way from the parts to the
coolant is taken away, every mass and every Foster cell keeps its temperature, the power is held, and the stage is
marched on until a limit is reached.
"""

from __future__ import annotations

import dataclasses
from typing import Any

import numpy as np

from tideleg.demand import battery_of, demand_of, profile_of
from tideleg.errors import NoEquilibriumError
from tideleg.heat import transferred
from tideleg.march import Carry, Demand, march, relax, start
from tideleg.outcome import CoolantLoss, Outcome
from tideleg.plan import LimitsTable, Plan
from tideleg.registry import Registry
from tideleg.stage import Stage, build_stage, without_coolant

FIRST_STEP_S, GROWTH, LONGEST_S = 0.02, 1.08, 7200.0
"""Steps after the loss begin so short, grow by so much each, and end after so long [s], [-], [s]."""

KIND_LIMITS = {
    "switch": "junction_temperature",
    "inductor": "inductor_temperature",
    "transformer": "inductor_temperature",
    "capacitor": "capacitor_temperature",
}


def temperature_limits(stage: Stage, limits: LimitsTable) -> dict[str, float]:
    """Return the limit of every part whose temperature is modelled and limited [degC]."""
    found = {}
    for part in stage.parts:
        key = KIND_LIMITS.get(part.slot.kind)
        limit = None if key is None else getattr(limits, key)
        if limit is not None and part.slot.name in stage.seated:
            found[part.slot.name] = float(limit)
    return found


def coolant_loss(plan: Plan, outcome: Outcome, registry: Registry | None = None) -> CoolantLoss | None:
    """Return what happens without coolant; None where no limited temperature is modelled or nothing is cooled by it."""
    stage, without = build_stage(plan, registry), without_coolant(plan, registry)
    limits = temperature_limits(stage, plan.limits)
    if without is None or not limits or stage.modes is None or without.modes is None:
        return None
    mission, step = _nearest(outcome, limits)
    index = [m.name for m in outcome.missions].index(mission)
    profile = profile_of(plan, plan.mission[index])
    demand = demand_of(plan, index, profile, stage)
    begin = plan.mission[index].start
    battery = battery_of(plan, plan.mission[index])
    carry = start(stage, battery, demand, begin if isinstance(begin, float) else None)
    *_, last = march(stage, battery, _cut(demand, slice(0, step + 1)), carry)
    moved = transferred(last.carry.heat, stage.modes, without.modes)
    held = _cut(demand, slice(step, step + 1))
    when = float(demand.duration[: step + 1].sum())
    return _until_a_limit(without, battery, held, last.carry._replace(heat=moved), limits, (mission, when))


def _nearest(outcome: Outcome, limits: dict[str, float]) -> tuple[str, int]:
    """Return (mission, step) at which a part comes nearest to its limit."""
    best = (-np.inf, "", 0)
    for mission in outcome.missions:
        for part, limit in limits.items():
            room = mission.steps[f"{part}.temperature_degc"].to_numpy() - limit
            row = int(np.argmax(room))
            best = max(best, (float(room[row]), mission.name, row))
    return best[1], best[2]


def _cut(demand: Demand, steps: slice) -> Demand:
    """Return some steps of a demand."""
    changes: dict[str, Any] = {}
    for field in dataclasses.fields(demand):
        values = getattr(demand, field.name)
        if isinstance(values, np.ndarray):
            changes[field.name] = values[..., steps]
    return dataclasses.replace(demand, **changes)


def _until_a_limit(
    stage: Stage, battery: Any, held: Demand, carry: Carry, limits: dict[str, float], origin: tuple[str, float]
) -> CoolantLoss:
    """March single steps at held power until a part passes its limit."""
    rows = [stage.seated.index(part) for part in limits]
    allowed = np.array(list(limits.values()))
    mission, when = origin
    power = float(held.power[0])
    before = np.array([carry.temperature[row, 0, -1] for row in rows])
    elapsed, seconds = 0.0, FIRST_STEP_S
    while elapsed < LONGEST_S:
        step = dataclasses.replace(held, duration=np.array([seconds]))
        try:
            settled = relax(stage, battery, step, carry, when + elapsed)
        except NoEquilibriumError:
            part = list(limits)[int(np.argmax(before - allowed))]
            return CoolantLoss(part, limits[part], elapsed, True, when, mission, power)
        after = settled.end[rows, 0, -1]
        if np.any(after > allowed):
            share = np.where(after > allowed, (allowed - before) / np.maximum(after - before, 1e-12), np.inf)
            first = int(np.argmin(share))
            reached = elapsed + float(np.clip(share[first], 0.0, 1.0)) * seconds
            part = list(limits)[first]
            return CoolantLoss(part, limits[part], reached, False, when, mission, power)
        before, carry = after, settled.carry
        elapsed, seconds = elapsed + seconds, seconds * GROWTH
    part = list(limits)[int(np.argmax(before - allowed))]
    return CoolantLoss(part, limits[part], None, False, when, mission, power)
