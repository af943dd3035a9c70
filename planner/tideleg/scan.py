"""Running sums along steps without a loop over steps: numpy alone.

Both recurrences are associative, so a block of steps is cut into short rows; all rows advance together, position by
position, and the rows are joined by the same routine. Arrays run along the last axis; leading axes broadcast.
"""

from __future__ import annotations

import math

import numpy as np

from tideleg.waveform import FloatArray

ROW = 32
"""Longest row: the loop runs over the positions in a row, for all rows at once."""

Map = tuple[FloatArray, FloatArray, FloatArray]
"""x -> min(max(x + shift, lower), upper), as (shift, lower, upper)."""


def linear_scan(decay: FloatArray, drive: FloatArray, initial: FloatArray) -> FloatArray:
    """Return y with y_k = decay_k y_(k-1) + drive_k along the last axis.

    Parameters
    ----------
    decay : (..., S) of each step, or (..., 1) of every step; between 0 and 1 [-]
    drive : (..., S)
    initial : (..., 1), y before the first step

    Examples
    --------
    >>> linear_scan(np.array([0.5, 0.5]), np.array([1.0, 1.0]), np.array([4.0])).tolist()
    [3.0, 2.5]
    """
    steps = drive.shape[-1]
    if decay.shape[-1] == 1 and steps > 1:
        return EqualScan(decay, steps).run(drive, initial)
    return LinearScan(decay).run(drive, initial)


class LinearScan:
    """y_k = decay_k y_(k-1) + drive_k along the last axis, with the decays prepared once.

    Parameters
    ----------
    decay : (..., S), between 0 and 1 [-]

    Attributes
    ----------
    weight : (R, ..., N) what a drive at each position is still worth at the end of its row [-]
    """

    def __init__(self, decay: FloatArray) -> None:
        self.steps = decay.shape[-1]
        self._decay = positions_first(decay, 1.0)
        self.weight, whole = worth_at_row_end(self._decay)
        self._joint = LinearScan(whole) if whole.shape[-1] > 1 else None

    def run(self, drive: FloatArray, initial: FloatArray) -> FloatArray:
        """Return y (..., S) for drives (..., S) and y before the first step (..., 1)."""
        if drive.shape[-1] != self.steps:
            raise ValueError(f"the drive has {drive.shape[-1]} steps, the decay {self.steps}; they must agree")
        lead = np.broadcast_shapes(self._decay.shape[1:-1], drive.shape[:-1], initial.shape[:-1])
        rows = positions_first(np.broadcast_to(drive, (*lead, self.steps)), 0.0)
        value = self.row_begins(np.einsum("r...,r...->...", self.weight, rows), initial)
        for decay, here in zip(self._decay, rows, strict=True):
            value = np.add(decay * value, here, out=here)  # y replaces the drives
        return steps_last(rows, self.steps)

    def row_begins(self, ends: FloatArray, initial: FloatArray) -> FloatArray:
        """Return y (..., N) before each row, from what each row alone would end at if it began at zero."""
        return shifted(ends if self._joint is None else self._joint.run(ends, initial), initial)


