"""Inductance that falls with current, through the flux linkage.

The small-signal inductance over current, as a data sheet or a meter gives it, is the slope of the flux linkage:
lambda(i) = integral of L di. Volt-seconds fix how far the linkage swings in a period, whatever the inductance; so the
valley and the peak around a mean current follow from lambda(peak) - lambda(valley), and a topology that is given
L = swing of linkage / swing of current states their distance right. Between them its currents stay straight, where the
true ones bend: most of the period is spent below the middle, so that at one mean current both extremes lie higher than
the straight ones, by about (ripple²/12) (-L'/L). `true_extremes` gives them; RMS, edges and charge are those of the
straight currents.

Source: definition of the flux linkage, Faraday's law.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from tideleg.waveform import FloatArray, Values

SETTLED = 1e-12
"""Relative change of the half swing at which its root is found [-]."""

MOST_ROUNDS = 60


class LinkageCurve(NamedTuple):
    """Small-signal inductance over current, even in the current, straight between points and level beyond the last.

    ampere : (K,) increasing from 0 [A]
    henry : (K,) at each [H]
    linkage : (K,) flux linkage at each [V s]
    moment : (K,) integral of i L di from zero to each [V s A]
    """

    ampere: FloatArray
    henry: FloatArray
    linkage: FloatArray
    moment: FloatArray

    @classmethod
    def of(cls, points: tuple[tuple[float, float], ...]) -> LinkageCurve:
        """Return the curve through (current [A], inductance [H]) points, the first at zero current."""
        ampere, henry = (np.array(column, dtype=np.float64) for column in zip(*points, strict=True))
        steps = np.diff(ampere) * 0.5 * (henry[1:] + henry[:-1])
        # Simpson's rule is exact for the cubic that current times a straight inductance integrates to.
        middle = 0.25 * (ampere[1:] + ampere[:-1]) * (henry[1:] + henry[:-1])
        moments = np.diff(ampere) * (ampere[:-1] * henry[:-1] + 4.0 * middle + ampere[1:] * henry[1:]) / 6.0
        zero = np.zeros(1)
        return cls(ampere, henry, np.concatenate([zero, np.cumsum(steps)]), np.concatenate([zero, np.cumsum(moments)]))

    def slope(self, current: FloatArray) -> FloatArray:
        """Return the small-signal inductance [H]."""
        return np.interp(np.abs(current), self.ampere, self.henry)

    def at(self, current: FloatArray) -> FloatArray:
        """Return the flux linkage [V s], odd in the current: exact for the straight pieces of the inductance."""
        size = np.abs(current)
        piece = np.clip(np.searchsorted(self.ampere, size, side="right") - 1, 0, len(self.ampere) - 1)
        beyond = size - self.ampere[piece]
        here = self.slope(size)
        linkage = self.linkage[piece] + 0.5 * beyond * (self.henry[piece] + here)
        return np.copysign(linkage, current)

    def moment_at(self, current: FloatArray) -> FloatArray:
        """Return the integral of i L di from zero current [V s A], even in the current."""
        size = np.abs(current)
        piece = np.clip(np.searchsorted(self.ampere, size, side="right") - 1, 0, len(self.ampere) - 1)
        start = self.ampere[piece]
        begin, end = start * self.henry[piece], size * self.slope(size)
        middle = 0.25 * (start + size) * (self.henry[piece] + self.slope(size))
        return np.asarray(self.moment[piece] + (size - start) * (begin + 4.0 * middle + end) / 6.0)


def effective_inductance(curve: LinkageCurve, valley: FloatArray, peak: FloatArray, henry: Values) -> FloatArray:
    """Return the inductance with which the same volt-seconds give the true swing of current [H].

    Parameters
    ----------
    curve : LinkageCurve
    valley, peak : currents that a topology stated with `henry` [A]
    henry : inductance that it was given [H]

    Notes
    -----
    With m the middle of valley and peak and X = henry (peak - valley) the swing of the linkage, the half swing h solves
    lambda(m + h) - lambda(m - h) = X. The left side rises with h, so there is one root, found by Newton steps kept
    inside a bracket. Without swing it is the small-signal inductance at m.
    """
    middle, swing = 0.5 * (valley + peak), np.asarray(henry * (peak - valley))
    half = _half_swing(curve, middle, swing)
    flows = half > 0.0
    return np.where(flows, swing / np.where(flows, 2.0 * half, 1.0), curve.slope(middle))


def effective_inductance_of(curve: LinkageCurve, valley: FloatArray, peak: FloatArray) -> FloatArray:
    """Return the swing of linkage over the swing of current between two currents [H]."""
    swing = peak - valley
    flows = swing > 0.0
    linkage = curve.at(peak) - curve.at(valley)
    return np.where(flows, linkage / np.where(flows, swing, 1.0), curve.slope(valley))


def true_extremes(
    curve: LinkageCurve, valley: FloatArray, peak: FloatArray, henry: Values
) -> tuple[FloatArray, FloatArray]:
    """Return valley and peak [A] of the bent current with the mean and the volt-seconds of a straight one.

    Parameters as for `effective_inductance`, of a current that is not discontinuous. While the linkage moves evenly in
    time between both ends, the mean current is the integral of i L di between them over the swing of the linkage; the
    middle of the ends is moved until that is the mean of the straight current.
    """
    mean, swing = 0.5 * (valley + peak), np.asarray(henry * (peak - valley))
    flows = swing > 0.0
    safe = np.where(flows, swing, 1.0)
    middle = mean
    for _ in range(MOST_ROUNDS):
        half = _half_swing(curve, middle, swing)
        found = (curve.moment_at(middle + half) - curve.moment_at(middle - half)) / safe
        missing = np.where(flows, mean - found, 0.0)
        middle = middle + missing
        if np.all(np.abs(missing) <= MEAN_TOLERANCE * (np.abs(mean) + half)):
            break
    return middle - half, middle + half


MEAN_TOLERANCE = 1e-9
"""Of the size of the current: how near the mean of the bent current comes to that of the straight one [-]."""


def _half_swing(curve: LinkageCurve, middle: FloatArray, swing: FloatArray) -> FloatArray:
    """Return the half swing of current about a middle that a swing of linkage means [A]."""
    low, high = swing / (2.0 * curve.henry.max()), swing / (2.0 * curve.henry.min())
    half = np.clip(swing / (2.0 * curve.slope(middle)), low, high)
    for _ in range(MOST_ROUNDS):
        over = curve.at(middle + half) - curve.at(middle - half) - swing
        low, high = np.where(over > 0.0, low, half), np.where(over > 0.0, half, high)
        rise = curve.slope(middle + half) + curve.slope(middle - half)
        newton = half - over / rise
        moved = np.where((newton >= low) & (newton <= high), newton, 0.5 * (low + high))
        still = np.all(np.abs(moved - half) <= SETTLED * np.maximum(moved, 1e-300))
        half = moved
        if still:
            break
    return half
