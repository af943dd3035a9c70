"""Finding x = f(x) at every step at once, by the secant through the last two passes."""

from __future__ import annotations

import numpy as np

from tideleg.waveform import FloatArray

_CAUTIOUS_PASSES = 8
_CAUTIOUS, _BOLD = 0.5, 0.999
"""Steepest rise of f that the secant believes: early slopes still mix with what else moves in a pass."""


class RootSearch:
    """The search for a loss that the stage has when the battery carries that very loss.

    Plain repetition is slow where f rises nearly as fast as x, and swings for ever where it falls faster than x rises:
    at light load in discontinuous conduction the loss goes with the root of the current, and both happen.
    """

    def __init__(self) -> None:
        self._passes = 0
        self._earlier: tuple[FloatArray, FloatArray] | None = None

    def next(self, guess: FloatArray, found: FloatArray) -> FloatArray:
        """Return the next guess, given what was found at this one."""
        slope = np.zeros_like(guess)
        if self._earlier is not None:
            moved = guess - self._earlier[0]
            seen = np.abs(moved) > 1e-14 * np.abs(guess)
            slope = np.where(seen, (found - self._earlier[1]) / np.where(seen, moved, 1.0), 0.0)
        self._earlier = (guess, found)
        self._passes += 1
        steepest = _CAUTIOUS if self._passes <= _CAUTIOUS_PASSES else _BOLD
        return guess + (found - guess) / (1.0 - np.clip(slope, -1e6, steepest))
