"""The battery's limits: what is curtailed, why, and that the books of charge and energy close."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tideleg.battery import Battery, Cause, answer, at_rest, nodes_of, path_of, resting_path


def pack(**changes):
    soc = np.linspace(0.0, 1.0, 11)
    usual = {
        "soc": soc,
        "open_circuit_voltage": 320.0 + 100.0 * soc,
        "discharge_resistance": np.full(11, 0.08),
        "charge_resistance": np.full(11, 0.10),
        "capacity": 3600.0 * 5.0,
        "start_soc": 0.5,
        "lowest_soc": 0.2,
        "highest_soc": 0.9,
    }
    return Battery(**{**usual, **changes})


def settled(battery, power, seconds):
    """Relax the state of charge against the open-circuit voltage, as the march does."""
    before = at_rest(battery)
    path = resting_path(before, len(power))
    for _ in range(40):
        found = answer(battery, np.atleast_2d(power), seconds, before, path)
        path = path_of(found, path)
    return found


@settings(max_examples=60, deadline=None)
@given(
    st.lists(st.floats(-150e3, 150e3), min_size=1, max_size=60),
    st.lists(st.floats(0.1, 600.0), min_size=60, max_size=60),
)
def test_charge_and_energy_close_and_no_limit_is_passed(power, seconds):
    limits = {"discharge_current_limit": 250.0, "charge_current_limit": 180.0}
    battery = pack(**limits, lowest_voltage=310.0, highest_voltage=425.0)
    seconds = np.array(seconds[: len(power)])
    found = settled(battery, np.array(power), seconds)
    moved = found.soc_start - found.soc_end
    np.testing.assert_allclose(moved, found.current * seconds / battery.capacity, atol=1e-12)
    assert np.all(found.soc_end >= 0.2 - 1e-12)
    assert np.all(found.soc_end <= 0.9 + 1e-12)
    assert np.all(found.current <= 250.0 + 1e-9)
    assert np.all(found.current >= -180.0 - 1e-9)
    chemical = found.source_voltage * found.current
    heat = found.resistance * found.current**2
    np.testing.assert_allclose(chemical, found.power + heat, rtol=1e-12, atol=1e-6)
    unserved = np.abs(found.power - power) > 1e-6
    assert np.all(found.cause[unserved] != Cause.NONE)


@pytest.mark.parametrize(
    ("changes", "power", "cause"),
    [
        ({"discharge_current_limit": 100.0}, 90e3, Cause.DISCHARGE_CURRENT),
        ({"charge_current_limit": 100.0}, -90e3, Cause.CHARGE_CURRENT),
        ({"lowest_voltage": 365.0}, 90e3, Cause.VOLTAGE_LOW),
        ({"highest_voltage": 375.0}, -90e3, Cause.VOLTAGE_HIGH),
        ({"start_soc": 0.2}, 10e3, Cause.SOC_LOW),
        ({"start_soc": 0.9}, -10e3, Cause.SOC_HIGH),
        ({}, 5e6, Cause.GREATEST_POWER),
    ],
)
def test_each_limit_names_itself(changes, power, cause):
    # The pack is made huge where the state of charge is not the point, so that it cannot bind.
    capacity = {} if "start_soc" in changes else {"capacity": 3.6e9}
    found = settled(pack(**capacity, **changes), np.array([power]), np.array([1.0]))
    assert found.cause[0, 0] == cause


def test_an_empty_battery_gives_nothing_and_takes_charge():
    found = settled(pack(start_soc=0.2), np.array([50e3, -50e3]), np.array([10.0, 10.0]))
    assert found.current[0, 0] == 0.0
    assert found.current[0, 1] < 0.0
    assert found.cause[0].tolist() == [Cause.SOC_LOW, Cause.NONE]


def test_a_step_that_meets_the_window_ends_exactly_on_it():
    found = settled(pack(), np.array([100e3]), np.array([3600.0]))
    assert found.soc_end[0, 0] == 0.2
    assert found.current[0, 0] == pytest.approx(0.3 * 3600 * 5 / 3600, rel=1e-12)


def test_one_step_alone_equals_the_same_among_many():
    power = np.array([30e3, -20e3, 80e3, 0.0])
    seconds = np.array([1.0, 5.0, 2.0, 9.0])
    many = settled(pack(), power, seconds)
    alone = settled(pack(start_soc=float(many.soc_start[0, 2])), power[2:3], seconds[2:3])
    assert alone.current[0, 0] == pytest.approx(many.current[0, 2], rel=1e-12)


def test_zero_resistance_and_no_capacity_is_an_ideal_source():
    ideal = pack(discharge_resistance=np.zeros(11), charge_resistance=np.zeros(11), capacity=np.inf)
    found = settled(ideal, np.array([37e3, -37e3]), np.array([1.0, 1.0]))
    np.testing.assert_array_equal(found.voltage, [[370.0, 370.0]])
    np.testing.assert_array_equal(found.soc_end, [[0.5, 0.5]])


def exact_discharge_time(power, volts, slope, ohms, capacity, start, end):
    """Return how long a held power takes from one state of charge to another [s].

    E = volts + slope s, constant R. With dt = -Q ds/I and 1/I = (E + sqrt(E² - 4 R P))/(2 P) the time is a standard
    integral in E: I. N. Bronshtein and K. A. Semendyayev, Handbook of Mathematics, integrals of sqrt(x² - a²) (from
    memory); checked below against quadrature.
    """
    square = 4.0 * ohms * power

    def primitive(e):
        root = np.sqrt(e * e - square)
        return 0.5 * e * e + 0.5 * (e * root - square * np.log(e + root))

    before, after = volts + slope * start, volts + slope * end
    return capacity / (2.0 * slope * power) * (primitive(before) - primitive(after))


def test_the_exact_time_is_its_quadrature():
    s = np.linspace(0.3, 0.8, 2_000_001)
    e = 320.0 + 100.0 * s
    inverse = (e + np.sqrt(e * e - 4 * 0.08 * 30e3)) / (2 * 30e3)
    by_sum = 18000.0 * np.sum(0.5 * (inverse[1:] + inverse[:-1])) * (s[1] - s[0])
    assert exact_discharge_time(30e3, 320.0, 100.0, 0.08, 18000.0, 0.8, 0.3) == pytest.approx(by_sum, rel=1e-10)


@pytest.mark.parametrize("power", [2e3, 30e3, 60e3, -2e3, -25e3, -50e3])
@pytest.mark.parametrize("end", [0.499, 0.45, 0.25, 0.21])
def test_charge_is_exact_at_held_power_however_long_the_step(power, end):
    end = end if power > 0 else 1.0 - end
    ohms = 0.08 if power > 0 else 0.10
    seconds = exact_discharge_time(power, 320.0, 100.0, ohms, 18000.0, 0.5, end)
    found = held(pack(highest_soc=1.0, lowest_soc=0.0), power, seconds)
    assert found.soc_end[0, 0] == pytest.approx(end, abs=1e-9)
    assert found.power[0, 0] == pytest.approx(power, rel=1e-12)
    assert found.current[0, 0] * seconds == pytest.approx((0.5 - end) * 18000.0, rel=1e-8)
    heat = (found.source_voltage - found.voltage) * found.current
    assert heat[0, 0] == pytest.approx(found.resistance[0, 0] * found.current[0, 0] ** 2, rel=1e-9)


def held(battery, power, *seconds):
    """Relax held power over steps of these lengths, with the instants inside them that they need."""
    seconds, power = np.array(seconds), np.full((1, len(seconds)), power)
    before = at_rest(battery)
    path = resting_path(before, len(seconds), nodes_of(battery, power, seconds))
    for _ in range(80):
        found = answer(battery, power, seconds, before, path)
        path = path_of(found, path)
    return found


def test_one_long_step_is_many_short_ones():
    curved = pack(
        open_circuit_voltage=330.0 + 60.0 * np.sqrt(np.linspace(0.01, 1.0, 11)), lowest_soc=0.0, start_soc=0.9
    )
    long, short = held(curved, 12e3, 1200.0), held(curved, 12e3, *([0.25] * 4800))
    # The curve bends at its grid points, which a piece may straddle: 1e-6, not rounding.
    assert long.soc_end[0, -1] == pytest.approx(short.soc_end[0, -1], abs=2e-6)
    assert long.current[0, 0] == pytest.approx(short.current.mean(), rel=1e-5)


def test_a_long_step_that_empties_the_battery_stops_on_the_window():
    found = held(pack(), 100e3, 3600.0)
    assert found.soc_end[0, 0] == 0.2
    assert found.cause[0, 0] == Cause.SOC_LOW
    assert np.all(found.soc_nodes >= 0.2)
    assert found.power[0, 0] < 100e3


WARM = {
    "degc": (-10.0, 25.0),
    "open_circuit_voltage": np.stack([300.0 + 100.0 * np.linspace(0, 1, 11), 320.0 + 100.0 * np.linspace(0, 1, 11)]),
    "discharge_resistance": np.stack([np.full(11, 0.3), np.full(11, 0.08)]),
    "charge_resistance": np.stack([np.full(11, 0.4), np.full(11, 0.10)]),
}


@pytest.mark.parametrize(("degc", "volts", "ohms"), [(-10.0, 350.0, 0.3), (25.0, 370.0, 0.08), (7.5, 360.0, 0.19)])
def test_curves_are_straight_between_temperatures(degc, volts, ohms):
    voltage, resistance = pack(**WARM).source(np.array([[0.5]]), np.array([[True]]), np.array([degc]))
    assert (voltage[0, 0], resistance[0, 0]) == (pytest.approx(volts), pytest.approx(ohms))


def test_a_cold_battery_takes_no_charge_and_says_why():
    battery = pack(charge_degc=(0.0, 50.0), discharge_degc=(-20.0, 60.0))
    before = at_rest(battery)
    wanted, seconds = np.array([[-20e3, -20e3, 20e3, 20e3]]), np.ones(4)
    found = answer(battery, wanted, seconds, before, resting_path(before, 4), np.array([-5.0, 5.0, -5.0, -25.0]))
    assert found.cause[0].tolist() == [Cause.TEMPERATURE, Cause.NONE, Cause.NONE, Cause.TEMPERATURE]
    assert found.current[0, 0] == 0.0
    assert found.available[0, 0] == 0.0


def test_available_power_is_what_the_limits_leave():
    battery = pack(capacity=3.6e9, discharge_current_limit=100.0, highest_voltage=380.0)
    found = settled(battery, np.array([1e3, 90e3, -1e3, -90e3]), np.ones(4))
    # 370 V at rest: 100 A through 0.08 ohm leaves 362 V; charging stops at 380 V, 100 A through 0.10 ohm.
    assert found.available[0] == pytest.approx([36.2e3, 36.2e3, 38e3, 38e3], rel=1e-6)
    assert np.abs(found.power[0, [1, 3]]) == pytest.approx(found.available[0, [1, 3]])
    free = settled(pack(capacity=3.6e9), np.array([1e3]), np.ones(1))
    assert free.available[0, 0] == pytest.approx(370.0**2 / (4 * 0.08), rel=1e-6)
