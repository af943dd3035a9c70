"""Constant-power battery equations against closed forms and a published value.

BT rows: circuit law, recomputed by two independent codes; BT-02 as in Mechanical Engineers' Handbook vol. 2, static
systems (P = V_oc I_sc/4). Tolerances cover the printed digits.
"""

import numpy as np
import pytest

from tideleg.battery import Battery, Cause, answer, at_rest, current_at_power, path_of, resting_path

E, R = 400.0, 0.1


def battery(**changes):
    grid = np.array([0.0, 1.0])
    given = {
        "soc": grid,
        "open_circuit_voltage": np.full(2, E),
        "discharge_resistance": np.full(2, R),
        "charge_resistance": np.full(2, R),
        "capacity": np.inf,
        "start_soc": 0.5,
    }
    return Battery(**{**given, **changes})


def ask(pack, power, seconds=1.0):
    before = at_rest(pack)
    return answer(pack, np.array([[power]]), np.array([seconds]), before, resting_path(before, 1))


@pytest.mark.parametrize(
    ("row", "power_w", "current_a", "voltage_v"),
    [
        ("BT-03", 50e3, 129.17131, 387.08287),
        ("BT-04", -50e3, -121.32034, 412.13203),
    ],
)
def test_low_current_root(row, power_w, current_a, voltage_v):
    given = ask(battery(), power_w)
    assert given.current[0, 0] == pytest.approx(current_a, rel=1e-7), row
    assert given.voltage[0, 0] == pytest.approx(voltage_v, rel=1e-7), row


def test_bt_01_agrees_with_the_textbook_form_of_the_root():
    power = np.linspace(-200e3, 390e3, 101)
    textbook = (E - np.sqrt(E * E - 4 * R * power)) / (2 * R)
    np.testing.assert_allclose(current_at_power(power, E, R), textbook, rtol=1e-9, atol=1e-9)


def test_bt_02_and_bt_05_greatest_power_and_power_at_a_voltage_floor():
    given = ask(battery(), 400e3)
    assert given.power[0, 0] == pytest.approx(400e3, rel=1e-12)
    assert given.voltage[0, 0] == pytest.approx(200.0, rel=1e-12)
    floor = ask(battery(lowest_voltage=300.0), 400e3)
    assert floor.power[0, 0] == pytest.approx(300e3, rel=1e-12)
    assert floor.cause[0, 0] == Cause.VOLTAGE_LOW


def test_bt_06_one_way_and_round_trip_efficiency_at_equal_terminal_power():
    out, into = ask(battery(), 50e3), ask(battery(), -50e3)
    one_way_out, one_way_in = out.voltage[0, 0] / E, E / into.voltage[0, 0]
    assert one_way_out == pytest.approx(0.967707, rel=1e-6)
    assert one_way_in == pytest.approx(0.970563, rel=1e-6)
    assert one_way_out * one_way_in == pytest.approx(0.939221, rel=1e-6)


def test_bt_07_beyond_the_greatest_power_is_limited_and_said_never_nan():
    given = ask(battery(), 400.001e3)
    assert np.isfinite(given.current).all()
    assert given.power[0, 0] == pytest.approx(400e3, rel=1e-12)
    assert given.cause[0, 0] == Cause.GREATEST_POWER


def test_trap_the_low_current_root_is_taken_not_the_high_one():
    assert ask(battery(), 300e3).voltage[0, 0] > E / 2


def test_trap_the_state_of_charge_counts_current_not_terminal_power():
    pack = battery(capacity=3600.0)
    given = ask(pack, 50e3, seconds=2.0)
    assert given.soc_start[0, 0] - given.soc_end[0, 0] == pytest.approx(129.17131 * 2.0 / 3600.0, rel=1e-7)


def test_trap_charging_raises_the_terminal_voltage():
    assert ask(battery(), -50e3).voltage[0, 0] > E


def test_bt_08_rc_pulse_at_100_a_from_rest():
    # E 400 V, R0 0.1 ohm, R1 0.05 ohm, tau 20 s; V = E - I R0 - I R1 (1 - exp(-t/tau)). The battery is asked for power,
    # so 100 A is had by a current limit far below what the power would draw; end-of-step values follow from the pair.
    pack = battery(pairs=((0.05, 20.0),), discharge_current_limit=100.0)
    before = at_rest(pack)
    seconds = np.array([10.0, 10.0, 40.0])
    path = resting_path(before, 3)
    for _ in range(5):
        given = answer(pack, np.full((1, 3), 60e3), seconds, before, path)
        path = path_of(given, path)
    assert given.current[0] == pytest.approx([100.0] * 3)
    ends = E - 100.0 * R - given.pair_end[0, 0]
    assert E - 100.0 * R - given.pair_start[0, 0, 0] == pytest.approx(390.0, rel=1e-7)
    assert ends == pytest.approx([388.03265, 386.83940, 385.24894], rel=1e-7)


def test_mean_voltage_of_a_step_with_an_rc_pair_is_the_mean_of_the_exponential():
    pack = battery(pairs=((0.05, 20.0),), discharge_current_limit=100.0)
    given = ask(pack, 60e3, seconds=30.0)
    t = np.linspace(0.0, 30.0, 200001)
    trace = E - 100.0 * R - 100.0 * 0.05 * (1.0 - np.exp(-t / 20.0))
    assert given.voltage[0, 0] == pytest.approx(np.trapezoid(trace, t) / 30.0, rel=1e-9)
