"""Limits: what is allowed, what was found, with which margin, in which part, at which instant."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np

from tideleg.errors import InputError

if TYPE_CHECKING:
    import pandas as pd

    from tideleg.plan import LimitsTable
    from tideleg.stage import Stage, StagePart


@dataclass(frozen=True)
class LimitCheck:
    """One limit against what the run found.

    name : such as "junction temperature"
    part : slot name, or "stage", "mission", "link"
    value, limit : found and allowed, both in `unit`
    unit : "degC", "A", "V", "share" or another
    margin : distance to the limit in `unit`, positive where it holds
    used : share of the limit in use [-], 1 at the limit; for temperatures the rise above the coolant over the allowed
        rise; for a limit of zero 1 plus the excess
    time_s, mission : instant at which `value` was met; None where it is no matter of one instant
    holds : value within limit
    """

    name: str
    part: str
    value: float
    limit: float
    unit: str
    margin: float
    used: float
    time_s: float | None
    mission: str | None
    holds: bool


class Seen(NamedTuple):
    """What the limits are checked on.

    steps : frame by mission name
    coolest : lowest coolant temperature of all missions [degC], the foot of temperature shares
    requested_j, curtailed_j : energy of one pass of each mission, magnitudes
    efficiency : of all missions, weighted by passes a year [-]
    rated_leg_current : greatest mean leg current of all missions [A]
    """

    steps: Mapping[str, pd.DataFrame]
    coolest: float
    requested_j: Mapping[str, float]
    curtailed_j: Mapping[str, float]
    efficiency: float
    rated_leg_current: float


def check_limits(limits: LimitsTable, stage: Stage, trip_voltage: float | None, seen: Seen) -> tuple[LimitCheck, ...]:
    """Return every limit that the plan states and the stage can be held against, tightest first.

    A stated limit whose quantity is not modelled gives no check; the caller lists it as not modelled.
    """
    found = [
        *_temperature_checks(limits, stage, seen),
        *_current_checks(limits, stage, seen),
        *_curve_checks(stage, seen),
        *_battery_checks(limits, seen),
        *_voltage_checks(limits, stage, trip_voltage, seen),
        *_mission_checks(limits, seen),
    ]
    return tuple(sorted(found, key=lambda c: -c.used))


def unchecked_limits(limits: LimitsTable, checks: tuple[LimitCheck, ...]) -> tuple[str, ...]:
    """Return one sentence for each stated limit that nothing could be held against."""
    checked = {check.name for check in checks}
    stated = [name for name, value in limits if value is not None]
    words = [name.replace("_", " ") for name in stated]
    return tuple(
        f"limit {word!r} could not be checked: its quantity is not modelled" for word in words if word not in checked
    )


def _deciding(stage: Stage) -> list[StagePart]:
    """Return the parts that a limit looks at: of chips in parallel the one that carries the most."""
    return [part for part in stage.parts if part.decides]


def _temperature_checks(limits: LimitsTable, stage: Stage, seen: Seen) -> Iterator[LimitCheck]:
    by_kind = {
        "switch": ("junction temperature", limits.junction_temperature),
        "diode": ("junction temperature", limits.junction_temperature),
        "inductor": ("inductor temperature", limits.inductor_temperature),
        "transformer": ("inductor temperature", limits.inductor_temperature),
        "capacitor": ("capacitor temperature", limits.capacitor_temperature),
    }
    for part in _deciding(stage):
        name, limit = by_kind.get(part.slot.kind, ("", None))
        if limit is not None and part.slot.name in stage.seated:
            value, time, mission = _greatest(seen, f"{part.slot.name}.temperature_degc")
            if limit <= seen.coolest:
                raise InputError(
                    f"limits.{name.replace(' ', '_')}: {limit:g} degC is not above the coolest coolant"
                    f" ({seen.coolest:g} degC), so no stage can hold it; raise the limit or cool the coolant"
                )
            used = (value - seen.coolest) / (limit - seen.coolest)
            yield _upper(name, part.slot.name, value, limit, "degC", (time, mission), used)


def _current_checks(limits: LimitsTable, stage: Stage, seen: Seen) -> Iterator[LimitCheck]:
    for part in _deciding(stage):
        name = part.slot.name
        if part.slot.kind == "inductor":
            if limits.inductor_peak_current is not None:
                value, *when = _greatest(seen, f"{name}.current_peak_a", f"{name}.current_valley_a")
                yield _upper("inductor peak current", name, value, limits.inductor_peak_current, "A", when)
            saturation = getattr(part.base, "saturation_current", None)
            if saturation is not None:
                value, *when = _greatest(seen, f"{name}.current_peak_a", f"{name}.current_valley_a")
                yield _upper("inductor saturation current", name, value, saturation, "A", when)
            if limits.ripple_ratio is not None and seen.rated_leg_current > 0.0:
                value, *when = _greatest(seen, f"{name}.current_ripple_a")
                yield _upper("ripple ratio", name, value / seen.rated_leg_current, limits.ripple_ratio, "share", when)
        if part.slot.kind == "switch" and limits.switch_current is not None:
            value, *when = _greatest(seen, f"{name}.current_rms_a")
            yield _upper("switch current", name, value, limits.switch_current, "A", when)
        if part.slot.kind == "capacitor":
            limit = getattr(limits, f"{name}_current", None)
            limit = limit if limit is not None else getattr(part.base, "rated_current", None)
            if limit is not None:
                value, *when = _greatest(seen, f"{name}.current_rms_a")
                yield _upper(f"{name.replace('_', ' ')} current", name, value, limit, "A", when)


def _curve_checks(stage: Stage, seen: Seen) -> Iterator[LimitCheck]:
    """Hold each inductor's peak against the end of its curve: beyond it the last inductance holds, unmeasured."""
    for part in stage.parts:
        curve = getattr(part.base, "inductance_curve", None)
        if curve is not None:
            name = part.slot.name
            value, *when = _greatest(seen, f"{name}.current_peak_a", f"{name}.current_valley_a")
            yield _upper("inductance curve, last current", name, value, curve[-1][0], "A", when)