class EqualScan:
    """y_k = decay y_(k-1) + drive_k along the last axis, where one decay holds for every step.

    Within a row y is a product of the drives with a small triangular matrix of powers.

    Parameters
    ----------
    decay : (..., 1), between 0 and 1 [-]
    steps : how many
    """

    def __init__(self, decay: FloatArray, steps: int) -> None:
        self.steps = steps
        self.rows = -(-steps // ROW)
        powers = decay ** np.arange(ROW + 1)
        self._triangle = toeplitz(powers[..., :ROW])
        self._fade = powers[..., None, 1:]
        self._joint = EqualScan(powers[..., ROW:], self.rows) if self.rows > 1 else None

    def run(self, drive: FloatArray, initial: FloatArray) -> FloatArray:
        """Return y (..., S) for drives (..., S) and y before the first step (..., 1)."""
        rows = padded(drive, self.rows * ROW, 0.0)
        rows = rows.reshape(*rows.shape[:-1], self.rows, ROW) @ self._triangle
        ends = rows[..., -1]
        begins = shifted(ends if self._joint is None else self._joint.run(ends, initial), initial)
        y = rows + begins[..., None] * self._fade
        return np.asarray(y.reshape(*y.shape[:-2], -1)[..., : self.steps])


def clipped_sum(start: FloatArray, change: FloatArray, low: float, high: float) -> FloatArray:
    """Return s with s_k = clip(s_(k-1) + change_k, low, high) along the last axis.

    Parameters
    ----------
    start : (..., 1), s before the first step
    change : (..., S)
    low, high : the walls, low not above high

    Notes
    -----
    The map x -> min(max(x + d, l), u) keeps its form when two are chained, so the maps of a block chain like sums. A
    block that meets no wall is a plain sum and is not chained.

    Examples
    --------
    >>> clipped_sum(np.array([0.5]), np.array([0.4, 0.4, -0.3]), 0.0, 1.0).tolist()
    [0.9, 1.0, 0.7]
    """
    if np.any(np.asarray(low) > high):
        raise ValueError(f"the lower wall {low} lies above the upper wall {high}")
    plain = start + np.cumsum(change, axis=-1)
    if np.all((plain >= low) & (plain <= high)):
        return plain
    full = (np.broadcast_to(values, plain.shape) for values in (change, low, high))
    shift, lower, upper = _chained((next(full), next(full), next(full)))
    return np.minimum(np.maximum(start + shift, lower), upper)


_REST: tuple[float, float, float] = (0.0, -np.inf, np.inf)
"""The map that leaves everything as it is."""


def _chained(maps: Map) -> Map:
    """Return the maps chained from the first step up to each step."""
    steps = maps[0].shape[-1]
    shift, lower, upper = (positions_first(values, rest) for values, rest in zip(maps, _REST, strict=True))
    for k in range(1, len(shift)):
        before = (shift[k - 1], lower[k - 1], upper[k - 1])
        shift[k], lower[k], upper[k] = _then(before, (shift[k], lower[k], upper[k]))
    if shift.shape[-1] > 1:
        joined = _chained((shift[-1], lower[-1], upper[-1]))
        rests = (np.full((*values.shape[:-1], 1), rest) for values, rest in zip(joined, _REST, strict=True))
        begin = [shifted(values, rest) for values, rest in zip(joined, rests, strict=True)]
        shift, lower, upper = _then((begin[0], begin[1], begin[2]), (shift, lower, upper))
    return steps_last(shift, steps), steps_last(lower, steps), steps_last(upper, steps)


def _then(first: Map, second: Map) -> Map:
    """Return the map that applies `first` and then `second`."""
    shift, lower, upper = second
    return (
        first[0] + shift,
        np.minimum(np.maximum(first[1] + shift, lower), upper),
        np.minimum(np.maximum(first[2] + shift, lower), upper),
    )


def positions_first(values: FloatArray, filling: float) -> FloatArray:
    """Return (..., S) as a new array (R, ..., N): position in the row first, rows last, the end of the last row filled.

    A loop over positions then reads and writes whole contiguous arrays.
    """
    return np.array(in_rows(values, filling), order="C")


def in_rows(values: FloatArray, filling: float) -> FloatArray:
    """Return (..., S) as (R, ..., N) without copying where the last row is full."""
    length, rows = row_shape(values.shape[-1])
    whole = padded(values, rows * length, filling)
    return np.moveaxis(whole.reshape(*values.shape[:-1], rows, length), -1, 0)


def steps_last(rows: FloatArray, steps: int) -> FloatArray:
    """Return (R, ..., N) as a new array (..., S): the way back from `positions_first`."""
    ordered = np.moveaxis(rows, 0, -1)
    flat = np.empty(ordered.shape)
    flat[...] = ordered
    return flat.reshape(*flat.shape[:-2], -1)[..., :steps]


def row_shape(steps: int) -> tuple[int, int]:
    """Return how many steps stand in a row (as many as there are rows, up to `ROW`), and how many rows there are."""
    length = min(ROW, math.isqrt(max(steps - 1, 0)) + 1)
    return length, -(-steps // length)


def worth_at_row_end(decay: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return what a drive at each position (R, ...) is worth at the end of its row, and the decay of whole rows."""
    worth = np.empty_like(decay)
    worth[-1] = 1.0
    for position in range(len(decay) - 1, 0, -1):
        np.multiply(worth[position], decay[position], out=worth[position - 1])
    return worth, worth[0] * decay[0]


def toeplitz(response: FloatArray) -> FloatArray:
    """Return (..., R, R) matrices that turn a row of drives into their running response (..., R)."""
    length = response.shape[-1]
    since = np.arange(length)[None, :] - np.arange(length)[:, None]
    return np.where(since >= 0, response[..., np.maximum(since, 0)], 0.0)


def shifted(values: FloatArray, initial: FloatArray) -> FloatArray:
    """Return values (..., N) one place later, begun by `initial` (..., 1)."""
    lead = np.broadcast_shapes(values.shape[:-1], initial.shape[:-1])
    out = np.empty((*lead, values.shape[-1]))
    out[..., :1] = initial
    out[..., 1:] = values[..., :-1]
    return out


def padded(values: FloatArray, length: int, filling: float) -> FloatArray:
    """Return (..., S) filled up to (..., length)."""
    missing = length - values.shape[-1]
    if not missing:
        return values
    return np.concatenate([values, np.full((*values.shape[:-1], missing), filling)], axis=-1)
