"""Which mode the four-switch leg is in at each step: boost, blend or buck, by the voltages at rest, with hysteresis.

Two comparators watch the ratio of battery to link voltage at rest, one at each border of the blend band. Each changes
over only once the ratio is past its border by the hysteresis, and otherwise holds what it said before. The mode is the
number of comparators that say "above".
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tideleg import Choice, FloatArray, Rest

MODES = ("boost", "blend", "buck")
BOOST, BLEND, BUCK = 0, 1, 2

_LEAST = 1e-100
"""Keeps the ratio finite where a link has no voltage; such steps carry a reason."""


def choose(rest: Rest, blend_band: float, hysteresis: float, before: NDArray[np.int64] | None) -> Choice:
    """Return the mode of each step, and the last one as the carry to the next block.

    Parameters
    ----------
    rest : Rest
        Voltages at rest, arrays (C, S).
    blend_band : float
        Half width of the blend band in the ratio of battery to link voltage [-].
    hysteresis : float
        How far past a border the ratio must be before the mode changes, less than `blend_band` [-].
    before : ndarray (C, 1) or None
        Mode of the last step of the block before; None at the start, where the borders themselves decide.
    """
    ratio = rest.battery_voltage / np.maximum(rest.link_voltage, _LEAST)
    code = np.zeros(ratio.shape, dtype=np.int64)
    for border, mode in ((1.0 - blend_band, BLEND), (1.0 + blend_band, BUCK)):
        first = ratio[..., :1] > border if before is None else before >= mode
        code += _above(ratio, border, hysteresis, first)
    return Choice(code, code[..., -1:].copy())


def _above(ratio: FloatArray, border: float, hysteresis: float, first: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Return what a comparator with hysteresis says at each step (C, S); `first` (C, 1) is what it said before."""
    above, below = ratio > border + hysteresis, ratio < border - hysteresis
    forced = np.where(above | below, np.arange(ratio.shape[-1]), -1)
    latest = np.maximum.accumulate(forced, axis=-1)  # the last step, up to each, that left it no choice
    held = np.take_along_axis(above, np.maximum(latest, 0), axis=-1)
    return np.where(latest >= 0, held, first)
