"""Products of small matrices with long arrays of steps, for one network or for stacked candidates."""

from __future__ import annotations

from typing import Any

import numpy as np

from tideleg.heat.modes import Modes
from tideleg.waveform import FloatArray


class Workspace:
    """Arrays that every pass over one block fills anew: fresh memory of this size costs as much as the arithmetic.

    One workspace serves one caller at a time.
    """

    def __init__(self) -> None:
        self._kept: dict[str, FloatArray] = {}

    def array(self, name: str, shape: tuple[int, ...]) -> FloatArray:
        """Return the array of that name, with whatever it held before."""
        if name not in self._kept or self._kept[name].shape != shape:
            self._kept[name] = np.empty(shape)
        return self._kept[name]


def mixed(matrix: FloatArray, values: FloatArray, out: FloatArray | None = None) -> FloatArray:
    """Return (..., J, C, S) for a matrix (J, I), stacked (J, I, C), and values (..., I, C, S)."""
    *lead, inputs, candidates, steps = values.shape
    whole = np.empty((*lead, len(matrix), candidates, steps)) if out is None else out
    if matrix.ndim > 2:
        axes: Any = [(0, 1), (-3, -1), (-3, -1)]
        np.matmul(matrix, values, out=whole, axes=axes)
    else:
        flat = whole.reshape(*lead, len(matrix), candidates * steps)
        np.matmul(matrix, values.reshape(*lead, inputs, candidates * steps), out=flat)
    return whole


def own_response(m: Modes, reached: FloatArray) -> FloatArray:
    """Return (part, C or 1, S): warming of each part per watt of its own power [K/W].

    Parameters
    ----------
    m : Modes
    reached : (M, C or 1, S) share of its rest that each mode has reached [-]
    """
    own = np.arange(len(m.parts))
    through_modes = m.output * np.swapaxes(m.gain[:, : len(own)], 0, 1)
    at_once = m.direct[own, own]
    if not m.stacked:
        through_modes, at_once = through_modes[..., None], at_once[..., None]
    return np.asarray(np.einsum("pmc,mcs->pcs", through_modes, reached) + at_once[..., None])
