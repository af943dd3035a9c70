"""Heat: any network of masses, paths and Foster chains, solved by its exact modes.

The masses' equations C dT/dt = -G T + heat are made symmetric by sqrt(C), so their modes decay with real time
constants; every Foster cell is a mode of its own, driven and seen by its part alone. A mode under constant input moves
as an exact exponential over a step of any length. Linear algebra of RC networks; no source needed.

Inputs stand in the order: loss of ONE of each seated part [W], then boundary temperatures [degC]. Shapes: powers and
temperatures (part, C, S), boundaries (B, S), modal states (M, C).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from tideleg.errors import InputError
from tideleg.network import Network, Seat
from tideleg.scan import LinearScan
from tideleg.waveform import FloatArray


@dataclass(frozen=True)
class Modes:
    """A network in modal form.

    parts, masses, boundaries : names, in the order of the arrays
    time_constants : (M,) [s]
    gain : (M, inputs) value at which each mode rests under a unit of each input
    output : (part, M) how each part's temperature sees the modes
    direct : (part, inputs) what reaches a part at once: boundaries, cells and joints without heat capacity
    """

    parts: tuple[str, ...]
    masses: tuple[str, ...]
    boundaries: tuple[str, ...]
    time_constants: FloatArray
    gain: FloatArray
    output: FloatArray
    direct: FloatArray

    def at_rest(self) -> FloatArray:
        """Return (part, inputs): temperatures at rest under a unit of each input [K/W], [-]."""
        return np.asarray(self.output @ self.gain + self.direct)

    def steady(self, power: FloatArray, boundary: FloatArray) -> FloatArray:
        """Return temperatures at rest [degC] for powers (part, ...) [W] and boundaries (B, ...) [degC]."""
        return np.asarray(np.einsum("pi,i...->p...", self.at_rest(), np.concatenate([power, boundary])))

    def resistance_matrix(self) -> FloatArray:
        """Return (part, part): warming of each part at rest per watt in ONE of each part [K/W]."""
        return self.at_rest()[:, : len(self.parts)]

    def soaked(self, boundary: FloatArray) -> FloatArray:
        """Return the modal state (M,) at rest without loss under boundaries (B,) [degC]."""
        return np.asarray(self.gain[:, len(self.parts) :] @ np.asarray(boundary, dtype=np.float64))

    def periodic_start(self, before: FloatArray, after: FloatArray, seconds: float) -> FloatArray:
        """Return the state that comes back to itself if the same inputs repeat.

        With the same inputs a state x ends as a x + c, a = exp(-seconds/tau); one run shows c, and x = c/(1 - a).

        Parameters
        ----------
        before, after : (M, C) states before and after one run
        seconds : length of the run [s]
        """
        decay = np.exp(-seconds / self.time_constants)[:, None]
        return np.asarray((after - decay * before) / -np.expm1(-seconds / self.time_constants)[:, None])


class Response(NamedTuple):
    """Temperatures over and at the end of each step (part, C, S) [degC], and the state after the last step (M, C)."""

    mean: FloatArray
    end: FloatArray
    state: FloatArray


class Propagator:
    """Modes over one block of steps: the decays are prepared once, then asked in every pass of the relaxation.

    Parameters
    ----------
    modes : Modes
    durations : (S,) [s]
    """

    def __init__(self, modes: Modes, durations: FloatArray) -> None:
        self.modes = modes
        shares = np.asarray(durations)[None, :] / modes.time_constants[:, None]
        rise = -np.expm1(-shares)
        self._rise = rise[:, None, :]
        self._mean_decay = (rise / shares)[:, None, :]
        self._scan = LinearScan(np.exp(-shares)[:, None, :])
        self._same_step = self._own_response()

    def respond(self, state: FloatArray, power: FloatArray, boundary: FloatArray) -> Response:
        """Return the temperatures under losses held in each step.

        Parameters
        ----------
        state : (M, C) before the first step
        power : (part, C, S) loss of ONE of each seated part [W]
        boundary : (B, S) [degC]
        """
        m, shape = self.modes, power.shape[1:]
        given = np.concatenate([power, np.broadcast_to(boundary[:, None, :], (len(boundary), *shape))])
        flat = given.reshape(len(given), -1)
        direct = (m.direct @ flat).reshape(len(m.parts), *shape)
        if not len(m.time_constants):
            return Response(direct, direct, state)
        rest = (m.gain @ flat).reshape(-1, *shape)
        end = self._scan.run(self._rise * rest, state[..., None])
        begin = np.concatenate([state[..., None], end[..., :-1]], axis=-1)
        mean = rest + (begin - rest) * self._mean_decay
        return Response(self._seen(mean) + direct, self._seen(end) + direct, end[..., -1])

    def _seen(self, modal: FloatArray) -> FloatArray:
        whole = self.modes.output @ modal.reshape(len(modal), -1)
        return np.asarray(whole.reshape(-1, *modal.shape[1:]))

    def same_step_response(self) -> FloatArray:
        """Return (part, 1, S): warming of a step's mean temperature per watt of the part in that same step [K/W]."""
        return self._same_step

    def _own_response(self) -> FloatArray:
        m, n = self.modes, len(self.modes.parts)
        own = m.output * m.gain[:, :n].T
        at_once = np.diagonal(m.direct[:, :n])[:, None, None]
        return np.asarray(np.einsum("pm,mcs->pcs", own, 1.0 - self._mean_decay) + at_once)


