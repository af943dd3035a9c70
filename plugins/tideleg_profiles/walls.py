"""Running sums between walls, without a loop over steps.

x -> min(max(m x + a, low), high) with m >= 0 is a family that is closed under composition: two of them after each
other are one again. So all steps are composed by doubling, in log2(S) passes.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from tideleg import FloatArray


class Step(NamedTuple):
    """x -> min(max(keep x + add, low), high), step by step; arrays (S,), keep >= 0, low <= high."""

    keep: FloatArray
    add: FloatArray
    low: FloatArray
    high: FloatArray


def run_between_walls(start: float, steps: Step) -> FloatArray:
    """Return the state after each step, (S,).

    Examples
    --------
    >>> import numpy as np
    >>> one = np.ones(4)
    >>> run_between_walls(1.0, Step(one, np.array([5.0, -1.0, -9.0, 2.0]), 0.0 * one, 3.0 * one)).tolist()
    [3.0, 2.0, 0.0, 2.0]
    """
    whole = steps
    reach = 1
    while reach < len(whole.keep):
        joined = _after(Step(*(v[:-reach] for v in whole)), Step(*(v[reach:] for v in whole)))
        whole = Step(*(np.concatenate([v[:reach], j]) for v, j in zip(whole, joined, strict=True)))
        reach *= 2
    return np.minimum(np.maximum(whole.keep * start + whole.add, whole.low), whole.high)


def _after(first: Step, then: Step) -> Step:
    """Return the two as one step."""

    def moved(wall: FloatArray) -> FloatArray:
        return np.minimum(np.maximum(then.keep * wall + then.add, then.low), then.high)

    return Step(then.keep * first.keep, then.keep * first.add + then.add, moved(first.low), moved(first.high))
