"""The high-voltage caution and its numbers for one design. Every report carries it, in every format.

Formulas: E = C V²/2; discharge t = R C ln(V0/V); a capacitor fed with constant power rises as
C (V2² - V1²)/2 = P t. The voltage classes are those of ISO 6469-3:2021, clause 4 (values from memory); the figures of
60 V and of seconds differ from rule to rule, so they are shown with their rule and never as compliance.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

CLASS_A_LIMIT_V = 60.0
CLASS_B_LIMIT_V = 1500.0
DISCHARGE_SECONDS = 5.0
"""Time to reach 60 V that IEC 60204-1, 6.2.4 prints for machines; other rules print 1 s, 10 s or 60 s."""


@dataclass(frozen=True)
class SafetyFacts:
    """What the caution needs to know about a design.

    bus_capacitance_f : of the whole bus, or None; stage_link_capacitance_f : the stage's own, or None
    battery_resistance_ohm, path_resistance_ohm : least battery resistance; stage path, all legs together
    greatest_discharge_w : greatest power into the link, which a load dump leaves without a load
    """

    highest_link_voltage_v: float
    highest_battery_voltage_v: float
    link_voltage_v: float
    trip_voltage_v: float | None
    bus_capacitance_f: float | None
    stage_link_capacitance_f: float | None
    battery_source_voltage_v: float
    battery_resistance_ohm: float
    path_resistance_ohm: float
    inductance_per_leg_h: float
    legs: int
    greatest_discharge_w: float


@dataclass(frozen=True)
class Safety:
    """The caution's numbers, None where the plan gives too little, and its sentences."""

    highest_voltage_v: float
    voltage_class: str
    capacitance_f: float | None
    stored_energy_j: float | None
    discharge_resistor_ohm: float | None
    discharge_resistor_loss_w: float | None
    energy_at_60v_j: float | None
    link_short_current_a: float | None
    link_short_rise_a_per_us: float
    load_dump_time_to_trip_s: float | None
    sentences: tuple[str, ...]


def stored_energy(capacitance_f: float, voltage_v: float) -> float:
    """Return C V²/2 [J].

    Examples
    --------
    >>> stored_energy(500e-6, 400.0)
    40.0
    """
    return 0.5 * capacitance_f * voltage_v * voltage_v


def discharge_time(resistance_ohm: float, capacitance_f: float, from_v: float, to_v: float) -> float:
    """Return R C ln(V0/V) [s]."""
    return resistance_ohm * capacitance_f * math.log(from_v / to_v)


def discharge_resistor(capacitance_f: float, from_v: float, to_v: float, seconds: float) -> float:
    """Return the greatest resistance that discharges from one voltage to another in a time [Ω]."""
    return seconds / (capacitance_f * math.log(from_v / to_v))


def capacitance_for_energy(energy_j: float, voltage_v: float) -> float:
    """Return the capacitance that holds an energy at a voltage, 2 E/V² [F]."""
    return 2.0 * energy_j / (voltage_v * voltage_v)


def time_to_rise(capacitance_f: float, from_v: float, to_v: float, power_w: float) -> float:
    """Return C (V2² - V1²)/(2 P) [s]: how long a capacitance takes a power before it reaches a voltage."""
    return 0.5 * capacitance_f * (to_v * to_v - from_v * from_v) / power_w


def voltage_class(highest_v: float) -> str:
    """Return the class of the greatest working voltage, charge end included; exactly 60 V is A, exactly 1500 V is B."""
    if highest_v <= CLASS_A_LIMIT_V:
        return "A (up to 60 V DC, ISO 6469-3:2021, from memory)"
    if highest_v <= CLASS_B_LIMIT_V:
        return "B (above 60 V up to 1500 V DC, ISO 6469-3:2021, from memory)"
    return "above 1500 V DC, outside ISO 6469-3:2021 (from memory)"