def modes(network: Network) -> Modes:
    """Return the exact modal form of a network.

    Raises
    ------
    InputError
        If a name is unknown or stands twice, a resistance is not above zero, a capacity or time constant is negative,
        or a mass reaches no boundary.
    """
    _refuse_bad(network)
    masses = sorted(network.masses, key=lambda mass: mass.heat_capacity == 0.0)
    place = {mass.name: i for i, mass in enumerate(masses)}
    inputs = len(network.seats) + len(network.boundaries)
    outer = {name: len(network.seats) + i for i, name in enumerate(network.boundaries)}
    conductance, heat = _balance(network, place, outer, inputs)
    stored = np.array([mass.heat_capacity for mass in masses if mass.heat_capacity > 0.0])
    joints = _eliminated(conductance, heat, len(stored))
    root = np.sqrt(stored)
    decay, shape = np.linalg.eigh(joints.conductance / root[:, None] / root[None, :])
    gain = (shape.T @ (joints.heat / root[:, None])) / decay[:, None]
    seen = shape / root[:, None]
    base_output = np.concatenate([seen, joints.by_mass @ seen])
    base_direct = np.concatenate([np.zeros((len(stored), inputs)), joints.by_input])
    return _with_chains(network, place, outer, _Bases(1.0 / decay, gain, base_output, base_direct))


class _Joints(NamedTuple):
    """A network without its massless joints; the joints follow as by_mass T + by_input u."""

    conductance: FloatArray
    heat: FloatArray
    by_mass: FloatArray
    by_input: FloatArray


class _Bases(NamedTuple):
    """Modes of the masses, and how every place (masses, then joints) sees modes and inputs."""

    time_constants: FloatArray
    gain: FloatArray
    output: FloatArray
    direct: FloatArray


def _balance(
    network: Network, place: dict[str, int], outer: dict[str, int], inputs: int
) -> tuple[FloatArray, FloatArray]:
    """Return conductances between places [W/K] and the heat that a unit of each input brings to each place."""
    conductance = np.zeros((len(place), len(place)))
    heat = np.zeros((len(place), inputs))
    for path in network.paths:
        for here, there in ((path.one, path.other), (path.other, path.one)):
            if here not in place:
                continue
            conductance[place[here], place[here]] += 1.0 / path.resistance
            if there in place:
                conductance[place[here], place[there]] -= 1.0 / path.resistance
            else:
                heat[place[here], outer[there]] += 1.0 / path.resistance
    for i, seat in enumerate(network.seats):
        if seat.base in place:
            heat[place[seat.base], i] += seat.copies
    return conductance, heat


