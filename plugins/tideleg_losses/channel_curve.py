"""Conduction of a channel whose resistance is a table of points over temperature, current or both."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tideleg import FloatArray, Line, Position, Timing, Values, Waveform
from tideleg_losses.edges import diode_current_at_begin, diode_current_at_end
from tideleg_losses.family import Family
from tideleg_losses.moments import moments


def shares_of_columns(one_way: Waveform, knots: FloatArray, order: int) -> FloatArray:
    """Return the integral of |i| (order 1) or i² (order 2) that belongs to each current knot (..., knots) [A, A²].

    Between two knots a value on a straight line over |i| is the mean of the two, weighted by nearness; the weights
    times i² over a run are moments of second and third order, so the integral of R(|i|) i² is exact.
    """
    whole = moments(one_way, 0.0, np.inf)[order - 1]
    if knots.size == 1:
        return np.asarray(whole)[..., None]
    shares = [np.zeros_like(whole) for _ in knots]
    greatest = max(float(np.max(np.abs(end), initial=0.0)) for s in one_way.segments for end in (s.start, s.end))
    for k in range(knots.size - 1):
        low, high = knots[k], knots[k + 1]
        if low > greatest:
            break
        part = moments(one_way, low, high)
        mass, next_mass = part[order - 1], part[order]
        upper = (next_mass - low * mass) / (high - low)
        shares[k] = shares[k] + mass - upper
        shares[k + 1] = shares[k + 1] + upper
    if greatest >= knots[-1]:
        shares[-1] = shares[-1] + moments(one_way, knots[-1], np.inf)[order - 1]
    return np.stack(np.broadcast_arrays(*shares), axis=-1)


def peak_magnitude(part: Position) -> FloatArray:
    """Return the greatest |i| of the run [A]."""
    return np.maximum(np.abs(part.current.peak()), np.abs(part.current.valley()))


def reaches_beyond(family: Family, one_way: Waveform, degc: Values) -> NDArray[np.bool_]:
    """Return where a run asks the table beyond its points: by its peak, by its own mean, or by the temperature.

    A ripple passes through small currents on its way; only a run whose rms lies below the least point counts as
    below it.
    """
    peak = np.maximum(np.abs(one_way.peak()), np.abs(one_way.valley()))
    width = one_way.width()
    rms = np.sqrt(one_way.mean_square() / np.where(width > 0.0, width, 1.0))
    asked = peak > 0.0
    beyond = family.over_current.beyond(np.maximum(peak, family.over_current.low)) | (
        family.over_current.beyond(np.minimum(rms, family.over_current.high))
    )
    return np.asarray(asked & (beyond | family.over_degc.beyond(degc)))


@dataclass(frozen=True)
class CurveChannelTerm:
    """The mean of R(T, |i|) i², exact along straight pieces of current; forward and reverse by their own curves.

    diode_counted : whether a dead-time loss takes the diode's share of the run; else the channel keeps it
    """

    forward: Family
    reverse: Family
    diode_counted: bool
    scale: Values = 1.0
    mechanism: str = "channel conduction"
    ohmic: bool = True
    heats: bool = True

    def at(self, part: Position, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one chip [W] and its slope [W/K]."""
        there = self._mean(self.forward, part.current.forward(), temperature)
        back = self._mean(self.reverse, part.current.reverse(), temperature)
        watts, slope = back
        if self.diode_counted:
            dead = timing.dead_time * timing.frequency
            for current in (diode_current_at_begin(part), diode_current_at_end(part)):
                ohms, rise = self.reverse.at(current, 0.0, temperature)
                watts = watts - dead * ohms * current * current
                slope = slope - dead * rise * current * current
        kept = watts > 0.0
        watts, slope = np.where(kept, watts, 0.0), np.where(kept, slope, 0.0)
        return Line(np.asarray(self.scale * (there[0] + watts)), np.asarray(self.scale * (there[1] + slope)))

    def outside(self, part: Position, timing: Timing, temperature: FloatArray) -> NDArray[np.bool_]:
        """Return where current or temperature lie beyond the points of the curve in use."""
        there = reaches_beyond(self.forward, part.current.forward(), temperature)
        return there | reaches_beyond(self.reverse, part.current.reverse(), temperature)

    def _mean(self, family: Family, one_way: Waveform, degc: FloatArray) -> tuple[FloatArray, FloatArray]:
        return family.weighted(shares_of_columns(one_way, family.current, 2), degc)
