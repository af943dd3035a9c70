"""The thermal solver: exact for any step, against an independent matrix exponential; energy is kept."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.linalg import expm

from tideleg import InputError, Mass, Network, Path, Seat
from tideleg.heat import Propagator, modes


def random_network(rng, masses=4):
    names = [f"m{i}" for i in range(masses)]
    places = tuple(Mass(n, float(rng.uniform(0.2, 50.0))) for n in names)
    paths = [Path(a, b, float(rng.uniform(0.01, 2.0))) for a, b in zip(names, [*names[1:], "coolant"], strict=False)]
    paths.append(Path(names[0], "ambient", float(rng.uniform(0.5, 5.0))))
    seats = (Seat("a", "m0", ((0.1, 0.02), (0.2, 0.5)), 3), Seat("b", names[-1]), Seat("c", "coolant", ((0.4, 2.0),)))
    return Network(("coolant", "ambient"), places, tuple(paths), seats)


def expm_ends(network, power, boundary, seconds):
    """March the masses by the matrix exponential of their own equations: nothing shared with the solver."""
    names = [m.name for m in network.masses]
    capacity = np.array([m.heat_capacity for m in network.masses])
    g = np.zeros((len(names), len(names)))
    outside = np.zeros((len(names), len(network.boundaries)))
    for p in network.paths:
        for a, b in ((p.one, p.other), (p.other, p.one)):
            if a in names:
                g[names.index(a), names.index(a)] += 1 / p.resistance
                if b in names:
                    g[names.index(a), names.index(b)] -= 1 / p.resistance
                else:
                    outside[names.index(a), network.boundaries.index(b)] += 1 / p.resistance
    a = -g / capacity[:, None]
    start = np.linalg.solve(g, outside @ boundary[:, 0])
    cells = [np.zeros(len(s.cells)) for s in network.seats]
    found = []
    for k, h in enumerate(seconds):
        heat = outside @ boundary[:, k]
        for i, s in enumerate(network.seats):
            if s.base in names:
                heat[names.index(s.base)] += s.copies * power[i, k]
        rest = np.linalg.solve(g, heat)
        start = rest + expm(a * h) @ (start - rest)
        row = []
        for i, s in enumerate(network.seats):
            r, tau = (np.array(x) for x in (zip(*s.cells, strict=True) if s.cells else ((), ())))
            if len(r):
                cells[i] = r * power[i, k] + np.exp(-h / tau) * (cells[i] - r * power[i, k])
            base = start[names.index(s.base)] if s.base in names else boundary[network.boundaries.index(s.base), k]
            row.append(base + cells[i].sum())
        found.append(row)
    return np.array(found).T


def respond(solved, power, boundary, seconds):
    state = solved.soaked(boundary[:, 0])[:, None]
    return Propagator(solved, seconds).respond(state, power[:, None, :], boundary)


@pytest.mark.parametrize("seed", range(6))
def test_any_network_and_any_steps_agree_with_the_matrix_exponential(seed):
    rng = np.random.default_rng(seed)
    network = random_network(rng)
    steps = int(rng.integers(1, 90))
    seconds = 10.0 ** rng.uniform(-4, 4, steps)
    power = rng.uniform(0.0, 200.0, (3, steps))
    boundary = np.stack([rng.uniform(20, 80, steps), rng.uniform(-20, 50, steps)])
    ends = respond(modes(network), power, boundary, seconds).end[:, 0]
    np.testing.assert_allclose(ends, expm_ends(network, power, boundary, seconds), rtol=1e-9, atol=1e-8)


@settings(max_examples=30)
@given(st.lists(st.floats(0.0, 500.0), min_size=1, max_size=40), st.floats(1e-3, 1e3))
def test_splitting_every_step_tenfold_changes_nothing(power, seconds):
    solved = modes(random_network(np.random.default_rng(1)))
    power = np.stack([power, power, power])
    boundary = np.full((2, power.shape[1]), 40.0)
    coarse = respond(solved, power, boundary, np.full(power.shape[1], seconds))
    fine = respond(
        solved,
        np.repeat(power, 10, axis=1),
        np.repeat(boundary, 10, axis=1),
        np.full(power.shape[1] * 10, seconds / 10),
    )
    np.testing.assert_allclose(coarse.end, fine.end[..., 9::10], rtol=0, atol=1e-9)
    means = fine.mean.reshape(3, 1, -1, 10).mean(axis=-1)
    np.testing.assert_allclose(coarse.mean, means, rtol=0, atol=1e-9)


def test_heat_in_is_heat_stored_and_heat_out():
    rng = np.random.default_rng(5)
    plate, coolant = Mass("plate", 900.0), 60.0
    network = Network(("coolant",), (plate,), (Path("plate", "coolant", 0.02),), (Seat("a", "plate", (), 4),))
    solved = modes(network)
    seconds = 10.0 ** rng.uniform(-2, 2, 300)
    power = rng.uniform(0, 300, (1, 300))
    found = respond(solved, power, np.full((1, 300), coolant), seconds)
    out = np.sum((found.mean[0, 0] - coolant) / 0.02 * seconds)
    stored = plate.heat_capacity * (found.end[0, 0, -1] - coolant)
    put_in = np.sum(4 * power[0] * seconds)
    assert out + stored == pytest.approx(put_in, rel=1e-9)


def test_candidates_and_steps_are_independent():
    solved = modes(random_network(np.random.default_rng(2)))
    rng = np.random.default_rng(3)
    power, seconds = rng.uniform(0, 90, (3, 5, 70)), rng.uniform(0.1, 9, 70)
    boundary = np.full((2, 70), 35.0)
    state = np.repeat(solved.soaked(boundary[:, 0])[:, None], 5, axis=1)
    together = Propagator(solved, seconds).respond(state, power, boundary)
    for c in range(5):
        alone = Propagator(solved, seconds).respond(state[:, c : c + 1], power[:, c : c + 1], boundary)
        np.testing.assert_allclose(alone.end[:, 0], together.end[:, c], rtol=1e-12)


def test_the_periodic_start_equals_two_hundred_repetitions():
    solved = modes(random_network(np.random.default_rng(7)))
    rng = np.random.default_rng(8)
    power, seconds = rng.uniform(0, 90, (3, 1, 50)), rng.uniform(0.1, 9, 50)
    boundary = np.full((2, 50), 35.0)
    propagator = Propagator(solved, seconds)
    state = solved.soaked(boundary[:, 0])[:, None]
    after = propagator.respond(state, power, boundary).state
    start = solved.periodic_start(state, after, float(seconds.sum()))
    for _ in range(200):
        state = propagator.respond(state, power, boundary).state
    brute, exact = (propagator.respond(s, power, boundary).end for s in (state, start))
    np.testing.assert_allclose(exact, brute, atol=1e-6)


def test_the_same_step_response_is_a_true_derivative():
    solved = modes(random_network(np.random.default_rng(9)))
    seconds, boundary = np.array([0.01, 3.0, 500.0]), np.full((2, 3), 30.0)
    slope = Propagator(solved, seconds).same_step_response()
    for part in range(3):
        for step in range(3):
            power = np.zeros((3, 3))
            low = respond(solved, power, boundary, seconds).mean[part, 0, step]
            power[part, step] = 1.0
            high = respond(solved, power, boundary, seconds).mean[part, 0, step]
            assert slope[part, 0, step] == pytest.approx(high - low, rel=1e-9)


@pytest.mark.parametrize(
    ("network", "said"),
    [
        (Network(("c",), (Mass("m", 1.0), Mass("m", 2.0)), (Path("m", "c", 1.0),), ()), "stands twice"),
        (Network(("c",), (Mass("m", -1.0),), (Path("m", "c", 1.0),), ()), "not be below zero"),
        (Network(("c",), (Mass("m", 1.0),), (Path("m", "c", 0.0),), ()), "must be above zero"),
        (Network(("c",), (Mass("m", 1.0),), (Path("m", "d", 1.0),), ()), "places are c, m"),
        (Network(("c",), (Mass("m", 1.0),), (), ()), "reaches no boundary"),
        (Network(("c",), (), (), (Seat("a", "plate"),)), "stands on 'plate'"),
        (Network(("c",), (), (), (Seat("a", "c", ((-1.0, 1.0),)),)), "resistance must be above zero"),
    ],
)
def test_a_network_that_cannot_be_is_refused(network, said):
    with pytest.raises(InputError, match=said):
        modes(network)
