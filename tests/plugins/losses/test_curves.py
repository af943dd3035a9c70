"""Tables of points: met exactly, never left between them, read whole or refused; checked against scipy and quadrature."""

from __future__ import annotations

from itertools import pairwise
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from pydantic import ValidationError
from scipy.interpolate import PchipInterpolator

from tideleg import PointReader, Position, Segment, Timing, Waveform
from tideleg_losses.channel import Channel, ChannelSettings
from tideleg_losses.energy_curve import EnergyCurve
from tideleg_losses.family import family
from tideleg_losses.knee import Knee, KneeSettings
from tideleg_losses.moments import moments
from tideleg_losses.output_charge import OutputCharge, OutputChargeSettings
from tideleg_losses.recovery import Recovery, RecoverySettings
from tideleg_losses.switching import Switching, SwitchingSettings

TIMING = Timing(40e3, 0.0)
R_OF_T = PointReader("resistance", "resistance", {"temperature": "temperature", "current": "current"}, above_zero=True)
E_OF_I = PointReader(
    "energy",
    "energy",
    {"current": "current", "voltage": "voltage", "temperature": "temperature"},
    required=("current",),
)


def run(start: Any, end: Any, width: float = 0.4, voltage: Any = 750.0) -> Position:
    start, end = np.asarray(start, dtype=float), np.asarray(end, dtype=float)
    return Position(Waveform((Segment(0.0, width, start, end),)), voltage, voltage, 1.0)


def asked(model: Any, keys: dict[str, Any], part: Position, degc: Any, timing: Timing = TIMING) -> Any:
    (term,) = model.terms(model.settings.model_validate(keys))
    degc = np.asarray(degc, dtype=float)
    return term.at(part, timing, degc), term.outside(part, timing, degc)


KNOTS = st.lists(st.tuples(st.floats(-40, 200), st.floats(0.5, 3.0)), min_size=2, max_size=8, unique_by=lambda p: p[0])


@given(KNOTS)
def test_over_temperature_it_is_the_monotone_cubic_of_scipy(points: list[tuple[float, float]]) -> None:
    points = [p for i, p in enumerate(sorted(points)) if i == 0 or p[0] - sorted(points)[i - 1][0] > 0.1]
    if len(points) < 2:
        return
    curve = family(R_OF_T([[t, r] for t, r in points]), "hold")
    x, y = np.array(points).T
    degc = np.linspace(x[0], x[-1], 301)
    value, slope = curve.at(0.0, 0.0, degc)
    reference = PchipInterpolator(x, y)
    np.testing.assert_allclose(value, reference(degc), rtol=1e-9, atol=1e-9)
    np.testing.assert_allclose(slope, reference(degc, 1), rtol=1e-6, atol=1e-6 * np.max(np.abs(slope) + 1))
    np.testing.assert_allclose(curve.at(0.0, 0.0, x)[0], y, rtol=1e-12)
    for low, high in pairwise(points):
        between = curve.at(0.0, 0.0, np.linspace(low[0], high[0], 31))[0]
        assert np.all(between >= min(low[1], high[1]) - 1e-12)
        assert np.all(between <= max(low[1], high[1]) + 1e-12)


def test_a_resistance_with_its_least_at_room_temperature_is_kept_so() -> None:
    points = [[-40, "14 mohm"], [0, "12.4 mohm"], [25, "12 mohm"], [75, "12.9 mohm"], [150, "17 mohm"]]
    keys = {"on_resistance_curve": points}
    part = run(np.full(301, 10.0), 10.0, 1.0)
    watts = asked(Channel(), keys, part, np.linspace(-40, 150, 301))[0].watts
    assert 1.2 - 1e-12 <= watts.min() < 1.20001
    at = [asked(Channel(), keys, run([10.0], 10.0, 1.0), [t])[0].watts[0] for t in (-40, 0, 25, 75, 150)]
    np.testing.assert_allclose(at, [1.4, 1.24, 1.2, 1.29, 1.7], rtol=1e-12)


