"""Core loss, windings and gaps against published constants, closed forms and numerical integration.

Rows CL, WD, IN. Status: "found", "found inputs", "closed form" or "from memory", beside each. Not here: WD-09, about
wire gauges, which no part uses. WD-04's figures carry WD-03's formula at other frequencies.
"""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tideleg import Segment, Timing, Waveform, Winding
from tideleg_losses.core import Core, cosine_integral, flux_swing, igse_density, igse_k, k_in_si
from tideleg_losses.dowell import (
    COPPER_RESISTIVITY_20,
    copper_factor,
    dowell_factor,
    litz_factor,
    round_wire_height,
    skin_depth,
)
from tideleg_losses.gap import area_product, fringing_factor, gap_length, gapped_inductance, turns_for_flux
from tideleg_losses.winding import WindingLoss

ALPHA, BETA = 1.3, 2.5
K_SI = 5.971608  # CL-06


def triangle(duty, swing, frequency, alpha=ALPHA, beta=BETA, k=K_SI):
    """Loss density of a triangle of flux: up for a share of the period, down for the rest."""
    rates = [swing * frequency / duty, -swing * frequency / (1 - duty)]
    return float(igse_density([duty, 1 - duty], rates, frequency, igse_k(k, alpha, beta), alpha, beta))


@pytest.mark.parametrize(("alpha", "value"), [(1.0, 4.0), (1.5, 3.496077), (2.0, 3.141593)])
def test_cl_01_integral_of_the_cosine(alpha, value):  # closed form
    assert cosine_integral(alpha) == pytest.approx(value, rel=1e-6)


def test_cl_02_k_i_and_its_curve_fit():  # from memory; fit and integral agree within 0.1 %
    exact = igse_k(1.0, 1.5, 2.5)
    assert exact == pytest.approx(0.05705571, rel=1e-6)
    fit = 1.0 / (2**3.5 * np.pi**0.5 * (0.2761 + 1.7061 / (1.5 + 1.354)))
    assert fit == pytest.approx(0.05706398, rel=1e-6)
    assert exact == pytest.approx(fit, rel=1e-3)


def steinmetz(swing, frequency, alpha, beta, k=K_SI):
    return k * frequency**alpha * (swing / 2) ** beta


@pytest.mark.parametrize(("alpha", "ratio"), [(1.0, 1.0), (1.3, 0.9506426), (1.5, 0.9128914), (2.0, 0.8105695)])
def test_cl_03_triangle_over_sine(alpha, ratio):  # closed form; alpha = 2 is 8/pi²
    beta = 2.6
    found = triangle(0.5, 0.2, 1e5, alpha, beta) / steinmetz(0.2, 1e5, alpha, beta)
    assert found == pytest.approx(ratio, rel=1e-6)


@pytest.mark.parametrize(("duty", "ratio"), [(0.4, 1.015452), (0.25, 1.115355), (0.1, 1.490712)])
def test_cl_04_unequal_slopes_lose_more_and_alike_both_ways(duty, ratio):  # closed form
    half = triangle(0.5, 0.2, 1e5, 1.5)
    assert triangle(duty, 0.2, 1e5, 1.5) / half == pytest.approx(ratio, rel=1e-6)
    assert triangle(1 - duty, 0.2, 1e5, 1.5) / half == pytest.approx(ratio, rel=1e-6)


def test_cl_05_and_cl_06_units():  # from memory: Mohan, Undeland, Robbins, 3rd ed., (30-6); closed form
    assert pytest.approx(60.0, rel=1e-2) == 1.5e-6 * 100.0**1.3 * 100.0**2.5
    assert k_in_si(1.5e-6, 1.3, 2.5, "mW/cm3, kHz, mT") == pytest.approx(K_SI, rel=1e-6)


def test_cl_07_density_by_duty():  # closed form, checked by numerical integration
    assert triangle(0.5, 0.2, 1e5) == pytest.approx(56768.65, rel=1e-6)
    assert triangle(0.25, 0.2, 1e5) == pytest.approx(60078.6, rel=1e-6)
    assert steinmetz(0.2, 1e5, ALPHA, BETA) == pytest.approx(59716.08, rel=1e-6)


