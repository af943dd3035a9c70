"""Capacitors, stored energy and discharge: rows E-G and HV. Status beside each; the local code decides, never a test."""

import numpy as np
import pytest

from tideleg import Exchange, Segment, Timing, Waveform
from tideleg.caution import (
    SafetyFacts,
    capacitance_for_energy,
    discharge_resistor,
    discharge_time,
    safety,
    stored_energy,
    voltage_class,
)
from tideleg_losses.capacitor import CapacitorEsr, esr_from_dissipation


def test_e_g01_bank_loss():
    # Found: Infineon, PFC boost converter design guide, DN 2013-01, Eq. 32, 34: 237 mohm, 9.91 W at 6.47 A rms.
    esr = float(esr_from_dissipation(0.2, 120.0, 1.12e-3))
    assert esr == pytest.approx(0.237, rel=2e-3)
    (term,) = CapacitorEsr().terms(CapacitorEsr().settings(esr=esr))
    half = 6.47
    square = Waveform((Segment(0.0, 0.5, half, half), Segment(0.5, 0.5, -half, -half)))
    found = term.at(Exchange(square, 120.0, 400.0), Timing(120.0, 0.0), np.array([[25.0]])).watts
    assert float(np.squeeze(found)) == pytest.approx(9.91, rel=2e-3)


def test_a_bank_also_carries_what_others_put_on_the_port():
    (term,) = CapacitorEsr().terms(CapacitorEsr().settings(esr="10 mohm", external_ripple_current="30 A"))
    calm = Exchange(Waveform((Segment(0.0, 1.0, 50.0, 50.0),)), 4e4, 750.0)
    assert float(np.squeeze(term.at(calm, Timing(4e4, 0.0), np.array([[25.0]])).watts)) == pytest.approx(9.0)


def test_e_g02_hv_28_passive_bleed():
    # Found: AMK, racing kit documentation PDK 205481: 600 V, 300 uF to 50 V in 111.82 s; the 150 kohm total fits it.
    assert discharge_time(150e3, 300e-6, 600.0, 50.0) == pytest.approx(111.82, rel=1e-4)
    assert 600.0 * np.exp(-300.0 / (150e3 * 300e-6)) == pytest.approx(0.76, abs=0.01)
    assert pytest.approx(2.4, rel=1e-9) == 600.0**2 / 150e3


@pytest.mark.parametrize(
    ("row", "farad", "volt", "joule"), [("E-G03", 500e-6, 400.0, 40.0), ("E-G06", 2e-3, 800.0, 640.0)]
)
def test_stored_energy(row, farad, volt, joule):  # found: knowledge-base articles on discharge resistors
    assert stored_energy(farad, volt) == pytest.approx(joule, rel=1e-9), row


@pytest.mark.parametrize(
    ("row", "volt", "farad"),
    [("E-G04", 200.0, 10e-6), ("HV-31", 60.0, 111.1e-6), ("HV-31", 400.0, 2.5e-6), ("HV-31", 800.0, 0.625e-6)],
)
def test_capacitance_of_a_fifth_of_a_joule(row, volt, farad):  # 0.2 J: ISO 6469-4:2015, 5.2.3 (found); arithmetic
    assert capacitance_for_energy(0.2, volt) == pytest.approx(farad, rel=1e-3), row


def test_e_g05_and_hv_29_hv_30_discharge_resistors():  # inputs found in the trade press; arithmetic
    assert discharge_resistor(600e-6, 450.0, 60.0, 2.0) == pytest.approx(1654.3, rel=1e-3)
    assert stored_energy(600e-6, 450.0) == pytest.approx(60.75, rel=1e-4)
    assert discharge_time(20e3, 500e-6, 800.0, 60.0) == pytest.approx(25.903, rel=1e-4)
    assert discharge_resistor(500e-6, 800.0, 60.0, 5.0) == pytest.approx(3860.6, rel=1e-4)
    assert pytest.approx(165.8, rel=1e-3) == 800.0**2 / 3860.6


def test_trap_sixty_volts_and_a_fifth_of_a_joule_are_different_limits():
    assert stored_energy(500e-6, 60.0) == pytest.approx(0.9)
    assert stored_energy(500e-6, 28.3) == pytest.approx(0.2, rel=2e-3)


# HV-01, from memory: ISO 6469-3:2021, clause 4. Trap: the class follows the greatest voltage, charge end included.
@pytest.mark.parametrize(
    ("volt", "word"), [(14 * 4.2, "A"), (60.0, "A"), (15 * 4.2, "B"), (1500.0, "B"), (1500.1, "above")]
)
def test_voltage_class_borders(volt, word):
    assert voltage_class(volt).startswith(word)


FACTS = SafetyFacts(830.0, 453.0, 750.0, 830.0, 900e-6, 220e-6, 453.0, 0.055, 0.0, 110e-6, 4, 164e3)


def test_the_caution_carries_this_designs_own_numbers_and_claims_nothing():
    found = safety(FACTS)
    text = " ".join(found.sentences)
    assert found.stored_energy_j == pytest.approx(0.5 * 900e-6 * 830.0**2)
    assert found.link_short_current_a == pytest.approx(453.0 / 0.055)
    assert found.load_dump_time_to_trip_s == pytest.approx(0.5 * 900e-6 * (830.0**2 - 750.0**2) / 164e3)
    for said in (
        "830 V",
        "310 J",
        "2115 ohm",
        "8236 A",
        "cannot interrupt",
        "local code",
        "no statement of compliance",
    ):
        assert said in text, said
    assert not any(word in text.lower() for word in ("complies", "compliant", "certified", "safe to touch"))


def test_what_the_caution_does_not_know_it_says():
    bare = safety(SafetyFacts(58.0, 50.0, 58.0, None, None, None, 50.0, 0.0, 0.0, 1e-4, 1, 0.0))
    text = " ".join(bare.sentences)
    assert "not known" in text
    assert "do not bound" in text
    assert bare.voltage_class.startswith("A")
