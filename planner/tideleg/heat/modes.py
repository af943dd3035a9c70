"""A thermal network in modal form, and what it says at rest.

A mode under constant input moves as an exact exponential over a step of any length, whatever the network.

Inputs stand in the order: loss of ONE of each seated part [W], then boundary temperatures [degC]. Shapes: powers and
temperatures (part, C, S), boundaries (B, S) or (B, C, S), modal states (M, C). Modes of stacked candidates carry a last
axis C in every array; those of one network have none and serve any number of candidates.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from tideleg.errors import InputError
from tideleg.waveform import FloatArray


class Response(NamedTuple):
    """Temperatures over and at the end of each step (place, C, S) [degC], and the state after the last step (M, C)."""

    mean: FloatArray
    end: FloatArray
    state: FloatArray


@dataclass(frozen=True)
class Modes:
    """A network in modal form; [C] stands for the axis of stacked candidates, absent for one network.

    parts, masses, boundaries : names, in the order of the arrays
    time_constants : (M[, C]) [s]
    gain : (M, inputs[, C]) value at which each mode rests under a unit of each input
    output : (part, M[, C]) how each part's temperature sees the modes
    direct : (part, inputs[, C]) what reaches a part at once: boundaries, cells and joints without heat capacity
    mass_output, mass_direct : the same for the temperature of each mass
    """

    parts: tuple[str, ...]
    masses: tuple[str, ...]
    boundaries: tuple[str, ...]
    time_constants: FloatArray
    gain: FloatArray
    output: FloatArray
    direct: FloatArray
    mass_output: FloatArray
    mass_direct: FloatArray

    @property
    def stacked(self) -> bool:
        """Whether the arrays carry an axis of candidates."""
        return self.time_constants.ndim > 1

    @property
    def by_candidate(self) -> FloatArray:
        """Time constants as (M, C or 1) [s], the shape of modal states."""
        return self.time_constants if self.stacked else self.time_constants[:, None]

    @property
    def rest_matrix(self) -> FloatArray:
        """What parts see at rest, in the shape of the other arrays: (part, inputs[, C]) [K/W], [-]."""
        return _product(self.output, self.gain) + self.direct

    def at_rest(self) -> FloatArray:
        """Return `rest_matrix` so that it meets arrays over steps: (part, inputs), stacked (part, inputs, C, 1)."""
        return self._over_steps(self.rest_matrix)

    def steady(self, power: FloatArray, boundary: FloatArray) -> FloatArray:
        """Return temperatures at rest [degC] for powers (part, ...) [W] and boundaries (B, ...) [degC]."""
        return _answer(self.at_rest(), power, boundary)

    def steady_masses(self, power: FloatArray, boundary: FloatArray) -> FloatArray:
        """Return the temperature of every mass at rest (mass, ...) [degC], as `steady` does of every part."""
        rest_matrix = _product(self.mass_output, self.gain) + self.mass_direct
        return _answer(self._over_steps(rest_matrix), power, boundary)

    def resistance_matrix(self) -> FloatArray:
        """Return (part, part), stacked (part, part, C, 1): warming at rest per watt in ONE of each part [K/W]."""
        return self.at_rest()[:, : len(self.parts)]

    def soaked(self, boundary: FloatArray) -> FloatArray:
        """Return the modal state (M,), stacked (M, C), at rest without loss under boundaries (B[, C]) [degC]."""
        by_boundary = self.gain[:, len(self.parts) :]
        return np.asarray(np.einsum("mb...,b...->m...", by_boundary, np.asarray(boundary, dtype=np.float64)))

    def whole_decay(self, seconds: float) -> FloatArray:
        """Return (M, C or 1): what is left of a state after so many seconds [-]."""
        return np.asarray(np.exp(-seconds / self.by_candidate))

    def periodic_start(self, before: FloatArray, after: FloatArray, seconds: float) -> FloatArray:
        """Return the state that comes back to itself if the same inputs repeat.

        With the same inputs a state x ends as a x + c, a = exp(-seconds/tau); one run shows c, and x = c/(1 - a).

        Parameters
        ----------
        before, after : (M, C) states before and after one run
        seconds : length of the run [s], above zero
        """
        if not seconds > 0.0:
            raise ValueError(f"a run of {seconds:g} s has no periodic start; it must last longer than zero")
        lost = -np.expm1(-seconds / self.by_candidate)
        return np.asarray(before + (after - before) / lost)

    def _over_steps(self, array: FloatArray) -> FloatArray:
        return array[..., None] if self.stacked else array


def stack(candidates: Sequence[Modes]) -> Modes:
    """Return the modes of candidates that share their layout as one, with a last axis C in every array.

    Raises
    ------
    InputError
        If the candidates differ in parts, masses, boundaries or the number of modes.
    """
    if not candidates:
        raise InputError("no thermal network to stack; give at least one candidate")
    first = candidates[0]
    for i, other in enumerate(candidates):
        if other.stacked:
            raise InputError(f"thermal network {i + 1} is already stacked; stack networks of single candidates")
        for what in ("parts", "masses", "boundaries"):
            wanted, found = getattr(first, what), getattr(other, what)
            if wanted != found:
                raise InputError(
                    f"thermal networks 1 and {i + 1} differ in their {what}: {', '.join(wanted) or 'none'} and"
                    f" {', '.join(found) or 'none'}; only candidates of one layout can be stacked"
                )
        if len(first.time_constants) != len(other.time_constants):
            raise InputError(
                f"thermal networks 1 and {i + 1} have {len(first.time_constants)} and {len(other.time_constants)} time"
                " constants; only candidates with as many masses and cells can be stacked"
            )
    arrays = ("time_constants", "gain", "output", "direct", "mass_output", "mass_direct")
    joined = {name: np.stack([getattr(m, name) for m in candidates], axis=-1) for name in arrays}
    return Modes(first.parts, first.masses, first.boundaries, **joined)


def _product(left: FloatArray, right: FloatArray) -> FloatArray:
    return np.asarray(np.einsum("ij...,jk...->ik...", left, right))


def _answer(at_rest: FloatArray, power: FloatArray, boundary: FloatArray) -> FloatArray:
    shape = np.broadcast_shapes(power.shape[1:], boundary.shape[1:])
    given = [np.broadcast_to(values, (len(values), *shape)) for values in (power, boundary)]
    return np.asarray(np.einsum("pi...,i...->p...", at_rest, np.concatenate(given)))
