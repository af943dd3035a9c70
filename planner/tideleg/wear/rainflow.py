"""Rainflow counting: exact ranges, no classes; in one go or block by block with the same result.

Four neighbouring turning points a, b, c, d close the cycle b-c where its range is no greater than the ranges a-b and
c-d. What never closes is the residue, and a rule by name says what it counts for: see `RESIDUE_RULES`.

Sources: ASTM E1049-85, 5.4.4 and 5.4.5; the four-point form: Lee, Barkey, Kang, Metal Fatigue Analysis Handbook.
"""

from __future__ import annotations

from typing import Literal, NamedTuple, get_args

import numpy as np
from numpy.typing import NDArray

from tideleg.stress import Cycles
from tideleg.waveform import FloatArray
from tideleg.wear.turning import turning_points

ResidueRule = Literal["half_cycles", "repeating", "closed_only"]

RESIDUE_RULES: dict[ResidueRule, str] = {
    "half_cycles": "every step of the residue counts as half a cycle (ASTM E1049-85, 5.4.4)",
    "repeating": "the history repeats: the residue is joined to itself, all cycles are whole (ASTM E1049-85, 5.4.5)",
    "closed_only": "the residue is left out; the greatest swings are then missing from the damage",
}
"""Rules for the residue, with what they mean."""

WORTHWHILE = 16
"""A pass that removes less than one point in so many is the last: a plain loop is quicker from there."""


class _Points(NamedTuple):
    """Turning points: time [s] and value [degC]."""

    time: FloatArray
    value: FloatArray

    def chosen(self, which: NDArray[np.bool_] | NDArray[np.int64]) -> _Points:
        return _Points(self.time[which], self.value[which])


class CycleCount:
    """A count that takes a history in blocks and holds only its residue between them.

    Cycles do not depend on how the history is cut: what has closed is handed out by `take`, and `finish` gives what
    the residue counts for. Memory grows with the residue only, in which each range differs from the one before.

    Parameters
    ----------
    rule : what the residue counts for
    """

    def __init__(self, rule: ResidueRule = "repeating") -> None:
        if rule not in get_args(ResidueRule):
            raise ValueError(f"found the residue rule {rule!r}; it is one of {', '.join(get_args(ResidueRule))}")
        self.rule = rule
        self._residue = _Points(np.zeros(0), np.zeros(0))
        self._begin: float | None = None

    @property
    def residue(self) -> FloatArray:
        """Values that have not closed yet, the last sample included [degC]."""
        return self._residue.value.copy()

    def take(self, time: FloatArray, value: FloatArray) -> Cycles:
        """Return the cycles that this block closes, by time of beginning.

        Parameters
        ----------
        time, value : (S,) rising [s]; finite [degC]
        """
        time, value = np.asarray(time, dtype=np.float64), np.asarray(value, dtype=np.float64)
        if len(time) != len(value):
            raise ValueError(f"found {len(time)} times and {len(value)} values; give one time a value")
        if len(time) == 0:
            return _cycles([], 1.0)
        self._begin = float(time[0]) if self._begin is None else self._begin
        held = self._residue
        joined = _Points(np.concatenate([held.time, time]), np.concatenate([held.value, value]))
        if np.any(np.diff(joined.time) < 0.0):
            raise ValueError("times must not fall, neither within a block nor from one block to the next")
        # The last sample may still move on: it stays outside the count until it is known to be a turning point.
        points = joined.chosen(turning_points(joined.value))
        closed, kept = _close(points.chosen(np.arange(len(points.time) - 1)))
        last = points.chosen(np.arange(len(points.time) - 1, len(points.time)))
        self._residue = _Points(np.append(kept.time, last.time), np.append(kept.value, last.value))
        return _cycles(closed, 1.0)

    def finish(self, period: float | None = None) -> Cycles:
        """Return the last closed cycles and what the residue counts for; the count is then empty.

        Parameters
        ----------
        period : time after which the history repeats [s]; from its first to its last sample if None. A cycle across
            the seam ends after it.
        """
        closed, kept = _close(self._residue)
        first, begin = _cycles(closed, 1.0), self._begin or 0.0
        self._residue, self._begin = _Points(np.zeros(0), np.zeros(0)), None
        if len(kept.time) < 2 or self.rule == "closed_only":
            return first
        if self.rule == "half_cycles":
            return joined_cycles(
                [first, _cycles([(kept.chosen(_all_but(kept, -1)), kept.chosen(_all_but(kept, 0)))], 0.5)]
            )
        span = float(kept.time[-1]) - begin if period is None else period
        return joined_cycles([first, _cycles(_close_repeating(kept, span), 1.0)])


