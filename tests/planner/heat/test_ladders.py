"""Foster chains and Cauer ladders are one impedance, through the solver and by exact conversion."""

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from tideleg import InputError, Mass, Network, Path, Seat
from tideleg.heat import Propagator, cauer_to_foster, foster_to_cauer, modes

CELLS = st.lists(st.tuples(st.floats(1e-3, 10.0), st.floats(1e-4, 1e4)), min_size=1, max_size=7)


def apart(cells, factor=1.05):
    """Time constants that nearly coincide have no well-placed ladder: neighbours must differ by a factor."""
    tau = np.sort([t for _, t in cells])
    return np.all(tau[1:] > factor * tau[:-1])


@settings(max_examples=60)
@given(CELLS)
def test_there_and_back_is_the_same_chain(cells):
    assume(apart(cells))
    ladder = foster_to_cauer(cells)
    assert len(ladder) == len(cells)
    assert all(r > 0.0 and c > 0.0 for r, c in ladder)
    # dZ/dt at once is 1/C of the first place and the sum of 1/C over the cells; at rest all resistances count.
    assert 1.0 / ladder[0][1] == pytest.approx(sum(r / tau for r, tau in cells), rel=1e-12)
    assert sum(r for r, _ in ladder) == pytest.approx(sum(r for r, _ in cells), rel=1e-12)
    back = np.array(cauer_to_foster(ladder))
    # The conversion is exact; rounding the ladder to floats is magnified where time constants lie close.
    np.testing.assert_allclose(back, np.array(sorted(cells, key=lambda cell: cell[1])), rtol=1e-7)


@settings(max_examples=20)
@given(CELLS, st.integers(0, 99))
def test_a_chain_and_its_ladder_warm_alike(cells, seed):
    assume(apart(cells))
    rng = np.random.default_rng(seed)
    ladder = foster_to_cauer(cells)
    names = [*(f"place {i}" for i in range(len(ladder))), "coolant"]
    masses = tuple(Mass(names[i], c) for i, (_, c) in enumerate(ladder))
    paths = tuple(Path(names[i], names[i + 1], r) for i, (r, _) in enumerate(ladder))
    of_masses = modes(Network(("coolant",), masses, paths, (Seat("die", names[0]),)))
    of_cells = modes(Network(("coolant",), (), (), (Seat("die", "coolant", tuple(cells)),)))
    seconds, power = 10.0 ** rng.uniform(-5, 4, 60), rng.uniform(0, 100, (1, 1, 60))
    ends = []
    for solved in (of_masses, of_cells):
        boundary = np.full((1, 60), 55.0)
        state = solved.soaked(boundary[:, 0])[:, None]
        ends.append(Propagator(solved, seconds).respond(state, power, boundary).end)
    np.testing.assert_allclose(ends[0], ends[1], rtol=1e-8)


def test_cells_of_one_time_constant_are_one_place():
    assert foster_to_cauer([(0.25, 2.0), (0.75, 2.0)]) == ((1.0, 2.0),)


@pytest.mark.parametrize(
    ("convert", "rows", "said"),
    [
        (foster_to_cauer, [(0.1, 1.0), (0.2, 0.0)], "cell 2 has 0.2 K/W and 0 s"),
        (foster_to_cauer, [(-0.1, 1.0)], "must be above zero"),
        (foster_to_cauer, [], "at least one"),
        (cauer_to_foster, [(0.1, float("nan"))], "place 1 has 0.1 K/W and nan J/K"),
    ],
)
def test_a_chain_that_has_no_ladder_is_refused(convert, rows, said):
    with pytest.raises(InputError, match=said):
        convert(rows)
