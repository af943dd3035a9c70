"""First-party profile sources: energy accounts, against step-by-step references written here; contract checks."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from pydantic import ValidationError
from scipy import signal

from tideleg import ProfileError
from tideleg.conformance import profile_checks
from tideleg.registry import installed
from tideleg_profiles.duty import DutySettings, synthesize
from tideleg_profiles.frequency_response import FrequencyResponseSettings, request
from tideleg_profiles.peak_shaving import PeakShavingSettings, shave
from tideleg_profiles.series import Series, read_series
from tideleg_profiles.solar_smoothing import SolarSmoothingSettings, smooth

DUTY = {
    "duration": "1 h",
    "step": "2 s",
    "mean_power": "5 kW",
    "rms_power": "20 kW",
    "corner_frequency": 0.01,
    "seed": 7,
}
KEYS = {
    "peak-shaving": {
        "load": "load.csv", "threshold": 60e3, "storage_energy": "2 kWh", "discharge_limit": 5e4, "charge_limit": 2e4,
    },
    "frequency-response": {"frequency": "f.csv", "rated_power": "1 MW", "dead_band": "10 mHz", "droop": "0.4 %"},
    "solar-smoothing": {"solar": "sun.csv", "window": "10 min", "storage_energy": "20 kWh", "return_time": "2 h"},
    "duty": DUTY,
}  # fmt: skip
STEPS = st.lists(st.tuples(st.floats(0.5, 600.0), st.floats(0.0, 150e3)), min_size=1, max_size=40)


def series(rows):
    duration, value = (np.array(column) for column in zip(*rows, strict=True))
    return Series(np.cumsum(duration) - duration, duration, value)


@pytest.fixture
def folder(tmp_path):
    (tmp_path / "load.csv").write_text("time_s,load_kw\n0,50\n60,90\n120,55\n300,0\n")
    (tmp_path / "f.csv").write_text("time_s,frequency_hz\n0,49.95\n10,50.02\n20,50\n")
    (tmp_path / "sun.csv").write_text("solar_w,time_s\n0,0\n30000,60\n8000,120\n20000,300\n0,400\n")
    return tmp_path


@pytest.mark.parametrize("name", KEYS)
def test_contract(name, folder):
    for check in profile_checks(installed().profile_source(name), (KEYS[name], folder)):
        check()


def shaving(**other):
    base = {"load": "-", "threshold": 80e3, "storage_energy": 3.6e6, "discharge_limit": 1e6, "charge_limit": 30e3}
    return PeakShavingSettings(**{**base, **other})


@given(STEPS, st.floats(0.0, 1.0), st.floats(0.7, 1.0), st.floats(1e5, 3e7))
def test_shaving_is_that_of_a_plain_loop_and_its_account_closes(rows, share, efficiency, capacity):
    load = series(rows)
    keys = shaving(start_share=share, one_way_efficiency=efficiency, storage_energy=capacity, recharge_threshold=60e3)
    power, energy = shave(load, keys)
    stored = share * capacity
    for k, (seconds, value) in enumerate(rows):
        before = stored
        if value > 80e3:
            gives = min(value - 80e3, 1e6, stored * efficiency / seconds)
            stored -= gives * seconds / efficiency
        else:
            gives = -min(max(60e3 - value, 0.0), 30e3, (capacity - stored) / efficiency / seconds)
            stored -= gives * seconds * efficiency
        assert energy[k] == pytest.approx(stored, abs=1e-9 * capacity)
        assert power[k] == pytest.approx(gives, abs=1e-7 * (capacity / seconds + value + 1.0))
        assert energy[k] - before == pytest.approx(stored - before, abs=2e-9 * capacity)
    assert energy.min() >= 0.0
    assert energy.max() <= capacity


@given(STEPS)
def test_the_supply_never_passes_the_threshold_where_the_storage_allows(rows):
    load = series(rows)
    supply = load.value - shave(load, shaving(storage_energy=1e12)).power
    assert supply.max() <= 80e3 * (1 + 1e-12)
    untouched = supply - load.value <= 0.0
    assert np.all(untouched | (supply <= 80e3))


def test_where_the_storage_does_not_allow_it_is_said(folder):
    made = installed().profile_source("peak-shaving")
    keys = made.settings.model_validate({**KEYS["peak-shaving"], "storage_energy": "0.2 kWh"})
    rules = " ".join(made.make(keys, folder).rules)
    # 90 kW for 60 s above 60 kW is 0.5 kWh; 0.2 kWh leave 30 - 12 = 18 kW of it.
    assert "passes the threshold in 1 of 3 steps, most at 60 s by 18000 W" in rules


@given(st.floats(-1.0, 1.0), st.sampled_from(["through nominal", "from edge"]))
def test_droop_is_exact_piece_by_piece(deviation, form):
    keys = FrequencyResponseSettings(
        frequency="-", rated_power=1.0, dead_band=0.01, droop=0.004, outside_dead_band=form
    )
    asked = float(request(np.array([deviation]), keys)[0])
    size, skipped = abs(deviation), 0.0 if form == "through nominal" else 0.01
    if round(size, 9) <= 0.01:
        assert asked == 0.0
    elif size >= 0.2:
        assert asked == -np.sign(deviation)
    else:
        assert asked == pytest.approx(-np.sign(deviation) * (size - skipped) / (0.2 - skipped), abs=1e-12)


@pytest.mark.parametrize(
    ("other", "message"),
    [
        ({"full_deviation": 0.2, "droop": 0.004}, "give exactly one"),
        ({}, "found none"),
        ({"full_deviation": 0.2, "dead_band": 0.2}, "not below the 0.2 Hz"),
        ({"curve": [(0.0, 0.0), (0.2, 1.0)], "dead_band": 0.01}, "states its own dead band"),
        ({"curve": [(0.2, 0.0), (0.1, 1.0)]}, "deviation rising"),
    ],
)
def test_frequency_keys_that_contradict_are_refused(other, message):
    with pytest.raises(ValidationError, match=message):
        FrequencyResponseSettings(frequency="-", rated_power=1.0, **other)


def smoothing(**other):
    return SolarSmoothingSettings(**{"solar": "-", "storage_energy": 1e12, **other})


@given(STEPS, st.floats(10.0, 5e4))
def test_the_feed_in_keeps_the_ramp_midway_between_its_bounds(rows, per_minute):
    solar, rate = series(rows), per_minute / 60.0
    feed_in = smooth(solar, smoothing(ramp_limit_per_minute=per_minute)).feed_in
    gaps = rate * np.abs(solar.time[:, None] - solar.time[None, :])
    middle = 0.5 * (np.min(solar.value + gaps, axis=1) + np.max(solar.value - gaps, axis=1))
    assert feed_in == pytest.approx(middle, abs=1e-2)  # 1e12 J stored leave 1e-4 J of rounding a step
    assert np.all(np.abs(np.diff(feed_in)) <= rate * solar.duration[:-1] + 1e-2)


def test_a_sun_that_keeps_the_ramp_is_left_alone():
    rows = [(60.0, 1e3 * k) for k in range(30)]
    assert smooth(series(rows), smoothing(ramp_limit_per_minute=1e3)).power == pytest.approx(np.zeros(30), abs=1e-2)


@given(STEPS, st.floats(50.0, 5e3), st.floats(1e4, 1e7))
def test_charge_returns_as_a_fine_integration_says_and_energy_closes(rows, tau, capacity):
    solar = series(rows)
    keys = smoothing(window=300.0, storage_energy=capacity, return_time=tau)
    power, feed_in, energy = smooth(solar, keys)
    start = stored = 0.5 * capacity
    edges = np.concatenate([[0.0], np.cumsum(solar.duration)])
    sums = np.concatenate([[0.0], np.cumsum(solar.duration * solar.value)])
    for k, (seconds, value) in enumerate(rows):
        begin = edges[k + 1] - 300.0
        before = rows[0][1] * begin if begin < 0 else np.interp(begin, edges, sums)
        wanted = (sums[k + 1] - before) / 300.0 - value
        # dE/dt = -wanted - (E - start)/tau, in closed form from rest; a wall holds at the end of the step.
        settled = start - wanted * tau
        stored = float(np.clip(settled + (stored - settled) * np.exp(-seconds / tau), 0.0, capacity))
        assert energy[k] == pytest.approx(stored, abs=1e-8 * (capacity + abs(wanted) * tau))
    assert np.sum(power * solar.duration) == pytest.approx(start - energy[-1], abs=1e-8 * capacity)
    assert np.allclose(feed_in - solar.value, power, atol=1e-6)


def test_the_charge_comes_back_after_the_clouds():
    rows = [(60.0, 50e3)] * 5 + [(60.0, 0.0)] * 200
    energy = smooth(series(rows), smoothing(window=600.0, storage_energy=7.2e7, return_time=1200.0)).energy
    assert np.ptp(energy) > 1e6
    assert energy[-1] == pytest.approx(3.6e7, abs=1e-3 * np.ptp(energy))


@given(st.integers(0, 2**32), st.sampled_from([600, 601, 1800]))
def test_a_duty_has_its_mean_rms_and_spectrum_whatever_the_seed(seed, steps):
    keys = DutySettings(**{**DUTY, "duration": 2.0 * steps, "seed": seed})
    power = synthesize(keys)
    assert np.array_equal(power, synthesize(keys))
    assert power.mean() == pytest.approx(5e3, rel=1e-9)
    assert power.std() == pytest.approx(20e3, rel=1e-9)
    frequency, density = signal.periodogram(power, fs=0.5, detrend="constant")
    inner = slice(1, (steps - 1) // 2 + 1)
    flat = density[inner] * (1.0 + (frequency[inner] / 0.01) ** 2)
    assert np.allclose(flat, flat[0], rtol=1e-6)


def test_another_seed_is_another_duty():
    one, other = (synthesize(DutySettings(**{**DUTY, "seed": seed})) for seed in (1, 2))
    assert np.abs(one - other).max() > 1e4


def test_a_step_that_does_not_divide_the_duration_is_refused():
    with pytest.raises(ValidationError, match="goes 1200.33 times"):
        DutySettings(**{**DUTY, "step": 3.0, "duration": 3601.0})


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("time_s,load_kw\n0,1\n1,x\n2,0\n", "line 3, load_kw: found 'x'"),
        ("time_s,load_kw\n0,1\n\n1,nan\n", "line 4, load_kw: found 'nan'"),
        ("time_s,load_kw\n0,1\n1,2,5\n", "line 3: found 3 cells under 2 columns"),
        ("time_s,load_kw\n0,1\n0,2\n", "line 3, time_s: 0 s does not come after 0 s"),
        ("time_s,load\n0,1\n1,2\n", "line 1: needs the column time_s and one of load_w"),
        ("time_s,load_kw\n0,1\n", "found 1 rows"),
        ("\n", "the file is empty"),
    ],
)
def test_a_series_is_taken_as_it_stands_or_refused(tmp_path, text, message):
    path = tmp_path / "load.csv"
    path.write_text(text)
    with pytest.raises(ProfileError, match=message):
        read_series(path, {"load_w": 1.0, "load_kw": 1e3})


class Spoiled:
    """A source whose table or settings are spoiled."""

    def __init__(self, name, **spoilt):
        self._good, self._spoilt = installed().profile_source(name), spoilt

    def __getattr__(self, key):
        return self._spoilt.get(key, getattr(self._good, key))


@pytest.mark.parametrize(
    ("spoilt", "promise"),
    [
        (lambda made: made._replace(power_w=made.power_w * np.nan), "not finite"),
        (lambda made: made._replace(power_w=made.power_w + np.random.default_rng().random()), "power_w differs"),
        (lambda made: made._replace(files=()), "does not name them as read"),
        (lambda made: made._replace(rules=()), "says nothing"),
    ],
)
def test_a_broken_source_fails_with_the_promise(spoilt, promise):
    good = installed().profile_source("peak-shaving")
    bad = Spoiled("peak-shaving", make=lambda settings, folder: spoilt(good.make(settings, folder)))
    said = []
    for check in profile_checks(bad):
        try:
            check()
        except AssertionError as error:
            said.append(str(error))
    assert any(promise in one for one in said)
