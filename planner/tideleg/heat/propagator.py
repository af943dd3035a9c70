"""A block of steps: what every pass of the relaxation asks."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from tideleg.heat.equal import EqualSteps
from tideleg.heat.modes import Modes, Response
from tideleg.heat.products import mixed
from tideleg.heat.unequal import UnequalSteps
from tideleg.scan import ROW
from tideleg.waveform import FloatArray


class Propagator:
    """Modes over one block of steps: the decays are prepared once, then asked in every pass of the relaxation.

    Losses and boundaries are constant within a step; each step is an exact exponential, whatever its length. Steps
    that are all equal to the last bit take a quicker way to the same numbers.

    Parameters
    ----------
    modes : Modes
    durations : (S,) not below zero, finite [s]
    """

    def __init__(self, modes: Modes, durations: FloatArray) -> None:
        durations = np.asarray(durations, dtype=np.float64)
        bad = ~(np.isfinite(durations) & (durations >= 0.0))
        if np.any(bad):
            step = int(np.argmax(bad))
            raise ValueError(f"step {step} lasts {durations[step]:g} s; a duration is finite and not below zero")
        self.modes = modes
        self._durations = durations
        self._steps = _prepared(modes, durations)
        self._same_step: FloatArray | None = None

    def respond(self, state: FloatArray, power: FloatArray, boundary: FloatArray) -> Response:
        """Return the temperatures of the parts under losses held in each step.

        Parameters
        ----------
        state : (M, C) before the first step
        power : (part, C, S) loss of ONE of each seated part [W]
        boundary : (B, S) or (B, C, S) [degC]
        """
        return _responded(self._steps, self.modes.direct, state, power, boundary)

    def respond_masses(self, state: FloatArray, power: FloatArray, boundary: FloatArray) -> Response:
        """Return the temperatures of the masses instead, for reports; otherwise as `respond`."""
        m = self.modes
        view = replace(m, output=m.mass_output, direct=m.mass_direct)
        steps = None if self._steps is None else UnequalSteps(view, self._durations)
        return _responded(steps, view.direct, state, power, boundary)

    def same_step_response(self) -> FloatArray:
        """Return (part, C or 1, S): warming of a step's mean temperature per watt of the part in that step [K/W]."""
        if self._same_step is None:
            self._same_step = self._found_same_step()
        return self._same_step

    def _found_same_step(self) -> FloatArray:
        if self._steps is not None:
            return self._steps.same_step_response()
        own = np.arange(len(self.modes.parts))
        at_once = self.modes.direct[own, own].reshape(len(own), -1, 1)
        return np.broadcast_to(at_once, (*at_once.shape[:-1], len(self._durations)))


def _prepared(modes: Modes, durations: FloatArray) -> EqualSteps | UnequalSteps | None:
    if not len(modes.time_constants):
        return None
    if len(durations) > ROW and np.all(durations == durations[0]):
        return EqualSteps(modes, float(durations[0]), len(durations))
    return UnequalSteps(modes, durations)


def _responded(
    steps: EqualSteps | UnequalSteps | None,
    direct: FloatArray,
    state: FloatArray,
    power: FloatArray,
    boundary: FloatArray,
) -> Response:
    outside = boundary if boundary.ndim == power.ndim else boundary[:, None, :]
    if steps is not None:
        return steps.respond(state, power, outside)
    wide = np.broadcast_to(outside, (len(outside), *power.shape[1:]))
    at_once = mixed(direct, np.concatenate([power, wide]))
    return Response(at_once, at_once.copy(), state)
