"""Periodic piecewise-linear currents: the one algebra behind every stage.

In steady state each branch current of a pulse-width-modulated stage is piecewise linear over one switching period.
A `Waveform` holds its segments; mean, RMS, peaks, charge, harmonics and the sum of shifted copies follow exactly.

Shapes: every field is a number or an array broadcastable to (..., S), candidates first and steps last. Places and
widths are fractions of the period; currents are in ampere. A segment of zero width carries the value that keeps the
trace continuous and weighs nothing.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
Values = FloatArray | float

NEGLIGIBLE_WIDTH = 1e-12
"""A segment narrower than this fraction of a period is rounding, not a current: its ends do not count as peaks."""


class Segment(NamedTuple):
    """One straight piece of a periodic current.

    place : where in the period it begins, 0 to 1 [-]; a segment may run past 1 and then wraps
    width : what fraction of the period it lasts, 0 to 1 [-]
    start : current at its beginning [A]
    end : current at its end [A]
    """

    place: Values
    width: Values
    start: Values
    end: Values


@dataclass(frozen=True)
class Waveform:
    """A periodic current made of straight segments, zero where no segment lies.

    Segments of one waveform do not overlap and stand in the order of time, so that the first one's start and the
    last one's end are the edges of a contiguous run. `overlay` adds waveforms whose segments do overlap.

    Examples
    --------
    A ramp from 0 A to 3 A over the whole period:

    >>> ramp = Waveform((Segment(0.0, 1.0, 0.0, 3.0),))
    >>> float(ramp.mean()), float(ramp.mean_square()), float(ramp.peak())
    (1.5, 3.0, 3.0)
    """

    segments: tuple[Segment, ...]

    def mean(self) -> FloatArray:
        """Return the mean over one period [A]."""
        return _array(sum(s.width * (s.start + s.end) * 0.5 for s in self.segments))

    def mean_square(self) -> FloatArray:
        """Return the mean square over one period [A²].

        Each segment gives d (a² + a b + b²)/3: R. W. Erickson and D. Maksimović, Fundamentals of Power Electronics,
        2nd ed., Kluwer, 2001, Appendix A (edition from memory).
        """
        return _array(sum(s.width * (s.start * s.start + s.start * s.end + s.end * s.end) for s in self.segments)) / 3.0

    def rms(self) -> FloatArray:
        """Return the root mean square over one period [A]."""
        return np.sqrt(self.mean_square())

    def ac_mean_square(self) -> FloatArray:
        """Return the mean square less the squared mean [A²]; rounding below zero is cut at zero.

        Near a ripple null this is the small difference of large numbers: trust it to about 1e-15 of the mean square.
        """
        mean = self.mean()
        return np.maximum(self.mean_square() - mean * mean, 0.0)

    def ac_rms(self) -> FloatArray:
        """Return the root mean square of the current less its mean [A]."""
        return np.sqrt(self.ac_mean_square())

    def mean_magnitude(self) -> FloatArray:
        """Return the mean of the magnitude over one period [A]; a segment that crosses zero counts both triangles."""
        total: Values = 0.0
        for s in self.segments:
            start, end = _array(s.start), _array(s.end)
            crosses = start * end < 0.0
            span = np.where(crosses, np.abs(start) + np.abs(end), 1.0)
            both_triangles = 0.5 * (start * start + end * end) / span
            total = total + s.width * np.where(crosses, both_triangles, 0.5 * np.abs(start + end))
        return _array(total)

    def width(self) -> FloatArray:
        """Return the fraction of the period in which a segment lies [-]."""
        return _array(sum(s.width for s in self.segments))

    def peak(self) -> FloatArray:
        """Return the greatest current of the period [A], zero included where no segment lies."""
        return self._extreme(np.maximum, -np.inf)

    def valley(self) -> FloatArray:
        """Return the least current of the period [A], zero included where no segment lies."""
        return self._extreme(np.minimum, np.inf)

    def peak_to_peak(self) -> FloatArray:
        """Return the ripple, greatest less least current [A]."""
        return self.peak() - self.valley()

    def _extreme(self, pick: Any, worst: float) -> FloatArray:
        found: Any = np.where(self.width() < 1.0 - NEGLIGIBLE_WIDTH, 0.0, worst)
        for s in self.segments:
            here = np.where(np.asarray(s.width) > NEGLIGIBLE_WIDTH, pick(s.start, s.end), worst)
            found = pick(found, here)
        return _array(found)

    def scaled(self, factor: Values) -> Waveform:
        """Return the waveform with every current multiplied by `factor` [-]."""
        return Waveform(tuple(Segment(s.place, s.width, s.start * factor, s.end * factor) for s in self.segments))

    def shifted(self, fraction: Values) -> Waveform:
        """Return the waveform delayed by `fraction` of the period [-]."""
        return Waveform(tuple(s._replace(place=np.mod(s.place + fraction, 1.0)) for s in self.segments))

    def overlay(self, *others: Waveform) -> Waveform:
        """Return the sum of this waveform and others of the same period, as tiles without gap or overlap."""
        every = sum((other.segments for other in others), self.segments)
        return _tiles(every, 1.0)

    def fold(self, copies: Values = 1.0) -> Waveform:
        """Return the sum of `copies` equally shifted copies, over ITS period of 1/copies.

        The result tiles its own period without gap: multiply the switching frequency by `copies` to name its
        frequency. With one copy the waveform itself comes back as ordered tiles, gaps filled with zero.

        Parameters
        ----------
        copies : float or ndarray, broadcastable to (..., S)
            Whole number of copies, 1 or more; may differ from step to step.

        Notes
        -----
        At a phase t of the folded period a segment contributes the copies j = 0..n-1 that lie at x + j/copies inside
        its width, with x = (t - place) mod 1/copies: an arithmetic series, so the sum is exact and linear in t.
        """
        return _tiles(self.segments, copies)

    def charge_swing(self) -> FloatArray:
        """Return the peak-to-peak swing of the charge that the ac part carries [A · period].

        Divide by the frequency of this waveform for coulomb, and by a capacitance for the voltage ripple. The charge
        is a parabola inside each segment; its extremes there (where the current crosses its mean) are included.
        """
        tiles = self.fold(1.0).segments
        mean = self.mean()
        charge: FloatArray = np.zeros_like(mean)
        highest: FloatArray = charge
        lowest: FloatArray = charge
        for tile in tiles:
            before, after = tile.start - mean, tile.end - mean
            crosses = before * after < 0.0
            slope = np.where(crosses, before - after, 1.0)
            inside = charge + np.where(crosses, 0.5 * tile.width * before * before / slope, 0.0)
            charge = charge + tile.width * 0.5 * (before + after)
            highest = np.maximum(np.maximum(highest, inside), charge)
            lowest = np.minimum(np.minimum(lowest, inside), charge)
        return _array(highest - lowest)

    def harmonic(self, order: int) -> NDArray[np.complex128]:
        """Return the complex amplitude of one harmonic [A]; its magnitude is the peak of that sine.

        Parameters
        ----------
        order : int
            1 for the fundamental and so on; 0 is the mean (see `mean`) and is refused.

        Raises
        ------
        ValueError
            If `order` is below 1.
        """
        if order < 1:
            raise ValueError(f"a harmonic has an order of 1 or more, not {order}; the mean is mean()")
        total: Any = 0.0
        for s in self.segments:
            half_angle = np.pi * order * np.asarray(s.width, dtype=float)
            middle = np.exp(-2j * np.pi * order * (s.place + 0.5 * np.asarray(s.width)))
            level = 0.5 * (s.start + s.end) * np.sinc(half_angle / np.pi)
            tilt = 0.5j * (s.end - s.start) * _tilt_factor(half_angle)
            total = total + s.width * middle * (level + tilt)
        return np.asarray(2.0 * total, dtype=np.complex128)

    def trace(self, step: tuple[int, ...] = ()) -> tuple[FloatArray, FloatArray]:
        """Return the corner points of one step as (fraction of period, current [A]), for drawing.

        Parameters
        ----------
        step : tuple of int
            Index of the wanted operating point in the shape of the waveform; () for a single point.
        """
        fractions: list[float] = []
        currents: list[float] = []
        shape = np.shape(self.mean())
        for tile in self.fold(1.0).segments:
            place, width, start, end = (float(np.broadcast_to(np.asarray(v), shape)[step]) for v in tile)
            if width > NEGLIGIBLE_WIDTH:
                fractions += [place, place + width]
                currents += [start, end]
        return np.array(fractions), np.array(currents)


def _array(value: Any) -> FloatArray:
    return np.asarray(value, dtype=np.float64)


def _tilt_factor(x: FloatArray) -> FloatArray:
    """Return (x cos x - sin x)/x², by its series where the difference would cancel."""
    small = np.abs(x) < 1e-2
    safe = np.where(small, 1.0, x)
    full = (safe * np.cos(safe) - np.sin(safe)) / (safe * safe)
    return np.where(small, x * (-1.0 / 3.0 + x * x / 30.0), full)


def _tiles(segments: Sequence[Segment], copies: Values) -> Waveform:
    """Return the sum of `copies` shifted copies of all segments as tiles of one period of 1/copies."""
    n = np.asarray(copies, dtype=np.float64)
    period = 1.0 / n
    corners = [np.mod(s.place, period) for s in segments] + [np.mod(s.place + s.width, period) for s in segments]
    edges = np.sort(np.stack(np.broadcast_arrays(*corners)), axis=0)
    tiles = []
    for index in range(len(edges)):
        begin = edges[index]
        is_last = index == len(edges) - 1
        span = (edges[0] + period if is_last else edges[index + 1]) - begin
        middle, slope = _sum_of_copies(segments, begin + 0.5 * span, n)
        half = 0.5 * span * slope
        tiles.append(Segment(begin * n, span * n, middle - half, middle + half))
    return Waveform(tuple(tiles))


def _sum_of_copies(segments: Sequence[Segment], phase: FloatArray, n: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return the summed current [A] and its slope [A/period] of `n` shifted copies at one phase."""
    current: Any = 0.0
    slope: Any = 0.0
    for s in segments:
        width = np.asarray(s.width, dtype=np.float64)
        present = width > 0.0
        rate = np.where(present, (s.end - s.start) / np.where(present, width, 1.0), 0.0)
        first = np.mod(phase - s.place, 1.0 / n)
        inside = np.where(present, np.maximum(np.floor((width - first) * n) + 1.0, 0.0), 0.0)
        current = current + inside * s.start + rate * (inside * first + inside * (inside - 1.0) / (2.0 * n))
        slope = slope + inside * rate
    return _array(current), _array(slope)
