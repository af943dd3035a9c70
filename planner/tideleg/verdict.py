"""The words of page one: the verdict in one sentence, and what a reader must be warned of."""

from __future__ import annotations

from collections.abc import Iterable, Mapping

import numpy as np

from tideleg.battery import Battery
from tideleg.dew import HIGHEST_DEGC, LOWEST_DEGC, dew_point
from tideleg.limits import LimitCheck
from tideleg.march import Demand, Settled
from tideleg.outcome import MissionResult, ThermalEntry
from tideleg.plan import Plan
from tideleg.stage import Stage


def verdict_sentence(checks: tuple[LimitCheck, ...], unchecked: tuple[str, ...]) -> str:
    """Return whether the stage does the mission, what binds, where and with what margin."""
    broken = [check for check in checks if not check.holds]
    if broken:
        first = broken[0]
        more = f" and {len(broken) - 1} more" if len(broken) > 1 else ""
        return f"does not hold: {describe(first)}{more} of {len(checks)} limits"
    if unchecked:
        return f"not proven: {len(unchecked)} of the stated limits could not be checked for lack of data"
    return f"holds all {len(checks)} limits; the tightest is {describe(checks[0])}"


def describe(check: LimitCheck) -> str:
    """Return one limit in words: what, where, found against allowed, margin, instant."""
    where = "" if check.part in ("mission", "stage") else f" of {check.part.replace('_', ' ')}"
    when = "" if check.time_s is None else f" at {check.time_s:.6g} s of {check.mission}"
    found, allowed, margin = (quantity_text(v, check.unit) for v in (check.value, check.limit, abs(check.margin)))
    distance = f"{margin} left" if check.holds else f"{margin} too far"
    return f"{check.name}{where}: {found} against {allowed} ({distance}){when}"


def quantity_text(value: float, unit: str) -> str:
    """Return a value with its unit as page one prints it; shares as percent."""
    return f"{100.0 * value:.3g} %" if unit == "share" else f"{value:.4g} {unit}"


CHARGE_SHARE = 0.01
"""Energy left in or taken from the battery, over its throughput, beyond which a reader is warned [-]."""


def _charge_warnings(results: Iterable[MissionResult]) -> list[str]:
    """Return one sentence for each mission that ends with another charge than it began with."""
    found = []
    for result in results:
        begin, end = result.battery.start_soc, result.battery.end_soc
        if begin is None or end is None or result.energy.throughput_j <= 0.0:
            continue
        kept = result.battery.stored_change_j / result.energy.throughput_j
        if abs(kept) > CHARGE_SHARE:
            found.append(
                f"{result.name}: the state of charge moves from {100.0 * begin:.1f} to {100.0 * end:.1f} %, which is"
                f" {100.0 * abs(kept):.3g} % of the throughput: the mission does not repeat as it is, and efficiencies"
                " hold for this pass only"
            )
    return found


def warnings_of(
    stage: Stage,
    battery: Battery,
    demands: Iterable[tuple[str, Demand]],
    thermal: tuple[ThermalEntry, ...],
    results: Iterable[MissionResult] = (),
) -> tuple[str, ...]:
    """Return what a reader must know before trusting the numbers."""
    found = [
        f"{entry.part.replace('_', ' ')}: the loop gain at rest reaches {entry.loop_gain:.2f}; held at that operating"
        " point the part would find no steady temperature"
        for entry in thermal
        if entry.loop_gain >= 1.0
    ]
    if not battery.tracks_charge:
        found.append("the battery has no capacity given: it is an ideal source and its state of charge is not modelled")
    found += _charge_warnings(results)
    if stage.modes is not None:
        shortest = float(np.min(stage.modes.time_constants, initial=np.inf))
        for name, demand in demands:
            longest = float(demand.duration.max())
            if longest > shortest:
                found.append(
                    f"{name}: steps of up to {longest:g} s are longer than the shortest thermal time constant"
                    f" ({shortest:.2g} s); temperature peaks inside a step are not seen"
                )
    return tuple(found)


def dew_warnings(plan: Plan, demands: Mapping[str, Demand], stage: Stage) -> tuple[str, ...]:
    """Return one sentence for each mission whose coolant is at times colder than the dew point of the air around it.

    The plate is nowhere colder than the coolant at its inlet; where that stays above the dew point nothing is said.

    Raises
    ------
    PlanError
        If a humidity is given without what it needs, or for air at which the form for the dew point does not hold.
    """
    found = []
    for index, (mission, (name, demand)) in enumerate(zip(plan.mission, demands.items(), strict=True)):
        if mission.humidity is None:
            continue
        key = f"mission.{index}.humidity"
        if mission.ambient is None or stage.modes is None or "coolant" not in stage.modes.boundaries:
            what = "the dew point needs ambient, the temperature of the air, and parts that a coolant cools"
            raise plan.fault(key, what)
        if not LOWEST_DEGC <= mission.ambient <= HIGHEST_DEGC:
            known = f"{LOWEST_DEGC:g} to {HIGHEST_DEGC:g} degC"
            raise plan.fault(key, f"air of {mission.ambient:g} degC: the dew point is known from {known}")
        dew = float(dew_point(mission.ambient, mission.humidity))
        coolant = demand.boundary[stage.modes.boundaries.index("coolant")]
        below = coolant < dew
        if np.any(below):
            share = float(demand.duration[below].sum() / demand.duration.sum())
            found.append(
                f"{name}: the coolant is below the dew point of {dew:.1f} degC for {quantity_text(share, 'share')} of"
                f" the time (coldest {float(coolant.min()):.4g} degC): water may condense on the plate"
            )
    return tuple(found)


def cautions_of(stage: Stage, missions: Iterable[tuple[str, Demand, list[Settled]]]) -> tuple[str, ...]:
    """Return one sentence for each caution that the topology states in a mission: how long it holds, and since when."""
    words: tuple[str, ...] = getattr(stage.topology, "cautions", ())
    found = []
    for name, demand, blocks in missions if words else ():
        codes = [np.broadcast_to(b.checked.operation.caution, b.losses.total.shape)[0] for b in blocks]
        code = np.concatenate(codes)
        for index, word in enumerate(words):
            held = code == index + 1
            if np.any(held):
                share = float(demand.duration[held].sum() / demand.duration.sum())
                first = float(demand.duration[: int(np.argmax(held))].sum())
                found.append(f"{name}: {word} ({quantity_text(share, 'share')} of the time, first at {first:g} s)")
    return tuple(found)
