"""A capacitor whose resistance changes with frequency and temperature, against integration in time of its own."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pydantic import ValidationError

from tideleg import Exchange, InputError, PointsFile, Segment, Timing, Waveform
from tideleg_losses.capacitor import CapacitorEsr, CapacitorSettings
from tideleg_losses.capacitor_harmonics import TabledEsrTerm
from tideleg_losses.esr_table import read_esr_table

F = 20e3
TIMING = Timing(F, 0.0)
ROWS = [
    [hz, degc, ohm]
    for degc, scale in ((-40.0, 3.0), (25.0, 1.0), (130.0, 0.7))
    for hz, ohm in (
        (100.0, 9e-3 * scale),
        (2e4, 4e-3 * scale),
        (1e5, 2e-3 * scale),
        (1e6, 3e-3 * scale),
        (2e7, 5e-3 * scale),
    )
]


def esr_by_hand(hertz: Any, degc: float) -> Any:
    """Return the resistance of ROWS, by numpy's own interpolation, first in log f and then in temperature."""
    temperatures = [-40.0, 25.0, 130.0]
    rows = [
        np.interp(np.log(hertz), np.log([r[0] for r in ROWS if r[1] == t]), [r[2] for r in ROWS if r[1] == t])
        for t in temperatures
    ]
    return np.array([np.interp(degc, temperatures, column) for column in np.array(rows).T])


def sampled(segments: list[tuple[float, float, float, float]], samples: int) -> Any:
    """Return the current at the middles of equal steps, by straight lines of its own."""
    time = (np.arange(samples) + 0.5) / samples
    current = np.zeros(samples)
    for place, width, start, end in segments:
        inside = (time >= place) & (time < place + width)
        current[inside] = start + (end - start) * (time[inside] - place) / width
    return current


@settings(max_examples=25, deadline=None)
@given(st.floats(0.15, 0.85), st.floats(-200.0, 200.0), st.floats(10.0, 80.0), st.floats(-30.0, 120.0))
def test_the_loss_is_that_of_the_sampled_currents_spectrum(
    duty: float, mean: float, ripple: float, degc: float
) -> None:
    low, high = mean - ripple / 2, mean + ripple / 2
    segments = [(0.0, duty, low, high)]
    part = Exchange(Waveform(tuple(Segment(*s) for s in segments)), F, 700.0)
    line = TabledEsrTerm(read_esr_table(ROWS)).at(part, TIMING, np.array([[degc]]))
    # 2^16 samples: power by order from the fast transform; orders to 1000 reach the end of the table.
    spectrum = np.abs(np.fft.rfft(sampled(segments, 2**16)) / 2**16) ** 2 * 2.0
    orders = np.arange(1, 1001)
    due = float(np.sum(esr_by_hand(orders * F, degc) * spectrum[1:1001]))
    found = float(line.watts[0, 0])
    # What lies above order 24 is charged at the greatest resistance from there up: at most twice that of 480 kHz.
    rest = float(np.sum(spectrum[25:1001]))
    slack = 3e-3 * due
    assert due - slack <= found <= due + rest * float(esr_by_hand(np.array([2e7]), degc)[0]) + slack


def test_a_sine_like_sum_loses_as_the_voltage_across_a_real_ladder_integrated_in_time() -> None:
    # Time-domain check: p(t) = i(t) v(t) with v from an R-L ladder whose resistance at f is known in closed form.
    # R1 in series with (R2 parallel L): Re Z = R1 + R2 w²L²/(R2² + w²L²), which rises with frequency.
    r1, r2, henry = 2e-3, 3e-3, 2e-8

    def real(hertz: Any) -> Any:
        x = 2 * np.pi * np.asarray(hertz) * henry
        return r1 + r2 * x * x / (r2 * r2 + x * x)

    grid = np.geomspace(1e3, 2e8, 400)
    table = read_esr_table([[float(hz), float(real(hz))] for hz in grid])
    part = Exchange(Waveform((Segment(0.0, 0.4, -30.0, 30.0), Segment(0.4, 0.6, 30.0, -30.0))), F, 700.0)
    found = float(TabledEsrTerm(table).at(part, TIMING, np.array([[25.0]])).watts[0, 0])
    steps = 20_000
    current = sampled([(0.0, 0.4, -30.0, 30.0), (0.4, 0.6, 30.0, -30.0)], steps)
    through = 0.0  # current in L; trapezoidal rule, over enough periods to settle
    gain, energy = r2 / (F * steps) / henry / 2, 0.0
    previous = current[-1]
    for period in range(3):
        energy = 0.0
        for now in current:
            after = (through * (1 - gain) + gain * (previous + now)) / (1 + gain)
            middle = 0.5 * (previous + now)
            energy += r1 * middle**2 + r2 * (middle - 0.5 * (through + after)) ** 2
            through, previous = after, now
        del period
    assert found == pytest.approx(energy / steps, rel=2e-3)


