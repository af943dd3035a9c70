"""The four-switch leg against a switched circuit solved here from its gate signals alone; modes; published rows.

With resistance the circuit is solved by its exponentials, and no current is imposed: the gates alone must lead to the
battery current that was asked. Formulas: R. W. Erickson and D. Maksimović, Fundamentals of Power Electronics, 2nd ed.,
Kluwer, 2001 (from memory). E-A13: Texas Instruments support forum, thread on four-switch buck-boost inductor selection,
which quotes the data-sheet equation (found).
"""

import dataclasses

import numpy as np
import pytest
from pydantic import ValidationError

from tideleg import Point
from tideleg.registry import installed

F = 50e3
BAND = 0.1
BOOST, BLEND, BUCK = 0, 1, 2
SAMPLES = 4001
TOPOLOGY = installed().topology("four-switch")


def settings(**keys):
    return TOPOLOGY.settings(**{"switching_frequency": F, **keys})


def ask(battery, link, current, henry, mode=BLEND, ohm=0.0, active=True, **keys):
    battery, link, current, ohm, mode = np.broadcast_arrays(
        *(np.atleast_2d(v) for v in (battery, link, current, ohm, mode))
    )
    battery, link, current, ohm = (v.astype(float) for v in (battery, link, current, ohm))
    point = Point(battery, link, current, ohm, np.full(battery.shape, active), mode.astype(np.int64))
    return TOPOLOGY.operate(point, settings(**keys), {"inductor": henry})


def waveforms(operation):
    for group in (operation.positions, operation.windings, operation.exchanges):
        for name, reading in group.items():
            yield name, reading.current


# ---- an independent switched circuit


@dataclasses.dataclass
class Branch:
    """A branch current sampled in each interval between two switching instants."""

    width: list
    current: list

    def integral(self, of):
        weights = np.ones(SAMPLES)  # Simpson: exact for the squares of straight lines
        weights[1:-1:2], weights[2:-1:2] = 4.0, 2.0
        return sum(w * (weights @ of(i)) / weights.sum() for w, i in zip(self.width, self.current, strict=True))

    @property
    def mean(self):
        return self.integral(lambda i: i)

    @property
    def rms(self):
        return np.sqrt(self.integral(np.square))

    @property
    def ac_rms(self):
        mean = self.mean
        return np.sqrt(self.integral(lambda i: (i - mean) ** 2))

    @property
    def extremes(self):
        return max(i.max() for i in self.current), min(i.min() for i in self.current)

    @property
    def charge_swing(self):
        mean, charge, every = self.mean, 0.0, [0.0]
        for width, current in zip(self.width, self.current, strict=True):
            rest = current - mean
            path = charge + np.cumsum(0.5 * (rest[1:] + rest[:-1])) * width / (SAMPLES - 1)
            charge = path[-1]
            every += [path.max(), path.min()]
        return max(every) - min(every)


def gates(battery_upper, link_upper):
    """Return both upper gate signals: the battery's begins the period, the link's ends it; the lower ones oppose."""
    return (lambda t: float(t < battery_upper)), (lambda t: float(t >= 1.0 - link_upper))


def switched(battery, link, shares, henry, ohm, wanted):
    """Solve one period. Lossless, the battery's mean is `wanted`; with resistance it follows from the gates."""
    upper, link_upper = gates(*shares)
    instants = np.unique([0.0, shares[0], 1.0 - shares[1], 1.0])
    widths = np.diff(instants)
    middles = 0.5 * (instants[1:] + instants[:-1])
    volts = [battery * upper(t) - link * link_upper(t) for t in middles]

    def piece(start, volt, width):
        time = np.linspace(0.0, width / F, SAMPLES)
        if ohm == 0.0:
            return start + volt / henry * time
        return start * np.exp(-ohm / henry * time) - volt / ohm * np.expm1(-ohm / henry * time)

    def period(start):
        found = []
        for volt, width in zip(volts, widths, strict=True):
            found.append(piece(start, volt, width))
            start = found[-1][-1]
        return found

    def branch(start, share):
        return Branch(list(widths), [share(t) * i for t, i in zip(middles, period(start), strict=True)])

    if ohm == 0.0:
        at_zero = branch(0.0, upper)
        start = (wanted - at_zero.mean) / sum(w for w, t in zip(widths, middles, strict=True) if upper(t))
        assert abs(period(start)[-1][-1] - start) < 1e-9 * (abs(start) + (battery + link) / (henry * F))
    else:
        end_of_zero = period(0.0)[-1][-1]
        start = end_of_zero / -np.expm1(-ohm / henry / F)
    return {
        "inductor": branch(start, lambda t: 1.0),
        "battery_upper_switch": branch(start, upper),
        "battery_lower_switch": branch(start, lambda t: upper(t) - 1.0),
        "link_upper_switch": branch(start, lambda t: -link_upper(t)),
        "link_lower_switch": branch(start, lambda t: 1.0 - link_upper(t)),
        "battery_capacitor": branch(start, upper),
        "link_capacitor": branch(start, link_upper),
    }


