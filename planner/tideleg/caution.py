"""The high-voltage caution and its numbers for one design. Every report carries it, in every format.

It cannot be switched off and claims no compliance: voltage, seconds and joules of one rule differ from those of the
next, so each number stands with its rule, and the local code decides. What the plan does not give is said, not guessed.
"""

from __future__ import annotations

import dataclasses
import math
from dataclasses import dataclass

from tideleg.errors import InputError

CLASS_A_LIMIT_V = 60.0
CLASS_B_LIMIT_V = 1500.0
DISCHARGE_SECONDS = 5.0
"""Time to reach 60 V that IEC 60204-1, 6.2.4 prints for machines; other rules print 1 s, 10 s or 60 s."""

NOTES = (
    "stored energy: C V²/2, at the highest link voltage, trip voltage included",
    "discharge: t = R C ln(V0/V) through a constant resistance; loss of the resistor: V²/R at the working link voltage",
    "link short: E/(R battery + R path) at the highest source voltage; first rise: legs V/L, inductors not saturated",
    "load dump: C (V trip² - V²)/(2 P) from the working link voltage, the stage feeding on at its greatest discharge",
    "voltage classes: ISO 6469-3:2021, clause 4, values from memory; by the greatest voltage, charge end included",
)
"""How the numbers are found, in words that any output can print."""


GENERAL_SENTENCES = (
    "HIGH VOLTAGE: a stage between a battery and a link carries voltages and stored energy that kill.",
    "Only licensed or qualified persons work on this equipment, under the local code and the rules of the site.",
    "All numbers here are planning estimates; they are no statement of compliance with any standard.",
)
"""The caution where no design was found and so no numbers of its own exist."""