def safety(facts: SafetyFacts) -> Safety:
    """Return the caution of one design."""
    highest = max(facts.highest_link_voltage_v, facts.highest_battery_voltage_v)
    capacitance = facts.bus_capacitance_f if facts.bus_capacitance_f is not None else facts.stage_link_capacitance_f
    energy = None if capacitance is None else stored_energy(capacitance, facts.highest_link_voltage_v)
    resistor = None
    if capacitance is not None and facts.highest_link_voltage_v > CLASS_A_LIMIT_V:
        resistor = discharge_resistor(capacitance, facts.highest_link_voltage_v, CLASS_A_LIMIT_V, DISCHARGE_SECONDS)
    loss = None if resistor is None else facts.link_voltage_v**2 / resistor
    ohms = facts.battery_resistance_ohm + facts.path_resistance_ohm
    short = facts.battery_source_voltage_v / ohms if ohms > 0.0 else None
    rise = facts.legs * facts.battery_source_voltage_v / facts.inductance_per_leg_h * 1e-6
    dump = None
    if capacitance is not None and facts.trip_voltage_v is not None and facts.greatest_discharge_w > 0.0:
        dump = time_to_rise(capacitance, facts.link_voltage_v, facts.trip_voltage_v, facts.greatest_discharge_w)
    left = (
        None if capacitance is None else stored_energy(capacitance, min(CLASS_A_LIMIT_V, facts.highest_link_voltage_v))
    )
    numbers = Safety(
        highest, voltage_class(highest), capacitance, energy, resistor, loss, left, short, rise, dump, sentences=()
    )
    return Safety(**{**vars(numbers), "sentences": _sentences(facts, numbers)})


def _sentences(facts: SafetyFacts, n: Safety) -> tuple[str, ...]:
    return (
        f"HIGH VOLTAGE: up to {n.highest_voltage_v:.4g} V DC, class {n.voltage_class}. Contact can kill.",
        "Only licensed or qualified persons work on this equipment, under the local code and the rules of the site;"
        " those decide wherever they differ from this page.",
        _energy_sentence(facts, n),
        _short_sentence(n),
        _dump_sentence(facts, n),
        "After switching off, wait for the discharge and measure both ports before touching: capacitors keep charge,"
        " and the battery stays live behind its contactors.",
        "All numbers here are planning estimates from the plan's own data. They are no statement of compliance with"
        " any standard and no release for building or operation.",
    )


def _energy_sentence(facts: SafetyFacts, n: Safety) -> str:
    if n.stored_energy_j is None or n.capacitance_f is None:
        return "Stored energy of the link is not known: the plan gives no link capacitance. Treat it as dangerous."
    which = "whole bus" if facts.bus_capacitance_f is not None else "the stage's own capacitor only"
    farad = f"{n.capacitance_f * 1e6:.4g} uF, {which}"
    text = f"The link holds {n.stored_energy_j:.4g} J at {facts.highest_link_voltage_v:.4g} V ({farad})."
    if n.discharge_resistor_ohm is None:
        return text
    return (
        f"{text} A resistor of at most {n.discharge_resistor_ohm:.4g} ohm brings it to 60 V in {DISCHARGE_SECONDS:g} s"
        f" (figures of IEC 60204-1; rules differ, the local code decides), would lose"
        f" {n.discharge_resistor_loss_w:.4g} W if always connected, and leaves {n.energy_at_60v_j:.3g} J at 60 V."
    )


def _short_sentence(n: Safety) -> str:
    size = "a current that the given data do not bound (no battery resistance)"
    if n.link_short_current_a is not None:
        size = f"up to about {n.link_short_current_a:.4g} A"
    return (
        f"A short of the link draws {size} from the battery through the upper diodes, rising at first by"
        f" {n.link_short_rise_a_per_us:.3g} A/us; the stage cannot interrupt it; a fuse and a contactor must."
    )


def _dump_sentence(facts: SafetyFacts, n: Safety) -> str:
    if n.load_dump_time_to_trip_s is None:
        return (
            "Time from a load dump to over-voltage is not known: the plan lacks a trip voltage, a link capacitance or"
            " any discharge."
        )
    return (
        f"If the load leaves at {facts.greatest_discharge_w / 1e3:.4g} kW, the link reaches its trip voltage of"
        f" {facts.trip_voltage_v:.4g} V in {n.load_dump_time_to_trip_s * 1e3:.3g} ms; the trip must be faster."
    )
