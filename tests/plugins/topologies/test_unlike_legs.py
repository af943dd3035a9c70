"""Legs that differ, legs that rest, and legs whose frequency follows the current.

References: sums of switched legs built here from their own corner points on a fine common grid; a plain loop over
steps for the hysteresis and dwell of shedding; V D (1 - D)/(L f) for the boundary frequency (R. W. Erickson and
D. Maksimović, Fundamentals of Power Electronics, 2nd ed., 2001, chapters 2 and 5).
"""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pydantic import ValidationError

from tideleg import BOUNDARY, CONTINUOUS, Point, Rest
from tideleg.registry import installed

F = 40e3
LEGS = installed().topology("interleaved")


def make(**keys):
    return LEGS.settings(**{"switching_frequency": F, "legs": 3, **keys})


def point(battery, link, current, choice=0):
    battery, link, current = np.broadcast_arrays(
        *(np.atleast_2d(np.asarray(v, float)) for v in (battery, link, current))
    )
    codes = choice if isinstance(choice, int) else np.atleast_2d(choice)
    return Point(battery, link, current, np.zeros(battery.shape), np.ones(battery.shape, bool), codes)


def ask(at, made, henry=150e-6):
    return LEGS.operate(at, made, dict.fromkeys(("inductor", "lead_inductor"), henry))


def triangle(phase, duty, mean, ripple):
    """Return one leg's current: rising while its lower position conducts, for 1 - duty from the carrier's start."""
    x = np.mod(phase, 1.0)
    rises = x < 1 - duty
    return np.where(
        rises, mean - ripple / 2 + ripple * x / (1 - duty), mean + ripple / 2 - ripple * (x - 1 + duty) / duty
    )


def sum_of_legs(duty, link, currents, henries, shifts):
    """Return (battery, link) instantaneous currents on a fine grid of cell middles."""
    x = (np.arange(400_000) + 0.5) / 400_000
    battery, into_link = np.zeros_like(x), np.zeros_like(x)
    for mean, henry, shift in zip(currents, henries, shifts, strict=True):
        leg = triangle(x - shift, duty, mean, link * duty * (1 - duty) / (henry * F))
        battery += leg
        into_link += leg * (np.mod(x - shift, 1.0) >= 1 - duty)
    return battery, into_link


@pytest.mark.parametrize("seed", range(30))
def test_an_unlike_lead_leg_leaves_its_ripple_at_the_switching_frequency(seed):
    rng = np.random.default_rng(seed)
    legs, duty, total = int(rng.integers(2, 6)), rng.uniform(0.05, 0.95), rng.uniform(-300, 300)
    share, weaker = rng.uniform(0.7, 1.3), rng.uniform(0.7, 1.3)
    made = make(legs=legs, lead_leg_current=share, lead_leg_inductance=weaker)
    found = ask(point(duty * 800, 800, total), made)
    others = (legs - share) / (legs - 1)
    currents = np.array([share] + [others] * (legs - 1)) * total / legs
    henries = np.array([weaker] + [1.0] * (legs - 1)) * 150e-6
    battery, into_link = sum_of_legs(duty, 800, currents, henries, np.arange(legs) / legs)
    ports = found.exchanges
    assert float(np.max(ports["battery_capacitor"].frequency)) == F
    assert float(ports["battery_capacitor"].current.mean()[0, 0]) == pytest.approx(total, rel=1e-9, abs=1e-9)
    for waveform, grid in ((ports["battery_capacitor"].current, battery), (ports["link_capacitor"].current, into_link)):
        assert float(waveform.mean_square()[0, 0]) == pytest.approx(np.mean(grid**2), rel=2e-4)
        charge = np.cumsum(grid - grid.mean()) / len(grid)
        assert float(waveform.charge_swing()[0, 0]) == pytest.approx(np.ptp(charge), rel=1e-3, abs=1e-4)
    lead, other = found.windings["lead_inductor"], found.windings["inductor"]
    assert float(lead.current.mean()[0, 0]) == pytest.approx(currents[0])
    assert float(other.current.mean()[0, 0]) == pytest.approx(currents[1])
    assert float(lead.current.peak_to_peak()[0, 0] / other.current.peak_to_peak()[0, 0]) == pytest.approx(1 / weaker)
    assert (lead.copies, other.copies) == (1, legs - 1)