@settings(max_examples=25, deadline=None)
@given(st.floats(0.05, 0.95), st.floats(-200.0, 200.0), st.floats(0.0, 80.0), st.integers(1, 4))
def test_a_flat_table_loses_just_what_the_number_does(duty: float, mean: float, ripple: float, folds: int) -> None:
    # Nothing of the exact mean square may be lost or counted twice, however narrow the pulse.
    current = Waveform((Segment(0.0, duty, mean - ripple / 2, mean + ripple / 2),)).fold(float(folds))
    part = Exchange(current, F * folds, 700.0)
    flat = TabledEsrTerm(read_esr_table([[1e3, 2e-3], [5e8, 2e-3]])).at(part, TIMING, np.array([[60.0]])).watts
    assert float(flat[0, 0]) == pytest.approx(2e-3 * float(current.ac_mean_square()), rel=1e-9, abs=1e-9)


def test_steps_and_candidates_of_any_shape_give_what_each_gives_alone() -> None:
    frequency = np.array([[2e4], [5e4]])
    amps = np.array([[10.0, 40.0, 90.0]])
    part = Exchange(Waveform((Segment(0.0, 0.4, amps, amps + 20.0),)), frequency, 700.0)
    degc = np.array([[-10.0, 25.0, 77.0], [130.0, 60.0, -40.0]])
    term = TabledEsrTerm(read_esr_table(ROWS))
    whole = term.at(part, TIMING, degc)
    for c in range(2):
        for s in range(3):
            one = Exchange(Waveform((Segment(0.0, 0.4, amps[0, s], amps[0, s] + 20.0),)), frequency[c, 0], 700.0)
            alone = term.at(one, TIMING, np.array([[degc[c, s]]]))
            assert whole.watts[c, s] == pytest.approx(float(alone.watts[0, 0]), rel=1e-9)


def test_the_slope_in_temperature_is_that_of_the_table() -> None:
    part = Exchange(Waveform((Segment(0.0, 0.5, 50.0, 70.0),)), F, 700.0)
    term = TabledEsrTerm(read_esr_table(ROWS))
    at = [term.at(part, TIMING, np.array([[degc]])) for degc in (79.0, 80.0, 81.0)]
    assert float(at[1].watts_per_kelvin[0, 0]) == pytest.approx(
        float(at[2].watts[0, 0] - at[0].watts[0, 0]) / 2, rel=1e-9
    )
    assert float(at[1].watts_per_kelvin[0, 0]) < 0.0


def test_a_ripple_of_others_is_charged_at_its_own_frequency() -> None:
    model = CapacitorEsr()
    keys = {"esr_table": ROWS, "external_ripple_spectrum": [["100 Hz", "10 A"], ["100 kHz", "20 A"]]}
    terms = {t.mechanism: t for t in model.terms(CapacitorSettings.model_validate(keys))}
    calm = Exchange(Waveform((Segment(0.0, 1.0, 50.0, 50.0),)), F, 750.0)
    found = terms["capacitor ripple of others"].at(calm, TIMING, np.array([[25.0]])).watts
    assert float(found[0, 0]) == pytest.approx(9e-3 * 100.0 + 2e-3 * 400.0)
    # The trap: all of it at one frequency.
    assert float(found[0, 0]) != pytest.approx(9e-3 * 500.0, rel=0.1)


@pytest.mark.parametrize(
    ("frequency", "degc", "words"),
    [
        (50.0, 25.0, "100 Hz to 2e\\+07 Hz, and 50 Hz"),
        (F, 131.0, "-40 to 130 degC, and the capacitor comes to 131"),
        (F, -41.0, "-41 degC"),
        (3e7, 25.0, "100 % of the squared ripple current"),
    ],
)
def test_nothing_is_extrapolated(frequency: float, degc: float, words: str) -> None:
    term = TabledEsrTerm(read_esr_table(ROWS))
    part = Exchange(Waveform((Segment(0.0, 0.5, 10.0, 10.0),)), frequency, 700.0)
    with pytest.raises(InputError, match=words):
        term.at(part, TIMING, np.array([[degc]]))


