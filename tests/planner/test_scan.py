"""Running sums by blocks against plain loops."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tideleg.scan import clipped_sum, linear_scan


def looped(decay, drive, initial):
    y, value = np.empty_like(drive), initial[..., 0]
    for k in range(drive.shape[-1]):
        y[..., k] = value = decay[..., k] * value + drive[..., k]
    return y


@settings(max_examples=60)
@given(st.integers(1, 2200), st.integers(0, 10_000), st.booleans())
def test_linear_scan_is_the_loop(steps, seed, underflows):
    rng = np.random.default_rng(seed)
    decay = np.exp(-(10.0 ** rng.uniform(-6, 4 if underflows else 0, (2, 1, steps))))
    drive, initial = rng.normal(size=(2, 3, steps)), rng.normal(size=(2, 3, 1))
    np.testing.assert_allclose(linear_scan(decay, drive, initial), looped(decay, drive, initial), rtol=1e-9, atol=1e-9)


@settings(max_examples=60)
@given(st.integers(1, 1200), st.integers(0, 10_000), st.floats(0.001, 1.0))
def test_clipped_sum_is_the_loop(steps, seed, size):
    rng = np.random.default_rng(seed)
    change, start = rng.normal(scale=size, size=(2, steps)), rng.uniform(0.2, 0.9, (2, 1))
    expected, value = np.empty_like(change), start[:, 0]
    for k in range(steps):
        expected[:, k] = value = np.minimum(np.maximum(value + change[:, k], 0.2), 0.9)
    np.testing.assert_allclose(clipped_sum(start, change, 0.2, 0.9), expected, rtol=0, atol=1e-12)


@settings(max_examples=40)
@given(st.integers(1, 2200), st.integers(0, 10_000), st.floats(-6.0, 4.0))
def test_one_decay_for_all_steps_is_the_loop(steps, seed, magnitude):
    rng = np.random.default_rng(seed)
    decay = np.exp(-(10.0 ** (magnitude + rng.uniform(0, 1, (2, 1, 1)))))
    drive, initial = rng.normal(size=(2, 3, steps)), rng.normal(size=(2, 3, 1))
    expected = looped(np.broadcast_to(decay, (2, 1, steps)), drive, initial)
    np.testing.assert_allclose(linear_scan(decay, drive, initial), expected, rtol=1e-9, atol=1e-9)


@pytest.mark.parametrize("steps", [1, 31, 32, 33, 1024, 1025])
def test_a_decay_of_nothing_and_of_everything(steps):
    drive, initial = np.random.default_rng(steps).normal(size=(1, steps)), np.array([[3.0]])
    for decay, expected in ((0.0, drive), (1.0, 3.0 + np.cumsum(drive, axis=-1))):
        for shape in ((1, 1), (1, steps)):
            found = linear_scan(np.full(shape, decay), drive, initial)
            np.testing.assert_allclose(found, expected, rtol=0, atol=1e-12)


def test_decays_and_drives_of_other_lengths_are_refused():
    with pytest.raises(ValueError, match="the drive has 5 steps, the decay 4"):
        linear_scan(np.ones(4), np.ones(5), np.zeros(1))


def test_walls_that_stand_the_wrong_way_are_refused():
    with pytest.raises(ValueError, match="lies above the upper wall"):
        clipped_sum(np.array([0.5]), np.ones(3), 1.0, 0.0)


def test_a_sum_that_starts_outside_comes_in_at_once():
    found = clipped_sum(np.array([1.5]), np.array([0.1, -0.3]), 0.0, 1.0)
    np.testing.assert_allclose(found, [1.0, 0.7], rtol=1e-15)