def test_cl_08_flat_tops_add_nothing():  # closed form; real ferrites relax and lose more
    rate = 0.2 * 1e5 / 0.25
    found = igse_density([0.25] * 4, [rate, 0.0, -rate, 0.0], 1e5, igse_k(K_SI, ALPHA, BETA), ALPHA, BETA)
    assert float(found) == pytest.approx(69890.4, rel=1e-6)


def test_cl_09_power_law_in_the_peak():  # from memory: Erickson & Maksimović, transformer design, dB is the PEAK
    assert pytest.approx(0.06204359, rel=1e-6) == 24.7 * 0.1**2.6
    assert steinmetz(0.2, 1.0, 1.0, 2.6, k=24.7) == pytest.approx(0.06204359, rel=1e-6)


def test_a_sampled_sine_returns_steinmetz():
    edges = np.linspace(0.0, 1.0, 401)
    flux = 0.1 * np.sin(2 * np.pi * edges)
    rates = list(np.diff(flux) / np.diff(edges) * 1e5)
    found = float(igse_density(list(np.diff(edges)), rates, 1e5, igse_k(K_SI, ALPHA, BETA), ALPHA, BETA))
    assert found == pytest.approx(steinmetz(0.2, 1e5, ALPHA, BETA), rel=1e-3)


@settings(max_examples=40)
@given(st.lists(st.tuples(st.integers(1, 20), st.floats(-3.0, 3.0)), min_size=2, max_size=6))
def test_igse_equals_numerical_integration_of_any_segments(pieces):
    widths = np.array([w for w, _ in pieces], dtype=float)
    widths /= widths.sum()
    rates = np.array([r for _, r in pieces]) * 1e4
    rates -= np.sum(widths * rates)
    swing = float(flux_swing(list(widths), list(rates), 1e5))
    if swing < 1e-4:
        return
    k_i = igse_k(K_SI, ALPHA, BETA)
    # Widths are whole parts of the period, so no sample straddles a corner; flux by summing, swing from its samples.
    slope = np.repeat(rates, [200 * w for w, _ in pieces])
    flux = np.concatenate([[0.0], np.cumsum(slope)]) / (len(slope) * 1e5)
    numeric = np.mean(k_i * np.abs(slope) ** ALPHA * np.ptp(flux) ** (BETA - ALPHA))
    found = float(igse_density(list(widths), list(rates), 1e5, k_i, ALPHA, BETA))
    assert found == pytest.approx(numeric, rel=1e-6)


def test_trap_igse_takes_the_full_swing_through_the_plugin():
    steinmetz_data = {"core_k": K_SI, "core_alpha": ALPHA, "core_beta": BETA}
    (term,) = Core().terms(Core().settings(**steinmetz_data, core_area="2 cm2", core_volume="50 cm3", turns=20))
    volt = 0.2 * 1e5 / 0.5 * 20 * 2e-4
    ramp = Waveform((Segment(0.0, 0.5, -5.0, 5.0), Segment(0.5, 0.5, 5.0, -5.0)))
    line = term.at(Winding(ramp, (volt, -volt)), Timing(1e5, 0.0), np.array([[60.0]]))
    assert float(np.squeeze(line.watts)) == pytest.approx(56768.65 * 50e-6, rel=1e-6)


# WD-01, WD-02: found: IEC 60028; Agrawal, Industrial Power Engineering; a note on IEC 60028 (28 % at 90 degC).
def test_wd_01_and_wd_02_copper():
    assert pytest.approx(5.8e7, rel=1e-4) == 1 / 1.7241e-8
    assert float(copper_factor(90.0)) == pytest.approx(1.28, rel=5e-3)
    assert 1.7241e-8 * float(copper_factor(100.0)) == pytest.approx(2.266157e-8, rel=1e-4)


def test_wd_10_resistivity_by_mass():  # found: history of the annealed copper standard; printed digits: 0.1 %
    assert pytest.approx(COPPER_RESISTIVITY_20, rel=1e-3) == 0.15328 / 8.89e6


