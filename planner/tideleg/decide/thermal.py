"""Sizing what the temperatures set: chips in parallel and plate resistance, over the whole mission."""

from __future__ import annotations

import math

from tideleg.decide.changes import with_cooling, with_part
from tideleg.decide.trial import Decision, Trial, rounded_down
from tideleg.errors import NoEquilibriumError
from tideleg.limits import LimitCheck
from tideleg.outcome import Outcome
from tideleg.plan import Plan, SizeTable, format_quantity
from tideleg.registry import Registry
from tideleg.running import Progress, run

TRIALS = 8
"""Halvings of the plate resistance's range on a logarithmic scale: a range of 100 : 1 comes down to 2 %."""

Temperatures = tuple[LimitCheck, ...]


def size_chips_and_plate(trial: Trial, has_plate: bool, registry: Registry | None, progress: Progress | None) -> Trial:
    """Choose the fewest chips in parallel that any plate of the range can hold, then the weakest plate that holds them.

    Every attempt is a run of the whole mission: the junction limit is met by temperatures, not by a worst point.
    """
    plan = trial.plan
    stated = (plan.limits.junction_temperature, plan.limits.inductor_temperature, plan.limits.capacitor_temperature)
    if plan.cooling is None or all(limit is None for limit in stated):
        return trial.noted("chips in parallel and plate kept: the plan gives no [cooling] or no temperature limit")
    size = plan.size or SizeTable()
    strongest, weakest = min(size.plate_resistance_range), max(size.plate_resistance_range)
    for chips in range(1, size.in_parallel_max + 1):
        wanted = with_part(plan, "switch", in_parallel=chips)
        best = with_cooling(wanted, plate_resistance=strongest) if has_plate else wanted
        checks = _temperatures(best, registry, progress)
        if checks is not None and all(check.holds for check in checks):
            return _with_plate(trial, chips, (strongest, weakest) if has_plate else None, checks, registry, progress)
        tightest = "no thermal equilibrium" if checks is None else _words(checks[0])
        blame = _part_of(checks)
        if blame is not None and "switch" not in blame:
            break
    return trial.noted(
        f"up to {chips} chips in parallel on the strongest plate do not hold the temperatures ({tightest});"
        " chips and plate are kept as given"
    )


def _part_of(checks: Temperatures | None) -> str | None:
    """Return the part of the tightest temperature: more chips only help a switch."""
    return None if not checks else checks[0].part


def _with_plate(
    trial: Trial,
    chips: int,
    plate_range: tuple[float, float] | None,
    checks: Temperatures,
    registry: Registry | None,
    progress: Progress | None,
) -> Trial:
    given = "" if trial.plan.cooling is None else str(trial.plan.cooling.settings.get("plate_resistance", ""))
    plan = with_part(trial.plan, "switch", in_parallel=chips)
    before = str(trial.plan.stage.parts.get("switch", {}).get("in_parallel", 1))
    resistance: float | None = None
    if plate_range is not None:
        resistance, checks = _weakest_plate(plan, plate_range, checks, registry, progress)
        plan = with_cooling(plan, plate_resistance=resistance)
    at = _when(checks[0])
    trial = trial.decided(plan, Decision("stage.switch.in_parallel", chips, before, _words(checks[0]), at))
    if resistance is not None:
        text = format_quantity(resistance, "thermal resistance")
        at_end = plate_range is not None and resistance >= plate_range[1]
        set_by = "end of [size] plate_resistance_range: every temperature holds" if at_end else _words(checks[0])
        plan = with_cooling(plan, plate_resistance=text)
        trial = trial.decided(plan, Decision("cooling.plate_resistance", text, given, set_by, "" if at_end else at))
    return trial


def _weakest_plate(
    plan: Plan,
    plate_range: tuple[float, float],
    checks: Temperatures,
    registry: Registry | None,
    progress: Progress | None,
) -> tuple[float, Temperatures]:
    """Return the greatest plate resistance that still holds, rounded down to two digits, and its checks."""
    low, high = plate_range
    whole = _temperatures(with_cooling(plan, plate_resistance=high), registry, progress)
    if whole is not None and all(check.holds for check in whole):
        return high, whole
    for _ in range(TRIALS):
        middle = math.sqrt(low * high)
        seen = _temperatures(with_cooling(plan, plate_resistance=middle), registry, progress)
        if seen is not None and all(check.holds for check in seen):
            low, checks = middle, seen
        else:
            high = middle
    resistance = max(rounded_down(low), plate_range[0])
    final = _temperatures(with_cooling(plan, plate_resistance=resistance), registry, progress)
    return resistance, checks if final is None else final


def _temperatures(plan: Plan, registry: Registry | None, progress: Progress | None) -> Temperatures | None:
    """Return the temperature checks of a run, tightest first; None where there is no equilibrium."""
    try:
        outcome: Outcome = run(plan, registry=registry, progress=progress)
    except NoEquilibriumError:
        return None
    return tuple(check for check in outcome.limits if check.unit == "degC")


def _words(check: LimitCheck) -> str:
    return f"{check.name} {check.limit:g} degC of {check.part.replace('_', ' ')}"


def _when(check: LimitCheck) -> str:
    return "" if check.time_s is None else f"{check.time_s:.6g} s of {check.mission}"