@pytest.mark.parametrize(("degc", "due"), [(200.0, "more"), (-60.0, "held")])
def test_beyond_the_points_a_loss_goes_on_where_it_costs_more_and_is_held_where_it_costs_less(
    degc: float, due: str
) -> None:
    points = [[-40, 0.010], [25, 0.012], [150, 0.017]]
    (line, outside) = asked(Channel(), {"on_resistance_curve": points}, run([10.0], 10.0, 1.0), [degc])
    assert outside[0]
    edge = 1.7 if degc > 0 else 1.0
    assert line.watts[0] > edge if due == "more" else line.watts[0] == pytest.approx(edge, rel=1e-12)
    assert (line.watts_per_kelvin[0] > 0.0) == (due == "more")


AMPERES = st.floats(-200.0, 200.0)


@given(AMPERES, AMPERES, st.floats(0.01, 1.0), st.floats(0.0, 150.0), st.floats(0.0, 150.0))
def test_moments_are_those_of_a_fine_sum(start: float, end: float, width: float, one: float, other: float) -> None:
    low, high = sorted((one, other))
    current = start + (end - start) * (np.arange(200_000) + 0.5) / 200_000
    for way, size in (("forward", np.maximum(current, 0.0)), ("reverse", np.maximum(-current, 0.0))):
        piece = getattr(run([start], [end], width).current, way)()
        found = moments(piece, low, high)
        inside = (size >= low) & (size < high)
        for order, value in enumerate(found, start=1):
            due = width * np.mean(np.where(inside, size**order, 0.0))
            assert float(np.squeeze(value)) == pytest.approx(due, rel=1e-4, abs=2e-4 * max(high, 1.0) ** order)


@given(AMPERES, AMPERES, st.floats(0.05, 1.0), st.floats(-30.0, 170.0))
def test_a_resistance_over_current_is_the_integral_of_r_i_squared(
    start: float, end: float, width: float, degc: float
) -> None:
    """The reference sums R(|i|) i² over 100000 moments, with R from numpy on the points of each temperature."""
    amps, temps = np.array([0.0, 30.0, 80.0, 150.0, 220.0]), (-40.0, 175.0)
    ohms = {-40.0: np.array([9, 9.5, 12, 11, 16]) * 1e-3, 175.0: np.array([15, 17, 16, 24, 40]) * 1e-3}
    keys = {
        "on_resistance_curve": [
            {"current": i, "temperature": t, "resistance": r} for t in temps for i, r in zip(amps, ohms[t], strict=True)
        ]
    }
    line, outside = asked(Channel(), keys, run([start], [end], width), [degc])
    i = np.abs(start + (end - start) * (np.arange(100_000) + 0.5) / 100_000)
    share = (degc + 40.0) / 215.0
    r = (1 - share) * np.interp(i, amps, ohms[-40.0]) + share * np.interp(i, amps, ohms[175.0])
    assert line.watts[0] == pytest.approx(width * np.mean(r * i * i), rel=1e-6, abs=1e-9)
    assert not outside[0]


@given(AMPERES, AMPERES, st.floats(0.05, 1.0))
def test_a_forward_voltage_over_current_is_the_integral_of_v_i(start: float, end: float, width: float) -> None:
    amps, volts = np.array([0.0, 5.0, 60.0, 220.0]), np.array([0.6, 0.9, 1.4, 2.6])
    keys = {"forward_voltage_curve": [[i, v] for i, v in zip(amps, volts, strict=True)]}
    line, _ = asked(Knee(), keys, run([start], [end], width), [80.0])
    i = np.maximum(start + (end - start) * (np.arange(100_000) + 0.5) / 100_000, 0.0)
    assert line.watts[0] == pytest.approx(width * np.mean(np.interp(i, amps, volts) * i), rel=1e-5, abs=1e-6)