# WD-03 found: Johnson, Transmission Lines and Networks, p. 58: 6.64/sqrt(f) cm; WD-04 found: Sullivan, IEMDC 2013.
@pytest.mark.parametrize(
    ("frequency", "depth_mm", "tolerance"),
    [
        (60, 8.57, 6e-3),
        (1e4, 0.664, 6e-3),
        (1e5, 0.20997, 6e-3),
        (1e6, 0.0664, 6e-3),
        (60, 8.5, 5e-3),
        (200, 4.7, 7e-3),
    ],
)
def test_wd_03_and_wd_04_skin_depth(frequency, depth_mm, tolerance):
    assert 1e3 * float(skin_depth(frequency, 20.0)) == pytest.approx(depth_mm, rel=tolerance)


def test_wd_05_and_the_trap_of_the_temperature():  # closed form: 14.6 % deeper at 100 degC than at 20 degC
    assert 1e3 * float(skin_depth(1e5, 100.0)) == pytest.approx(0.239588, rel=1e-4)
    assert float(skin_depth(1e5, 100.0) / skin_depth(1e5, 20.0)) == pytest.approx(1.146, rel=1e-3)


# WD-06 to WD-08 found inputs: Dowell 1966, complex form as printed at e-magnetica.pl; values computed.
@pytest.mark.parametrize(
    ("phi", "layers", "factor"),
    [(1, 1, 1.085636), (1, 2, 1.406009), (1, 3, 1.939965), (1, 5, 3.648623), (1, 10, 11.65796), (4, 3, 26.44981)],
)
def test_wd_06_and_wd_07_dowell(phi, layers, factor):
    assert float(dowell_factor(phi, layers)) == pytest.approx(factor, rel=1e-6)


def test_wd_07_and_wd_08_limits():
    assert float(dowell_factor(40.0, 3)) == pytest.approx(40.0 * (2 * 9 + 1) / 3, rel=1e-6)
    assert float(dowell_factor(0.25, 5)) == pytest.approx(1.010762, rel=1e-6)
    assert float(dowell_factor(0.0999, 5)) == pytest.approx(float(dowell_factor(0.1001, 5)), rel=1e-5)


def test_wd_11_litz():  # from memory: Sullivan, IEEE Trans. PE 14(2), 1999
    found = float(litz_factor(1e5, 20.0, 10, 100, 1e-4, 0.02)) - 1.0
    # our copper is 1.7241e-8, the row's 1.72e-8: the excess goes with 1/rho²
    assert 1.0 + found * (1.7241 / 1.72) ** 2 == pytest.approx(1.067702, rel=1e-4)


def test_round_wire_stands_for_a_square_of_equal_area():
    assert float(round_wire_height(1.0)) == pytest.approx(0.886, rel=1e-3)


def test_trap_dc_current_does_not_see_the_ac_factor():
    keys = {"winding_resistance": "10 mohm", "winding_layers": 4, "winding_conductor_thickness": "1.5 mm"}
    dc, ac = WindingLoss().terms(WindingLoss().settings(**keys))
    steady = Winding(Waveform((Segment(0.0, 1.0, 40.0, 40.0),)), (0.0,))
    degc = np.array([[20.0]])
    assert float(np.squeeze(ac.at(steady, Timing(1e5, 0.0), degc).watts)) == pytest.approx(0.0, abs=1e-12)
    assert float(np.squeeze(dc.at(steady, Timing(1e5, 0.0), degc).watts)) == pytest.approx(16.0)


def test_winding_ac_is_the_sum_over_many_harmonics():
    # 8 harmonics and a rest charged at twice the ninth, against 400 harmonics one by one: within 2 %, and above.
    keys = {"winding_resistance": "10 mohm", "winding_layers": 3, "winding_conductor_thickness": "0.4 mm"}
    settings_ = WindingLoss().settings(**keys)
    _, ac = WindingLoss().terms(settings_)
    ramp = Waveform((Segment(0.0, 0.3, -20.0, 20.0), Segment(0.3, 0.7, 20.0, -20.0)))
    found = float(np.squeeze(ac.at(Winding(ramp, (1.0, -1.0)), Timing(5e4, 0.0), np.array([[80.0]])).watts))
    phi = settings_.conductor_height / skin_depth(5e4, 80.0)
    orders = np.arange(1, 401)
    squares = np.array([0.5 * abs(complex(ramp.harmonic(int(n)))) ** 2 for n in orders])
    exact = 10e-3 * float(copper_factor(80.0)) * np.sum((dowell_factor(phi * np.sqrt(orders), 3) - 1) * squares)
    assert found == pytest.approx(exact, rel=2e-2)


