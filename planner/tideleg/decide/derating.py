"""Derating: how much power the stage can hold for good at each coolant temperature, and what the mission then loses.

At each coolant temperature the greatest constant power each way is sought with which every limited temperature holds
at rest. A step far longer than every thermal time constant ends at rest, whatever came before; so a grid of powers is
one block of such steps, and the border is found by a few ever finer grids.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Sequence
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np

from tideleg.battery import Battery
from tideleg.decide.coolant_loss import temperature_limits
from tideleg.demand import battery_of, demand_of, profile_of
from tideleg.errors import InputError, NoEquilibriumError
from tideleg.march import Demand, march, start
from tideleg.plan import Plan, load_plan
from tideleg.registry import Registry
from tideleg.stage import Stage, build_stage
from tideleg.waveform import FloatArray

GRID = 17
"""Powers of one grid, its ends included."""

REFINEMENTS = 3
REST_OVER_LONGEST = 60.0
"""A step of so many of the longest thermal time constant ends at rest: e^-60 is below rounding [-]."""

TEMPERATURES = 9
"""Coolant temperatures, evenly from the mission's own up to the lowest limit."""


NOT_LIMITED = "not limited"
"""What stands where the stage holds all that any mission asks."""


class DeratedPoint(NamedTuple):
    """What holds for good at one coolant temperature.

    coolant_degc : at the inlet
    discharge_w, charge_w : greatest power at the profile's terminals each way [W], magnitudes
    discharge_binds, charge_binds : what stops a greater one: a part, the reason why the stage cannot operate, or
        `NOT_LIMITED` where the missions ask no more
    lost_share : of each mission's requested energy above these powers, by mission [-]
    """

    coolant_degc: float
    discharge_w: float
    charge_w: float
    discharge_binds: str
    charge_binds: str
    lost_share: dict[str, float]


class Derating(NamedTuple):
    """The whole curve, coldest coolant first; and the greatest power that any mission asks each way [W]."""

    points: tuple[DeratedPoint, ...]
    greatest_discharge_w: float
    greatest_charge_w: float


def derate(
    plan: Plan | str | Path, *, coolant_degc: Sequence[float] = (), registry: Registry | None = None
) -> Derating:
    """Return the power that the stage can hold for good over coolant temperature.

    Parameters
    ----------
    plan : Plan, or the path of a plan file
    coolant_degc : temperatures to look at; by default from the coldest of the missions to the lowest limit

    Raises
    ------
    InputError
        If the plan limits no temperature that is modelled, or gives no coolant to start from.
    """
    plan = plan if isinstance(plan, Plan) else load_plan(plan)
    stage, battery = build_stage(plan, registry), battery_of(plan)
    limits = temperature_limits(stage, plan.limits)
    if stage.modes is None or not limits or "coolant" not in stage.modes.boundaries:
        raise InputError(
            "derating needs a limited temperature that the coolant decides: give thermal data of a part, its limit in"
            " [limits] such as junction_temperature = '150 degC', and [cooling]"
        )
    demands = _demands(plan, stage)
    temperatures = _temperatures(coolant_degc, stage, demands, limits)
    asked = {name: np.clip(d.power, d.least, d.greatest) for name, d in demands.items()}
    out = max(float(np.max(power, initial=0.0)) for power in asked.values())
    into = max(float(np.max(-power, initial=0.0)) for power in asked.values())
    # At rest for good the state of charge cannot move: the battery is held where it starts.
    held = dataclasses.replace(battery, capacity=np.inf)
    first = next(iter(demands.values()))
    points = []
    for degc in temperatures:
        give, gives = _border(stage, held, first, limits, degc, out)
        take, takes = _border(stage, held, first, limits, degc, -into)
        lost = {name: _lost(asked[name], demands[name].duration, give, take) for name in demands}
        points.append(DeratedPoint(degc, give, take, gives, takes, lost))
    return Derating(tuple(points), out, into)


def _demands(plan: Plan, stage: Stage) -> dict[str, Demand]:
    found = {}
    for index, mission in enumerate(plan.mission):
        profile = profile_of(plan, mission)
        found[profile.name] = demand_of(plan, index, profile, stage)
    return found