CURVES = [
    {"current": i, "voltage": v, "temperature": t, "energy": e}
    for v, t, pairs in [
        (400.0, 25.0, [(10, 1e-4), (50, 5e-4), (100, 1.2e-3)]),
        (400.0, 150.0, [(20, 3e-4), (60, 8e-4), (90, 1.3e-3)]),
        (800.0, 25.0, [(10, 3e-4), (100, 3.1e-3)]),
        (800.0, 150.0, [(15, 5e-4), (40, 1.1e-3), (120, 4.2e-3)]),
    ]
    for i, e in pairs
]


def test_every_point_of_every_energy_curve_comes_back_though_the_curves_have_no_current_in_common() -> None:
    for point in CURVES:
        keys = {"turn_on_energy_curve": CURVES}
        part = run([point["current"]], [0.0], voltage=point["voltage"])
        line, _ = asked(Switching(), keys, part, [point["temperature"]])
        assert line.watts[0] == pytest.approx(40e3 * point["energy"], rel=1e-12)


def test_the_order_of_points_says_nothing() -> None:
    keys = {"turn_on_energy_curve": CURVES}
    other = {"turn_on_energy_curve": CURVES[::-1]}
    part = run(np.linspace(-5.0, 150.0, 40), 0.0, voltage=610.0)
    degc = np.linspace(0.0, 170.0, 40)
    np.testing.assert_array_equal(
        asked(Switching(), keys, part, degc)[0].watts, asked(Switching(), other, part, degc)[0].watts
    )


@pytest.mark.parametrize(
    ("current", "voltage", "degc", "beyond"),
    [
        (50.0, 600.0, 80.0, False),
        (20.0, 400.0, 25.0, False),
        (19.0, 400.0, 25.0, True),  # one of the curves begins at 20 A
        (91.0, 600.0, 80.0, True),  # another ends at 90 A
        (50.0, 390.0, 80.0, True),
        (50.0, 810.0, 80.0, True),
        (50.0, 600.0, 24.0, True),
        (50.0, 600.0, 151.0, True),
        (-50.0, 810.0, 200.0, False),  # a soft edge asks nothing
    ],
)
def test_what_is_asked_beyond_the_points_is_told(current: float, voltage: float, degc: float, beyond: bool) -> None:
    _, outside = asked(Switching(), {"turn_on_energy_curve": CURVES}, run([current], [0.0], voltage=voltage), [degc])
    assert bool(outside[0]) is beyond


def test_beyond_its_voltages_a_table_is_scaled_with_the_stated_exponent_and_within_it_is_not() -> None:
    points = [{"current": i, "voltage": v, "energy": 1e-5 * i * v / 400} for i in (10, 100) for v in (400.0, 800.0)]
    keys = {"turn_on_energy_curve": points, "switching_voltage_exponent": 2.0}
    found = [asked(Switching(), keys, run([50.0], [0.0], voltage=v), [25.0])[0].watts[0] for v in (200, 600, 1200)]
    np.testing.assert_allclose(found, 40e3 * 5e-4 * np.array([0.25, 1.5, 2 * 1.5**2]), rtol=1e-12)


def test_a_table_of_one_voltage_and_one_temperature_is_scaled_as_a_test_point_is() -> None:
    keys = {
        "turn_off_energy_curve": [[0, 0], ["50 A", "1 mJ"], ["100 A", "2.4 mJ"]],
        "test_voltage": "800 V",
        "test_temperature": "125 degC",
        "switching_energy_slope": "0.3 %/K",
    }
    line, outside = asked(Switching(), keys, run([0.0], [75.0], voltage=400.0), [25.0])
    assert line.watts[0] == pytest.approx(40e3 * 1.7e-3 * 0.5**1.3 * 0.7, rel=1e-12)
    assert not outside[0]


