"""Winding and core losses over waveforms of every shape: spectrum, table, three ways to the ac resistance, flux."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from tideleg import InputError, Segment, Timing, Waveform, Winding
from tideleg_losses.core import Core, flux_swing
from tideleg_losses.dowell import copper_factor, dowell_factor, litz_factor, skin_depth
from tideleg_losses.dowell_table import HIGHEST, dowell_table
from tideleg_losses.spectrum import harmonic_squares
from tideleg_losses.winding import WindingLoss
from tideleg_losses.winding_ac import ORDERS

WARM = np.array([80.0])
F = 50e3
COPPER = {"winding_resistance": 0.01}
FOIL = {**COPPER, "winding_layers": 3, "winding_conductor": "foil", "winding_conductor_thickness": 4e-4}
LITZ = {
    **COPPER,
    "winding_conductor": "litz",
    "winding_strands": 400,
    "winding_strand_diameter": 2e-4,
    "winding_width": 0.03,
    "turns": 16,
}


def triangle(middle: float, ripple: float, duty: float, share: float = 1.0) -> Waveform:
    """Rise for `duty` of the conducting share, fall for the rest of it; idle after that."""
    low, high = np.array([middle - 0.5 * ripple]), np.array([middle + 0.5 * ripple])
    return Waveform((Segment(0.0, share * duty, low, high), Segment(share * duty, share * (1.0 - duty), high, low)))


def ac_watts(keys: dict[str, Any], current: Waveform, frequency: float = F, degc: float = 80.0) -> float:
    model = WindingLoss()
    (term,) = (t for t in model.terms(model.settings.model_validate(keys)) if t.mechanism == "winding ac")
    line = term.at(Winding(current, (1.0,) * len(current.segments)), Timing(frequency, 0.0), np.array([degc]))
    return float(line.watts[0])


SHARES = st.floats(0.05, 1.0)
AMPERES = st.floats(-100.0, 100.0)


@settings(max_examples=60)
@given(st.lists(st.tuples(SHARES, AMPERES, AMPERES), min_size=1, max_size=4), st.floats(0.0, 1.0), st.floats(0.3, 1.0))
def test_spectrum_is_that_of_the_waveform(pieces: list[Any], place: float, filled: float) -> None:
    """Any segments: touching or with an idle rest, with jumps or without, wrapped over the end of the period."""
    whole = sum(width for width, _, _ in pieces)
    segments = []
    for width, start, end in pieces:
        share = filled * width / whole
        segments.append(Segment(place, share, np.array([start]), np.array([end])))
        place += share
    current = Waveform(tuple(segments))
    due = [0.5 * np.abs(a) ** 2 for a in (current.harmonic(n) for n in range(1, 9))]
    slope = max(abs(s.end - s.start) / s.width for s in segments)
    # Rounding: 1e-16 of the squared slope or of the squared current.
    np.testing.assert_allclose(
        harmonic_squares(current, 8), due, rtol=1e-10, atol=1e-14 * float(np.max(slope)) ** 2 + 1e-12
    )


def test_spectrum_of_modes_side_by_side() -> None:
    """Continuous, discontinuous and idle steps in one array, where corners coincide in some steps only."""
    share = np.array([1.0, 0.6, 0.2, 0.0])
    low = np.array([30.0, 0.0, 0.0, 0.0])
    high = low + 25.0 * share
    for place in (0.4 * share, 1.0 - 0.6 * share):
        current = Waveform((Segment(0.0, 0.4 * share, low, high), Segment(place, 0.6 * share, high, low)))
        due = [0.5 * np.abs(a) ** 2 for a in (current.harmonic(n) for n in range(1, 9))]
        np.testing.assert_allclose(harmonic_squares(current, 8), due, rtol=1e-9, atol=1e-11)
        assert all(square[3] == 0.0 for square in harmonic_squares(current, 8))


@pytest.mark.parametrize("layers", [0.5, 1.0, 3.0, 12.0])
def test_the_table_is_dowell(layers: float) -> None:
    phi = np.concatenate([np.geomspace(1e-3, 3.0 * HIGHEST, 4001), [HIGHEST, HIGHEST + 1e-9]])
    table = dowell_table(layers, ORDERS)
    for i, order in enumerate(ORDERS):
        squares = [np.full_like(phi, float(i == j)) for j in range(len(ORDERS))]
        value, rise = table.weigh(phi, squares)
        exact = dowell_factor(phi * np.sqrt(order), layers) - 1.0
        np.testing.assert_allclose(value, exact, rtol=1e-6, atol=2e-7 * max(layers, 1.0) ** 2)
        assert np.all(value >= 0.0), "below zero a winding would give energy back"
        beside = 1e-5 * phi
        above, below = (dowell_factor((phi + s) * np.sqrt(order), layers) for s in (beside, -beside))
        np.testing.assert_allclose(rise, phi * (above - below) / (2 * beside), rtol=1e-3, atol=1e-4 * layers**2)


@settings(max_examples=25)
@given(st.floats(0.15, 0.85), st.sampled_from([1.0, 2.0, 5.0, 10.0]), st.floats(0.05e-3, 2e-3))
def test_the_uncounted_rest_is_bounded_from_above(duty: float, layers: float, thickness: float) -> None:
    """Against 600 harmonics one by one: never below by more than the rounding of F - 1, above by 9 % at most."""
    current = triangle(40.0, 20.0, duty)
    phi = thickness / float(skin_depth(F, 80.0))
    orders = np.arange(1, 601)
    squares = (np.sin(np.pi * orders * duty) / orders**2) ** 2  # of a triangle; Erickson and Maksimović, Appendix A
    squares = squares / np.sum(squares) * float(current.ac_mean_square()[0])
    excess = float(np.sum((dowell_factor(phi * np.sqrt(orders), layers) - 1.0) * squares))
    exact = 0.01 * float(copper_factor(80.0)) * excess
    found = ac_watts({**FOIL, "winding_layers": layers, "winding_conductor_thickness": thickness}, current)
    assert exact * (1.0 - 2e-3) - 1e-9 <= found <= exact * 1.09 + 1e-9


def test_round_wire_and_porosity_thin_the_foil_that_stands_for_them() -> None:
    current = triangle(40.0, 20.0, 0.4)
    foil = ac_watts(FOIL, current)
    assert ac_watts({**FOIL, "winding_conductor": "round"}, current) < foil
    assert ac_watts({**FOIL, "winding_porosity": 0.8}, current) < foil


def test_litz_is_the_factor_at_each_harmonic() -> None:
    current = triangle(40.0, 20.0, 0.4)
    found = ac_watts(LITZ, current)
    orders = np.arange(1, 601)
    squares = [0.5 * abs(complex(current.harmonic(int(n))[0])) ** 2 for n in orders]
    factors = litz_factor(F * orders, 80.0, 16, 400, 2e-4, 0.03)
    exact = 0.01 * float(copper_factor(80.0)) * float(np.sum((factors - 1.0) * squares))
    assert exact <= found <= 1.05 * exact


def test_litz_of_strands_thicker_than_the_skin_depth_is_refused() -> None:
    with pytest.raises(InputError, match=r"winding_strand_diameter: found 0\.2 mm, more than the skin depth"):
        ac_watts(LITZ, triangle(40.0, 20.0, 0.4), frequency=150e3)


def test_a_table_of_dowells_own_ratios_gives_dowells_loss() -> None:
    hz = np.geomspace(1e4, 2e6, 400)
    phi = 4e-4 / skin_depth(hz, 80.0)
    table = [[float(f), float(r)] for f, r in zip(hz, dowell_factor(phi, 3.0), strict=True)]
    current = triangle(40.0, 20.0, 0.4)
    assert ac_watts({**COPPER, "ac_resistance_ratio": table}, current) == pytest.approx(
        ac_watts(FOIL, current), rel=1e-3
    )


@pytest.mark.parametrize(
    ("table", "words"),
    [
        ([[6e4, 1.2], [2e6, 9.0]], "begins at 60000 Hz, above the switching frequency 50000 Hz"),
        ([[1e4, 1.1], [6e4, 1.5]], "squared ripple current lies above it"),
    ],
)
def test_nothing_is_extrapolated_from_a_table(table: Any, words: str) -> None:
    with pytest.raises(InputError, match=words):
        ac_watts({**COPPER, "ac_resistance_ratio": table}, triangle(40.0, 20.0, 0.4))


def test_a_table_may_end_where_next_to_nothing_is_left() -> None:
    # At half duty the harmonics above the fifth carry 0.06 % of the ripple.
    table = {**COPPER, "ac_resistance_ratio": [[1e4, 1.1], [5.5 * F, 4.0]]}
    assert ac_watts(table, triangle(40.0, 20.0, 0.5)) > 0.0


def test_a_frequency_for_each_step_equals_each_alone() -> None:
    model = WindingLoss()
    _, term = model.terms(model.settings.model_validate(FOIL))
    hz = np.array([20e3, 50e3, 90e3])
    part = Winding(triangle(40.0, 20.0, 0.4), (1.0, -1.0))
    together = term.at(part, Timing(hz, 0.0), np.full(3, 80.0)).watts
    np.testing.assert_allclose(together, [ac_watts(FOIL, part.current, float(f)) for f in hz], rtol=1e-13)


@settings(max_examples=40)
@given(AMPERES, st.floats(0.0, 50.0), st.floats(0.1, 0.9))
def test_dc_term_charges_the_whole_rms_and_ac_only_the_ripple(middle: float, ripple: float, duty: float) -> None:
    model = WindingLoss()
    dc, _ = model.terms(model.settings.model_validate(FOIL))
    current = triangle(middle, ripple, duty)
    found = float(dc.at(Winding(current, (1.0, -1.0)), Timing(F, 0.0), np.array([20.0])).watts[0])
    assert found == pytest.approx(0.01 * (middle**2 + ripple**2 / 12.0), rel=1e-9, abs=1e-12)
    assert ac_watts(FOIL, current) == pytest.approx(ac_watts(FOIL, triangle(0.0, ripple, duty)), rel=1e-6, abs=1e-10)


CORE = {
    "core_k": 5.971608,
    "core_alpha": 1.3,
    "core_beta": 2.5,
    "core_area": 1.6e-3,
    "core_volume": 4.2e-4,
    "turns": 16,
}


def core_watts(current: Waveform, voltages: tuple[float, ...], frequency: float = F) -> float:
    (term,) = Core().terms(Core().settings.model_validate(CORE))
    return float(term.at(Winding(current, voltages), Timing(frequency, 0.0), WARM).watts[0])


def test_an_idle_rest_adds_no_flux_and_no_loss() -> None:
    """The same two voltage pulses lose the same energy a period, whether idle follows or not (iGSE, no relaxation)."""
    full = core_watts(triangle(0.0, 20.0, 0.4), (300.0, -200.0))
    # Half the share at half the frequency: pulses as long as before, once where there were two.
    rested = core_watts(triangle(0.0, 20.0, 0.4, share=0.5), (300.0, -200.0), 0.5 * F)
    assert rested == pytest.approx(0.5 * full, rel=1e-12)


def test_a_core_at_rest_loses_nothing() -> None:
    assert core_watts(triangle(0.0, 0.0, 0.4, share=0.0), (300.0, -200.0)) == 0.0
    assert core_watts(triangle(50.0, 0.0, 0.4), (0.0, 0.0)) == 0.0


@settings(max_examples=40)
@given(st.floats(0.1, 0.9), st.floats(1.2, 4.0), st.floats(10e3, 200e3))
def test_core_scales_by_its_exponents(duty: float, factor: float, frequency: float) -> None:
    current = triangle(0.0, 20.0, duty)
    volts = (300.0, -300.0 * duty / (1.0 - duty))
    base = core_watts(current, volts, frequency)
    more = core_watts(current, tuple(factor * v for v in volts), frequency)
    assert more == pytest.approx(base * factor**2.5, rel=1e-9)
    # Higher frequency at the same voltages: less swing, so f^(alpha - beta).
    assert core_watts(current, volts, factor * frequency) == pytest.approx(base * factor ** (1.3 - 2.5), rel=1e-9)
    assert core_watts(current, tuple(-v for v in volts), frequency) == pytest.approx(base, rel=1e-12)


@settings(max_examples=40)
@given(st.lists(st.tuples(st.floats(0.05, 1.0), st.floats(-1.0, 1.0)), min_size=2, max_size=6), st.integers(1, 5))
def test_the_swing_does_not_depend_on_where_the_period_begins(pieces: list[tuple[float, float]], turn: int) -> None:
    widths = np.array([w for w, _ in pieces])
    widths = widths / widths.sum()
    rates = np.array([r for _, r in pieces])
    rates = rates - np.sum(widths * rates)
    assume(np.max(np.abs(rates)) > 1e-3)
    here = float(flux_swing(list(widths), list(rates), 1.0))
    there = float(flux_swing(list(np.roll(widths, turn)), list(np.roll(rates, turn)), 1.0))
    assert here == pytest.approx(there, rel=1e-9)
