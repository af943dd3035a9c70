"""Quantities: every unit, every prefix, and words for what is none."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tideleg.quantity import DIMENSIONS, parse


@pytest.mark.parametrize(
    ("text", "dimension", "value"),
    [
        ("120 uH", "inductance", 120e-6),
        ("120µH", "inductance", 120e-6),  # micro sign
        ("120 μH", "inductance", 120e-6),  # Greek mu
        ("8 mohm", "resistance", 8e-3),
        ("8 mΩ", "resistance", 8e-3),  # Greek omega
        ("8 m\u2126", "resistance", 8e-3),  # ohm sign
        ("2 Mohm", "resistance", 2e6),
        ("40 kHz", "frequency", 40e3),
        ("65 degC", "temperature", 65.0),
        ("-20 °C", "temperature", -20.0),
        ("250 ns", "time", 250e-9),
        ("2 min", "time", 120.0),
        ("180 Ah", "charge", 648000.0),
        ("60 kWh", "energy", 216e6),
        ("5 K/kW", "thermal resistance", 5e-3),
        ("10 l/min", "flow", 10e-3 / 60),
        ("18 t", "mass", 18000.0),
        ("1500 kg", "mass", 1500.0),
        ("6.4 cm2", "area", 6.4e-4),
        ("30 %", "share", 0.3),
        ("50 km/h", "speed", 50 / 3.6),
        ("0.4 %/K", "relative slope", 4e-3),
        ("1e-3 V", "voltage", 1e-3),
        (".5V", "voltage", 0.5),
        (750, "voltage", 750.0),
        (1e-6, "capacitance", 1e-6),
        ("7", "current", 7.0),
    ],
)
def test_units_and_prefixes(text, dimension, value):
    assert parse(text, dimension) == pytest.approx(value, rel=1e-14)


@given(st.floats(0.001, 999.0))
def test_a_prefix_is_an_exact_power_of_ten(number):
    assert parse(f"{number!r} uF", "capacitance") == number / 1e6
    assert parse(f"{number!r} kHz", "frequency") == number * 1e3


@pytest.mark.parametrize("dimension", sorted(DIMENSIONS))
def test_every_dimensions_own_example_and_base_unit_are_read(dimension):
    parse(DIMENSIONS[dimension].example, dimension)
    assert parse(f"3 {DIMENSIONS[dimension].base}", dimension) == pytest.approx(3.0)


@pytest.mark.parametrize(
    ("given_", "said"),
    [
        ("120 uF", "where the unit is a unit of capacitance"),
        ("120 furlong", "where the unit is not known"),
        ("12,5 uH", "unit is not known"),
        ("uH", "starts with no number"),
        ("", "starts with no number"),
        ("nan", "starts with no number"),
        (float("nan"), "not a finite"),
        (float("inf"), "not a finite"),
        ("1e999 H", "not a finite"),
        (True, "found True"),
        (None, "found None"),
        ([1], r"found \[1\]"),
    ],
)
def test_what_is_no_inductance_is_said(given_, said):
    with pytest.raises(ValueError, match=said):
        parse(given_, "inductance")
