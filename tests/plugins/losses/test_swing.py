"""Partial soft switching against the node's own differential equation and the books of its charges."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad, solve_ivp

from tideleg import Position, Segment, Timing, Waveform
from tideleg_losses.output_charge import OutputCharge, OutputChargeSettings
from tideleg_losses.swing import ChargeCurve, PowerLaw, charge_moved

VOLTS, CHARGE, DEAD = 800.0, 300e-9, 100e-9


def lost_by_the_circuit(capacitance: Any, volts: float, ampere: float, seconds: float) -> float:
    """Energy lost when a channel closes on a node that the current has swung for some time.

    C(v) dv/dt of both capacitances is the current; then the channel takes the node to zero while the link charges the
    opposite capacitance: given by the link less what the two capacitances gain.
    """
    swing = solve_ivp(
        lambda _, v: -ampere / (capacitance(v) + capacitance(volts - v)),
        (0.0, seconds),
        [volts * (1.0 - 1e-9)],
        rtol=1e-9,
        atol=1e-6,
        max_step=seconds / 400.0,
        events=_at_zero,
    )
    left = max(float(swing.y[0, -1]), 0.0) if swing.status == 0 else 0.0

    def charge(a: float, b: float) -> float:
        return quad(lambda v: float(capacitance(v)), a, b, epsabs=0, epsrel=1e-8, limit=400)[0]

    def stored(a: float, b: float) -> float:
        return quad(lambda v: v * float(capacitance(v)), a, b, epsabs=0, epsrel=1e-8, limit=400)[0]

    return volts * charge(volts - left, volts) - stored(volts - left, volts) + stored(0.0, left)


def _at_zero(_: float, v: Any) -> float:
    return float(v[0]) - 1e-6


_at_zero.terminal = True  # type: ignore[attr-defined]


@pytest.mark.parametrize("ampere", [0.4, 1.5, 3.0, 4.5, 5.8, 7.0])
def test_a_power_law_swings_as_its_differential_equation(ampere: float) -> None:
    def capacitance(v: Any) -> Any:
        return 0.5 * CHARGE / np.sqrt(np.maximum(v, 1e-9) * VOLTS)

    law = PowerLaw(CHARGE, VOLTS, 0.5)
    found = float(law.hard_share(np.array([ampere * DEAD]), VOLTS)[0]) * CHARGE * VOLTS
    assert found == pytest.approx(lost_by_the_circuit(capacitance, VOLTS, ampere, DEAD), rel=2e-3, abs=1e-9)


@pytest.mark.parametrize("ampere", [0.4, 1.5, 3.0, 4.5, 5.8, 7.0])
def test_a_curve_of_points_swings_as_its_differential_equation(ampere: float) -> None:
    volts, charge = np.array([0.0, 40.0, 150.0, 400.0, 800.0]), np.array([0.0, 90, 150, 220, 300]) * 1e-9
    slopes = np.diff(charge) / np.diff(volts)

    def capacitance(v: Any) -> Any:
        return slopes[np.clip(np.searchsorted(volts, np.asarray(v), side="right") - 1, 0, 3)]

    law = ChargeCurve(tuple(volts), tuple(charge))
    found = float(law.hard_share(np.array([ampere * DEAD]), VOLTS)[0]) * CHARGE * VOLTS
    assert found == pytest.approx(lost_by_the_circuit(capacitance, VOLTS, ampere, DEAD), rel=2e-3, abs=1e-9)


@given(st.floats(-20.0, 20.0), st.floats(0.0, 1e-6), st.floats(1e-9, 1e-6), st.floats(0.2, 1.0))
def test_the_share_is_one_when_hard_none_when_swung_and_falls_between(
    current: float, seconds: float, charge: float, exponent: float
) -> None:
    law = PowerLaw(charge, VOLTS, exponent)
    moved = charge_moved(np.array([current, current - 0.1]), seconds)
    share, more = law.hard_share(moved, VOLTS)
    assert 1.0 >= share >= more >= 0.0
    if current >= 0.0 or seconds == 0.0:
        assert share == 1.0
    if moved[0] >= 2.0 * charge:
        assert share == pytest.approx(0.0, abs=1e-9)


def test_equal_capacitances_leave_the_square_of_the_voltage_that_is_left() -> None:
    """Linear capacitances, both C: the rest v costs 2 C v²/2, a textbook sum."""
    ratio = np.linspace(0.0, 1.0, 11)
    left = (1.0 - ratio) ** 2
    np.testing.assert_allclose(PowerLaw(CHARGE, VOLTS, 1.0).hard_share(2 * CHARGE * ratio, VOLTS), left, atol=1e-6)
    line = ChargeCurve((0.0, VOLTS), (0.0, CHARGE))
    np.testing.assert_allclose(line.hard_share(2 * CHARGE * ratio, VOLTS), left, atol=1e-9)


def test_power_law_and_a_fine_curve_of_it_agree_at_any_voltage() -> None:
    volts = np.geomspace(0.01, 900.0, 2000)
    curve = ChargeCurve(tuple(volts), tuple(CHARGE * np.sqrt(volts / VOLTS)))
    law = PowerLaw(CHARGE, VOLTS, 0.5)
    at = np.array([[200.0], [500.0], [800.0]])
    moved = np.linspace(0.0, 7e-7, 57)
    np.testing.assert_allclose(curve.hard_share(moved, at), law.hard_share(moved, at), atol=5e-4)


def test_soft_at_one_voltage_is_partly_hard_at_a_higher_one() -> None:
    (term,) = OutputCharge().terms(OutputChargeSettings(output_charge=CHARGE, test_voltage=VOLTS))
    one = np.ones(3)
    part = Position(Waveform((Segment(0.0, 0.5, -4.0 * one, 20.0 * one),)), VOLTS, np.array([200.0, 400.0, 800.0]), 1.0)
    watts = term.at(part, Timing(40e3, DEAD), 25.0 * one).watts
    assert watts[0] == 0.0 < watts[2]
    assert np.all(np.diff(watts) >= 0.0)
