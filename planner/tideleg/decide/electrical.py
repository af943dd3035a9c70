"""Sizing what the currents and voltages set: legs, inductance, port capacitances, device class."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from tideleg.decide.changes import inductance_of, part_number, with_inductance, with_part, with_stage
from tideleg.decide.trial import Decision, Trial, Worst, rounded_down, rounded_up, worst_over
from tideleg.outcome import Outcome
from tideleg.plan import format_quantity

if TYPE_CHECKING:
    import pandas as pd

    from tideleg.waveform import FloatArray

_FULL_RIPPLE_ROOM = 1e-9


def size_legs(trial: Trial, outcome: Outcome, has_legs: bool) -> Trial:
    """Choose the number of legs so that none carries more than [size] leg_current on average."""
    plan = trial.plan
    wanted = None if plan.size is None else plan.size.leg_current
    if wanted is None:
        return trial.noted("legs kept: [size] leg_current is not given")
    worst = worst_over(outcome, "battery_current_a")
    legs = max(1, math.ceil(worst.value / wanted - 1e-9))
    if not has_legs:
        if legs > 1:
            return trial.noted(
                f"topology {plan.stage.topology!r} has one leg; {legs} would be needed for {wanted:g} A each"
            )
        return trial
    assert plan.size is not None
    if legs > plan.size.legs_max:
        trial = trial.noted(f"{legs} legs would be needed for {wanted:g} A each; held at legs_max {plan.size.legs_max}")
        legs = plan.size.legs_max
    before = plan.stage.settings.get("legs", "")
    set_by = f"leg current {wanted:g} A, battery current {worst.value:.4g} A"
    return trial.decided(with_stage(plan, legs=legs), Decision("stage.legs", legs, str(before), set_by, worst.at))


def size_inductance(trial: Trial, outcome: Outcome) -> Trial:
    """Choose the inductance from the ripple ratio at the worst duty ratio and from the peak current.

    In continuous conduction the ripple is inversely proportional to the inductance; the rounds of the sizing take up
    what is not.
    """
    plan, limits = trial.plan, trial.plan.limits
    present = inductance_of(plan)
    assert present is not None
    rated = worst_over(outcome, "inductor.current_mean_a").value
    needed: list[tuple[float, str, str]] = []
    if limits.ripple_ratio is not None and rated > 0.0:
        worst = worst_over(outcome, "inductor.current_ripple_a")
        share = worst.value / (limits.ripple_ratio * rated)
        needed.append((present * share, f"ripple ratio {100 * limits.ripple_ratio:g} % of {rated:.4g} A", worst.at))
    if limits.inductor_peak_current is not None:
        share_of_room = worst_over(outcome, (), lambda steps: _ripple_over_room(steps, limits.inductor_peak_current))
        if math.isinf(share_of_room.value):
            trial = trial.noted("the mean leg current alone passes limits.inductor_peak_current: more legs are needed")
        else:
            set_by = f"inductor peak current {limits.inductor_peak_current:g} A"
            needed.append((present * share_of_room.value, set_by, share_of_room.at))
    if not needed:
        return trial.noted("inductance kept: neither limits.ripple_ratio nor limits.inductor_peak_current sets it")
    value, set_by, at = max(needed)
    text = format_quantity(rounded_up(value), "inductance")
    before = str(plan.stage.parts["inductor"].get("inductance", ""))
    decision = Decision("stage.inductor.inductance", text, before, set_by, at)
    return trial.decided(with_inductance(plan, text), decision)


def _ripple_over_room(steps: pd.DataFrame, peak_limit: float | None) -> FloatArray:
    """Return the ripple over the ripple that the peak limit leaves, step by step; infinite where it leaves none."""
    assert peak_limit is not None
    room = 2.0 * (peak_limit - np.abs(steps["inductor.current_mean_a"].to_numpy()))
    ripple = steps["inductor.current_ripple_a"].to_numpy()
    return np.where(room > _FULL_RIPPLE_ROOM, ripple / np.where(room > _FULL_RIPPLE_ROOM, room, 1.0), np.inf)


def size_capacitors(trial: Trial, outcome: Outcome) -> Trial:
    """Choose both port capacitances from their voltage ripple and from the RMS rating of the given bank."""
    for port in ("battery", "link"):
        trial = _size_capacitor(trial, outcome, port)
    return trial


def _size_capacitor(trial: Trial, outcome: Outcome, port: str) -> Trial:
    """Scale one bank: k times the capacitance has k times the RMS rating and 1/k of the series resistance."""
    plan, table = trial.plan, f"{port}_capacitor"
    present = part_number(plan, table, "capacitance", "capacitance")
    if present is None:
        return trial.noted(f"{port} capacitance not sized: [stage.{table}] gives no capacitance to start from")
    scales: list[tuple[float, str, Worst]] = []
    ripple_limit = getattr(plan.limits, f"{port}_voltage_ripple")
    if ripple_limit is not None:
        worst = worst_over(outcome, f"{table}.voltage_ripple_v")
        scales.append((worst.value / ripple_limit, f"{port} voltage ripple {ripple_limit:g} V", worst))
    rated = part_number(plan, table, "rated_current", "current")
    if rated is not None:
        worst = worst_over(outcome, f"{table}.current_rms_a")
        scales.append((worst.value / rated, f"RMS rating {rated:.4g} A of the given bank", worst))
    if not scales:
        return trial.noted(f"{port} capacitance kept: no limit of voltage ripple or RMS rating sets it")
    scale, set_by, worst = max(scales, key=lambda item: item[0])
    value = rounded_up(present * scale)
    before = str(plan.stage.parts[table].get("capacitance", ""))
    keys: dict[str, str] = {"capacitance": format_quantity(value, "capacitance")}
    if rated is not None:
        keys["rated_current"] = format_quantity(rounded_down(rated * value / present, 3), "current")
    esr = part_number(plan, table, "esr", "resistance")
    if esr is not None:
        keys["esr"] = format_quantity(rounded_up(esr * present / value, 3), "resistance")
    changed = with_part(plan, table, **keys)
    trial = trial.decided(
        changed, Decision(f"stage.{table}.capacitance", keys.pop("capacitance"), before, set_by, worst.at)
    )
    for key, text in keys.items():
        before = str(plan.stage.parts[table].get(key, ""))
        trial = trial.decided(changed, Decision(f"stage.{table}.{key}", text, before, "scaled with the bank", ""))
    return trial


def size_device_class(trial: Trial, outcome: Outcome) -> Trial:
    """Choose the voltage class of the switches from the highest blocked voltage and the allowed utilisation."""
    plan = trial.plan
    utilisation = plan.limits.voltage_utilisation
    if utilisation is None:
        return trial.noted("device class kept: limits.voltage_utilisation is not given")
    blocked = max(
        (worst_over(outcome, f"{part.name}.blocked_voltage_v") for part in outcome.parts if part.kind == "switch"),
        key=lambda worst: worst.value,
    )
    link = worst_over(outcome, "link_voltage_v").value
    trip = plan.link.trip_voltage
    highest = blocked.value if trip is None else blocked.value * max(trip / link, 1.0)
    needed = highest / utilisation
    given = part_number(plan, "switch", "rated_voltage", "voltage")
    classes = sorted(plan.size.voltage_classes) if plan.size is not None else sorted(_default_classes())
    fitting = [c for c in classes if c >= needed - 1e-9]
    if not fitting:
        return trial.noted(f"no voltage class reaches {needed:.4g} V; [size] voltage_classes ends at {classes[-1]:g} V")
    if given is not None and given >= needed - 1e-9:
        text = format_quantity(given, "voltage")
        if fitting[0] < given:
            trial = trial.noted(f"a device of the {fitting[0]:g} V class would do as well ({needed:.4g} V needed)")
    else:
        text = format_quantity(fitting[0], "voltage")
        if given is not None:
            trial = trial.noted(
                "the given device's class is too low: its loss data must be replaced with the new class's"
            )
    set_by = f"{highest:.4g} V {'at trip' if trip else 'blocked'} at {100 * utilisation:g} % utilisation"
    before = "" if given is None else format_quantity(given, "voltage")
    decision = Decision("stage.switch.rated_voltage", text, before, set_by, blocked.at)
    return trial.decided(with_part(plan, "switch", rated_voltage=text), decision)


def _default_classes() -> tuple[float, ...]:
    from tideleg.plan import SizeTable

    return tuple(SizeTable().voltage_classes)
