"""Three-level leg with a flying capacitor: devices at half the link voltage, ripple at twice their frequency.

Four positions in series join the link to the return; the inductor meets them in the middle, the flying capacitor spans
the inner two and is held at half the link voltage. The outer pair and the inner pair each switch with the duty ratio D,
half a period apart. The outer and the inner upper position carry the same current half a period apart, and so do the
two lower ones: each sort is stated once, with two copies a leg.

Modelling choices: the flying capacitor is balanced; both port capacitors take the whole ac part of the exchange; legs
are alike and evenly shifted; the inductor current may reverse and is never discontinuous.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from pydantic import Field

from tideleg import (
    CONTINUOUS,
    IDLE,
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
    hookimpl,
)
from tideleg_topologies.leg import NO_DUTY_RATIO, NOT_BELOW_LINK, LegSettings

REASONS = (NOT_BELOW_LINK, NO_DUTY_RATIO)


class FlyingCapacitorSettings(LegSettings):
    """Keys under [stage]: those of a two-level leg, without diode emulation, and the number of legs."""

    modulation: Literal["synchronous"] = "synchronous"
    legs: int = Field(default=1, ge=1, strict=True)


@dataclass(frozen=True)
class FlyingCapacitor:
    """The topology. `Operation.duty_ratio` is that of the upper positions."""

    name: str = "flying-capacitor"
    source: str = (
        "T. Meynard and H. Foch, Multi-level conversion, IEEE PESC 1992 (from memory): ripple V D (1/2 - D)/(L f) below"
        " half duty, V (D - 1/2)(1 - D)/(L f) above"
    )
    settings: type[FlyingCapacitorSettings] = FlyingCapacitorSettings
    reasons: tuple[str, ...] = REASONS

    def slots(self, settings: FlyingCapacitorSettings) -> tuple[Slot, ...]:
        """Return the places for parts; two equal positions of each sort in a leg."""
        legs = settings.legs
        return (
            Slot("upper_switch", "switch", "switch", 2 * legs),
            Slot("lower_switch", "switch", "switch", 2 * legs),
            Slot("inductor", "inductor", "inductor", legs),
            Slot("flying_capacitor", "capacitor", "flying_capacitor", legs),
            Slot("battery_capacitor", "capacitor", "battery_capacitor"),
            Slot("link_capacitor", "capacitor", "link_capacitor"),
        )

    def operate(self, point: Point, settings: FlyingCapacitorSettings, inductance: Mapping[str, Values]) -> Operation:
        """Return the steady state at each step.

        Below half duty the node moves between 0 and half the link voltage, above between half and the whole. Either
        way each half period holds one falling and one rising piece of the inductor current: one layout for both.
        """
        legs, frequency, link = settings.legs, settings.switching_frequency, point.link_voltage
        current = point.battery_current / legs
        wanted = (point.battery_voltage - current * point.path_resistance) / np.maximum(link, 1e-100)
        duty = np.clip(wanted, 0.0, 1.0)
        below = duty < 0.5
        on = point.active.astype(np.float64)
        falls = np.where(below, duty, duty - 0.5) * on
        rises = 0.5 * on - falls
        level = np.where(below, 0.5, 1.0) * link
        ripple = (level - duty * link) * falls / (inductance["inductor"] * frequency)
        peak, valley = on * current + 0.5 * ripple, on * current - 0.5 * ripple
        parts = _Pieces(falls, rises, peak, valley, below)
        inductor, into_link = parts.inductor(), parts.upper()
        voltages = (duty * link - level, duty * link - level + 0.5 * link) * 2
        driven = on
        reason = np.where((wanted <= 0.0) | (wanted >= 1.0), np.int8(2), np.int8(0))
        return Operation(
            positions={
                "upper_switch": Position(into_link.scaled(-1.0), 0.5 * link, 0.5 * link, driven, 2 * legs),
                "lower_switch": Position(parts.lower(), 0.5 * link, 0.5 * link, driven, 2 * legs),
            },
            windings={"inductor": Winding(inductor, voltages, legs)},
            exchanges={
                "flying_capacitor": Exchange(parts.flying(), frequency, 0.5 * link),
                "battery_capacitor": Exchange(inductor.fold(legs), legs * frequency, point.battery_voltage),
                "link_capacitor": Exchange(into_link.fold(legs), legs * frequency, link),
            },
            timing=Timing(frequency, settings.dead_time),
            duty_ratio=duty * on,
            conduction=np.where(point.active, np.int8(CONTINUOUS), np.int8(IDLE)),
            reason=np.where(point.battery_voltage >= link, np.int8(1), reason),
        )


@dataclass(frozen=True)
class _Pieces:
    """The four pieces of a period: falling, rising, falling, rising; and which of them each branch carries."""

    falls: FloatArray
    rises: FloatArray
    peak: FloatArray
    valley: FloatArray
    below: Any

    def _fall(self, place: Values, width: Values, sign: float = 1.0) -> Segment:
        return Segment(place, width, sign * self.peak, sign * self.valley)

    def _rise(self, place: Values, width: Values, sign: float = 1.0) -> Segment:
        return Segment(place, width, sign * self.valley, sign * self.peak)

    def inductor(self) -> Waveform:
        """Return the whole inductor current."""
        f, r = self.falls, self.rises
        return Waveform((self._fall(0.0, f), self._rise(f, r), self._fall(0.5, f), self._rise(0.5 + f, r)))

    def upper(self) -> Waveform:
        """Return what the outer upper position passes to the link: its run begins the period."""
        f, above_r, above_f = self.falls, np.where(self.below, 0.0, self.rises), np.where(self.below, 0.0, self.falls)
        return Waveform((self._fall(0.0, f), self._rise(f, above_r), self._fall(0.5, above_f)))

    def lower(self) -> Waveform:
        """Return the current of the outer lower position: it conducts while the upper one does not."""
        f, below_r, below_f = self.falls, np.where(self.below, self.rises, 0.0), np.where(self.below, self.falls, 0.0)
        return Waveform((self._rise(f, below_r), self._fall(0.5, below_f), self._rise(0.5 + f, self.rises)))

    def flying(self) -> Waveform:
        """Return the flying capacitor's current: out where only the outer upper conducts, in where only the inner."""
        f, r, below = self.falls, self.rises, self.below
        low, high = np.where(below, f, 0.0), np.where(below, 0.0, r)
        return Waveform(
            (
                self._fall(0.0, low, -1.0),
                self._rise(f, high, -1.0),
                self._fall(0.5, low),
                self._rise(0.5 + f, high),
            )
        )


@hookimpl
def topology() -> FlyingCapacitor:
    """Offer the three-level leg with a flying capacitor."""
    return FlyingCapacitor()