def edge_currents(circuit, name):
    """Return current at the begin and at the end of a switch's run, read off the neighbours in time of its samples."""
    run = [i for i in circuit[name].current if np.any(i != 0.0)]
    return run[0][0], run[-1][-1]


def compare(found, circuit, tolerance):
    """Hold every number that a loss or a column reads against the circuit; sizes relative to the inductor current."""
    size = circuit["inductor"].rms
    for name, waveform in waveforms(found):
        true = circuit[name]
        assert waveform.mean().item() == pytest.approx(true.mean, abs=tolerance * size), name
        assert waveform.rms().item() == pytest.approx(true.rms, abs=tolerance * size), name
    coil, (peak, valley) = found.windings["inductor"].current, circuit["inductor"].extremes
    assert coil.peak().item() == pytest.approx(peak, abs=tolerance * size)
    assert coil.valley().item() == pytest.approx(valley, abs=tolerance * size)
    assert coil.peak_to_peak().item() == pytest.approx(peak - valley, rel=2 * tolerance, abs=tolerance * size)
    for name, position in found.positions.items():
        if not position.has_edges().item():
            continue
        begin, end = edge_currents(circuit, name)
        assert position.turn_on_current().item() == pytest.approx(begin, abs=tolerance * size), name
        assert position.turn_off_current().item() == pytest.approx(end, abs=tolerance * size), name
    for name, exchange in found.exchanges.items():
        true = circuit[name]
        assert exchange.current.ac_rms().item() == pytest.approx(true.ac_rms, abs=tolerance * size), name
        swing = exchange.current.charge_swing().item()
        assert swing == pytest.approx(true.charge_swing, rel=tolerance, abs=0.1 * tolerance * size), name


def drawn(seed, kind):
    """Return a random point: battery and link voltage, current, inductance."""
    rng = np.random.default_rng([seed, len(kind)])
    low, high = {"boost": (0.25, 0.98), "blend": (0.901, 1.099), "buck": (1.02, 4.0), "pairs": (0.25, 4.0)}[kind]
    link = rng.uniform(100, 900)
    battery = link * rng.uniform(low, high)
    current = rng.choice([-1.0, 1.0]) * rng.uniform(5, 300)
    # the triangle of half duty is up to 0.8 times the current, so some points reverse within the period
    henry = 0.25 * max(battery, link) / (F * abs(current) * rng.uniform(0.05, 0.8))
    return battery, link, current, henry, rng


def shares_of(kind, battery, link):
    """Return how long both upper switches are on, without drops, by the documented rules."""
    if kind == "boost":
        return 1.0, battery / link
    if kind == "buck":
        return link / battery, 1.0
    if kind == "pairs":
        duty = link / (battery + link)
        return duty, 1.0 - duty
    link_upper = 1.0 - BAND * (1.0 + BAND - battery / link) / (2.0 * BAND)  # straight from BAND to 0 across the band
    return link_upper * link / battery, link_upper


KINDS = ("boost", "blend", "buck", "pairs")
MODE = {"boost": BOOST, "blend": BLEND, "buck": BUCK, "pairs": 0}


def keys_of(kind):
    return {"control": "pairs"} if kind == "pairs" else {"blend_band": BAND}