@dataclass(frozen=True)
class SafetyFacts:
    """What the caution needs to know about a design.

    highest_link_voltage_v, highest_battery_voltage_v : greatest, trip and charge end included [V]
    link_voltage_v : working voltage of the link [V]
    trip_voltage_v : link voltage at which the stage is switched off, or None [V]
    bus_capacitance_f : of the whole bus, or None [F]
    stage_link_capacitance_f : of the stage's own link capacitor, or None [F]
    battery_source_voltage_v : greatest open-circuit voltage [V]
    battery_resistance_ohm : least battery resistance, 0 where none is given [Ω]
    path_resistance_ohm : of the whole stage, legs in parallel, 0 where none is given [Ω]
    inductance_per_leg_h : at the working current [H]
    legs : how many
    greatest_discharge_w : greatest power into the link, which a load dump leaves without a load [W]
    link_fed_through_diodes : whether the battery feeds the link through diodes while every gate is off
    discharge_to_v, discharge_within_s : the wanted discharge; a person's choice, since rules differ [V], [s]
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
    discharge_to_v: float = CLASS_A_LIMIT_V
    discharge_within_s: float = DISCHARGE_SECONDS
    link_fed_through_diodes: bool = True


@dataclass(frozen=True)
class Safety:
    """The caution's numbers, None where the plan gives too little, and its sentences.

    capacitance_of : which capacitance `capacitance_f` is
    discharge_resistor_ohm : greatest resistor that brings the link to `discharge_to_v` within `discharge_within_s`
    discharge_resistor_loss_w : what it loses at the working voltage if always connected
    energy_left_j : what the link still holds at `discharge_to_v`
    link_short_current_a : prospective current of a link short; None where no resistance bounds it
    unknown : what could not be told, each with its reason
    sentences : the caution as every output prints it
    notes : the formulas behind the numbers
    """

    highest_voltage_v: float
    voltage_class: str
    capacitance_f: float | None
    capacitance_of: str | None
    stored_energy_j: float | None
    discharge_to_v: float
    discharge_within_s: float
    discharge_resistor_ohm: float | None
    discharge_resistor_loss_w: float | None
    energy_left_j: float | None
    link_short_current_a: float | None
    link_short_rise_a_per_us: float
    load_dump_time_to_trip_s: float | None
    unknown: tuple[str, ...]
    sentences: tuple[str, ...]
    notes: tuple[str, ...] = NOTES


def stored_energy(capacitance_f: float, voltage_v: float) -> float:
    """Return C V²/2 [J].

    Examples
    --------
    >>> stored_energy(500e-6, 400.0)
    40.0
    """
    return 0.5 * capacitance_f * voltage_v * voltage_v


def discharge_time(resistance_ohm: float, capacitance_f: float, from_v: float, to_v: float) -> float:
    """Return how long a resistor takes from one voltage to a lower one, R C ln(V0/V) [s]."""
    return resistance_ohm * capacitance_f * math.log(from_v / to_v)


def discharge_resistor(capacitance_f: float, from_v: float, to_v: float, seconds: float) -> float:
    """Return the greatest resistance that discharges from one voltage to a lower one in a time [Ω]."""
    return seconds / (capacitance_f * math.log(from_v / to_v))


def capacitance_for_energy(energy_j: float, voltage_v: float) -> float:
    """Return the capacitance that holds an energy at a voltage, 2 E/V² [F]."""
    return 2.0 * energy_j / (voltage_v * voltage_v)


def time_to_rise(capacitance_f: float, from_v: float, to_v: float, power_w: float) -> float:
    """Return C (V2² - V1²)/(2 P) [s]: how long a capacitance takes a power before it reaches a higher voltage."""
    return 0.5 * capacitance_f * (to_v * to_v - from_v * from_v) / power_w


def voltage_class(highest_v: float) -> str:
    """Return the class of the greatest working voltage, charge end included; exactly 60 V is A, exactly 1500 V is B.

    Examples
    --------
    >>> voltage_class(60.0)[0], voltage_class(60.1)[0]
    ('A', 'B')
    """
    if highest_v <= CLASS_A_LIMIT_V:
        return "A (up to 60 V DC, ISO 6469-3:2021, from memory)"
    if highest_v <= CLASS_B_LIMIT_V:
        return "B (above 60 V up to 1500 V DC, ISO 6469-3:2021, from memory)"
    return "above 1500 V DC, outside ISO 6469-3:2021 (from memory)"


def ampere_text(ampere: float) -> str:
    """Return a current as people read it, in kA from ten thousand on.

    Examples
    --------
    >>> ampere_text(8236.4), ampere_text(22260.0)
    ('8236 A', '22.26 kA')
    """
    return f"{ampere:.4g} A" if ampere < 9999.5 else f"{ampere / 1e3:.4g} kA"


def safety(facts: SafetyFacts) -> Safety:
    """Return the caution of one design.

    Raises
    ------
    InputError
        If a fact is not finite or not of its sign: a caution must not print a number that means nothing.
    """
    _refuse_meaningless(facts)
    highest = max(facts.highest_link_voltage_v, facts.highest_battery_voltage_v)
    farad, farad_of = _capacitance(facts)
    top, low = facts.highest_link_voltage_v, facts.discharge_to_v
    resistor = None
    if farad is not None and top > low:
        resistor = discharge_resistor(farad, top, low, facts.discharge_within_s)
    ohm = facts.battery_resistance_ohm + facts.path_resistance_ohm
    dump = None
    if farad is not None and _dump_unknown(facts, farad) is None and facts.trip_voltage_v is not None:
        dump = time_to_rise(farad, facts.link_voltage_v, facts.trip_voltage_v, facts.greatest_discharge_w)
    numbers = Safety(
        highest_voltage_v=highest,
        voltage_class=voltage_class(highest),
        capacitance_f=farad,
        capacitance_of=farad_of,
        stored_energy_j=None if farad is None else stored_energy(farad, top),
        discharge_to_v=low,
        discharge_within_s=facts.discharge_within_s,
        discharge_resistor_ohm=resistor,
        discharge_resistor_loss_w=None if resistor is None else facts.link_voltage_v**2 / resistor,
        energy_left_j=None if farad is None else stored_energy(farad, min(low, top)),
        link_short_current_a=facts.battery_source_voltage_v / ohm if ohm > 0.0 else None,
        link_short_rise_a_per_us=facts.legs * facts.battery_source_voltage_v / facts.inductance_per_leg_h * 1e-6,
        load_dump_time_to_trip_s=dump,
        unknown=_unknown(facts, farad, ohm),
        sentences=(),
    )
    return dataclasses.replace(numbers, sentences=_sentences(facts, numbers))


def _refuse_meaningless(facts: SafetyFacts) -> None:
    may_be_zero = {"battery_resistance_ohm", "path_resistance_ohm", "greatest_discharge_w"}
    for field in dataclasses.fields(facts):
        value = getattr(facts, field.name)
        if value is None or isinstance(value, bool):
            continue
        if not math.isfinite(value) or value < 0.0 or (value == 0.0 and field.name not in may_be_zero):
            least = "zero or more" if field.name in may_be_zero else "more than zero"
            raise InputError(f"safety facts, {field.name}: found {value:g}; a finite number, {least}, is needed")


def _capacitance(facts: SafetyFacts) -> tuple[float | None, str | None]:
    if facts.bus_capacitance_f is not None:
        return facts.bus_capacitance_f, "the whole bus"
    if facts.stage_link_capacitance_f is not None:
        return facts.stage_link_capacitance_f, "the stage's own link capacitor only; what else hangs on the link adds"
    return None, None


def _dump_unknown(facts: SafetyFacts, farad: float | None) -> str | None:
    """Return why the time from a load dump to the trip is not known, or None where it is."""
    if farad is None:
        return "no link capacitance is given"
    if facts.trip_voltage_v is None:
        return "no trip voltage is given"
    if facts.trip_voltage_v <= facts.link_voltage_v:
        return "the trip voltage does not lie above the link voltage"
    return None if facts.greatest_discharge_w > 0.0 else "the missions never discharge"


def _unknown(facts: SafetyFacts, farad: float | None, ohm: float) -> tuple[str, ...]:
    found = []
    if farad is None:
        found.append("stored energy and discharge of the link: no bus capacitance is given")
    if ohm == 0.0:
        found.append("current of a link short: no battery or path resistance is given")
    dump = _dump_unknown(facts, farad)
    if dump is not None:
        found.append(f"time from a load dump to the trip: {dump}")
    return tuple(found)


def _sentences(facts: SafetyFacts, n: Safety) -> tuple[str, ...]:
    return (
        _voltage_sentence(n),
        "Only licensed or qualified persons work on this equipment, under the local code and the rules of the site;"
        " those decide wherever they differ from this page.",
        _energy_sentence(facts, n),
        f"{n.discharge_to_v:g} V and {n.discharge_within_s:g} s are figures to choose, not a rule of this page. Printed"
        " for 60 V DC: 1 s for connectors opened without tools (FMVSS 305), 5 s for machines (IEC 60204-1),"
        " 10 s after a crash (ISO 6469-4:2015), 60 s (UN R94, from memory); others limit the energy to 0.2 J or the"
        " charge to 45, 50 or 60 uC. The local code decides.",
        _short_sentence(facts, n),
        _dump_sentence(facts, n),
        "After switching off, wait for the discharge and measure both ports before touching: capacitors keep charge,"
        " and the battery stays live behind its contactors.",
        "All numbers here are planning estimates from the plan's own data. They are no statement of compliance with"
        " any standard and no release for building or operation.",
    )


def _voltage_sentence(n: Safety) -> str:
    where = f"up to {n.highest_voltage_v:.4g} V DC, class {n.voltage_class}."
    if n.highest_voltage_v <= CLASS_A_LIMIT_V:
        return f"CAUTION: {where} Even so, a short of the battery or link burns, arcs and starts fires."
    if n.highest_voltage_v > CLASS_B_LIMIT_V:
        where = f"up to {n.highest_voltage_v:.4g} V DC, {n.voltage_class}."
    return f"HIGH VOLTAGE: {where} Contact can kill."


def _energy_sentence(facts: SafetyFacts, n: Safety) -> str:
    if n.stored_energy_j is None or n.capacitance_f is None:
        return (
            "Stored energy of the link is not known: no bus capacitance is given. Nor is the time of its discharge."
            " Treat the link as charged and dangerous."
        )
    text = (
        f"The link holds {n.stored_energy_j:.4g} J at {facts.highest_link_voltage_v:.4g} V"
        f" ({n.capacitance_f * 1e6:.4g} uF: {n.capacitance_of})."
    )
    if n.discharge_resistor_ohm is None:
        return f"{text} It never stands above {n.discharge_to_v:g} V."
    first = ""
    if facts.link_fed_through_diodes:
        first = (
            " It can do so only once the battery is disconnected: until then the upper diodes hold the link at battery"
            " voltage."
        )
    return (
        f"{text} A resistor of at most {n.discharge_resistor_ohm:.4g} ohm brings it to {n.discharge_to_v:g} V in"
        f" {n.discharge_within_s:g} s, would lose {n.discharge_resistor_loss_w:.4g} W if always connected, and leaves"
        f" {n.energy_left_j:.3g} J.{first}"
    )


def _short_sentence(facts: SafetyFacts, n: Safety) -> str:
    if not facts.link_fed_through_diodes:
        return (
            "A short of the link discharges its capacitors and inductors into the fault. With every gate off no diode"
            " of this topology feeds it from the battery, but a failed switch can: a fuse and a contactor rated for the"
            " battery's own short current must interrupt that."
        )
    size = "a current that the given data do not bound (no battery or path resistance)"
    if n.link_short_current_a is not None:
        within = "" if facts.path_resistance_ohm > 0.0 else " (bounded here by the battery's resistance alone)"
        size = f"up to about {ampere_text(n.link_short_current_a)}{within}"
    return (
        f"A short of the link draws {size} from the battery through the upper diodes, rising at first by"
        f" {n.link_short_rise_a_per_us:.3g} A/us and faster once the inductors saturate. Boosting, the stage cannot"
        " interrupt it: a fuse and a contactor rated for it must."
    )


def _dump_sentence(facts: SafetyFacts, n: Safety) -> str:
    if n.load_dump_time_to_trip_s is None:
        reason = _dump_unknown(facts, n.capacitance_f)
        return f"Time from a load dump to over-voltage is not known: {reason}."
    own = "" if facts.bus_capacitance_f is not None else " with the stage's own capacitor alone"
    return (
        f"If the load leaves at {facts.greatest_discharge_w / 1e3:.4g} kW, the link rises from"
        f" {facts.link_voltage_v:.4g} V to its trip voltage of {facts.trip_voltage_v:.4g} V in"
        f" {n.load_dump_time_to_trip_s * 1e3:.3g} ms{own}; the trip must be faster."
    )