def test_a_table_that_ends_too_soon_is_refused_with_the_share_that_it_misses() -> None:
    short = TabledEsrTerm(read_esr_table([[1e3, 1e-3], [5.5 * F, 2e-3]]))
    part = Exchange(Waveform((Segment(0.0, 0.5, 10.0, 10.0),)), F, 700.0)
    due = 100.0 * (1.0 - 8.0 / np.pi**2 * (1.0 + 1.0 / 9.0 + 1.0 / 25.0))
    with pytest.raises(InputError, match=f"{due:.3g} % of the squared"):
        short.at(part, TIMING, np.array([[25.0]]))


HOSTILE = {
    "no rows": ([], "no rows"),
    "one frequency": ([[1e3, 1e-3]], "one frequency"),
    "one temperature": ([[1e3, 25.0, 1e-3], [2e3, 25.0, 1e-3]], "one temperature"),
    "a hole": ([[1e3, 25, 1e-3], [2e3, 25, 1e-3], [1e3, 85, 1e-3]], "no row at 2000 Hz and 85 degC"),
    "twice": ([[1e3, 1e-3], ["1 kHz", 2e-3], [2e3, 1e-3]], "row 2: the point at 1000 Hz stands twice"),
    "mixed": ([[1e3, 1e-3], [2e3, 25.0, 1e-3]], "row 2: rows with and without a temperature are mixed"),
    "negative": ([[1e3, 1e-3], [2e3, -1e-3]], "row 2: found -0.001 ohm"),
    "zero frequency": ([[0.0, 1e-3], [2e3, 1e-3]], "row 1: found 0 Hz"),
    "below zero kelvin": ([[1e3, -300.0, 1e-3], [2e3, 25, 1e-3]], "absolute zero"),
    "nan": ([[1e3, float("nan")], [2e3, 1e-3]], "not a finite resistance"),
    "infinite": ([[float("inf"), 1e-3], [2e3, 1e-3]], "not a finite frequency"),
    "wrong unit": ([["1 kHz", "2 A"], [2e3, 1e-3]], "unit of current"),
    "flat": ([1e3, 1e-3], "row 1: found 1000.0"),
    "long row": ([[1e3, 25, 1e-3, 4]], "row 1"),
    "number": (3.0, "give rows"),
    "too many": ([[1.0 + i, 1e-3] for i in range(10_001)], "at most 10000"),
    "no csv": ("table.xls", "CSV"),
    "truth": ([[True, 1e-3], [2e3, 1e-3]], "found True"),
}


@pytest.mark.parametrize("case", HOSTILE)
def test_hostile_tables_are_refused_in_words(case: str) -> None:
    given, words = HOSTILE[case]
    with pytest.raises(ValueError, match=words):
        read_esr_table(given)


FILES = {
    "header": (PointsFile("esr.csv", ("f", "t", "r"), ((1.0, 2.0, 3.0),), (2,)), "line 1: found"),
    "empty": (PointsFile("esr.csv", ("frequency_hz", "esr_ohm"), (), ()), "no rows"),
    "twice": (
        PointsFile("esr.csv", ("frequency_hz", "esr_ohm"), ((1e3, 1e-3), (1e3, 2e-3)), (2, 5)),
        "esr.csv, line 5: the point at 1000 Hz stands twice",
    ),
}


@pytest.mark.parametrize("case", FILES)
def test_hostile_files_are_refused_with_their_line(case: str) -> None:
    given, words = FILES[case]
    with pytest.raises(ValueError, match=words):
        read_esr_table(given)


def test_a_file_says_the_same_as_its_rows() -> None:
    numbers = tuple(tuple(float(x) for x in row) for row in ROWS)
    file = PointsFile(
        "esr.csv", ("frequency_hz", "temperature_degc", "esr_ohm"), numbers, tuple(range(2, 2 + len(ROWS)))
    )
    np.testing.assert_array_equal(read_esr_table(file).ohms, read_esr_table(ROWS).ohms)


@pytest.mark.parametrize(
    ("keys", "words"),
    [
        ({"esr": 1e-3, "esr_table": ROWS}, "found esr and esr_table; give one"),
        ({"dissipation_factor": 0.1, "capacitance": 1e-3}, "dissipation_frequency is missing"),
        ({"dissipation_factor": 0.1, "dissipation_frequency": 120.0}, "capacitance is missing"),
        ({"dissipation_frequency": 120.0}, "dissipation_factor is missing"),
        ({"esr": 1e-3, "external_ripple_current": 3.0, "external_ripple_spectrum": [[100.0, 3.0]]}, "give one of them"),
        ({"esr_table": ROWS, "external_ripple_current": 3.0}, "external_ripple_spectrum instead"),
    ],
)
def test_half_given_or_double_data_are_refused(keys: dict[str, Any], words: str) -> None:
    with pytest.raises(ValidationError, match=words):
        CapacitorSettings.model_validate(keys)