@pytest.mark.parametrize("kind", KINDS)
def test_two_hundred_lossless_points_are_their_switched_circuit(kind):
    for seed in range(200):
        battery, link, current, henry, _ = drawn(seed, kind)
        found = ask(battery, link, current, henry, MODE[kind], **keys_of(kind))
        assert found.reason.item() == 0
        circuit = switched(battery, link, shares_of(kind, battery, link), henry, 0.0, current)
        compare(found, circuit, 1e-6)
        assert circuit["battery_capacitor"].mean == pytest.approx(current, rel=1e-9)


@pytest.mark.parametrize("kind", KINDS)
def test_two_hundred_points_with_drops_are_their_exponential_circuit(kind):
    # The drop is up to 1.5 % of the lower PORT voltage: in the blend band the inductor sees almost none while direct.
    for seed in range(200):
        battery, link, current, henry, rng = drawn(seed, kind)
        if kind in ("boost", "buck"):  # room for the drop between the ports
            battery = link * (min(battery / link, 0.96) if kind == "boost" else max(battery / link, 1.04))
        inductor = abs(current) / shares_of(kind, battery, link)[0]
        ohm = rng.uniform(0.0005, 0.015) * min(battery, link) / inductor
        found = ask(battery, link, current, henry, MODE[kind], ohm, **keys_of(kind))
        assert found.reason.item() == 0
        duties = [found.columns[f"{leg}_leg_duty_ratio"].item() for leg in ("battery", "link")]
        circuit = switched(battery, link, duties, henry, ohm, None)
        assert circuit["battery_capacitor"].mean == pytest.approx(current, rel=2e-3)
        compare(found, circuit, 2e-3)
        assert found.exchanges["battery_capacitor"].current.mean().item() == pytest.approx(current, rel=1e-9)
        mean = found.windings["inductor"].current.mean().item()
        left = battery * duties[0] - link * duties[1]
        assert left == pytest.approx(ohm * mean, rel=1e-6)  # volt-seconds with the drop of the mean inductor current


def test_the_mean_of_the_battery_counts_the_ripple_of_the_part_in_which_it_flows():
    # A blend with a ripple as large as its current: the plain I = I_L (1 - e) misses what the triangle adds.
    found = ask(400.0, 405.0, 20.0, 20e-6, BLEND, 0.1, blend_band=0.3)
    coil, taken = found.windings["inductor"].current, found.exchanges["battery_capacitor"].current
    assert taken.mean().item() == pytest.approx(20.0, rel=1e-12)
    plain = coil.mean().item() * found.duty_ratio.item()
    assert abs(plain - 20.0) > 0.02
    left = 400.0 * found.duty_ratio.item() - 405.0 * found.columns["link_leg_duty_ratio"].item()
    assert left == pytest.approx(0.1 * coil.mean().item(), rel=1e-9)


# ---- borders, layout, reasons, cautions


@pytest.mark.parametrize("ohm", [0.0, 0.05])
@pytest.mark.parametrize("current", [-60.0, 60.0])
@pytest.mark.parametrize("pure", [BOOST, BUCK])
def test_blend_meets_the_pure_modes_at_its_borders(pure, current, ohm):
    link = 400.0
    if pure == BOOST:
        battery = link * (1.0 - BAND) + ohm * current
    else:
        duty = 1.0 / (1.0 + BAND)
        battery = (link + ohm * current / duty) / duty
    for nudge in (-1e-9, 0.0, 1e-9):
        one = ask(battery * (1.0 + nudge), link, current, 1e-4, pure, ohm, blend_band=BAND)
        other = ask(battery * (1.0 + nudge), link, current, 1e-4, BLEND, ohm, blend_band=BAND)
        for (name, first), (_, second) in zip(waveforms(one), waveforms(other), strict=True):
            assert first.mean().item() == pytest.approx(second.mean().item(), abs=1e-6 * abs(current)), name
            square = second.mean_square().item()
            assert first.mean_square().item() == pytest.approx(square, abs=1e-6 * current**2), name
        coil, again = (o.windings["inductor"].current for o in (one, other))
        assert coil.peak().item() == pytest.approx(again.peak().item(), rel=1e-6)
        assert coil.valley().item() == pytest.approx(again.valley().item(), rel=1e-6)
        for name, exchange in one.exchanges.items():
            swing = other.exchanges[name].current.charge_swing().item()
            assert exchange.current.charge_swing().item() == pytest.approx(swing, rel=1e-5)


