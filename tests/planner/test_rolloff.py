"""Inductance that falls with current: against an ODE of the nonlinear circuit (scipy), and the definition of linkage."""

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad, solve_ivp
from scipy.optimize import brentq

from tideleg import InputError, plan_from_mapping, run
from tideleg.rolloff import LinkageCurve, effective_inductance

RATED, HENRY, F = 100.0, 120e-6, 40e3
AMPERE = np.linspace(0.0, 260.0, 53)
POWDER = HENRY / (1.0 + 0.6 * (AMPERE / RATED) ** 1.6)  # a powder core: 62 % left at rated current
SHARP = HENRY * (0.12 + 0.88 / (1.0 + (AMPERE / 150.0) ** 8))  # a gapped ferrite near saturation
CURVES = {"powder": POWDER, "ferrite": SHARP}


def curve_of(name):
    return LinkageCurve.of(tuple(zip(AMPERE, CURVES[name], strict=True)))


@given(st.floats(-259.0, 259.0), st.sampled_from(sorted(CURVES)))
def test_the_linkage_is_the_integral_of_the_inductance_and_odd(current, name):
    curve = curve_of(name)
    inside = [a for a in AMPERE[1:-1] if a < abs(current)]
    whole, moment = 0.0, 0.0
    for start, end in pairwise([0.0, *inside, abs(current)]):
        whole += quad(lambda i: float(curve.slope(i)), start, end)[0]
        moment += quad(lambda i: i * float(curve.slope(i)), start, end)[0]
    whole = np.copysign(whole, current)
    assert float(curve.moment_at(current)) == pytest.approx(moment, rel=1e-9, abs=1e-15)
    assert float(curve.at(current)) == pytest.approx(whole, rel=1e-9, abs=1e-15)
    assert float(curve.at(-current)) == -float(curve.at(current))


@given(st.floats(-250.0, 250.0), st.floats(0.0, 200.0), st.sampled_from(sorted(CURVES)))
def test_the_same_volt_seconds_give_the_true_swing(middle, swing, name):
    curve = curve_of(name)
    stated = effective_inductance(curve, np.array(middle - swing / 2), np.array(middle + swing / 2), HENRY)
    ripple = HENRY * swing / float(stated)
    linkage = float(curve.at(middle + ripple / 2) - curve.at(middle - ripple / 2))
    assert linkage == pytest.approx(HENRY * swing, rel=1e-9, abs=1e-15)


def test_without_swing_it_is_the_small_signal_inductance():
    curve = curve_of("powder")
    assert float(effective_inductance(curve, np.array(100.0), np.array(100.0), HENRY)) == pytest.approx(HENRY / 1.6)


def switched(curve, battery, link, mean):
    """Return (valley, peak) of the nonlinear leg in steady state with a mean current, by ODE and root finding."""
    duty, period = battery / link, 1.0 / F
    rise = (1 - duty) * period

    def one(start):
        grid = np.linspace(0.0, rise, 400)
        up = solve_ivp(lambda t, i: battery / curve.slope(i), (0, rise), [start], t_eval=grid, rtol=1e-9, atol=1e-9)
        rest = np.linspace(0.0, period - rise, 400)
        down = solve_ivp(
            lambda t, i: (battery - link) / curve.slope(i),
            (0, period - rise),
            [up.y[0, -1]],
            t_eval=rest,
            rtol=1e-9,
            atol=1e-9,
        )
        area = np.trapezoid(up.y[0], grid) + np.trapezoid(down.y[0], rest)
        return area / period, start, up.y[0, -1]

    valley = brentq(lambda s: one(s)[0] - mean, mean - 90.0, mean, xtol=1e-6)
    return one(valley)[1:]


@pytest.mark.parametrize("name", sorted(CURVES))
@pytest.mark.parametrize("share", [0.3, 0.7, 1.0, 1.3])
@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_the_peak_is_that_of_the_nonlinear_circuit(name, share, sign, tmp_path):
    battery, link, mean = 300.0, 800.0, sign * share * RATED
    points = [[float(a), float(h)] for a, h in zip(AMPERE, CURVES[name], strict=True)]
    (tmp_path / "p.csv").write_text(f"time_s,power_w\n0,{battery * mean}\n1,0\n")
    outcome = run(
        plan_from_mapping(
            {
                "title": "rolloff",
                "battery": {"open_circuit_voltage": battery},
                "link": {"voltage": link},
                "stage": {
                    "topology": "half-bridge",
                    "switching_frequency": F,
                    "inductor": {"inductance_curve": points},
                },
                "mission": [{"profile": "p.csv"}],
            },
            folder=tmp_path,
        )
    )
    valley, peak = switched(curve_of(name), battery, link, abs(mean))
    row = outcome.steps.iloc[0]
    found = (row["inductor.current_valley_a"], row["inductor.current_peak_a"])
    found = found if sign > 0 else (-found[1], -found[0])
    assert found[1] == pytest.approx(peak, rel=0.003)
    assert found[1] - found[0] == pytest.approx(peak - valley, rel=0.02)
    checks = {check.name: check for check in outcome.limits}
    assert checks["inductance curve, last current"].holds
    assert not any("fall of the inductance" in line for line in outcome.not_modelled)


def test_a_constant_curve_is_a_constant_inductance(tmp_path):
    (tmp_path / "p.csv").write_text("time_s,power_w\n0,30000\n1,-3000\n2,0\n")
    stage = {"topology": "interleaved", "legs": 3, "switching_frequency": F, "modulation": "diode"}
    frames = []
    for inductor in ({"inductance": "120 uH"}, {"inductance_curve": [[0, "120 uH"], ["300 A", "120 uH"]]}):
        plan = plan_from_mapping(
            {
                "title": "level",
                "battery": {"open_circuit_voltage": 300.0},
                "link": {"voltage": 800.0},
                "stage": {**stage, "inductor": inductor},
                "mission": [{"profile": "p.csv"}],
            },
            folder=tmp_path,
        )
        frames.append(run(plan).steps.select_dtypes("number"))
    assert frames[0].to_numpy() == pytest.approx(frames[1].to_numpy(), rel=1e-9, abs=1e-9)


@pytest.mark.parametrize(
    ("keys", "said"),
    [
        ({"inductance_curve": [[0, "120 uH"]]}, "at least two points"),
        ({"inductance_curve": [["10 A", "120 uH"], ["20 A", "100 uH"]]}, "first at zero current"),
        (
            {"inductance_curve": [[0, "120 uH"], ["20 A", "100 uH"], ["20 A", "90 uH"]]},
            "point 3: current 20 A does not rise",
        ),
        ({"inductance": "100 uH", "inductance_curve": [[0, "120 uH"], ["20 A", "100 uH"]]}, "differ"),
        ({"inductance_curve": [[0, "120 uH"], ["20 A", "0 uH"]]}, "greater than 0"),
        ({"inductance_curve": [[0, "120 mohm"], ["20 A", "0.1 uH"]]}, "inductance"),
    ],
)
def test_curves_that_cannot_be_are_refused(keys, said, tmp_path):
    (tmp_path / "p.csv").write_text("time_s,power_w\n0,3000\n1,0\n")
    with pytest.raises(InputError, match=said):
        run(
            plan_from_mapping(
                {
                    "title": "bad",
                    "battery": {"open_circuit_voltage": 300.0},
                    "link": {"voltage": 800.0},
                    "stage": {"topology": "half-bridge", "switching_frequency": F, "inductor": keys},
                    "mission": [{"profile": "p.csv"}],
                },
                folder=tmp_path,
            )
        )
