"""Equal and unequal steps, stacked candidates and masses: every way through the solver gives the same temperatures."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tideleg import InputError, Mass, Network, Path, Seat
from tideleg.heat import Propagator, modes, stack
from tideleg.heat.equal import EqualSteps
from tideleg.heat.unequal import UnequalSteps

# Between two exact ways only rounding is left: some hundred sums of numbers near 1e3 K, so 1e-10 K is a fair bound.
ROUNDING = 1e-10


def network(seed):
    """A network with joints, a part that shares its mass, chains with and without time constant, and copies."""
    rng = np.random.default_rng(seed)
    masses = (
        Mass("joint", 0.0),
        Mass("block", float(rng.uniform(0.5, 40.0))),
        Mass("inner joint", 0.0),
        Mass("plate", float(rng.uniform(50.0, 4000.0))),
    )
    ends = (("joint", "block"), ("block", "inner joint"), ("inner joint", "plate"), ("joint", "plate"))
    outer = (("plate", "coolant"), ("block", "ambient"))
    paths = tuple(Path(a, b, float(rng.uniform(0.01, 2.0))) for a, b in (*ends, *outer))
    chain = tuple((float(rng.uniform(0.01, 0.4)), float(10.0 ** rng.uniform(-3, 2))) for _ in range(3))
    seats = (
        Seat("upper", "plate", (*chain, (0.05, 0.0)), 8),
        Seat("coil", "joint", ((0.4, 30.0),), 2),
        Seat("bare", "inner joint"),
        Seat("second", "block"),
        Seat("capacitor", "ambient", ((0.9, 200.0),)),
    )
    return Network(("coolant", "ambient"), masses, paths, seats)


def load(solved, rng, candidates, steps):
    power = rng.uniform(0.0, 150.0, (len(solved.parts), candidates, steps))
    boundary = rng.uniform(-20.0, 80.0, (2, steps))
    state = rng.normal(scale=20.0, size=(len(solved.time_constants), candidates))
    return state, power, boundary


def close(one, other, tolerance=ROUNDING):
    for name in ("mean", "end", "state"):
        np.testing.assert_allclose(getattr(one, name), getattr(other, name), rtol=0, atol=tolerance, err_msg=name)


@settings(max_examples=40)
@given(st.integers(0, 999), st.integers(1, 300), st.integers(1, 3), st.floats(-5.0, 5.0))
def test_the_equal_way_is_the_unequal_way(seed, steps, candidates, magnitude):
    rng = np.random.default_rng(seed)
    solved, seconds = modes(network(seed)), 10.0**magnitude
    state, power, boundary = load(solved, rng, candidates, steps)
    equal = EqualSteps(solved, seconds, steps)
    unequal = UnequalSteps(solved, np.full(steps, seconds))
    one = equal.respond(state, power, boundary[:, None])
    close(one, unequal.respond(state, power, boundary[:, None]))
    np.testing.assert_allclose(equal.same_step_response(), unequal.same_step_response(), rtol=1e-9, atol=1e-14)


def test_the_propagator_takes_the_equal_way_only_for_equal_steps():
    solved = modes(network(0))
    seconds = np.full(100, 0.1)
    assert isinstance(Propagator(solved, seconds)._steps, EqualSteps)
    seconds[70] = np.nextafter(0.1, 1.0)
    assert isinstance(Propagator(solved, seconds)._steps, UnequalSteps)


@settings(max_examples=20)
@given(st.integers(0, 999), st.integers(1, 150), st.booleans())
def test_stacked_candidates_equal_each_alone(seed, steps, equal):
    rng = np.random.default_rng(seed)
    alone = [modes(network(seed + i)) for i in range(3)]
    together = stack(alone)
    seconds = np.full(steps, 0.7) if equal else 10.0 ** rng.uniform(-3, 3, steps)
    state, power, boundary = load(together, rng, 3, steps)
    whole = Propagator(together, seconds)
    found, same_step = whole.respond(state, power, boundary), whole.same_step_response()
    masses = whole.respond_masses(state, power, boundary)
    start = together.periodic_start(state, found.state, float(seconds.sum()))
    for c, one in enumerate(alone):
        cut = slice(c, c + 1)
        single = Propagator(one, seconds)
        response = single.respond(state[:, cut], power[:, cut], boundary)
        close(response, type(found)(found.mean[:, cut], found.end[:, cut], found.state[:, cut]))
        own_masses = single.respond_masses(state[:, cut], power[:, cut], boundary)
        np.testing.assert_allclose(own_masses.end[:, 0], masses.end[:, c], rtol=0, atol=ROUNDING)
        np.testing.assert_allclose(single.same_step_response()[:, 0], same_step[:, c], rtol=1e-12)
        np.testing.assert_allclose(one.resistance_matrix(), together.resistance_matrix()[:, :, c, 0], rtol=1e-12)
        np.testing.assert_allclose(one.soaked(np.array([60.0, 20.0])), together.soaked(np.array([60.0, 20.0]))[:, c])
        again = one.periodic_start(state[:, cut], response.state, float(seconds.sum()))
        np.testing.assert_allclose(again[:, 0], start[:, c], rtol=1e-9, atol=1e-9)
        steady = one.steady(power[:, c, :1], boundary[:, :1])
        np.testing.assert_allclose(steady, together.steady(power[:, :, :1], boundary[:, None, :1])[:, c], rtol=1e-12)


def test_candidates_of_another_layout_are_not_stacked():
    first = modes(network(0))
    with pytest.raises(InputError, match="differ in their parts"):
        stack([first, modes(network(0)._replace(seats=network(0).seats[:2]))])
    longer = network(0).seats[1]._replace(cells=((0.1, 1.0), (0.2, 9.0)))
    seats = (network(0).seats[0], longer, *network(0).seats[2:])
    with pytest.raises(InputError, match="7 and 8 time constants"):
        stack([first, modes(network(0)._replace(seats=seats))])
    with pytest.raises(InputError, match="already stacked"):
        stack([stack([first]), first])
    with pytest.raises(InputError, match="at least one"):
        stack([])


@settings(max_examples=20)
@given(st.integers(0, 999), st.integers(1, 120), st.booleans())
def test_heat_into_boundaries_and_masses_is_the_heat_put_in(seed, steps, equal):
    # From rest without loss; 1e-9 of the heat put in is the promise to the user.
    rng = np.random.default_rng(seed)
    described = network(seed)
    solved = modes(described)
    seconds = np.full(steps, 5.0) if equal else 10.0 ** rng.uniform(-3, 4, steps)
    power = rng.uniform(1.0, 150.0, (len(solved.parts), 1, steps))
    outside = {"coolant": 40.0, "ambient": 40.0}
    boundary = np.full((2, steps), 40.0)
    state = solved.soaked(boundary[:, 0])[:, None]
    masses = Propagator(solved, seconds).respond_masses(state, power, boundary)
    mean = outside | {name: masses.mean[i, 0] for i, name in enumerate(solved.masses)}
    crossing = [p for p in described.paths if p.other in outside]
    out = sum(np.sum((mean[p.one] - mean[p.other]) / p.resistance * seconds) for p in crossing)
    stored = sum(m.heat_capacity * (masses.end[i, 0, -1] - 40.0) for i, m in enumerate(described.masses))
    reaches = np.array([s.copies if s.base not in outside else 0 for s in described.seats])
    put_in = np.sum(reaches[:, None] * power[:, 0] * seconds)
    assert out + stored == pytest.approx(put_in, rel=1e-9)


def test_masses_are_what_a_part_without_a_chain_feels():
    solved = modes(network(4))
    state, power, boundary = load(solved, np.random.default_rng(4), 2, 90)
    propagator = Propagator(solved, np.full(90, 2.0))
    parts, masses = propagator.respond(state, power, boundary), propagator.respond_masses(state, power, boundary)
    for part, mass in (("bare", "inner joint"), ("second", "block")):
        p, m = solved.parts.index(part), solved.masses.index(mass)
        np.testing.assert_allclose(parts.mean[p], masses.mean[m], rtol=0, atol=ROUNDING)
        np.testing.assert_allclose(parts.end[p], masses.end[m], rtol=0, atol=ROUNDING)
    at_rest = solved.steady_masses(np.zeros((5, 1)), np.full((2, 1), 33.0))
    np.testing.assert_allclose(at_rest, 33.0, rtol=1e-12)


@pytest.mark.parametrize("equal", [True, False])
def test_a_response_is_not_overwritten_by_the_next(equal):
    solved = modes(network(5))
    rng = np.random.default_rng(5)
    for steps in (1, 2, 20, 64):
        seconds = np.full(steps, 1.0) if equal else rng.uniform(0.1, 2.0, steps)
        propagator = Propagator(solved, seconds)
        state, power, boundary = load(solved, rng, 2, steps)
        kept = propagator.respond(state, power, boundary)
        copies = [np.array(part) for part in kept]
        propagator.respond(state, 3.0 * power, boundary)
        for part, copy in zip(kept, copies, strict=True):
            np.testing.assert_array_equal(part, copy)
        assert not np.shares_memory(kept.mean, kept.end)


def test_one_step_alone_is_the_same_step_among_many():
    solved = modes(network(6))
    rng = np.random.default_rng(6)
    seconds = rng.uniform(0.01, 50.0, 130)
    state, power, boundary = load(solved, rng, 1, 130)
    together = Propagator(solved, seconds).respond(state, power, boundary)
    for k in range(130):
        one = Propagator(solved, seconds[k : k + 1]).respond(state, power[..., k : k + 1], boundary[:, k : k + 1])
        np.testing.assert_allclose(one.end[..., 0], together.end[..., k], rtol=0, atol=ROUNDING)
        np.testing.assert_allclose(one.mean[..., 0], together.mean[..., k], rtol=0, atol=ROUNDING)
        state = one.state


def test_steps_far_shorter_and_far_longer_than_every_time_constant():
    solved = modes(network(7))
    state, power, boundary = load(solved, np.random.default_rng(7), 1, 3)
    found = Propagator(solved, np.array([1e-18, 1e300, 1e-300])).respond(state, power, boundary)
    assert all(np.all(np.isfinite(part)) for part in found)
    np.testing.assert_allclose(found.mean[..., 0], found.end[..., 0], rtol=0, atol=ROUNDING)
    rest = solved.steady(power[..., 1], boundary[:, None, 1])
    np.testing.assert_allclose(found.end[..., 1], rest, rtol=0, atol=1e-9)
    np.testing.assert_allclose(found.mean[..., 1], rest, rtol=0, atol=1e-9)


def test_a_step_of_no_length_leaves_every_mode_as_it_is():
    solved = modes(network(8))
    state, power, boundary = load(solved, np.random.default_rng(8), 1, 2)
    found = Propagator(solved, np.zeros(2)).respond(state, power, boundary)
    np.testing.assert_array_equal(found.state, state)
    np.testing.assert_allclose(found.mean, found.end, rtol=0, atol=ROUNDING)


@pytest.mark.parametrize("bad", [-1.0, np.nan, np.inf])
def test_a_duration_that_cannot_be_is_refused(bad):
    with pytest.raises(ValueError, match="step 2 lasts"):
        Propagator(modes(network(0)), np.array([1.0, 1.0, bad]))


def test_a_network_without_masses_answers_at_once():
    solved = modes(
        Network(("coolant",), (), (), (Seat("a", "coolant", ((0.5, 0.0), (0.25, 0.0))), Seat("b", "coolant")))
    )
    propagator = Propagator(solved, np.array([1.0, 2.0]))
    power, boundary = np.array([[[10.0, 20.0]], [[5.0, 5.0]]]), np.array([[40.0, 50.0]])
    found = propagator.respond(np.zeros((0, 1)), power, boundary)
    np.testing.assert_allclose(found.mean[:, 0], [[47.5, 65.0], [40.0, 50.0]], rtol=1e-15)
    np.testing.assert_array_equal(found.mean, found.end)
    np.testing.assert_allclose(propagator.same_step_response()[:, 0], [[0.75, 0.75], [0.0, 0.0]])
    assert propagator.respond_masses(np.zeros((0, 1)), power, boundary).mean.shape == (0, 1, 2)


@settings(max_examples=10)
@given(st.integers(0, 999))
def test_a_joint_is_a_mass_of_next_to_nothing(seed):
    # Independent of the elimination: masses of 1 uJ/K settle within microseconds of milliseconds-long steps.
    exact = network(seed)
    tiny = exact._replace(masses=tuple(m._replace(heat_capacity=m.heat_capacity or 1e-6) for m in exact.masses))
    rng = np.random.default_rng(seed)
    seconds, boundary = 10.0 ** rng.uniform(-1, 3, 50), np.full((2, 50), 30.0)
    power = rng.uniform(0.0, 100.0, (5, 1, 50))
    found = [
        Propagator(one, seconds).respond(one.soaked(boundary[:, 0])[:, None], power, boundary)
        for one in (modes(exact), modes(tiny))
    ]
    np.testing.assert_allclose(found[0].end, found[1].end, rtol=0, atol=1e-3)
    np.testing.assert_allclose(found[0].mean, found[1].mean, rtol=0, atol=2e-2)


@settings(max_examples=30)
@given(st.permutations(range(6)))
def test_the_order_of_masses_does_not_matter_however_stiff(order):
    # Capacities over ten decades: an eigenvalue routine on the squared matrix loses 1e-9 here in some orders.
    capacity = (1e-5, 1e-3, 0.1, 10.0, 1e3, 1e5)
    resistance = (0.05, 0.05, 0.02, 0.01, 0.01, 0.005)
    names = [*(f"m{i}" for i in range(6)), "coolant"]
    masses = tuple(Mass(names[i], capacity[i]) for i in order)
    paths = tuple(Path(names[i], names[i + 1], r) for i, r in enumerate(resistance))
    solved = modes(Network(("coolant",), masses, paths, (Seat("die", "m0"),)))
    assert solved.resistance_matrix()[0, 0] == pytest.approx(sum(resistance), rel=1e-11)
    assert solved.at_rest()[0, 1] == pytest.approx(1.0, rel=1e-11)
    # The sum of the time constants is the trace of C/G: each mass times its resistance to the coolant.
    total = sum(c * sum(resistance[i:]) for i, c in enumerate(capacity))
    assert solved.time_constants.sum() == pytest.approx(total, rel=1e-12)


def test_what_is_left_after_a_while():
    solved = modes(network(9))
    state = np.full((len(solved.time_constants), 1), 7.0)
    power, boundary = np.zeros((5, 1, 40)), np.zeros((2, 40))
    after = Propagator(solved, np.full(40, 3.0)).respond(state, power, boundary).state
    np.testing.assert_allclose(after, solved.whole_decay(120.0) * state, rtol=1e-11, atol=1e-14)
    with pytest.raises(ValueError, match="no periodic start"):
        solved.periodic_start(state, after, 0.0)
