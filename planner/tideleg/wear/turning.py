"""Turning points: the samples at which a history turns back, without a loop over samples."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tideleg.waveform import FloatArray


def turning_points(values: FloatArray) -> NDArray[np.int64]:
    """Return the indices of the samples at which a history turns, its first and last sample included.

    Parameters
    ----------
    values : (S,) finite

    Returns
    -------
    (P,) indices in rising order. Equal neighbours count as one sample, the first of them, so that the values found
    rise and fall in turn. A history that never changes gives its first sample only.

    Raises
    ------
    ValueError
        If a value is not finite: it would silently end every cycle around it.

    Examples
    --------
    >>> turning_points(np.array([1.0, 7.0, 4.0, 3.0, 3.0, 4.0])).tolist()
    [0, 1, 3, 5]
    """
    values = np.asarray(values, dtype=np.float64)
    if not np.all(np.isfinite(values)):
        raise ValueError(f"sample {int(np.argmin(np.isfinite(values)))} is not finite; cycles need finite values")
    if len(values) == 0:
        return np.zeros(0, dtype=np.int64)
    own = np.flatnonzero(np.concatenate([[True], values[1:] != values[:-1]]))
    rises = np.diff(values[own]) > 0.0
    turns = rises[1:] != rises[:-1]
    inside = own[1:-1][turns] if len(own) > 2 else own[:0]
    ends = own[[0]] if len(own) == 1 else own[[0, -1]]
    return np.asarray(np.concatenate([ends[:1], inside, ends[1:]]), dtype=np.int64)
