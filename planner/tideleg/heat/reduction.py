"""From a network to its exact modes.

The masses' equations C dT/dt = -G T + heat are made symmetric by sqrt(C), so their modes decay with real time
constants; every Foster cell is a mode of its own, driven and seen by its part alone. Linear algebra of RC networks; no
source needed.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from tideleg.heat.modes import Modes
from tideleg.heat.refusals import refuse_bad
from tideleg.network import Network
from tideleg.waveform import FloatArray


def modes(network: Network) -> Modes:
    """Return the exact modal form of a network.

    Raises
    ------
    InputError
        If a name is unknown or stands twice, a resistance is not above zero, a capacity or time constant is negative,
        any of them is not finite, or a mass reaches no boundary.
    """
    refuse_bad(network)
    return _with_chains(network, _places(network))


class _Places(NamedTuple):
    """Modes of the masses, and how every place (masses, joints, boundaries, by name) sees modes and inputs."""

    time_constants: FloatArray
    gain: FloatArray
    row: dict[str, int]
    output: FloatArray
    direct: FloatArray


class _Reduced(NamedTuple):
    """A network without its massless joints; the joints follow as by_mass T + by_input u."""

    conductance: FloatArray
    heat: FloatArray
    by_mass: FloatArray
    by_input: FloatArray


def _places(network: Network) -> _Places:
    masses = sorted(network.masses, key=lambda mass: mass.heat_capacity == 0.0)
    row = {name: i for i, name in enumerate([*(mass.name for mass in masses), *network.boundaries])}
    parts, places, outer = len(network.seats), len(masses), len(network.boundaries)
    stored = np.array([mass.heat_capacity for mass in masses if mass.heat_capacity > 0.0])
    inner = _without_joints(*_balance(network, row), len(stored))
    root = np.sqrt(stored)
    decay, shape = _decays_and_shapes(inner, root, parts)
    gain = (shape.T @ (inner.heat / root[:, None])) / decay[:, None]
    seen = shape / root[:, None]
    output = np.concatenate([seen, inner.by_mass @ seen, np.zeros((outer, len(stored)))])
    direct = np.zeros((places + outer, parts + outer))
    direct[len(stored) : places] = inner.by_input
    direct[places:, parts:] = np.eye(outer)
    return _Places(1.0 / decay, gain, row, output, direct)


def _balance(network: Network, row: dict[str, int]) -> tuple[FloatArray, FloatArray]:
    """Return conductances between places [W/K] and the heat that a unit of each input brings to each place."""
    parts, places = len(network.seats), len(network.masses)
    conductance = np.zeros((places, places))
    heat = np.zeros((places, parts + len(network.boundaries)))
    for path in network.paths:
        for here, there in ((row[path.one], row[path.other]), (row[path.other], row[path.one])):
            if here >= places:
                continue
            conductance[here, here] += 1.0 / path.resistance
            if there < places:
                conductance[here, there] -= 1.0 / path.resistance
            else:
                heat[here, parts + there - places] += 1.0 / path.resistance
    for i, seat in enumerate(network.seats):
        if row[seat.base] < places:
            heat[row[seat.base], i] += seat.copies
    return conductance, heat


def _without_joints(conductance: FloatArray, heat: FloatArray, stored: int) -> _Reduced:
    """Take the massless joints out exactly: 0 = -G_jm T_m - G_jj T_j + heat_j."""
    joints = conductance[stored:, stored:]
    if not len(joints):
        return _Reduced(conductance, heat, np.zeros((0, stored)), np.zeros((0, heat.shape[1])))
    by_mass = np.asarray(np.linalg.solve(joints, -conductance[stored:, :stored]), dtype=np.float64)
    by_input = np.asarray(np.linalg.solve(joints, heat[stored:]), dtype=np.float64)
    across = conductance[:stored, stored:]
    inner = conductance[:stored, :stored] + across @ by_mass
    return _Reduced(inner, heat[:stored] - across @ by_input, by_mass, by_input)


def _decays_and_shapes(inner: _Reduced, root: FloatArray, parts: int) -> tuple[FloatArray, FloatArray]:
    """Return the decay rates [1/s] and shapes of the masses' modes, slowest last.

    The symmetric matrix is A'A with one row of A for each path: sqrt(g) (e_a - e_b)/sqrt(C). Its singular values are
    the roots of the rates. Fast and slow masses that differ by 1e10 then keep their digits, of which an eigenvalue
    routine on A'A would lose half.
    """
    one, other = np.nonzero(np.triu(inner.conductance, 1))
    to_outside = inner.heat[:, parts:].sum(axis=1)
    across = np.zeros((len(one), len(root)))
    weight = np.sqrt(np.maximum(-inner.conductance[one, other], 0.0))
    across[np.arange(len(one)), one] = weight
    across[np.arange(len(one)), other] = -weight
    rows = np.concatenate([across, np.diag(np.sqrt(to_outside))]) / root[None, :]
    _, singular, shape = np.linalg.svd(rows, full_matrices=False)
    return singular * singular, np.asarray(shape.T)


def _with_chains(network: Network, places: _Places) -> Modes:
    """Add every Foster cell as a mode of its own and gather what each part and mass sees."""
    parts, masses = len(network.seats), len(network.masses)
    names = tuple(mass.name for mass in network.masses)
    base = [places.row[seat.base] for seat in network.seats]
    cells = [(i, r, tau) for i, seat in enumerate(network.seats) for r, tau in seat.cells if tau > 0.0]
    cell_gain = np.zeros((len(cells), places.gain.shape[1]))
    cell_output = np.zeros((parts, len(cells)))
    for k, (i, resistance, _) in enumerate(cells):
        cell_gain[k, i] = resistance
        cell_output[i, k] = 1.0
    direct = places.direct[base]
    for i, seat in enumerate(network.seats):
        direct[i, i] += sum(resistance for resistance, tau in seat.cells if tau == 0.0)
    own = [places.row[name] for name in names]
    return Modes(
        parts=tuple(seat.part for seat in network.seats),
        masses=names,
        boundaries=network.boundaries,
        time_constants=np.concatenate([places.time_constants, [tau for *_, tau in cells]]),
        gain=np.concatenate([places.gain, cell_gain]),
        output=np.concatenate([places.output[base], cell_output], axis=1),
        direct=direct,
        mass_output=np.concatenate([places.output[own], np.zeros((masses, len(cells)))], axis=1),
        mass_direct=places.direct[own],
    )
