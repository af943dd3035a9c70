"""Periodic piecewise-linear currents: the one algebra behind every stage.

In steady state each branch current of a pulse-width-modulated stage is piecewise linear over one switching period.
A `Waveform` holds its segments; mean, RMS, peaks, charge, harmonics and the sum of shifted copies follow exactly.

Shapes: every field is a number or an array broadcastable to (..., S), candidates first and steps last. Places and
widths are fractions of the period; currents are in ampere. A segment of zero width carries the value that keeps the
trace continuous and weighs nothing.
"""

from __future__ import annotations

import functools
import operator
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
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

    def forward(self) -> Waveform:
        """Return the part of the current above zero; the rest of each run stays in place as zero current.

        A segment that crosses zero is split there, so mean and mean square of `forward` and `reverse` add up exactly.
        """
        return Waveform(tuple(_clipped(piece, 0.0, np.inf) for s in self.segments for piece in _at_zero(s)))

    def reverse(self) -> Waveform:
        """Return the part of the current below zero, signed; see `forward`."""
        return Waveform(tuple(_clipped(piece, -np.inf, 0.0) for s in self.segments for piece in _at_zero(s)))

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
        Measured in folded periods, a segment that begins at b and lasts w contributes at phase t its values at x,
        x + 1, ... below w, with x = (t - b) mod 1. They are ceil(w - x) terms of an arithmetic series, so the sum is
        exact and linear in t.
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


def _at_zero(segment: Segment) -> tuple[Segment, Segment]:
    """Return a segment in two pieces that meet where it crosses zero; without a crossing the second has no width."""
    place, width, start, end = (_array(field) for field in segment)
    crosses = start * end < 0.0
    share = np.where(crosses, start / np.where(crosses, start - end, 1.0), 1.0)
    middle = np.where(crosses, 0.0, end)
    first = width * share
    return Segment(place, first, start, middle), Segment(place + first, width - first, middle, end)


def _clipped(segment: Segment, least: float, greatest: float) -> Segment:
    return segment._replace(start=np.clip(segment.start, least, greatest), end=np.clip(segment.end, least, greatest))


def _tilt_factor(x: FloatArray) -> FloatArray:
    """Return (x cos x - sin x)/x², by its series where the difference would cancel."""
    small = np.abs(x) < 1e-2
    safe = np.where(small, 1.0, x)
    full = (safe * np.cos(safe) - np.sin(safe)) / (safe * safe)
    return np.where(small, x * (-1.0 / 3.0 + x * x / 30.0), full)


def _tiles(segments: Sequence[Segment], copies: Values) -> Waveform:
    """Return the sum of `copies` shifted copies of all segments as tiles of one period of 1/copies."""
    n = _array(copies)
    runs = [_Run.of(s, n) for s in segments]
    edges = _in_order(_distinct([r.begin for r in runs] + [r.end for r in runs]))
    spans = [after - before for before, after in pairwise([*edges, edges[0] + 1.0])]
    tiles = []
    for begin, span in zip(edges, spans, strict=True):
        half = 0.5 * span
        middle, slope = _sum_of_copies(runs, begin + half)
        tilt = half * slope
        tiles.append(Segment(begin, span, middle - tilt, middle + tilt))
    return Waveform(tuple(tiles))


class _Run(NamedTuple):
    """A segment measured in folded periods: where in one it begins and ends, its length, and its straight line.

    level : current at its beginning less half of `slope` [A]
    slope : rise per folded period [A]
    """

    begin: FloatArray
    end: FloatArray
    length: FloatArray
    level: FloatArray
    slope: FloatArray

    @classmethod
    def of(cls, segment: Segment, n: FloatArray) -> _Run:
        length = _array(segment.width * n)
        # The end is rounded as the next segment's begin is, so that neighbours share a corner to the last bit.
        begin, end = _fraction(_array(segment.place * n)), _fraction(_array((segment.place + segment.width) * n))
        # A width of zero has no slope; it meets no copy below, so any finite number serves.
        slope = _array((segment.end - segment.start) / np.maximum(length, NEGLIGIBLE_WIDTH))
        return cls(begin, end, length, segment.start - 0.5 * slope, slope)


def _fraction(x: FloatArray) -> FloatArray:
    return _array(x - np.floor(x))


def _distinct(corners: Sequence[FloatArray]) -> list[FloatArray]:
    """Return the corners without those that coincide at every step: neighbours share theirs, and tiles cost time."""
    kept: list[FloatArray] = []
    for corner in corners:
        if not any(np.all(corner == other) for other in kept):
            kept.append(corner)
    return kept


def _in_order(corners: list[FloatArray]) -> list[FloatArray]:
    """Return the corners sorted step by step."""
    if len(corners) > _MOST_EXCHANGES:
        return list(np.sort(np.stack(np.broadcast_arrays(*corners)), axis=0))
    ordered = list(corners)
    for last in range(len(ordered) - 1, 0, -1):  # exchanges of whole arrays: np.sort walks short columns slowly
        for i in range(last):
            low, high = ordered[i], ordered[i + 1]
            ordered[i], ordered[i + 1] = np.minimum(low, high), np.maximum(low, high)
    return ordered


_MOST_EXCHANGES = 8
"""Up to this many corners, sorting by exchanges of whole arrays is quicker than a sort along the short axis."""


def _sum_of_copies(runs: Sequence[_Run], phase: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return the summed current [A] and its slope [A per folded period] of all shifted copies at one phase."""
    currents, slopes = [], []
    for run in runs:
        since = _fraction(phase - run.begin)
        count = np.ceil(run.length - since)  # how many of since, since + 1, ... lie below the length
        currents.append(count * (run.level + run.slope * (since + 0.5 * count)))
        slopes.append(count * run.slope)
    return _total(currents), _total(slopes)


def _total(terms: Sequence[FloatArray]) -> FloatArray:
    return _array(functools.reduce(operator.add, terms))