# IN-03 closed form; gap formula found at e-magnetica.pl. IN-04 closed form. IN-05 from memory: McLyman ch. 8.
def test_in_03_gap_holds_the_energy():
    turns = turns_for_flux(1e-4, 20.0, 0.25, 200e-6)
    gap = gap_length(turns, 200e-6, 1e-4)
    assert float(turns) == pytest.approx(40.0, rel=1e-6)
    assert 1e3 * float(gap) == pytest.approx(4.021239, rel=1e-6)
    energy_in_gap = 0.25**2 * 200e-6 * gap / (2 * 4e-7 * np.pi)
    assert float(energy_in_gap) == pytest.approx(0.5 * 1e-4 * 20.0**2, rel=1e-9)


def test_in_04_the_core_costs_a_little():
    assert 1e6 * gapped_inductance(40, 200e-6, 4.0212e-3, 0.1, 2000) == pytest.approx(98.77281, rel=1e-5)


def test_in_05_fringing():
    assert float(fringing_factor(1e-3, 1e-4, 0.02)) == pytest.approx(1.368888, rel=1e-5)


def test_in_01_and_in_06_area_product():  # IN-01 from memory: McLyman ch. 8; IN-06 closed form
    energy = 0.5 * 2.5e-3 * 1.6**2
    assert energy == pytest.approx(0.0032, rel=1e-9)
    assert 2 * energy * 1e4 / (0.22 * 300 * 0.4) == pytest.approx(2.42, rel=3e-3)
    assert 1e8 * area_product(1e-4, 110.0, 100.0, 0.25, 5e6, 0.4) == pytest.approx(220.0, rel=1e-6)


def test_trap_flux_takes_the_peak_current():
    assert float(turns_for_flux(1e-4, 20.0, 0.25, 2e-4)) > float(turns_for_flux(1e-4, 15.0, 0.25, 2e-4))


def test_trap_copper_loss_takes_the_rms_current():
    (term,) = WindingLoss().terms(WindingLoss().settings(winding_resistance="10 mohm"))
    ramp = Waveform((Segment(0.0, 0.5, 10.0, 30.0), Segment(0.5, 0.5, 30.0, 10.0)))
    found = float(np.squeeze(term.at(Winding(ramp, (1.0, -1.0)), Timing(1e5, 0.0), np.array([[20.0]])).watts))
    assert found == pytest.approx(10e-3 * (20.0**2 + 20.0**2 / 12.0), rel=1e-12)


def test_trap_a_narrow_triangle_loses_more_than_the_sine_and_an_even_one_less():
    sine = steinmetz(0.2, 1e5, 1.5, BETA)
    assert triangle(0.5, 0.2, 1e5, 1.5) < sine < triangle(0.1, 0.2, 1e5, 1.5)


def test_trap_units_and_half_swing_are_off_by_powers_that_no_one_would_miss():
    keys = {
        "core_k": 1.5e-6,
        "core_alpha": ALPHA,
        "core_beta": BETA,
        "core_area": 2e-4,
        "core_volume": 50e-6,
        "turns": 20,
    }
    (trade,) = Core().terms(Core().settings(**keys, core_units="mW/cm3, kHz, mT"))
    (wrong,) = Core().terms(Core().settings(**keys))
    assert trade.k_i / wrong.k_i == pytest.approx(10**6.6, rel=1e-9)
    # A full swing put where Steinmetz wants the peak would cost 2^beta.
    assert K_SI * 1e5**ALPHA * 0.2**BETA / steinmetz(0.2, 1e5, ALPHA, BETA) == pytest.approx(2**BETA)