def test_a_blend_held_past_its_border_switches_both_legs_and_does_not_jump():
    # A jump in the loss inside one mode would leave the relaxation without a fixed point.
    ratio = np.linspace(0.85, 1.15, 3001)
    held = ask(400.0 * ratio, 400.0, 50.0, 1e-4, BLEND, 0.03, blend_band=BAND)
    assert not np.any(held.reason)
    for name, position in held.positions.items():
        assert np.all(position.has_edges()), name
        assert np.all(position.driven == 1.0), name
        for edge in (position.turn_on_current(), position.turn_off_current()):
            assert np.max(np.abs(np.diff(edge))) < 0.5, name
    for name, waveform in waveforms(held):
        assert np.max(np.abs(np.diff(waveform.rms()))) < 1.0, name  # rms goes as the root of a vanishing width
    lossless = ask(400.0 * ratio, 400.0, 50.0, 1e-4, BLEND, blend_band=BAND)
    given_to_link = lossless.exchanges["link_capacitor"].current.mean()[0]
    np.testing.assert_allclose(given_to_link, 50.0 * ratio, rtol=1e-12)  # the least pulse takes no power
    for kind, mode, where in (("boost", BOOST, ratio < 0.88), ("buck", BUCK, ratio > 1.12)):
        pure = ask(400.0 * ratio, 400.0, 50.0, 1e-4, mode, 0.03, blend_band=BAND)
        for (name, one), (_, other) in zip(waveforms(pure), waveforms(held), strict=True):
            np.testing.assert_allclose(one.rms()[0, where], other.rms()[0, where], atol=1e-3, err_msg=f"{kind} {name}")


def test_the_resting_leg_has_no_edges_and_no_gate_drive():
    boost, buck = ask(300.0, 400.0, 50.0, 1e-4, BOOST), ask(500.0, 400.0, 50.0, 1e-4, BUCK)
    for operation, resting, working in ((boost, "battery", "link"), (buck, "link", "battery")):
        upper, lower = (operation.positions[f"{resting}_{place}_switch"] for place in ("upper", "lower"))
        assert upper.current.width().item() == pytest.approx(1.0, abs=1e-15)
        assert lower.current.width().item() == 0.0
        for position in (upper, lower):
            assert not position.has_edges().item()
            assert position.driven.item() == 0.0
        for place in ("upper", "lower"):
            position = operation.positions[f"{working}_{place}_switch"]
            assert position.has_edges().item()
            assert position.driven.item() == 1.0
    assert boost.positions["link_lower_switch"].blocks.item() == 400.0
    assert buck.positions["battery_lower_switch"].blocks.item() == 500.0


def test_steps_of_several_modes_are_each_its_own():
    mode, battery = np.array([BOOST, BLEND, BUCK, BLEND, BOOST]), np.array([300.0, 400.0, 500.0, 380.0, 200.0])
    together = ask(battery, 400.0, -40.0, 1e-4, mode, 0.02)
    for k in range(5):
        alone = ask(battery[k], 400.0, -40.0, 1e-4, mode[k], 0.02)
        for (name, one), (_, every) in zip(waveforms(alone), waveforms(together), strict=True):
            assert every.mean_square()[0, k] == pytest.approx(one.mean_square().item(), rel=1e-12, abs=1e-12), name


@pytest.mark.parametrize(
    ("case", "words"),
    [
        ({"battery": 410.0, "link": 400.0, "current": 10.0, "mode": BOOST}, "cannot hold"),
        ({"battery": 390.0, "link": 400.0, "current": 10.0, "mode": BUCK}, "cannot hold"),
        ({"battery": 401.0, "link": 400.0, "current": 100.0, "mode": BUCK, "ohm": 0.1}, "cannot hold"),  # by its drop
        ({"battery": 399.0, "link": 400.0, "current": -100.0, "mode": BOOST, "ohm": 0.1}, "cannot hold"),
        ({"battery": 300.0, "link": 400.0, "current": 400.0, "mode": BOOST, "ohm": 1.0}, "no duty ratio"),
        ({"battery": 500.0, "link": 100.0, "current": -50.0, "mode": BUCK, "ohm": 1.0}, "no duty ratio"),
        ({"battery": 300.0, "link": 400.0, "current": 400.0, "mode": BLEND, "ohm": 1.0}, "no duty ratio"),
        ({"battery": 500.0, "link": 100.0, "current": -50.0, "mode": BLEND, "ohm": 1.0}, "no duty ratio"),
        ({"battery": 300.0, "link": 400.0, "current": -200.0, "control": "pairs", "ohm": 1.0}, "no duty ratio"),
    ],
)
def test_what_it_cannot_do_has_a_reason(case, words):
    reason = ask(henry=1e-4, **case).reason.item()
    assert reason > 0
    assert words in TOPOLOGY.reasons[reason - 1]
    assert ask(henry=1e-4, active=False, **case).reason.item() == 0  # at rest its diodes block both ports


