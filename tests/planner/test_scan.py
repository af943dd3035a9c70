"""Running sums by blocks against plain loops."""

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from tideleg.scan import clipped_sum, linear_scan


@settings(max_examples=60)
@given(st.integers(1, 2200), st.integers(0, 10_000), st.booleans())
def test_linear_scan_is_the_loop(steps, seed, underflows):
    rng = np.random.default_rng(seed)
    decay = np.exp(-(10.0 ** rng.uniform(-6, 4 if underflows else 0, (2, 1, steps))))
    drive, initial = rng.normal(size=(2, 3, steps)), rng.normal(size=(2, 3, 1))
    found, value = linear_scan(decay, drive, initial), initial[..., 0]
    for k in range(steps):
        value = decay[..., k] * value + drive[..., k]
        np.testing.assert_allclose(found[..., k], value, rtol=1e-9, atol=1e-9)


@settings(max_examples=60)
@given(st.integers(1, 1200), st.integers(0, 10_000), st.floats(0.001, 1.0))
def test_clipped_sum_is_the_loop(steps, seed, size):
    rng = np.random.default_rng(seed)
    change, start = rng.normal(scale=size, size=(2, steps)), rng.uniform(0.2, 0.9, (2, 1))
    found, value = clipped_sum(start, change, 0.2, 0.9), start[:, 0]
    for k in range(steps):
        value = np.clip(value + change[:, k], 0.2, 0.9)
        np.testing.assert_allclose(found[:, k], value, rtol=0, atol=1e-12)