def test_a_null_of_the_ripple_does_not_survive_mismatch():
    # Trap: interleaving nulls hold for matched legs only; what is left stands at the switching frequency.
    even = ask(point(400, 800, 100.0), make(legs=2)).exchanges["battery_capacitor"].current
    unlike = ask(point(400, 800, 100.0), make(legs=2, lead_leg_inductance=0.9)).exchanges["battery_capacitor"].current
    assert float(even.peak_to_peak()[0, 0]) == pytest.approx(0.0, abs=1e-9)
    assert abs(unlike.harmonic(1)[0, 0]) > 0.5


@pytest.mark.parametrize("working", [1, 2, 3])
def test_resting_legs_leave_a_stage_of_fewer_legs(working):
    made = make(shedding="threshold", shedding_current="60 A")
    shed = ask(point(300, 800, 120.0, [working - 1]), made)
    fewer = ask(point(300, 800, 120.0), make(legs=working))
    for port in ("battery_capacitor", "link_capacitor"):
        for what in ("mean", "mean_square", "charge_swing", "peak"):
            theirs = getattr(fewer.exchanges[port].current, what)()
            assert getattr(shed.exchanges[port].current, what)() == pytest.approx(theirs, rel=1e-9, abs=1e-12)
        assert np.max(shed.exchanges[port].frequency) == np.max(fewer.exchanges[port].frequency)
    assert shed.windings["lead_inductor"].current.mean_square() == pytest.approx(
        fewer.windings["inductor"].current.mean_square()
    )
    assert int(np.max(shed.positions["upper_switch"].copies)) == working - 1
    resting = shed.windings["inductor"].current.mean_square()
    assert np.all(resting == 0.0) if working == 1 else np.all(resting > 0.0)


def test_shed_legs_with_a_spread_sum_as_their_own_circuit():
    made = make(legs=4, shedding="threshold", shedding_current="60 A", lead_leg_inductance=0.8, lead_leg_current=1.1)
    for working in (1, 2, 3, 4):
        found = ask(point(300, 800, 120.0, [working - 1]), made)
        share = 1.1 if working > 1 else 1.0
        rest = [(working - share) / max(working - 1, 1)] * (working - 1)
        currents = np.array([share, *rest]) * 120.0 / working
        henries = np.array([0.8] + [1.0] * (working - 1)) * 150e-6
        battery, into_link = sum_of_legs(300 / 800, 800, currents, henries, np.arange(working) / working)
        ports = found.exchanges
        assert float(ports["battery_capacitor"].current.mean_square()[0, 0]) == pytest.approx(
            np.mean(battery**2), rel=2e-4
        )
        assert float(ports["link_capacitor"].current.mean_square()[0, 0]) == pytest.approx(
            np.mean(into_link**2), rel=2e-4
        )


def rest_of(current, duration, loss=None):
    shape = (1, len(current))
    flat = np.full(shape, 300.0)
    none = loss or (lambda code: np.zeros(shape))
    return Rest(np.asarray(duration, float), flat, flat * 2, np.atleast_2d(current), np.ones(shape, bool), none)


def by_plain_loop(current, duration, limit, hysteresis, dwell, legs):
    """Return legs at work, step by step."""
    need = [min(max(math.ceil(abs(i) / limit), 1), legs) for i in current]
    spare = [min(max(math.ceil(abs(i) / (limit * (1 - hysteresis))), 1), legs) for i in current]
    working, since, now, found = need[0], 0.0, 0.0, []
    for up, down, seconds in zip(need, spare, duration, strict=True):
        if up > working:
            working, since = up, now
        elif down < working and now >= since + dwell:
            working, since = down, now
        found.append(working)
        now += seconds
    return found


STEP = st.tuples(st.floats(-400, 400), st.sampled_from([0.25, 0.5, 1.0, 2.0, 64.0]))


@settings(max_examples=300)
@given(
    steps=st.lists(STEP, min_size=1, max_size=120),
    dwell=st.sampled_from([0.0, 0.5, 3.0, 100.0]),
    cut=st.integers(0, 119),
)
def test_shedding_is_its_plain_loop_and_does_not_see_block_borders(steps, dwell, cut):
    current, duration = (np.array(column) for column in zip(*steps, strict=True))
    made = make(legs=5, shedding="threshold", shedding_current=80.0, shedding_hysteresis=0.2, shedding_dwell=dwell)
    whole = LEGS.choose(rest_of(current, duration), made, None)
    assert (whole.code[0] + 1).tolist() == by_plain_loop(current, duration, 80.0, 0.2, dwell, 5)
    if 0 < cut < len(current):
        first = LEGS.choose(rest_of(current[:cut], duration[:cut]), made, None)
        second = LEGS.choose(rest_of(current[cut:], duration[cut:]), made, first.carry)
        assert np.concatenate([first.code, second.code], axis=1).tolist() == whole.code.tolist()


