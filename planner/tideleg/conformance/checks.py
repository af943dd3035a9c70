"""A check and how it speaks."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np


@dataclass(frozen=True)
class Check:
    """One promise of the contract, held against one plugin.

    plugin : name of the plugin
    promise : what is promised, in words
    hold : raises AssertionError with the numbers where the promise is broken
    """

    plugin: str
    promise: str
    hold: Callable[[], None]

    def __call__(self) -> None:
        """Hold the plugin against the promise."""
        try:
            self.hold()
        except AssertionError as error:
            raise AssertionError(f"{self.plugin}: {self.promise}: {error}") from None

    def __str__(self) -> str:
        return self.promise.replace(" ", "-")


def require_close(found: object, wanted: object, scale: object, tolerance: float, what: str) -> None:
    """Raise AssertionError with the worst pair of numbers unless |found - wanted| <= tolerance * scale everywhere."""
    seen, due, size = np.broadcast_arrays(*(np.asarray(value, dtype=np.float64) for value in (found, wanted, scale)))
    off = np.abs(seen - due) - tolerance * size
    if not np.all(off <= 0.0):
        at = int(np.argmax(np.where(np.isfinite(off), off, np.inf)))
        raise AssertionError(f"{what}: found {seen.flat[at]:.9g}, wanted {due.flat[at]:.9g} (point {at})")


def require_finite(values: object, what: str) -> None:
    """Raise AssertionError unless every number is finite."""
    array = np.asarray(values, dtype=float)
    if not np.all(np.isfinite(array)):
        at = int(np.argmin(np.isfinite(array).ravel()))
        raise AssertionError(f"{what} is {array.flat[at]} (point {at})")