def count_cycles(
    time: FloatArray, value: FloatArray, rule: ResidueRule = "repeating", period: float | None = None
) -> Cycles:
    """Return the cycles of a whole history, by time of beginning.

    Parameters
    ----------
    time, value : (S,) rising [s]; finite [degC]
    rule : what the residue counts for
    period : see `CycleCount.finish`

    Examples
    --------
    >>> history = np.array([-2.0, 1, -3, 5, -1, 3, -4, 4, -2])  # ASTM E1049-85, Fig. 6
    >>> found = count_cycles(np.arange(9.0), history, "half_cycles")
    >>> sorted(zip(found.range.tolist(), found.weight.tolist()))
    [(3.0, 0.5), (4.0, 0.5), (4.0, 1.0), (6.0, 0.5), (8.0, 0.5), (8.0, 0.5), (9.0, 0.5)]
    """
    counting = CycleCount(rule)
    return joined_cycles([counting.take(time, value), counting.finish(period)])


def joined_cycles(pieces: list[Cycles]) -> Cycles:
    """Return the cycles of several counts as one, by time of beginning."""
    whole = [np.concatenate(column) for column in zip(*pieces, strict=True)]
    order = np.lexsort((whole[3], whole[2]))
    return Cycles(*(column[order] for column in whole))


def _all_but(points: _Points, which: int) -> NDArray[np.int64]:
    return np.delete(np.arange(len(points.time)), which)


_Pairs = list[tuple[_Points, _Points]]


def _close(points: _Points) -> tuple[_Pairs, _Points]:
    """Return the closed pairs and the residue of turning points.

    A pair whose range is smaller than the one before and no greater than the one after closes whatever the order, and
    such pairs never touch: all are removed at once. Removing them only makes neighbouring ranges greater, so the order
    of passes is free as well. A range equal to the one before does depend on order; such ranges, and what else is
    left, go through a plain stack, from the left.
    """
    pairs: _Pairs = []
    while len(points.time) >= 4:
        ranges = np.abs(np.diff(points.value))
        closing = np.flatnonzero((ranges[1:-1] < ranges[:-2]) & (ranges[1:-1] <= ranges[2:])) + 1
        if len(closing) * WORTHWHILE < len(points.time):
            break
        pairs.append((points.chosen(closing), points.chosen(closing + 1)))
        keep = np.ones(len(points.time), dtype=bool)
        keep[closing] = keep[closing + 1] = False
        points = points.chosen(keep)
    begins, ends, kept = _by_stack(points.value.tolist())
    pairs.append((points.chosen(np.asarray(begins, dtype=np.int64)), points.chosen(np.asarray(ends, dtype=np.int64))))
    return pairs, points.chosen(np.asarray(kept, dtype=np.int64))


def _by_stack(values: list[float]) -> tuple[list[int], list[int], list[int]]:
    """Return the indices of closed pairs, first and second points, and of the residue."""
    begins: list[int] = []
    ends: list[int] = []
    stack: list[int] = []
    for index, value in enumerate(values):
        stack.append(index)
        last = value
        while len(stack) >= 4:
            a, b, c = values[stack[-4]], values[stack[-3]], values[stack[-2]]
            inner = abs(c - b)
            if inner > abs(b - a) or inner > abs(last - c):
                break
            begins.append(stack[-3])
            ends.append(stack[-2])
            del stack[-3:-1]
    return begins, ends, stack


def _close_repeating(residue: _Points, period: float) -> _Pairs:
    """Return the pairs that close when the residue is followed by itself."""
    time = np.concatenate([residue.time, residue.time + period])
    value = np.concatenate([residue.value, residue.value])
    points = _Points(time, value).chosen(turning_points(value))
    return _close(points)[0]


def _cycles(pairs: _Pairs, count: float) -> Cycles:
    """Return pairs of turning points as cycles."""
    if not pairs:
        return Cycles(*(np.zeros(0) for _ in Cycles._fields))
    begin, end, first, second = (
        np.concatenate(column) for column in zip(*((b.time, e.time, b.value, e.value) for b, e in pairs), strict=True)
    )
    order = np.lexsort((end, begin))
    begin, end, first, second = begin[order], end[order], first[order], second[order]
    return Cycles(np.minimum(first, second), np.maximum(first, second), begin, end, np.full(len(begin), count))
