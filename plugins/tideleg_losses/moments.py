"""Moments of a run over ranges of its current: exact, since every piece of a run is straight."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from tideleg import FloatArray, Values, Waveform


class Moments(NamedTuple):
    """Integrals over one period, in periods, of |i|, i² and |i|³ while |i| lies in a range [A, A², A³]."""

    first: FloatArray
    second: FloatArray
    third: FloatArray


def moments(one_way: Waveform, low: Values, high: Values) -> Moments:
    """Return the moments of a current that has one sign (see `Waveform.forward`) while |i| is from `low` to `high`.

    Notes
    -----
    While a straight piece runs from a to b it spends on [l, h] inside it the share (h - l)/(b - a) of its time; the
    means there are (l + h)/2, (l² + l h + h²)/3 and (l + h)(l² + h²)/4: integrals of powers of a straight line.
    """
    first = second = third = np.zeros(())
    for s in one_way.segments:
        start, end = np.abs(s.start), np.abs(s.end)
        least, most = np.minimum(start, end), np.maximum(start, end)
        span = most - least
        a, b = np.clip(least, low, high), np.clip(most, low, high)
        flat = (least >= low) & (least < high)
        share = np.where(span > 0.0, (b - a) / np.where(span > 0.0, span, 1.0), flat)
        time = s.width * share
        first = first + time * 0.5 * (a + b)
        second = second + time * (a * a + a * b + b * b) / 3.0
        third = third + time * 0.25 * (a + b) * (a * a + b * b)
    return Moments(np.asarray(first), np.asarray(second), np.asarray(third))