def _eliminated(conductance: FloatArray, heat: FloatArray, stored: int) -> _Joints:
    """Take the massless joints out exactly: 0 = -G_jm T_m - G_jj T_j + heat_j."""
    inner = conductance[stored:, stored:]
    if not len(inner):
        return _Joints(conductance, heat, np.zeros((0, stored)), np.zeros((0, heat.shape[1])))
    by_mass = np.asarray(np.linalg.solve(inner, -conductance[stored:, :stored]), dtype=np.float64)
    by_input = np.asarray(np.linalg.solve(inner, heat[stored:]), dtype=np.float64)
    across = conductance[:stored, stored:]
    return _Joints(
        conductance[:stored, :stored] + across @ by_mass, heat[:stored] - across @ by_input, by_mass, by_input
    )


def _with_chains(network: Network, place: dict[str, int], outer: dict[str, int], bases: _Bases) -> Modes:
    """Add every Foster cell as a mode of its own and gather what each part sees."""
    parts, inputs = len(network.seats), bases.gain.shape[1]
    cells = [(i, r, tau) for i, seat in enumerate(network.seats) for r, tau in seat.cells if tau > 0.0]
    cell_gain = np.zeros((len(cells), inputs))
    cell_output = np.zeros((parts, len(cells)))
    for k, (i, resistance, _) in enumerate(cells):
        cell_gain[k, i] = resistance
        cell_output[i, k] = 1.0
    base_output = np.zeros((parts, len(bases.time_constants)))
    direct = np.zeros((parts, inputs))
    for i, seat in enumerate(network.seats):
        direct[i, i] += sum(resistance for resistance, tau in seat.cells if tau == 0.0)
        if seat.base in outer:
            direct[i, outer[seat.base]] += 1.0
        else:
            base_output[i] = bases.output[place[seat.base]]
            direct[i] += bases.direct[place[seat.base]]
    return Modes(
        parts=tuple(seat.part for seat in network.seats),
        masses=tuple(place),
        boundaries=network.boundaries,
        time_constants=np.concatenate([bases.time_constants, [tau for *_, tau in cells]]),
        gain=np.concatenate([bases.gain, cell_gain]),
        output=np.concatenate([base_output, cell_output], axis=1),
        direct=direct,
    )


def _refuse_bad(network: Network) -> None:
    names = [*network.boundaries, *(mass.name for mass in network.masses)]
    known = ", ".join(names)
    for name in names:
        if names.count(name) > 1:
            raise InputError(f"thermal network: the name {name!r} stands twice; give every place its own")
    for mass in network.masses:
        if not mass.heat_capacity >= 0.0:
            raise InputError(
                f"thermal network: {mass.name!r} has {mass.heat_capacity:g} J/K; it must not be below zero"
            )
    for path in network.paths:
        ends = f"{path.one!r} to {path.other!r}"
        if path.one not in names or path.other not in names:
            raise InputError(f"thermal network: a path runs from {ends}; places are {known}")
        if not path.resistance > 0.0:
            raise InputError(f"thermal network: {ends} has {path.resistance:g} K/W; it must be above zero")
    for seat in network.seats:
        if seat.base not in names:
            raise InputError(f"thermal network: {seat.part!r} stands on {seat.base!r}; places are {known}")
        _refuse_bad_cells(seat)
    _refuse_islands(network)


def _refuse_bad_cells(seat: Seat) -> None:
    for resistance, tau in seat.cells:
        if not (resistance > 0.0 and tau >= 0.0):
            raise InputError(
                f"thermal network: {seat.part!r} has a cell of {resistance:g} K/W and {tau:g} s;"
                " resistance must be above zero and the time constant not below"
            )


def _refuse_islands(network: Network) -> None:
    """Refuse a mass that reaches no boundary: it would warm for ever."""
    reached = set(network.boundaries)
    grew = True
    while grew:
        before = len(reached)
        for path in network.paths:
            if path.one in reached or path.other in reached:
                reached |= {path.one, path.other}
        grew = len(reached) > before
    for mass in network.masses:
        if mass.name not in reached:
            raise InputError(f"thermal network: {mass.name!r} reaches no boundary; its heat has nowhere to go")
