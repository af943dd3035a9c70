"""Running sums along steps without a loop over steps: numpy alone.

Both recurrences are associative, so a block of steps is cut into short rows; all rows advance together, position by
position, and the rows are joined by the same routine. Arrays run along the last axis; leading axes broadcast.
"""

from __future__ import annotations

import numpy as np

from tideleg.waveform import FloatArray

_ROW = 32
"""Length of a row: the loop runs over the positions in a row, for all rows at once."""

Map = tuple[FloatArray, FloatArray, FloatArray]
"""x -> min(max(x + shift, lower), upper), as (shift, lower, upper)."""


class LinearScan:
    """y_k = decay_k y_(k-1) + drive_k along the last axis, with the decays prepared once.

    Parameters
    ----------
    decay : (..., S), between 0 and 1 [-]
    """

    def __init__(self, decay: FloatArray) -> None:
        self.steps = decay.shape[-1]
        self.rows = -(-self.steps // _ROW)
        rows = _in_rows(decay, self.rows, 1.0)
        # Positions first: the loop then reads and writes whole contiguous arrays.
        self._decay = np.ascontiguousarray(np.moveaxis(rows, -1, 0))
        self._gain = np.multiply.accumulate(self._decay, axis=0)
        self._joint = LinearScan(self._gain[-1]) if self.rows > 1 else None

    def run(self, drive: FloatArray, initial: FloatArray) -> FloatArray:
        """Return y (..., S) for drives (..., S) and y before the first step (..., 1)."""
        rows = np.moveaxis(_in_rows(drive, self.rows, 0.0), -1, 0)
        lead = np.broadcast_shapes(self._decay.shape[1:-1], rows.shape[1:-1], initial.shape[:-1])
        out = np.empty((_ROW, *lead, self.rows))
        value: FloatArray = np.zeros((*lead, self.rows))
        for position in range(_ROW):
            value = self._decay[position] * value + rows[position]
            out[position] = value
        if self._joint is None:
            begins = np.broadcast_to(initial, (*lead, 1))
        else:
            ends = self._joint.run(out[-1], initial)
            begins = np.concatenate([np.broadcast_to(initial, (*lead, 1)), ends[..., :-1]], axis=-1)
        missing = (1,) * (len(lead) - (self._gain.ndim - 2))
        out += self._gain.reshape(_ROW, *missing, *self._gain.shape[1:]) * begins
        return np.moveaxis(out, 0, -1).reshape(*lead, self.rows * _ROW)[..., : self.steps]


def linear_scan(decay: FloatArray, drive: FloatArray, initial: FloatArray) -> FloatArray:
    """Return y with y_k = decay_k y_(k-1) + drive_k along the last axis.

    Parameters
    ----------
    decay : (..., S), between 0 and 1 [-]
    drive : (..., S)
    initial : (..., 1), y before the first step

    Examples
    --------
    >>> linear_scan(np.array([0.5, 0.5]), np.array([1.0, 1.0]), np.array([4.0])).tolist()
    [3.0, 2.5]
    """
    return LinearScan(decay).run(drive, initial)


def clipped_sum(start: FloatArray, change: FloatArray, low: float, high: float) -> FloatArray:
    """Return s with s_k = clip(s_(k-1) + change_k, low, high) along the last axis.

    Parameters
    ----------
    start : (..., 1), s before the first step, within the walls
    change : (..., S)
    low, high : the walls

    Notes
    -----
    The map x -> min(max(x + d, l), u) keeps its form when two are chained, so the maps of a block chain like sums. A
    block that meets no wall is a plain sum and is not chained.

    Examples
    --------
    >>> clipped_sum(np.array([0.5]), np.array([0.4, 0.4, -0.3]), 0.0, 1.0).tolist()
    [0.9, 1.0, 0.7]
    """
    plain = start + np.cumsum(change, axis=-1)
    if np.all((plain >= low) & (plain <= high)):
        return plain
    change = np.broadcast_to(change, plain.shape)
    shift, lower, upper = _chained((change, np.full(plain.shape, low), np.full(plain.shape, high)))
    return np.minimum(np.maximum(start + shift, lower), upper)


def _chained(maps: Map) -> Map:
    """Return the maps chained from the first step up to each step."""
    lead, steps = maps[0].shape[:-1], maps[0].shape[-1]
    rows = -(-steps // _ROW)
    rests = (0.0, -np.inf, np.inf)
    shift, lower, upper = (_in_rows(m, rows, rest).copy() for m, rest in zip(maps, rests, strict=True))
    for k in range(1, _ROW):
        before = (shift[..., k - 1], lower[..., k - 1], upper[..., k - 1])
        chained = _then(before, (shift[..., k], lower[..., k], upper[..., k]))
        shift[..., k], lower[..., k], upper[..., k] = chained
    if rows > 1:
        joined = _chained((shift[..., -1], lower[..., -1], upper[..., -1]))
        first = [np.full((*lead, 1), rest) for rest in rests]
        begin = tuple(np.concatenate([f, j[..., :-1]], axis=-1)[..., None] for f, j in zip(first, joined, strict=True))
        shift, lower, upper = _then((begin[0], begin[1], begin[2]), (shift, lower, upper))
    flat = tuple(m.reshape(*lead, rows * _ROW)[..., :steps] for m in (shift, lower, upper))
    return flat[0], flat[1], flat[2]


def _then(first: Map, second: Map) -> Map:
    """Return the map that applies `first` and then `second`."""
    shift, lower, upper = second
    return (
        first[0] + shift,
        np.minimum(np.maximum(first[1] + shift, lower), upper),
        np.minimum(np.maximum(first[2] + shift, lower), upper),
    )


def _in_rows(values: FloatArray, rows: int, filling: float) -> FloatArray:
    """Return (..., S) as (..., rows, _ROW), the end of the last row filled."""
    missing = rows * _ROW - values.shape[-1]
    if missing:
        tail = np.full((*values.shape[:-1], missing), filling)
        values = np.concatenate([values, tail], axis=-1)
    return values.reshape(*values.shape[:-1], rows, _ROW)
