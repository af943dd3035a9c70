"""Steps of any lengths: a blocked scan of every mode."""

from __future__ import annotations

import numpy as np

from tideleg.heat.modes import Modes, Response
from tideleg.heat.products import Workspace, mixed, own_response
from tideleg.scan import LinearScan, in_rows, positions_first, row_shape, shifted, steps_last, worth_at_row_end
from tideleg.waveform import FloatArray


class UnequalSteps:
    """Modes over a block of steps; every array stands with the position in a row first, rows last.

    In a step that a mode begins at a distance d below its rest, it rises by rise d, with rise = 1 - exp(-h/tau), and
    its mean lies fade d below its rest, with fade = rise tau/h: exact for an input that is constant in the step.

    Parameters
    ----------
    modes : Modes
    durations : (S,) not below zero [s]
    """

    def __init__(self, modes: Modes, durations: FloatArray) -> None:
        self.modes = modes
        self.steps = len(durations)
        # Rows are filled up by steps of no length, which leave every mode as it is.
        shares = positions_first(durations, 0.0)[:, None, None, :] / modes.by_candidate[..., None]
        self._rise = -np.expm1(-shares)
        self._fade = np.ones_like(shares)
        np.divide(self._rise, shares, out=self._fade, where=shares > 0.0)
        worth, whole = worth_at_row_end(1.0 - self._rise)
        self._worth = np.multiply(worth, self._rise, out=worth)
        self._joint = LinearScan(whole)
        self._see_end = np.concatenate([modes.output, modes.direct], axis=1)
        self._see_mean = np.concatenate([modes.rest_matrix, -modes.output], axis=1)
        self._work = Workspace()

    def respond(self, state: FloatArray, power: FloatArray, boundary: FloatArray) -> Response:
        """Return the answer to powers (part, C, S) and boundaries (B, C or 1, S) from a state (M, C)."""
        m, parts, inputs = len(state), len(power), len(power) + len(boundary)
        length, rows = row_shape(self.steps)
        block = (power.shape[1], rows)
        # Ends, inputs and distances lie side by side, so that places see each neighbouring pair by one product.
        held = self._work.array("held", (length, m + inputs + m, *block))
        ends, given, distances = held[:, :m], held[:, m : m + inputs], held[:, m + inputs :]
        given[:, :parts], given[:, parts:] = in_rows(power, 0.0), in_rows(boundary, 0.0)
        rest = mixed(self.modes.gain, given, self._work.array("rest", (length, m, *block)))
        row_ends = self._joint.run(np.einsum("rmcn,rmcn->mcn", self._worth, rest), state[..., None])
        value = shifted(row_ends, state[..., None])
        for k, distance in enumerate(distances):
            np.subtract(rest[k], value, out=distance)
            np.multiply(distance, self._rise[k], out=ends[k])
            value = np.add(ends[k], value, out=ends[k])
            np.multiply(distance, self._fade[k], out=distance)
        seen = self._work.array("seen", (length, len(self.modes.output), *block))
        mean = steps_last(mixed(self._see_mean, held[:, m:], seen), self.steps)
        end = steps_last(mixed(self._see_end, held[:, : m + inputs], seen), self.steps)
        return Response(mean, end, value[..., -1].copy())

    def same_step_response(self) -> FloatArray:
        """Return (part, C or 1, S): warming of a step's mean per watt of the part in that same step [K/W]."""
        return own_response(self.modes, steps_last(1.0 - self._fade, self.steps))