def test_energy_left_at_zero_current_fades_without_a_jump() -> None:
    keys = {
        "turn_on_energy_curve": [[0, 2e-4], [50, 9e-4]],
        "output_charge": 3e-7,
        "test_voltage": 750.0,
    }
    timing = Timing(40e3, 100e-9)
    current = np.array([1e-9, 0.0, -1e-9, -3.0, -6.0, -60.0])  # 2 x 300 nC in 100 ns are swung by 6 A
    watts = asked(Switching(), keys, run(current, 0.0), np.full(6, 25.0), timing)[0].watts
    np.testing.assert_allclose(watts, 40e3 * 2e-4 * np.array([1, 1, 1, 0.195, 0, 0]), rtol=2e-3, atol=1e-4)
    no_edge = asked(Switching(), keys, run([5.0], [5.0], 1.0), [25.0], timing)[0]
    assert no_edge.watts[0] == 0.0


@given(st.floats(0.0, 60.0))
def test_the_output_charge_of_points_loses_q_v(volts: float) -> None:
    points = [[0, 0], ["10 V", "40 nC"], ["30 V", "70 nC"], ["60 V", "90 nC"]]
    (term,) = OutputCharge().terms(OutputChargeSettings.model_validate({"output_charge_curve": points}))
    part = run([5.0], [9.0], voltage=volts)
    due = 40e3 * volts * np.interp(volts, [0, 10, 30, 60], [0, 40e-9, 70e-9, 90e-9])
    assert float(term.at(part, TIMING, np.array([25.0])).watts[0]) == pytest.approx(due, abs=1e-12)
    assert not np.any(term.outside(part, TIMING, np.array([25.0])))
    assert np.all(term.outside(run([5.0], [9.0], voltage=61.0), TIMING, np.array([25.0])))


def test_energy_and_charge_give_each_other_through_the_exponent() -> None:
    model = OutputCharge()
    hard = run([5.0], [9.0], voltage=800.0)

    def watts(keys: dict[str, Any]) -> float:
        (term,) = model.terms(model.settings.model_validate({"test_voltage": 800.0, **keys}))
        return float(term.at(hard, TIMING, np.array([25.0])).watts[0])

    # An abrupt junction stores Q V/3.
    assert watts({"output_energy": 8e-5}) == pytest.approx(watts({"output_charge": 3e-7}), rel=1e-12)
    assert watts({"output_energy": 6e-5, "output_charge": 3e-7}) == pytest.approx(watts({"output_charge": 3e-7}))


def test_an_energy_at_two_gate_resistances_is_carried_to_the_one_in_use() -> None:
    keys = {
        "turn_on_energy": 1e-3,
        "test_current": 50.0,
        "test_voltage": 750.0,
        "turn_on_energy_by_gate_resistance": [["2 ohm", "1.0 mJ"], ["10 ohm", "2.0 mJ"], ["20 ohm", "3.6 mJ"]],
        "test_gate_resistance": "2 ohm",
        "turn_on_gate_resistance": "6 ohm",
    }
    line, _ = asked(Switching(), keys, run([50.0], [0.0]), [25.0])
    assert line.watts[0] == pytest.approx(40e3 * 1.5e-3, rel=1e-12)


@given(AMPERES, AMPERES, st.floats(0.05, 1.0), st.floats(20.0, 150.0))
def test_channel_and_body_diode_in_reverse_are_two_parallel_branches(
    start: float, end: float, width: float, degc: float
) -> None:
    """The reference solves the two branches at 100000 moments: all in the channel below V0/R, shared above."""
    keys = {
        "on_resistance": 0.01,
        "on_resistance_slope": 0.004,
        "diode_voltage": 0.8,
        "diode_resistance": 0.003,
        "diode_voltage_slope": -0.002,
    }
    line, _ = asked(Channel(), keys, run([start], [end], width), [degc])
    ohms, volts, r = 0.01 * (1 + 0.004 * (degc - 25)), 0.8 - 0.002 * (degc - 25), 0.003
    i = start + (end - start) * (np.arange(100_000) + 0.5) / 100_000
    by_diode = np.maximum((-i * ohms - volts) / (ohms + r), 0.0)
    by_channel = -i - by_diode
    whole = np.where(i > 0.0, ohms * i * i, ohms * by_channel**2 + (volts + r * by_diode) * by_diode)
    assert line.watts[0] == pytest.approx(width * np.mean(whole), rel=1e-5, abs=1e-6)