def test_least_loss_takes_the_cheapest_number_and_holds_it_while_the_saving_is_small():
    fixed, ohmic = 20.0, 0.01  # W a leg, and R I² of evenly shared current: the best number is |I| sqrt(R/fixed)
    current = np.linspace(1.0, 250.0, 400)

    def loss(code):
        return np.atleast_2d((code + 1) * fixed + ohmic * current**2 / (code + 1))

    made = make(legs=5, shedding="least loss", shedding_hysteresis=0.0, shedding_dwell=0.0)
    found = LEGS.choose(rest_of(current, np.ones(400), loss), made, None).code[0] + 1
    every = np.stack([loss(code)[0] for code in range(5)])
    assert found.tolist() == (np.argmin(every, axis=0) + 1).tolist()
    lazy = make(legs=5, shedding="least loss", shedding_hysteresis=0.1, shedding_dwell=0.0)
    held = LEGS.choose(rest_of(current, np.ones(400), loss), lazy, None).code[0]
    assert np.all(np.take_along_axis(every, held[None], 0)[0] <= every.min(axis=0) / 0.9 * (1 + 1e-12))
    assert np.count_nonzero(np.diff(held)) <= np.count_nonzero(np.diff(found))


def test_least_loss_never_loads_a_leg_beyond_the_stated_current():
    made = make(legs=3, shedding="least loss", shedding_current="50 A", shedding_dwell=0.0)
    current = np.array([30.0, 70.0, 140.0, -140.0])
    cheapest_alone = lambda code: np.full((1, 4), float(code))  # noqa: E731
    found = LEGS.choose(rest_of(current, np.ones(4), cheapest_alone), made, None).code[0] + 1
    assert found.tolist() == [1, 2, 3, 3]


@pytest.mark.parametrize(
    ("keys", "words"),
    [
        ({"legs": 1, "lead_leg_current": 1.1}, "legs = 1"),
        ({"lead_leg_current": 2.0}, "less than 2"),
        ({"shedding": "threshold"}, "shedding_current is missing"),
        ({"modulation": "boundary"}, "lowest_frequency is missing"),
        ({"modulation": "boundary", "lowest_frequency": "50 kHz"}, "above switching_frequency"),
        ({"lowest_frequency": "10 kHz"}, "belong to modulation"),
    ],
)
def test_keys_that_make_no_sense_are_refused(keys, words):
    with pytest.raises(ValidationError, match=words):
        make(**keys)


class TestBoundary:
    """Frequency per step so that the valley just reverses."""

    made = LEGS.settings(
        switching_frequency="150 kHz", legs=2, modulation="boundary", lowest_frequency="20 kHz", reversal_current="4 A"
    )

    @pytest.mark.parametrize("sign", [1, -1])
    def test_the_valley_passes_zero_by_the_stated_current_inside_the_window(self, sign):
        currents = sign * np.array([30.0, 60.0, 80.0])
        found = ask(point(300, 800, 2 * currents), self.made, 50e-6)
        current = found.windings["inductor"].current
        least = current.valley() if sign > 0 else -current.peak()
        assert least[0].tolist() == pytest.approx([-4.0] * 3)
        frequency = found.timing.frequency[0]
        duty = 300 / 800
        assert frequency == pytest.approx(800 * duty * (1 - duty) / (2 * 50e-6 * (np.abs(currents) + 4.0)))
        assert found.conduction[0].tolist() == [BOUNDARY] * 3
        assert found.exchanges["link_capacitor"].frequency[0] == pytest.approx(2 * frequency)

    def test_outside_the_window_the_frequency_stays_and_conduction_says_so(self):
        found = ask(point(300, 800, [2 * 5.0, 2 * 300.0]), self.made, 50e-6)
        assert found.timing.frequency[0].tolist() == [150e3, 20e3]
        assert found.conduction[0].tolist() == [CONTINUOUS, CONTINUOUS]
        valley = found.windings["inductor"].current.valley()[0]
        assert valley[0] < -4.0  # cannot be slower to reverse than the window lets it
        assert valley[1] > 0.0  # no longer reverses

    def test_both_edges_are_soft_by_sign_inside_the_window(self):
        found = ask(point(300, 800, 2 * 60.0), self.made, 50e-6)
        assert found.positions["lower_switch"].turn_on_current()[0, 0] == pytest.approx(-4.0)
        assert found.positions["upper_switch"].turn_on_current()[0, 0] < 0.0
