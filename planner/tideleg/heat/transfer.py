"""Carrying a thermal state from one network to another of the same places, as when a way for heat is lost.

Masses keep their temperature and Foster cells their rise at that instant; only what happens next is new.
"""

from __future__ import annotations

import numpy as np

from tideleg.errors import InputError
from tideleg.heat.modes import Modes
from tideleg.waveform import FloatArray


def transferred(state: FloatArray, before: Modes, after: Modes) -> FloatArray:
    """Return the modal state (M, C) of `after` with the temperatures that `state` (M, C) means in `before`.

    Raises
    ------
    InputError
        If the two networks differ in parts, masses or the number of modes.

    Notes
    -----
    A mass's temperature is a sum over its modes, T = S x, with S of full rank over the masses that hold heat; Foster
    cells are modes of their own and keep their values. Massless joints follow at once and hold nothing.
    """
    same = (before.parts, before.masses, len(before.time_constants)) == (
        after.parts,
        after.masses,
        len(after.time_constants),
    )
    if not same or before.stacked or after.stacked:
        raise InputError("a thermal state passes only between single networks of the same parts and masses")
    of_masses = np.flatnonzero(np.any(before.mass_output != 0.0, axis=0))
    of_masses_after = np.flatnonzero(np.any(after.mass_output != 0.0, axis=0))
    moved = np.array(state, dtype=np.float64)
    if len(of_masses):
        temperature = before.mass_output[:, of_masses] @ state[of_masses]
        moved[of_masses_after] = np.linalg.pinv(after.mass_output[:, of_masses_after]) @ temperature
    return moved
