"""Capacitors: row E-G01. Stored energy and discharge stand in test_discharge.py; E-G07 is a matter of life models."""

import numpy as np
import pytest

from tideleg import Exchange, Segment, Timing, Waveform
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
    terms = CapacitorEsr().terms(CapacitorEsr().settings(esr="10 mohm", external_ripple_current="30 A"))
    calm = Exchange(Waveform((Segment(0.0, 1.0, 50.0, 50.0),)), 4e4, 750.0)
    watts = [float(np.squeeze(term.at(calm, Timing(4e4, 0.0), np.array([[25.0]])).watts)) for term in terms]
    assert watts == pytest.approx([0.0, 9.0])