def _temperatures(
    given: Sequence[float], stage: Stage, demands: dict[str, Demand], limits: dict[str, float]
) -> list[float]:
    if given:
        return sorted(float(t) for t in given)
    assert stage.modes is not None
    row = stage.modes.boundaries.index("coolant")
    coldest = min(float(demand.boundary[row].min()) for demand in demands.values())
    lowest = min(limits.values())
    if coldest >= lowest:
        raise InputError(f"the coolant at {coldest:g} degC is not below the lowest limit, {lowest:g} degC")
    return [float(t) for t in np.linspace(coldest, lowest, TEMPERATURES)]


def _border(
    stage: Stage, battery: Battery, demand: Demand, limits: dict[str, float], degc: float, greatest: float
) -> tuple[float, str]:
    """Return the greatest magnitude of power that holds, and what stops more; `greatest` carries the sign."""
    low, high, binds = 0.0, greatest, ""
    for _ in range(REFINEMENTS):
        powers = np.linspace(low, high, GRID)
        holds, stopped = _held(stage, battery, demand, limits, degc, powers)
        if holds == GRID:
            return abs(greatest), NOT_LIMITED
        if holds == 0:
            return 0.0, stopped
        low, high, binds = float(powers[holds - 1]), float(powers[holds]), stopped
    return abs(low), binds


def _held(
    stage: Stage, battery: Battery, demand: Demand, limits: dict[str, float], degc: float, powers: FloatArray
) -> tuple[int, str]:
    """Return how many of the powers hold, from the smallest on, and what stops the next one."""
    try:
        return _held_in_one(stage, battery, demand, limits, degc, powers)
    except NoEquilibriumError:
        if len(powers) == 1:
            return 0, "no thermal equilibrium"
    half = len(powers) // 2  # somewhere in the block a power runs away: look at the smaller ones first
    first, why = _held(stage, battery, demand, limits, degc, powers[:half])
    if first < half:
        return first, why
    more, why = _held(stage, battery, demand, limits, degc, powers[half:])
    return half + more, why


def _held_in_one(
    stage: Stage, battery: Battery, demand: Demand, limits: dict[str, float], degc: float, powers: FloatArray
) -> tuple[int, str]:
    assert stage.modes is not None
    at_rest = _at_rest(stage, demand, degc, powers)
    carry = start(stage, battery, at_rest, None)
    (settled,) = march(stage, battery, at_rest, carry)
    reason = np.broadcast_to(settled.checked.operation.reason, settled.losses.total.shape)[0]
    stopped = [""] * len(powers)
    for k in range(len(powers)):
        if reason[k]:
            stopped[k] = stage.topology.reasons[int(reason[k]) - 1]
        elif settled.battery.cause[0, k]:
            stopped[k] = "the battery"
    for part, limit in limits.items():
        warm = settled.end[stage.seated.index(part), 0]
        for hot in np.flatnonzero(warm > limit).tolist():
            stopped[hot] = stopped[hot] or part.replace("_", " ")
    broken = [k for k, why in enumerate(stopped) if why]
    return (broken[0], stopped[broken[0]]) if broken else (len(powers), "")


def _at_rest(stage: Stage, demand: Demand, degc: float, powers: FloatArray) -> Demand:
    """Return a demand of one step a power, each so long that it ends at rest, with the coolant at one temperature."""
    assert stage.modes is not None
    seconds = REST_OVER_LONGEST * float(np.max(stage.modes.time_constants, initial=1.0))
    shape = powers.shape
    boundary = np.repeat(demand.boundary[:, :1], len(powers), axis=1)
    boundary[stage.modes.boundaries.index("coolant")] = degc
    changes: dict[str, Any] = {
        "power": powers,
        "duration": np.full(shape, seconds),
        "link_voltage": np.full(shape, float(demand.link_voltage[0])),
        "boundary": boundary,
        "held": np.full(shape, degc),
        "greatest": np.full(shape, np.inf),
        "least": np.full(shape, -np.inf),
        "battery_degc": None if demand.battery_degc is None else np.full(shape, float(demand.battery_degc[0])),
    }
    return dataclasses.replace(demand, **changes)


def _lost(power: FloatArray, duration: FloatArray, give: float, take: float) -> float:
    """Return the share of the requested energy that lies above the derated powers: peaks that pass quickly included."""
    over = np.maximum(power - give, 0.0) + np.maximum(-power - take, 0.0)
    whole = float(np.sum(np.abs(power) * duration))
    return float(np.sum(over * duration)) / whole if whole > 0.0 else 0.0
