"""The battery's limits: what is curtailed, why, and that the books of charge and energy close."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tideleg.battery import Battery, Cause, answer, at_rest, path_of, resting_path


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