ONE_POINT = {"turn_on_energy": 1e-3, "test_current": 50.0, "test_voltage": 750.0}
GRID = {"current": 50, "temperature": 25, "energy": 1e-3}
REFUSED: list[tuple[Any, dict[str, Any], str]] = [
    (SwitchingSettings, {"turn_on_energy_curve": [["50 A", "1 mJ"]]}, "found 1 point; a table needs two"),
    (SwitchingSettings, {"turn_on_energy_curve": []}, "found 0 point"),
    (
        SwitchingSettings,
        {"turn_on_energy_curve": [["50 V", "1 mJ"], ["60 A", "2 mJ"]]},
        "point 1: current: found '50 V'",
    ),
    (
        SwitchingSettings,
        {"turn_on_energy_curve": [["50 A", "1 mC"], ["60 A", "2 mJ"]]},
        "point 1: energy: found '1 mC'",
    ),
    (
        SwitchingSettings,
        {"turn_on_energy_curve": [[50, 1e-3], [50, 2e-3]]},
        "point 2 stands at the same place as point 1",
    ),
    (SwitchingSettings, {"turn_on_energy_curve": [[50, 1e-3], [60, -2e-3]]}, "point 2: found the energy -0.002"),
    (SwitchingSettings, {"turn_on_energy_curve": [[-5, 1e-3], [60, 2e-3]]}, "current -5 is negative"),
    (SwitchingSettings, {"turn_on_energy_curve": [[5, float("nan")], [60, 2e-3]]}, "not a finite energy"),
    (SwitchingSettings, {"turn_on_energy_curve": [[5, 1e-3], [60, 2e-3]]}, "test_voltage is missing"),
    (SwitchingSettings, {"turn_on_energy_curve": [GRID, [60, 2e-3]]}, "every point gives current, temperature, energy"),
    (SwitchingSettings, {"turn_on_energy_curve": [GRID, {**GRID, "power": 1}]}, "found the key 'power'"),
    (SwitchingSettings, {"turn_on_energy_curve": "1 mJ"}, "give pairs [current, energy]"),
    (
        SwitchingSettings,
        {"turn_on_energy_curve": [*CURVES, {"current": 5, "voltage": 600, "temperature": 25, "energy": 1e-4}]},
        "no point stands at 600 V and 150 degC",
    ),
    (
        SwitchingSettings,
        {"turn_on_energy_curve": [{**GRID, "temperature": t} for t in (25, 125)], "test_voltage": 600},
        "one point at 25 degC makes no curve",
    ),
    (SwitchingSettings, {"turn_off_energy_curve": [[0, 1e-4], [9, 1e-3]], "test_voltage": 600}, "J at no current"),
    (
        SwitchingSettings,
        {"turn_on_energy_curve": [[0, 1e-4], [9, 1e-3]], "test_voltage": 600},
        "output_charge is missing",
    ),
    (
        RecoverySettings,
        {"recovery_energy_curve": [[0, 1e-4], [9, 1e-3]], "test_voltage": 600},
        "nothing recovers there",
    ),
    (
        ChannelSettings,
        {"on_resistance_curve": [[25, 0.01], [125, 0.0]]},
        "found the resistance 0; it must be above zero",
    ),
    (ChannelSettings, {"on_resistance_curve": [[25, 0.01], [125, 0.02]], "on_resistance": 0.01}, "give one of them"),
    (ChannelSettings, {"on_resistance": 0.01, "on_resistance_factor": [[0, 0.5], [100, 1.1]]}, "0.65 at 25 degC"),
    (
        ChannelSettings,
        {"on_resistance": 0.01, "on_resistance_factor": [[0, 0.9], [25, 1]], "on_resistance_slope": 0.004},
        "both say how temperature acts",
    ),
    (
        SwitchingSettings,
        {"turn_on_energy_curve": CURVES, "switching_energy_slope": 0.002},
        "the points give temperatures, so that a slope of the energy does nothing",
    ),
    (
        SwitchingSettings,
        {**ONE_POINT, "turn_on_gate_resistance": "10 ohm", "test_gate_resistance": "2 ohm"},
        "the energy holds at 2 ohm, and 10 ohm is in use",
    ),
    (SwitchingSettings, {**ONE_POINT, "turn_on_gate_resistance": "10 ohm"}, "go together; give both"),
    (
        RecoverySettings,
        {
            "recovery_energy": 1e-4,
            "test_current": 50.0,
            "test_voltage": 750.0,
            "turn_on_gate_resistance": 10,
            "test_gate_resistance": 2,
        },
        "recovery_energy_by_gate_resistance is missing",
    ),
    (ChannelSettings, {"on_resistance": 0.01, "on_resistance_polynomial": [4e-3, 0, -2e-7]}, "vanishes at"),
    (ChannelSettings, {"on_resistance": 0.01, "on_resistance_polynomial": []}, "at least 1 item"),
    (ChannelSettings, {"on_resistance_polynomial": [4e-3]}, "on_resistance is missing"),
    (
        ChannelSettings,
        {"on_resistance": 0.01, "on_resistance_polynomial": [4e-3], "on_resistance_factor": [[25, 1], [99, 2]]},
        "both say how temperature acts",
    ),
    (KneeSettings, {"knee_resistance": 0.01}, "knee_voltage is missing"),
    (KneeSettings, {"knee_voltage": 0.9, "knee_voltage_slope": -0.01}, "at 250 degC"),
    (OutputChargeSettings, {"output_charge_curve": [[10, 2e-7], [20, 1e-7]]}, "falls with voltage"),
    (OutputChargeSettings, {"output_charge": 1e-7, "output_energy": 5e-5, "test_voltage": 800}, "between 0 and 1/2"),
    (
        SwitchingSettings,
        {
            "turn_on_energy": 1e-3,
            "test_current": 50.0,
            "test_voltage": 750.0,
            "turn_on_energy_by_gate_resistance": [[2, 1e-3], [10, 2e-3]],
            "test_gate_resistance": 2,
            "turn_on_gate_resistance": 12,
        },
        "12 ohm, lies beyond its points from 2 to 10 ohm",
    ),
    (
        SwitchingSettings,
        {
            "turn_on_energy": 1e-3,
            "test_current": 50.0,
            "test_voltage": 750.0,
            "turn_on_energy_by_gate_resistance": [[2, 1e-3]],
            "test_gate_resistance": 2,
            "turn_on_gate_resistance": 2,
        },
        "found 1 point",
    ),
]


