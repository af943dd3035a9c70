"""A stage of two-level legs in parallel, evenly shifted: all alike, or one of them a lead leg that differs.

The lead leg is stated apart, as slots of its own, where one leg must be told from the others: where its inductance or
its share of the current differs (the unlucky leg decides), and where legs are shed (it never rests). The other legs are
alike; those that rest take turns, so each carries their mean heat.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, NamedTuple

import numpy as np

from tideleg import (
    DISCONTINUOUS,
    Exchange,
    FloatArray,
    Operation,
    Point,
    Position,
    Segment,
    Slot,
    Timing,
    Values,
    Waveform,
    Winding,
)
from tideleg_topologies.gates import SHORT_PULSE, Gates, Pulses, gates
from tideleg_topologies.leg import (
    REASONS,
    LegState,
    TwoLevelSettings,
    frequency_of,
    leg_state,
    turn_on_voltages,
)


class Sharing(NamedTuple):
    """How many legs work and how they differ.

    legs : legs of the stage
    working : legs that work, at each step
    lead : whether one leg is stated apart
    lead_current : current of the lead leg over that of an even share [-]
    lead_inductance : its inductance over that of the others [-]
    """

    legs: int
    working: Any
    lead: bool = False
    lead_current: float = 1.0
    lead_inductance: float = 1.0

    @property
    def even(self) -> bool:
        """Whether the working legs are alike, so that their sum is a fold."""
        return self.lead_current == 1.0 and self.lead_inductance == 1.0


def slots(legs: int, lead: bool = False) -> tuple[Slot, ...]:
    """Return the places for parts in a stage of so many legs."""
    places = []
    for prefix, copies in (("lead_", 1), ("", legs - 1)) if lead else (("", legs),):
        places += [
            Slot(f"{prefix}upper_switch", "switch", "switch", copies),
            Slot(f"{prefix}lower_switch", "switch", "switch", copies),
            Slot(f"{prefix}inductor", "inductor", "inductor", copies),
        ]
    return (
        *places,
        Slot("battery_capacitor", "capacitor", "battery_capacitor"),
        Slot("link_capacitor", "capacitor", "link_capacitor"),
    )


class _Leg(NamedTuple):
    """One sort of leg: its steady state, its waveforms, and how many of it work at each step."""

    prefix: str
    state: LegState
    inductor: Waveform
    into_link: Waveform
    copies: Any


def operate(point: Point, settings: TwoLevelSettings, inductance: Mapping[str, Values], sharing: Sharing) -> Operation:
    """Return the steady state of evenly shifted legs; see `Topology.operate`.

    `Operation.duty_ratio` is the share of the period in which the UPPER position of a leg conducts: of the lead leg,
    where there is one.
    """
    even_share = point.battery_current / sharing.working
    others = inductance["inductor"]
    frequency = frequency_of(point, even_share, settings, others)
    sorts = []
    if sharing.lead:
        several = np.maximum(sharing.working - 1, 1)
        lead_share = np.where(sharing.working > 1, sharing.lead_current, 1.0)
        henry = inductance["lead_inductor"] * sharing.lead_inductance
        sorts.append(_leg("lead_", point, even_share * lead_share, frequency, henry, settings, 1))
        # With one leg at work it is the lead leg: it carries the whole, and the others rest.
        even_share = even_share * np.where(sharing.working > 1, (sharing.working - lead_share) / several, 0.0)
        point = point._replace(active=point.active & (sharing.working > 1))
    rest = sharing.working - len(sorts)
    sorts.append(_leg("", point, even_share, frequency, others, settings, rest))
    first = sorts[0].state
    pulses = [_gates(leg.state, frequency, settings) for leg in sorts]
    reasons = [
        pulse.reason(leg.state.reason, 1 + REASONS.index(SHORT_PULSE)) for pulse, leg in zip(pulses, sorts, strict=True)
    ]
    positions: dict[str, Position] = {}
    for leg in sorts:
        positions |= _positions(point, leg)
    return Operation(
        positions=positions,
        windings={f"{leg.prefix}inductor": _winding(point, leg) for leg in sorts},
        exchanges={
            "battery_capacitor": _exchange([leg.inductor for leg in sorts], sharing, frequency, point.battery_voltage),
            "link_capacitor": _exchange([leg.into_link for leg in sorts], sharing, frequency, point.link_voltage),
        },
        timing=Timing(frequency, settings.dead_time),
        duty_ratio=np.asarray(first.upper.width),
        conduction=first.conduction,
        reason=np.maximum(reasons[0], reasons[-1]),
        caution=np.maximum(pulses[0].caution, pulses[-1].caution),
        columns=pulses[0].columns(),
    )


def _leg(
    prefix: str,
    point: Point,
    current: FloatArray,
    frequency: Values,
    henry: Values,
    settings: TwoLevelSettings,
    copies: Any,
) -> _Leg:
    state = leg_state(point, current, frequency, henry, settings)
    return _Leg(prefix, state, Waveform((state.lower, state.upper)), Waveform((state.upper,)), copies)


def _gates(state: LegState, frequency: Values, settings: TwoLevelSettings) -> Gates:
    rests = state.conduction == DISCONTINUOUS
    pulses = Pulses(state.upper.width, state.lower.width, state.lower.start, state.lower.end, rests)
    return gates(pulses, frequency, settings.dead_time, settings.minimum_pulse)


def _winding(point: Point, leg: _Leg) -> Winding:
    node = leg.state.node_mean
    return Winding(leg.inductor, (node, node - point.link_voltage), leg.copies)


def _positions(point: Point, leg: _Leg) -> dict[str, Position]:
    """Return both switch positions of one sort of leg."""
    place, width, start, end = leg.state.upper
    link = point.link_voltage
    lower_rises, upper_rises = turn_on_voltages(point, leg.state)
    driven = (np.asarray(leg.state.conducting) > 0.0).astype(np.float64)
    upper = Waveform((Segment(place, width, -start, -end),))
    return {
        f"{leg.prefix}upper_switch": Position(upper, link, upper_rises, driven, leg.copies),
        f"{leg.prefix}lower_switch": Position(Waveform((leg.state.lower,)), link, lower_rises, driven, leg.copies),
    }


def _exchange(sorts: list[Waveform], sharing: Sharing, frequency: Values, voltage: FloatArray) -> Exchange:
    """Return the sum of all working legs at one port, each shifted by its part of the period.

    Alike legs fold into the period of one over their number. Where the lead leg differs, what is left between legs
    stays at the switching frequency itself: nothing cancels by assumption.
    """
    if sharing.even:
        if sharing.legs == 1:
            return Exchange(sorts[0], frequency, voltage)
        return Exchange(sorts[0].fold(sharing.working), sharing.working * frequency, voltage)
    lead, other = sorts
    shifted = []
    for k in range(1, sharing.legs):
        works = np.asarray(k < sharing.working, dtype=np.float64)
        shifted.append(other.shifted(k / sharing.working).scaled(works))
    return Exchange(lead.overlay(*shifted), frequency, voltage)
