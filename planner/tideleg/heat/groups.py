"""Modes gathered by what drives them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tideleg.heat.modes import Modes
from tideleg.waveform import FloatArray


@dataclass(frozen=True)
class Groups:
    """Chains, each driven and seen by one part, then single modes that are driven and seen in any way.

    driver : the part of each chain
    alone : the mode of each further group
    place : (G, K) the mode at each place of a group; M where a place is empty
    drive : (M, C or 1) rest of each mode under a unit of its group's drive
    seen : (M, C or 1) how the value of its group counts each mode
    output : (part, G[, C]) how each part sees the groups
    """

    driver: list[int]
    alone: list[int]
    place: NDArray[np.intp]
    drive: FloatArray
    seen: FloatArray
    output: FloatArray

    def placed(self, values: FloatArray) -> FloatArray:
        """Return values of modes (M, ...) at their places (G, K, ...), zero at empty places."""
        return np.concatenate([values, np.zeros((1, *values.shape[1:]))])[self.place]

    def taken(self, placed: FloatArray) -> FloatArray:
        """Return the values of modes (M, ...) from their places (G, K, ...)."""
        out = np.empty((len(self.drive) + 1, *placed.shape[2:]))
        out[self.place] = placed
        return out[:-1]


def grouped(modes: Modes) -> Groups:
    """Return the modes gathered into chains and single modes."""
    owner = [_owner(modes, m) for m in range(len(modes.time_constants))]
    driver = sorted({part for part in owner if part is not None})
    alone = [m for m, part in enumerate(owner) if part is None]
    members = [[m for m, part in enumerate(owner) if part == p] for p in driver] + [[m] for m in alone]
    place = np.full((len(members), max(len(group) for group in members)), len(owner), dtype=np.intp)
    drive, seen = np.ones_like(modes.by_candidate), np.ones_like(modes.by_candidate)
    output = np.zeros((len(modes.parts), len(members), *modes.output.shape[2:]))
    for g, group in enumerate(members):
        place[g, : len(group)] = group
        if g < len(driver):
            drive[group], seen[group] = _of_candidates(modes, driver[g], group)
            output[driver[g], g] = 1.0
        else:
            output[:, g] = modes.output[:, group[0]]
    return Groups(driver, alone, place, drive, seen, output)


def _owner(modes: Modes, m: int) -> int | None:
    """Return the part that alone drives and alone sees a mode, in every candidate."""
    drivers = np.nonzero(modes.gain[m].reshape(modes.gain.shape[1], -1).any(axis=1))[0]
    viewers = np.nonzero(modes.output[:, m].reshape(len(modes.parts), -1).any(axis=1))[0]
    same = len(drivers) == len(viewers) == 1 and drivers[0] == viewers[0]
    return int(drivers[0]) if same else None


def _of_candidates(modes: Modes, part: int, group: list[int]) -> tuple[FloatArray, FloatArray]:
    drive, seen = modes.gain[group, part], modes.output[part, group]
    return (drive, seen) if modes.stacked else (drive[:, None], seen[:, None])