def _battery_checks(limits: LimitsTable, seen: Seen) -> Iterator[LimitCheck]:
    ripple = "battery_ripple.current_rms_a"
    if limits.battery_ripple_current is not None and all(ripple in steps for steps in seen.steps.values()):
        value, *when = _greatest(seen, ripple)
        yield _upper("battery ripple current", "battery", value, limits.battery_ripple_current, "A", when)


def _voltage_checks(limits: LimitsTable, stage: Stage, trip_voltage: float | None, seen: Seen) -> Iterator[LimitCheck]:
    for part in _deciding(stage):
        name = part.slot.name
        rated = getattr(part.base, "rated_voltage", None)
        if part.slot.kind == "switch" and rated is not None and limits.voltage_utilisation is not None:
            value, *when = _greatest(seen, f"{name}.blocked_voltage_v")
            worst = value if trip_voltage is None else _at_trip(value, trip_voltage, seen)
            yield _upper("voltage utilisation", name, worst / rated, limits.voltage_utilisation, "share", when)
        if part.slot.kind == "capacitor":
            port = name.removesuffix("_capacitor")
            limit = getattr(limits, f"{port}_voltage_ripple", None)
            if limit is not None and part.base.capacitance is not None:
                value, *when = _greatest(seen, f"{name}.voltage_ripple_v")
                yield _upper(f"{port} voltage ripple", name, value, limit, "V", when)
            if rated is not None:
                at_port = port in ("battery", "link") and part.slot.in_series == 1
                column = f"{port}_voltage_v" if at_port else f"{name}.voltage_v"
                value, *when = _greatest(seen, column)
                yield _upper("capacitor voltage", name, value, rated, "V", when)
            if rated is not None and limits.capacitor_voltage_utilisation is not None:
                value, *when = _greatest(seen, f"{name}.voltage_share")
                allowed = limits.capacitor_voltage_utilisation
                yield _upper("capacitor voltage utilisation", name, value, allowed, "share", when)


def _at_trip(blocked: float, trip_voltage: float, seen: Seen) -> float:
    """Return the blocked voltage when the link stands at its trip voltage: it grows in proportion [V]."""
    link, *_ = _greatest(seen, "link_voltage_v")
    return blocked * max(trip_voltage / link, 1.0)


def _mission_checks(limits: LimitsTable, seen: Seen) -> Iterator[LimitCheck]:
    allowed = limits.curtailed_energy if limits.curtailed_energy is not None else 0.0
    for mission, requested in seen.requested_j.items():
        share = seen.curtailed_j[mission] / requested if requested > 0.0 else 0.0
        _, time_s, _ = _greatest(Seen({mission: seen.steps[mission]}, *seen[1:]), "curtailed_w")
        when = (time_s if share > 0.0 else None, mission)
        used = share / allowed if allowed > 0.0 else (0.0 if share <= 0.0 else 1.0 + share)
        yield _upper("curtailed energy", "mission", share, allowed, "share", when, used)
    if limits.efficiency is not None:
        value, limit = seen.efficiency, limits.efficiency
        used = (1.0 - value) / (1.0 - limit)
        yield LimitCheck(
            "efficiency", "stage", value, limit, "share", value - limit, used, None, None, bool(value >= limit)
        )


def _greatest(seen: Seen, *columns: str) -> tuple[float, float | None, str | None]:
    """Return (greatest magnitude of the columns over all missions, its time [s], its mission).

    A quantity that never changes has no instant: time and mission are None.
    """
    best: tuple[float, float | None, str | None] = (-np.inf, None, None)
    varies = False
    for mission, steps in seen.steps.items():
        for column in columns:
            values = steps[column].to_numpy()
            magnitude = values if column.endswith("_degc") else np.abs(values)
            row = int(np.argmax(magnitude))
            varies = varies or bool(np.ptp(magnitude) > 0.0) or (len(magnitude) == 1)
            if magnitude[row] > best[0]:
                best = (float(magnitude[row]), float(steps["time_s"].iloc[row]), mission)
    return best if varies else (best[0], None, None)


def _upper(
    name: str, part: str, value: float, limit: float, unit: str, when: Sequence[Any], used: float | None = None
) -> LimitCheck:
    time, mission = when
    share = value / limit if used is None else used
    return LimitCheck(name, part, value, limit, unit, limit - value, share, time, mission, bool(value <= limit))
