"""The passport: exact for unequal steps, and unmoved by splitting them."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tideleg.errors import ProfileError
from tideleg.mission import Profile, coarsened, passport, read_profile
from tideleg.mission.passport import greatest_rms


def profile(power, duration):
    duration = np.asarray(duration, dtype=float)
    time = np.concatenate([[0.0], np.cumsum(duration)[:-1]])
    return Profile("p", None, "", "link", time, duration, np.asarray(power, dtype=float))


steps = st.lists(st.tuples(st.floats(-1e5, 1e5), st.floats(0.05, 900.0)), min_size=1, max_size=40)


@given(steps)
def test_splitting_steps_changes_no_energy_and_no_rms(rows):
    power, duration = zip(*rows, strict=True)
    whole = passport(profile(power, duration))
    halves = passport(profile(np.repeat(power, 2), np.repeat(duration, 2) / 2))
    for name in ("discharge_j", "charge_j", "net_j", "rms_w", "duration_s", "longest_run_s", "idle_share"):
        assert getattr(halves, name) == pytest.approx(getattr(whole, name), rel=1e-9, abs=1e-6), name
    for window, rms in whole.rms_by_window_w.items():
        assert halves.rms_by_window_w[window] == (None if rms is None else pytest.approx(rms, rel=1e-9, abs=1e-6))


@given(steps)
def test_a_window_never_has_less_rms_than_the_whole_and_never_more_than_the_peak(rows):
    power, duration = (np.array(x) for x in zip(*rows, strict=True))
    found = passport(profile(power, duration))
    for rms in found.rms_by_window_w.values():
        if rms is not None:
            assert rms <= np.abs(power).max() * (1 + 1e-9) + 1e-9


def test_the_greatest_window_against_brute_force():
    rng = np.random.default_rng(4)
    power, duration = rng.normal(size=60), rng.integers(1, 5, 60).astype(float)
    fine = np.repeat(power, (duration * 50).astype(int))
    square = np.concatenate([[0.0], np.cumsum(fine**2)]) / 50
    brute = np.sqrt(np.max(square[500:] - square[:-500]) / 10.0)
    assert greatest_rms(power, duration, 10.0) == pytest.approx(brute, rel=1e-12)


def test_one_step_and_idle():
    found = passport(profile([0.0], [3600.0]))
    assert (found.idle_share, found.rms_w, found.longest_run_s, found.steepest_w_per_s) == (1.0, 0.0, 0.0, 0.0)
    assert found.rms_by_window_w[60.0] == 0.0
    assert passport(profile([5.0], [0.5])).rms_by_window_w[1.0] is None
    assert found.to_dict()["rms_by_window_w"]["60"] == 0.0


def test_power_inside_steps_brackets_the_peak(tmp_path):
    path = tmp_path / "p.csv"
    path.write_text("time_s,power_w,power_peak_w,power_valley_w\n0,5,9,-2\n1,-3,1,-8\n2,0,0,0\n")
    found = passport(read_profile(path))
    assert (found.peak_discharge_w, found.inside_discharge_w, found.inside_charge_w) == (5.0, 9.0, 8.0)
    assert any("inside a step" in label for label, _ in found.rows())
    turned = passport(read_profile(path, positive="charge"))
    assert (turned.peak_discharge_w, turned.inside_discharge_w, turned.inside_charge_w) == (3.0, 8.0, 9.0)
    assert coarsened(read_profile(path), 2).power_peak_w.tolist() == [9.0]
    path.write_text("time_s,power_w,power_peak_w\n0,5,4\n1,0,0\n")
    with pytest.raises(ProfileError, match="line 2, power_peak_w: the mean power"):
        read_profile(path)
