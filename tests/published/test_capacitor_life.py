"""Capacitor life factors: rows CP-01 to CP-07, E-G07, with their traps.

Status: "found", "found inputs", "closed form" or "from memory", beside each. E-G01 stands in test_passives.py.
"""

import numpy as np
import pytest

from tideleg import Exchange, InputError, Segment, Timing, Waveform
from tideleg_losses.capacitor import CapacitorEsr, CapacitorSettings, esr_from_dissipation
from tideleg_losses.capacitor_life import (
    arrhenius_factor,
    combined_life,
    equivalent_temperature,
    linear_voltage_factor,
    power_voltage_factor,
    stress_exponent,
    ten_kelvin_factor,
)


@pytest.mark.parametrize(("degc", "hours"), [(95.0, 4000.0), (85.0, 8000.0), (65.0, 32000.0)])
def test_cp_01_and_e_g07_ten_kelvin_rule(degc, hours):  # found: archived explanation, 2000 h at 105 degC
    assert 2000.0 * float(ten_kelvin_factor(105.0, degc)) == pytest.approx(hours, rel=1e-9)


def test_cp_02_changing_ambient():  # found: Cosel technical Q&A
    degc, share = np.array([45.0, 55.0, 65.0]), np.full(3, 1.0 / 3.0)
    life = 1000.0 * ten_kelvin_factor(105.0, degc)
    assert combined_life(share, life) == pytest.approx(27428.57, rel=1e-6)
    assert equivalent_temperature(share, degc) == pytest.approx(57.2, rel=1e-3)


def test_trap_the_mean_temperature_is_not_the_equivalent_one():
    degc, share = np.array([45.0, 55.0, 65.0]), np.full(3, 1.0 / 3.0)
    by_mean = 1000.0 * float(ten_kelvin_factor(105.0, degc.mean()))
    assert by_mean == pytest.approx(32000.0)
    assert combined_life(share, 1000.0 * ten_kelvin_factor(105.0, degc)) < 0.9 * by_mean
    assert equivalent_temperature(share, degc) > degc.mean() + 2.0


@pytest.mark.parametrize(("share", "exponent"), [(0.25, 2.0001), (1.0, 3.956615), (1.4, 5.0001)])
def test_cp_03_exponent_under_stress(share, exponent):  # found: Electronic Concepts, after Moynihan 1987
    assert float(stress_exponent(share)) == pytest.approx(exponent, rel=1e-4)


@pytest.mark.parametrize(("share", "factor"), [(0.9, 1.33), (0.8, 1.66), (0.5, 2.65)])
def test_cp_04_voltage_factor(share, factor):  # from memory: Parler, form found
    assert float(linear_voltage_factor(share)) == pytest.approx(factor, rel=1e-9)


def test_cp_05_ripple_heats_the_hot_spot():  # closed form: I² ESR Rth, then the rule on the hot spot
    (term,) = CapacitorEsr().terms(CapacitorSettings.model_validate({"esr": "20 mohm"}))
    square = Waveform((Segment(0.0, 0.5, 10.0, 10.0), Segment(0.5, 0.5, -10.0, -10.0)))
    loss = float(np.squeeze(term.at(Exchange(square, 1e4, 400.0), Timing(1e4, 0.0), np.array([[60.0]])).watts))
    hot_spot = 60.0 + 3.0 * loss
    assert hot_spot == pytest.approx(66.0)
    assert 5000.0 * float(ten_kelvin_factor(105.0, hot_spot)) == pytest.approx(74642.64, rel=1e-6)
    # Trap: with the ripple's heat left out the life would look half as long again.
    assert 5000.0 * float(ten_kelvin_factor(105.0, 60.0)) > 1.5 * 74642.64


def test_cp_06_energy_that_doubles_life():  # closed form; Rubycon technical note 5-1: they agree for 70 to 90 degC only
    assert float(arrhenius_factor(0.7875681, 95.0, 85.0)) == pytest.approx(2.0, rel=1e-5)
    # Trap: far from there the rule and the same energy part.
    assert float(arrhenius_factor(0.7875681, 95.0, 35.0)) > 1.5 * float(ten_kelvin_factor(95.0, 35.0))


def test_cp_07_film():  # from memory: Wang and Blaabjerg, exponent 7 to 9.4
    factor = power_voltage_factor(700.0 / 800.0, 8.0) * ten_kelvin_factor(85.0, 70.0)
    assert float(factor) == pytest.approx(8.23153, rel=1e-5)


def test_shares_that_do_not_add_up_and_lives_that_are_none_are_refused():
    with pytest.raises(InputError, match=r"add up to 0\.9"):
        combined_life(np.array([0.4, 0.5]), np.array([1.0, 2.0]))
    with pytest.raises(InputError, match="life of 0"):
        combined_life(np.array([0.5, 0.5]), np.array([0.0, 2.0]))


def test_trap_tan_delta_belongs_to_its_own_frequency():
    # E-G01's bank at its 120 Hz: 237 mohm. Read at a switching frequency of 100 kHz it would be 0.28 mohm.
    keys = {"dissipation_factor": 0.2, "dissipation_frequency": "120 Hz", "capacitance": "1.12 mF"}
    (term,) = CapacitorEsr().terms(CapacitorSettings.model_validate(keys))
    half = 6.47
    square = Waveform((Segment(0.0, 0.5, half, half), Segment(0.5, 0.5, -half, -half)))
    loss = float(np.squeeze(term.at(Exchange(square, 1e5, 400.0), Timing(1e5, 0.0), np.array([[25.0]])).watts))
    assert loss == pytest.approx(9.91, rel=2e-3)
    assert float(esr_from_dissipation(0.2, 1e5, 1.12e-3)) < 1e-3


def test_trap_only_the_ac_part_heats():
    (term,) = CapacitorEsr().terms(CapacitorSettings.model_validate({"esr": "20 mohm"}))
    pulse = Exchange(Waveform((Segment(0.0, 0.25, 40.0, 40.0),)), 2e4, 400.0)
    loss = float(np.squeeze(term.at(pulse, Timing(2e4, 0.0), np.array([[25.0]])).watts))
    assert loss == pytest.approx(20e-3 * 40.0**2 * 0.25 * 0.75)
    assert loss < 0.8 * 20e-3 * 40.0**2 * 0.25
