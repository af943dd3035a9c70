"""Merging steps keeps energy and length, and can only lower the mean square."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tideleg.mission import Profile, coarsened

steps = st.lists(st.tuples(st.floats(-1e5, 1e5), st.floats(0.05, 900.0)), min_size=1, max_size=50)


@given(steps, st.integers(1, 60))
def test_energy_and_length_stay(rows, factor):
    power, duration = (np.array(x) for x in zip(*rows, strict=True))
    time = np.concatenate([[0.0], np.cumsum(duration)[:-1]])
    found = coarsened(Profile("p", None, "", "link", time, duration, power, coolant_degc=power), factor)
    assert len(found.power_w) == -(-len(power) // factor)
    assert np.sum(found.power_w * found.duration_s) == pytest.approx(np.sum(power * duration), rel=1e-9, abs=1e-6)
    assert np.sum(found.duration_s) == pytest.approx(np.sum(duration))
    square = np.sum(power**2 * duration)
    assert np.sum(found.power_w**2 * found.duration_s) <= square * (1 + 1e-9) + 1e-9
    np.testing.assert_array_equal(found.coolant_degc, found.power_w)
    np.testing.assert_allclose(found.time_s, np.concatenate([[0.0], np.cumsum(found.duration_s)[:-1]]), atol=1e-6)
    assert "merged" in found.rules[-1]


def test_fewer_than_one_is_refused():
    with pytest.raises(ValueError, match="not by 0"):
        coarsened(Profile("p", None, "", "link", np.zeros(1), np.ones(1), np.ones(1)), 0)
