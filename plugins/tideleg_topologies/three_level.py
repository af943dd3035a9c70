"""Currents of a three-level leg, whatever holds its middle level: the algebra that both three-level topologies share.

An outer and an inner switching function, alike but half a period apart, are each 1 for a share D of the period. The
inductor sees the battery voltage less half the link voltage times their sum. Below half duty the node moves between 0
and half the link voltage, above between half and the whole: either way each half period holds one falling and one
rising piece of the inductor current, so one layout of four pieces serves both.

Source: T. Meynard and H. Foch, Multi-level conversion, IEEE PESC 1992 (from memory): ripple V D (1/2 - D)/(L f) below
half duty, V (D - 1/2)(1 - D)/(L f) above.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from tideleg import FloatArray, Point, Segment, Values, Waveform
from tideleg_topologies.gates import SHORT_PULSE, Gates, Pulses, gates
from tideleg_topologies.leg import ASSUMPTIONS as LEG_ASSUMPTIONS
from tideleg_topologies.leg import NO_DUTY_RATIO, NOT_BELOW_LINK, REASONS, LegSettings

SOURCE = (
    "T. Meynard and H. Foch, Multi-level conversion, IEEE PESC 1992 (from memory): ripple V D (1/2 - D)/(L f) below"
    " half duty, V (D - 1/2)(1 - D)/(L f) above"
)
ASSUMPTIONS = (
    *LEG_ASSUMPTIONS[:2],
    "the middle level of a three-level leg is balanced at half the link voltage and both of its pulse trains are alike;"
    " a spread between them would leave ripple at the device frequency itself",
)
SHORT = 1 + REASONS.index(SHORT_PULSE)
"""Reason code of a pulse that is too short."""


@dataclass(frozen=True)
class ThreeLevelCurrents:
    """The four pieces of a period: falling, rising, falling, rising; and which of them each branch carries.

    duty : share of the period in which a switching function is 1 [-]
    falls, rises : widths of one falling and one rising piece [-]; zero where the leg idles
    peak, valley : of the inductor current, positive = discharge [A]
    below : whether the duty ratio is below one half
    reason : code into `REASONS`, counted from 1
    """

    duty: FloatArray
    falls: FloatArray
    rises: FloatArray
    peak: FloatArray
    valley: FloatArray
    below: Any
    reason: Any

    @classmethod
    def at(cls, point: Point, current: FloatArray, frequency: Values, inductance: Values) -> ThreeLevelCurrents:
        """Return the steady state of one leg that carries a mean inductor current [A]."""
        link = point.link_voltage
        wanted = (point.battery_voltage - current * point.path_resistance) / np.maximum(link, 1e-100)
        duty = np.clip(wanted, 0.0, 1.0)
        below = duty < 0.5
        on = point.active.astype(np.float64)
        falls = np.where(below, duty, duty - 0.5) * on
        rises = 0.5 * on - falls
        level = np.where(below, 0.5, 1.0) * link
        ripple = (level - duty * link) * falls / (inductance * frequency)
        lost = np.where((wanted <= 0.0) | (wanted >= 1.0), np.int8(1 + REASONS.index(NO_DUTY_RATIO)), np.int8(0))
        reason = np.where(point.battery_voltage >= link, np.int8(1 + REASONS.index(NOT_BELOW_LINK)), lost)
        return cls(duty, falls, rises, on * current + 0.5 * ripple, on * current - 0.5 * ripple, below, reason)

    def gates(self, settings: LegSettings) -> Gates:
        """Return the gate pulses: each pair of complementary positions switches as a two-level leg does."""
        on = 2.0 * (self.falls + self.rises)
        pulses = Pulses(self.duty * on, (1.0 - self.duty) * on, self.valley, self.peak)
        return gates(pulses, settings.switching_frequency, settings.dead_time, settings.minimum_pulse)

    def voltages(self, link: FloatArray) -> tuple[FloatArray, ...]:
        """Return the inductor voltage in each piece, positive = rising current [V]."""
        level = np.where(self.below, 0.5, 1.0) * link
        return (self.duty * link - level, self.duty * link - level + 0.5 * link) * 2

    def _fall(self, place: Values, width: Values, sign: float = 1.0) -> Segment:
        return Segment(place, width, sign * self.peak, sign * self.valley)

    def _rise(self, place: Values, width: Values, sign: float = 1.0) -> Segment:
        return Segment(place, width, sign * self.valley, sign * self.peak)

    def inductor(self) -> Waveform:
        """Return the whole inductor current."""
        f, r = self.falls, self.rises
        return Waveform((self._fall(0.0, f), self._rise(f, r), self._fall(0.5, f), self._rise(0.5 + f, r)))

    def upper(self) -> Waveform:
        """Return the current while the outer function is 1: its run begins the period."""
        f, above_r, above_f = self.falls, np.where(self.below, 0.0, self.rises), np.where(self.below, 0.0, self.falls)
        return Waveform((self._fall(0.0, f), self._rise(f, above_r), self._fall(0.5, above_f)))

    def lower(self) -> Waveform:
        """Return the current while the outer function is 0."""
        f, below_r, below_f = self.falls, np.where(self.below, self.rises, 0.0), np.where(self.below, self.falls, 0.0)
        return Waveform((self._rise(f, below_r), self._fall(0.5, below_f), self._rise(0.5 + f, self.rises)))

    def middle(self) -> Waveform:
        """Return the current of the middle level: inner function less outer, times the inductor current."""
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
