"""What the body diode takes from a channel that conducts in reverse: both lie in parallel."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tideleg import FloatArray, Line, Position, Timing, Values
from tideleg_losses.edges import diode_current_at_begin, diode_current_at_end
from tideleg_losses.moments import moments

REFERENCE_DEGC = 25.0


@dataclass(frozen=True)
class BodyDiode:
    """V0 + slope (T - 25) + r i [V]."""

    voltage: Values
    resistance: Values
    slope: Values

    def saving(self, part: Position, timing: Timing, degc: FloatArray, channel: FloatArray, rise: FloatArray) -> Line:
        """Return how much less the two lose together than the channel alone would, less the dead times [W], [W/K].

        Parameters
        ----------
        channel, rise : resistance of the channel in reverse [Ω] and its slope [Ω/K]

        Notes
        -----
        Above i0 = V0/R the diode conducts; both then stand at R (V0 + r i)/(R + r), so that the channel alone would
        lose R i (R i - V0)/(R + r) more: parallel branches. The saving grows from zero at i0, so the slope in
        temperature has no part from i0 moving.
        """
        volts = np.maximum(self.voltage + self.slope * (degc - REFERENCE_DEGC), 0.0)
        threshold = volts / channel
        if not np.any(-part.current.valley() > threshold):
            nothing = np.zeros(np.broadcast_shapes(np.shape(threshold), np.shape(part.current.mean())))
            return Line(nothing, nothing)
        over = moments(part.current.reverse(), threshold, np.inf)
        first, second = over.first, over.second
        dead = timing.dead_time * timing.frequency
        for current in (diode_current_at_begin(part), diode_current_at_end(part)):
            above = current > threshold
            first = first - dead * np.where(above, current, 0.0)
            second = second - dead * np.where(above, current * current, 0.0)
        whole = channel + self.resistance
        watts = channel * (channel * second - volts * first) / whole
        by_channel = (2.0 * channel * second - volts * first - watts) / whole
        by_volts = -channel * first / whole
        tilt = by_channel * rise + by_volts * np.where(volts > 0.0, self.slope, 0.0)
        kept = watts > 0.0
        return Line(np.where(kept, watts, 0.0), np.where(kept, tilt, 0.0))