@pytest.mark.parametrize(("settings", "keys", "words"), REFUSED, ids=[w for _, _, w in REFUSED])
def test_points_that_cannot_be_trusted_are_refused_with_words(settings: Any, keys: dict[str, Any], words: str) -> None:
    with pytest.raises(ValidationError) as caught:
        settings.model_validate(keys)
    assert words in str(caught.value)


def test_an_energy_that_falls_with_current_is_taken_as_stated() -> None:
    keys = {"turn_on_energy_curve": [[10, 5e-4], [20, 3e-4], [60, 9e-4]], "test_voltage": 750.0}
    found = asked(Switching(), keys, run([10.0, 15.0, 20.0, 40.0], 0.0), np.full(4, 25.0))[0].watts
    np.testing.assert_allclose(found, 40e3 * np.array([5e-4, 4e-4, 3e-4, 6e-4]), rtol=1e-12)
    (term,) = Switching().terms(SwitchingSettings.model_validate(keys))
    assert isinstance(term.law, EnergyCurve)


def test_recovery_of_points_comes_at_the_end_with_negative_current() -> None:
    keys = {"recovery_energy_curve": [[0, 0], [60, 3e-4]], "test_voltage": 750.0}
    assert asked(Recovery(), keys, run([9.0], [-30.0]), [25.0])[0].watts[0] == pytest.approx(40e3 * 1.5e-4)
    assert asked(Recovery(), keys, run([-9.0], [30.0]), [25.0])[0].watts[0] == 0.0


