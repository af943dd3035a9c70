"""Instants inside a step at which the battery is asked: a step of held power is not a step of held current.

While the terminal power is held, the state of charge moves, and with it voltage, resistance and current. Short steps
need one instant in the middle; steps that move the state of charge noticeably are cut into pieces with three Gauss
points each, and the state of charge at those points follows from the current by collocation.

Source: Gauss-Legendre collocation, e.g. E. Hairer and G. Wanner, Solving Ordinary Differential Equations II, 2nd ed.,
Springer, 1996, section IV.5 (from memory): three points, order six.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from tideleg.waveform import FloatArray

SHORT_STEP = 1e-4
"""A step that moves the state of charge by less has one instant, in its middle: the error is of second order [-]."""

PIECE = 0.01
"""Longer steps are cut into pieces that move the state of charge by about this much [-]."""

MOST_PIECES = 100

_ROOT = np.sqrt(15.0)
GAUSS_POINTS = np.array([0.5 - _ROOT / 10.0, 0.5, 0.5 + _ROOT / 10.0])
GAUSS_WEIGHTS = np.array([5.0, 8.0, 5.0]) / 18.0
GAUSS_MATRIX = np.array(
    [
        [5 / 36, 2 / 9 - _ROOT / 15, 5 / 36 - _ROOT / 30],
        [5 / 36 + _ROOT / 24, 2 / 9, 5 / 36 - _ROOT / 24],
        [5 / 36 + _ROOT / 30, 2 / 9 + _ROOT / 15, 5 / 36],
    ]
)
"""Integral of each point's polynomial from the start of a piece to each point, per length of the piece [-]."""


class Nodes(NamedTuple):
    """The instants of a step.

    pieces : equal parts of the step
    points : (P,) places in a piece, 0 to 1 [-]
    weights : (P,) of the points in the mean over a piece [-]
    matrix : (P, P) integral to each point [-]
    """

    pieces: int
    points: FloatArray
    weights: FloatArray
    matrix: FloatArray

    @property
    def number(self) -> int:
        """How many instants there are in a step."""
        return self.pieces * len(self.points)

    def mean(self, values: FloatArray) -> FloatArray:
        """Return the mean over the step of values (N, C, S) at the instants."""
        if self.number == 1:
            return np.asarray(values[0])
        split = values.reshape(self.pieces, len(self.points), *values.shape[1:])
        return np.asarray(np.einsum("p,mp...->...", self.weights, split) / self.pieces)

    def integral(self, values: FloatArray) -> FloatArray:
        """Return the integral from the start of the step to each instant, per length of the step (N, C, S)."""
        if self.number == 1:
            return 0.5 * values
        split = values.reshape(self.pieces, len(self.points), *values.shape[1:])
        whole = np.einsum("p,mp...->m...", self.weights, split)
        before = np.cumsum(whole, axis=0) - whole
        inside = np.einsum("qp,mp...->mq...", self.matrix, split)
        return np.asarray((before[:, None] + inside) / self.pieces).reshape(values.shape)


MIDDLE = Nodes(1, np.array([0.5]), np.array([1.0]), np.array([[0.5]]))
"""One instant, in the middle of the step."""


def nodes_for(greatest_change: float) -> Nodes:
    """Return the instants for steps of which one moves the state of charge by so much [-].

    Examples
    --------
    >>> [nodes_for(change).number for change in (1e-5, 0.004, 0.05)]
    [1, 3, 15]
    """
    if greatest_change < SHORT_STEP:
        return MIDDLE
    pieces = int(np.clip(np.ceil(greatest_change / PIECE), 1, MOST_PIECES))
    return Nodes(pieces, GAUSS_POINTS, GAUSS_WEIGHTS, GAUSS_MATRIX)