def test_idle_it_carries_nothing_and_drives_nothing():
    for mode in (BOOST, BLEND, BUCK):
        idle = ask(400.0, 400.0, 0.0, 1e-4, mode, active=False)
        assert all(not np.any(w.mean_square()) for _, w in waveforms(idle))
        assert all(not np.any(p.driven) for p in idle.positions.values())
        assert idle.duty_ratio.item() == 0.0
    assert TOPOLOGY.feeds_link_through_diodes is False


@pytest.mark.parametrize(
    ("battery", "mode", "warns"),
    [
        (300.0, BOOST, False),
        (397.0, BOOST, True),
        (4.0, BOOST, True),
        (404.0, BUCK, True),
        (500.0, BUCK, False),
        (400.0, BLEND, False),
        (361.0, BLEND, True),
        (439.0, BLEND, True),
        (350.0, BLEND, True),
    ],
)
def test_a_pulse_below_the_least_is_a_caution(battery, mode, warns):
    # 400 ns of 20 us are 2 %: the shares are 1 - battery/link in boost, 1 - link/battery in buck, 5 % in mid band.
    found = ask(battery, 400.0, 10.0, 1e-4, mode, minimum_pulse="400 ns", blend_band=BAND)
    assert bool(found.caution.item()) is warns
    assert "minimum_pulse" in TOPOLOGY.cautions[0]
    assert not np.any(ask(battery, 400.0, 10.0, 1e-4, mode).caution)
    assert not np.any(ask(battery, 400.0, 0.0, 1e-4, mode, active=False, minimum_pulse="400 ns").caution)


@pytest.mark.parametrize(
    ("keys", "said"),
    [
        ({"blend_band": 0.05, "mode_hysteresis": 0.05}, "not less than blend_band"),
        ({"blend_band": 0.005}, "not less than blend_band"),  # the default hysteresis counts too
        ({"blend_band": 0.0}, "greater than 0"),
        ({"minimum_pulse": "10 us"}, "half a period"),
        ({"control": "pairs", "blend_band": 0.1}, "has no modes: drop blend_band"),
        ({"modulation": "diode"}, "synchronous"),
        ({"legs": 2}, "legs"),
    ],
)
def test_keys_that_make_no_sense_are_refused(keys, said):
    with pytest.raises(ValidationError, match=said):
        settings(**keys)


# ---- published rows


@pytest.mark.parametrize(("battery", "mode"), [(9.0, BOOST), (48.0, BLEND), (46.0, BLEND), (90.0, BUCK)])
def test_the_voltage_ratio_of_the_cascade(battery, mode):
    found = ask(battery, 48.0, 0.5, 1e-4, mode)
    buck, boost = found.duty_ratio.item(), 1.0 - found.columns["link_leg_duty_ratio"].item()
    assert buck / (1.0 - boost) == pytest.approx(48.0 / battery, rel=1e-9)


def test_both_pairs_together():
    found = ask(20.0, 48.0, 4.8, 1e-4, control="pairs")
    duty = found.duty_ratio.item()
    assert duty / (1.0 - duty) == pytest.approx(48.0 / 20.0, rel=1e-12)
    assert found.windings["inductor"].current.mean().item() == pytest.approx(2.0 / (1.0 - duty), rel=1e-12)  # 96 W


def test_e_a13_inductor_of_a_boost_at_least_input():
    current = 0.5 * 48.0 / 9.0  # load current referred to the input
    found = ask(9.0, 48.0, current, 14.02e-6, BOOST, switching_frequency=490e3)
    assert found.windings["inductor"].current.peak_to_peak().item() / current == pytest.approx(0.4, rel=5e-3)