@given(AMPERES, AMPERES, st.floats(0.2, 1.0), st.booleans())
def test_the_dead_times_come_off_the_channel_as_the_channel_would_have_counted_them(
    start: float, end: float, width: float, body: bool
) -> None:
    """Reference: the loss without dead time, less what the same run loses when it carries the edge currents alone."""
    keys: dict[str, Any] = {"on_resistance": 0.01, "reverse_on_resistance": 0.008}
    keys |= {"diode_voltage": 0.6, "diode_resistance": 0.004} if body else {"on_resistance_current_slope": 2e-3}
    keys |= {} if body else {"diode_voltage": 9.0}
    timing = Timing(40e3, 500e-9)  # 2 % of the period at each edge
    line, _ = asked(Channel(), keys, run([start], [end], width), [25.0], timing)
    whole, _ = asked(Channel(), keys, run([start], [end], width), [25.0])
    off = 0.0
    if width < 1.0:
        for edge in (start, end):
            if edge < 0.0:
                off += asked(Channel(), keys, run([edge], [edge], 1.0), [25.0])[0].watts[0] * 0.02
    due = whole.watts[0] - off
    if start * end > 0.0:  # a ramp through zero may spend less time in reverse than the dead time: none is left then
        assert line.watts[0] == pytest.approx(due, rel=1e-9, abs=1e-9)


@given(AMPERES, AMPERES, st.floats(0.05, 1.0), st.floats(-30.0, 170.0))
def test_a_resistance_that_grows_with_current_and_differs_in_reverse(
    start: float, end: float, width: float, degc: float
) -> None:
    keys = {
        "on_resistance": 0.01,
        "on_resistance_slope": 0.004,
        "on_resistance_current_slope": 2e-3,
        "reverse_on_resistance": 0.008,
    }
    line, _ = asked(Channel(), keys, run([start], [end], width), [degc])
    i = start + (end - start) * (np.arange(100_000) + 0.5) / 100_000
    ohms = np.where(i > 0.0, 0.01, 0.008) * (1 + 0.004 * (degc - 25.0)) * (1 + 2e-3 * np.abs(i))
    assert line.watts[0] == pytest.approx(width * np.mean(ohms * i * i), rel=1e-5, abs=1e-9)


BY_GATE = [
    {"current": i, "gate_resistance": r, "temperature": t, "energy": (1 + 0.1 * r) * 1e-5 * i * (1 + 1e-3 * t)}
    for r, amps in ((2.0, (0.0, 50.0, 100.0)), (10.0, (0.0, 30.0, 90.0)), (20.0, (0.0, 80.0)))
    for t in (25.0, 150.0)
    for i in amps
]


@pytest.mark.parametrize("ohms", [2.0, 5.0, 10.0, 16.0, 20.0])
def test_an_energy_over_gate_resistance_is_read_at_the_one_in_use(ohms: float) -> None:
    keys = {"turn_on_energy_curve": BY_GATE, "test_voltage": 750.0, "turn_on_gate_resistance": ohms}
    line, outside = asked(Switching(), keys, run([60.0, 95.0], 0.0), [25.0, 150.0])
    due = 40e3 * (1 + 0.1 * ohms) * 1e-5 * np.array([60 * 1.025, 95 * 1.15])
    np.testing.assert_allclose(line.watts, due, rtol=1e-9)
    assert list(outside) == [False, ohms != 2.0]  # only the curves at 2 ohm go beyond 90 A


