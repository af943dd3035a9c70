"""Equal steps: products with small triangular matrices.

Modes that one part alone drives and sees, its Foster cells, are summed within the matrix: one product gives the whole
chain. Every other mode is a group of its own. Only states at the ends of rows are carried, mode by mode.
"""

from __future__ import annotations

import numpy as np

from tideleg.heat.groups import Groups, grouped
from tideleg.heat.modes import Modes, Response
from tideleg.heat.products import Workspace, mixed, own_response
from tideleg.scan import ROW, EqualScan, shifted, toeplitz
from tideleg.waveform import FloatArray


class EqualSteps:
    """Modes over a block of steps of one length; see `UnequalSteps` for rise and fade.

    Parameters
    ----------
    modes : Modes
    duration : of every step, not below zero [s]
    steps : how many
    """

    def __init__(self, modes: Modes, duration: float, steps: int) -> None:
        self.modes = modes
        self.steps, self.rows = steps, -(-steps // ROW)
        self._groups = groups = grouped(modes)
        share = duration / modes.by_candidate
        rise = -np.expm1(-share)[..., None]
        fade = np.divide(rise, share[..., None], out=np.ones_like(rise), where=share[..., None] > 0.0)
        powers = np.exp(-share)[..., None] ** np.arange(ROW + 1.0)
        since = rise * powers[..., :ROW]
        within = np.concatenate([1.0 - fade, fade * since[..., :-1]], axis=-1)
        self._fade, self._powers = fade, powers
        self._end = _kernel(groups, since, powers[..., 1:])
        self._mean = _kernel(groups, within, fade * powers[..., :ROW])
        self._worth = groups.placed(np.flip(groups.drive[..., None] * since, axis=-1))
        self._joint = EqualScan(groups.placed(powers[..., ROW:]), self.rows)
        self._see = np.concatenate([groups.output, modes.direct], axis=1)
        self._work = Workspace()

    def respond(self, state: FloatArray, power: FloatArray, boundary: FloatArray) -> Response:
        """Return the answer to powers (part, C, S) and boundaries (B, C or 1, S) from a state (M, C)."""
        count, parts = len(self._groups.place), len(power)
        places = count + parts + len(boundary)
        # Groups and inputs lie side by side, so that parts see both by one product.
        held = self._work.array("held", (places, power.shape[1], self.rows * ROW))
        held[count : count + parts, :, : self.steps] = power
        held[count + parts :, :, : self.steps] = boundary
        held[count:, :, self.steps :] = 0.0
        driven, before = self._driven(state, held[count:])
        of_groups = self._in_rows(held[:count])
        np.matmul(driven, self._end, out=of_groups)
        end = mixed(self._see, held)[..., : self.steps]
        np.matmul(driven, self._mean, out=of_groups)
        mean = mixed(self._see, held)[..., : self.steps]
        return Response(mean, end, self._after(driven, before))

    def _driven(self, state: FloatArray, given: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return drives of each group with the states that its rows begin at (G, C, N, ROW + K), and these states."""
        groups, chains = self._groups, len(self._groups.driver)
        count, places = groups.place.shape
        driven = self._work.array("driven", (count, given.shape[1], self.rows, ROW + places))
        for chain, part in enumerate(groups.driver):
            driven[chain, ..., :ROW] = self._in_rows(given[part])
        driven[chains:, ..., :ROW] = self._in_rows(mixed(self.modes.gain[groups.alone], given))
        ends = driven[..., :ROW] @ np.moveaxis(self._worth, 1, -1)
        begin = groups.placed(state)[..., None]
        before = shifted(self._joint.run(np.moveaxis(ends, -1, 1), begin), begin)
        driven[..., ROW:] = np.moveaxis(before, 1, -1)
        return driven, before

    def _after(self, driven: FloatArray, before: FloatArray) -> FloatArray:
        """Return the state (M, C) after the last step, which may lie within the last row."""
        steps = self.steps - (self.rows - 1) * ROW
        added = np.einsum("gcj,gkcj->gkc", driven[:, :, -1, :steps], self._worth[..., ROW - steps :])
        left = self._groups.placed(self._powers[..., steps]) * before[..., -1]
        return self._groups.taken(left + added)

    def _in_rows(self, values: FloatArray) -> FloatArray:
        return values.reshape(*values.shape[:-1], self.rows, ROW)

    def same_step_response(self) -> FloatArray:
        """Return (part, C or 1, S): warming of a step's mean per watt of the part in that same step [K/W]."""
        once = own_response(self.modes, 1.0 - self._fade)
        return np.broadcast_to(once, (*once.shape[:-1], self.steps))


def _kernel(groups: Groups, since: FloatArray, left: FloatArray) -> FloatArray:
    """Return (G, C or 1, ROW + K, ROW): from drives and states before a row to the group's value at each step.

    Parameters
    ----------
    groups : Groups
    since : (M, C or 1, ROW) a mode's value so many steps after a unit of drive [-]
    left : (M, C or 1, ROW) what is left at each step of a unit of state before the row [-]
    """
    by_drive = groups.placed((groups.seen * groups.drive)[..., None] * since).sum(axis=1)
    by_state = groups.placed(groups.seen[..., None] * left)
    return np.concatenate([toeplitz(by_drive), np.moveaxis(by_state, 1, 2)], axis=-2)
