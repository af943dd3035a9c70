"""Life and its spread against scipy and chance; damage along time against sums made by hand."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import integrate, stats

from tideleg.stress import Cycles
from tideleg.wear import cumulative_damage, hours_above, hours_at_temperature, life_of, lifetime_quantile

SPREADS = st.floats(0.05, 1.5)
SHARES = st.floats(0.01, 0.99)


@given(st.floats(1e-6, 1e3), SPREADS, SHARES)
def test_one_part_is_a_lognormal_with_its_median_at_one_over_the_damage(damage, spread, failed):
    found = lifetime_quantile(damage, spread, failed)
    assert found == pytest.approx(stats.lognorm(s=spread, scale=1.0 / damage).ppf(failed), rel=1e-9)


@given(SPREADS, SPREADS, SHARES)
def test_spreads_of_one_part_add_in_squares(spread, load, failed):
    found = lifetime_quantile(0.1, spread, failed, load_spread=load)
    assert found == pytest.approx(lifetime_quantile(0.1, float(np.hypot(spread, load)), failed), rel=1e-12)


@pytest.mark.parametrize(("among", "load"), [(8, 0.0), (8, 0.4), (16, 0.8), (2, 0.1)])
@pytest.mark.parametrize("failed", [0.05, 0.1, 0.5, 0.9])
def test_the_first_of_several_parts_under_a_common_load(among, load, failed):
    spread = 0.5
    life = lifetime_quantile(0.1, spread, failed, among, load)

    def share(x):
        one = stats.norm.cdf((np.log(life * 0.1) - load * x) / spread)
        return stats.norm.pdf(x) * (1.0 - (1.0 - one) ** among)

    lost, _ = integrate.quad(share, -9.0, 9.0, limit=200)
    assert lost == pytest.approx(failed, rel=1e-6)


def test_drawn_parts_fail_as_computed():
    rng = np.random.default_rng(11)
    parts = np.exp(0.5 * rng.normal(size=(200000, 8)) + 0.3 * rng.normal(size=(200000, 1))) / 0.04
    drawn = np.quantile(parts.min(axis=1), [0.1, 0.5, 0.9])
    life = life_of(0.04, 0.5, 8, 0.3)
    np.testing.assert_allclose([life.p10, life.p50, life.p90], drawn, rtol=0.01)


@given(SPREADS, st.integers(2, 40), SPREADS)
def test_more_parts_never_last_longer_and_quantiles_stand_in_order(spread, among, load):
    one, many = life_of(0.1, spread, 1, load), life_of(0.1, spread, among, load)
    assert many.p10 < many.p50 < many.p90
    assert many.p50 < one.p50


def test_no_damage_is_a_life_without_end_and_nonsense_is_refused():
    assert life_of(0.0, 0.5).p10 == np.inf
    assert lifetime_quantile(0.1, 0.0, 0.1, among=5) == pytest.approx(10.0)
    for wrong in ((-0.1, 0.5, 0.1), (0.1, -0.5, 0.1), (0.1, 0.5, 1.0), (0.1, 0.5, 0.0)):
        with pytest.raises(ValueError, match="share failed"):
            lifetime_quantile(*wrong)


def ramp(cycles, damage, at, period):
    """The same sum by hand, cycle by cycle, with what passes the seam begun again."""
    total = np.zeros(len(at))
    for b, e, d in zip(cycles.begin, cycles.end, damage, strict=True):
        for shift in (0.0, period):
            low, high = max(b - shift, 0.0), max(e - shift, 0.0)
            total += d * (np.clip(at, low, high) - low) / (e - b)
    return total


@given(st.lists(st.tuples(st.floats(0, 99), st.floats(0.1, 60), st.floats(0, 5)), min_size=1, max_size=12))
def test_damage_along_time_is_the_sum_of_ramps_and_keeps_the_whole(rows):
    begin, length, damage = (np.array(column) for column in zip(*rows, strict=True))
    cycles = Cycles(begin * 0, begin * 0 + 1, begin, begin + length, np.ones(len(begin)))
    at = np.linspace(0.0, 100.0, 41)
    found = cumulative_damage(cycles, damage, at, 100.0)
    np.testing.assert_allclose(found, ramp(cycles, damage, at, 100.0), rtol=1e-9, atol=1e-9)
    assert found[-1] == pytest.approx(damage.sum(), rel=1e-9, abs=1e-9)
    assert found[0] == 0.0
    assert np.all(np.diff(found) >= 0.0)


def test_hours_at_temperature_hold_all_the_time():
    degc, seconds = np.array([61.0, 99.9, 70.0, -5.0]), np.array([3600.0, 1800.0, 900.0, 900.0])
    edges, hours = hours_at_temperature(degc, seconds)
    assert (edges[0], edges[-1]) == (-10.0, 100.0)
    assert hours.sum() == pytest.approx(2.0)
    assert hours[edges[:-1] == 70.0][0] == pytest.approx(0.25)
    assert hours_above(65.0, degc, seconds) == pytest.approx(0.75)