@pytest.mark.parametrize(
    ("keys", "words"),
    [
        ({}, "the one in use is missing"),
        ({"turn_on_gate_resistance": 1.9}, "1.9 ohm, lies beyond the points from 2 to 20 ohm"),
        (
            {"turn_on_gate_resistance": 5, "turn_on_energy_by_gate_resistance": [[2, 1e-3], [9, 2e-3]]},
            "drop one of the two",
        ),
    ],
)
def test_a_gate_resistance_beyond_its_points_is_refused(keys: dict[str, Any], words: str) -> None:
    with pytest.raises(ValidationError) as caught:
        SwitchingSettings.model_validate({"turn_on_energy_curve": BY_GATE, "test_voltage": 750.0, **keys})
    assert words in str(caught.value)


@given(
    st.lists(st.lists(st.floats(1e-4, 1e-2), min_size=4, max_size=4), min_size=3, max_size=3),
    st.floats(-40.0, 175.0),
    st.floats(10.0, 160.0),
)
def test_between_its_points_a_table_never_leaves_the_span_of_its_four_neighbours(
    energies: list[list[float]], degc: float, current: float
) -> None:
    temps, amps = (-40.0, 30.0, 175.0), (10.0, 40.0, 90.0, 160.0)
    points = [
        {"current": i, "temperature": t, "energy": e}
        for t, row in zip(temps, energies, strict=True)
        for i, e in zip(amps, row, strict=True)
    ]
    keys = {"turn_on_energy_curve": points, "test_voltage": 750.0}
    line, outside = asked(Switching(), keys, run([current], [0.0]), [degc])
    t = min(np.searchsorted(temps, degc, side="right") - 1, 1)
    k = min(np.searchsorted(amps, current, side="right") - 1, 2)
    corners = [energies[a][b] for a in (t, t + 1) for b in (k, k + 1)]
    assert min(corners) - 1e-12 <= line.watts[0] / 40e3 <= max(corners) + 1e-12
    assert not outside[0]


@given(st.floats(-60.0, 250.0))
def test_a_fit_of_third_order_is_the_polynomial_of_numpy(degc: float) -> None:
    keys = {"on_resistance": 0.01, "on_resistance_polynomial": [-2e-4, 3.2e-5, -4e-8]}
    line, outside = asked(Channel(), keys, run([10.0], [10.0], 1.0), [degc])
    fit = np.poly1d([-4e-8, 3.2e-5, -2e-4, 1.0])
    assert line.watts[0] == pytest.approx(float(fit(degc - 25.0)), rel=1e-12)
    assert line.watts_per_kelvin[0] == pytest.approx(float(fit.deriv()(degc - 25.0)), rel=1e-9, abs=1e-12)
    assert not outside[0]
    assert asked(Channel(), keys, run([10.0], [10.0], 1.0), [251.0])[1][0]


def test_points_at_no_voltage_are_read_as_such_and_an_edge_from_there_costs_nothing() -> None:
    points = [{"current": i, "voltage": v, "energy": 2e-8 * i * v} for i in (10, 100) for v in (0.0, 400.0, 800.0)]
    volts = np.array([-20.0, 0.0, 1.0, 600.0])
    line, _ = asked(
        Switching(), {"turn_on_energy_curve": points}, run(np.full(4, 50.0), 0.0, voltage=volts), np.full(4, 25.0)
    )
    np.testing.assert_allclose(line.watts, 40e3 * 1e-6 * np.array([0, 0, 1.0, 600.0]), rtol=1e-12)
