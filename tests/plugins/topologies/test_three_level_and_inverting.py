"""Flying-capacitor and inverting legs against a switched circuit solved here by its gate signals alone; published rows.

E-D rows: T. Meynard, H. Foch, IEEE PESC 1992 (from memory), confirmed by switched-waveform simulation; the (N-1)²
inductance saving and the doubled ripple frequency were found in open-hardware notes. E-A12: Texas Instruments
JAJSDG8F, maximum-duty section (found).
"""

import numpy as np
import pytest

from tideleg import Point
from tideleg.registry import installed

F = 50e3


def ask(name, battery, link, current, inductance, resistance=0.0, **keys):
    topology = installed().topology(name)
    made = topology.settings(switching_frequency=F, **keys)
    battery, link, current = (np.atleast_2d(np.asarray(v, dtype=float)) for v in (battery, link, current))
    battery, link, current = np.broadcast_arrays(battery, link, current)
    resistances = np.full(battery.shape, resistance)
    point = Point(battery, link, current, resistances, np.ones(battery.shape, dtype=bool))
    return topology.operate(point, made, {"inductor": inductance})


def circuit(edges, voltage, share, mean, inductance):
    """Solve one period exactly between switching instants.

    edges : sorted instants in the period; voltage(t) : across the inductor; share(t) : what a branch takes of it;
    mean : wanted mean of the inductor current. Return (pieces of (width, start, end, middle instant)).
    """
    edges = np.unique(np.concatenate([[0.0, 1.0], np.mod(edges, 1.0)]))
    middles, widths = 0.5 * (edges[1:] + edges[:-1]), np.diff(edges)
    rise = np.array([voltage(t) for t in middles]) * widths / (inductance * F)
    corner = np.concatenate([[0.0], np.cumsum(rise)])
    assert abs(corner[-1]) < 1e-9 * max(1.0, np.abs(corner).max())
    corner += mean - np.sum(0.5 * (corner[1:] + corner[:-1]) * widths)
    taken = np.array([share(t) for t in middles])
    return widths, corner[:-1], corner[1:], taken


def circuit_with_drops(edges, voltage, inductance, resistance, pieces=4000):
    """Return (instants, inductor current) of the periodic state of L di/dt = v - R i: exact from edge to edge."""
    edges = np.unique(np.concatenate([[0.0, 1.0], np.mod(edges, 1.0), np.linspace(0.0, 1.0, pieces)]))
    decay = np.exp(-resistance / inductance * np.diff(edges) / F)
    towards = np.array([voltage(t) for t in 0.5 * (edges[1:] + edges[:-1])]) / resistance
    end, whole = 0.0, 1.0
    for d, r in zip(decay, towards, strict=True):
        end, whole = end * d + r * (1.0 - d), whole * d
    current = [end / (1.0 - whole)]
    for d, r in zip(decay, towards, strict=True):
        current.append(r + (current[-1] - r) * d)
    return edges, np.array(current)


def share_of(edges, current, share):
    """Return (mean, mean square) of a branch that takes `share(t)` of the inductor current."""
    taken = np.array([share(t) for t in 0.5 * (edges[1:] + edges[:-1])])
    return mean_and_square(np.diff(edges), current[:-1], current[1:], taken)


@pytest.mark.parametrize("seed", range(100))
def test_drops_in_a_flying_capacitor_leg_are_those_of_its_circuit(seed):
    rng = np.random.default_rng(7000 + seed)
    link, duty, henry = rng.uniform(300, 1500), rng.uniform(0.1, 0.9), 10 ** rng.uniform(-4.5, -3)
    current = rng.choice([-1, 1]) * rng.uniform(20, 200)
    resistance = 0.015 * min(duty, 1 - duty) * link / abs(current)
    battery = duty * link
    found = ask("flying-capacitor", battery, link, current, henry, resistance)
    stated = float(found.duty_ratio[0, 0])

    def conducts(t):
        return float(t % 1.0 < stated)

    def across(t):
        return battery - 0.5 * link * (conducts(t) + conducts(t - 0.5))

    edges, path = circuit_with_drops(np.array([0.0, stated, 0.5, 0.5 + stated]), across, henry, resistance)
    assert share_of(edges, path, lambda t: 1.0)[0] == pytest.approx(current, rel=2e-3)
    for waveform, share in (
        (found.windings["inductor"].current, lambda t: 1.0),
        (found.positions["upper_switch"].current, lambda t: -conducts(t)),
        (found.positions["lower_switch"].current, lambda t: 1.0 - conducts(t)),
    ):
        assert float(waveform.rms()[0, 0]) == pytest.approx(np.sqrt(share_of(edges, path, share)[1]), rel=2e-3)


@pytest.mark.parametrize("seed", range(100))
def test_drops_in_an_inverting_leg_are_those_of_its_circuit(seed):
    rng = np.random.default_rng(9000 + seed)
    battery, link, henry = rng.uniform(40, 900), rng.uniform(40, 900), 10 ** rng.uniform(-4.5, -3)
    current = rng.choice([-1, 1]) * rng.uniform(20, 200)
    duty = link / (battery + link)
    resistance = 0.01 * min(battery, link) * duty / abs(current)
    henry = max(henry, resistance / (0.01 * F))  # straight pieces miss the bow of the exponential, about R/(12 L f)
    found = ask("inverting", battery, link, current, henry, resistance)
    stated = float(found.duty_ratio[0, 0])

    def charges(t):
        return float(t % 1.0 < stated)

    edges, path = circuit_with_drops(
        np.array([0.0, stated]), lambda t: battery if charges(t) else -link, henry, resistance
    )
    # The bow of the exponential within a piece moves its mean by about R/(12 L f) of the rise: held against the size.
    size = abs(current) / stated + np.ptp(path)
    assert share_of(edges, path, charges)[0] == pytest.approx(current, abs=2e-3 * size)
    for waveform, share in (
        (found.windings["inductor"].current, lambda t: 1.0),
        (found.positions["battery_switch"].current, charges),
        (found.positions["link_switch"].current, lambda t: charges(t) - 1.0),
    ):
        reference = np.sqrt(share_of(edges, path, share)[1])
        assert float(waveform.rms()[0, 0]) == pytest.approx(reference, rel=2e-3)


def mean_and_square(widths, start, end, taken):
    start, end = start * taken, end * taken
    return np.sum(widths * (start + end) / 2), np.sum(widths * (start**2 + start * end + end**2) / 3)


@pytest.mark.parametrize("seed", range(200))
def test_flying_capacitor_leg_is_its_switched_circuit(seed):
    rng = np.random.default_rng(seed)
    link = rng.uniform(300, 1500)
    duty, current, henry = rng.uniform(0.03, 0.97), rng.uniform(-200, 200), 10 ** rng.uniform(-5, -3)
    found = ask("flying-capacitor", duty * link, link, current, henry)

    def outer(t):
        return float(t % 1.0 < duty)

    def inner(t):
        return float((t - 0.5) % 1.0 < duty)

    edges = np.array([0.0, duty, 0.5, 0.5 + duty])

    def across(t):
        return duty * link - 0.5 * link * (outer(t) + inner(t))

    def compare(waveform, share, what):
        mean, square = mean_and_square(*circuit(edges, across, share, current, henry))
        size = abs(current) + link / (henry * F)
        assert float(waveform.mean()[0, 0]) == pytest.approx(mean, abs=1e-9 * size), what
        assert float(waveform.mean_square()[0, 0]) == pytest.approx(square, rel=1e-9, abs=1e-9 * size**2), what

    compare(found.windings["inductor"].current, lambda t: 1.0, "inductor")
    compare(found.positions["upper_switch"].current, lambda t: -float(outer(t)), "upper")
    compare(found.positions["lower_switch"].current, lambda t: 1.0 - outer(t), "lower")
    compare(found.exchanges["flying_capacitor"].current, lambda t: float(inner(t)) - float(outer(t)), "flying")
    compare(found.exchanges["link_capacitor"].current, lambda t: float(outer(t)), "link")
    _, start, end, _ = circuit(edges, across, lambda t: 1.0, current, henry)
    ripple = max(start.max(), end.max()) - min(start.min(), end.min())
    assert float(found.windings["inductor"].current.peak_to_peak()[0, 0]) == pytest.approx(ripple, rel=1e-6, abs=1e-9)


@pytest.mark.parametrize("seed", range(200))
def test_inverting_leg_is_its_switched_circuit(seed):
    rng = np.random.default_rng(seed)
    battery, link = rng.uniform(40, 900), rng.uniform(40, 900)
    current, henry = rng.uniform(-200, 200), 10 ** rng.uniform(-5, -3)
    duty = link / (battery + link)
    found = ask("inverting", battery, link, current, henry)

    def charges(t):
        return float(t % 1.0 < duty)

    def across(t):
        return battery if charges(t) else -link

    def compare(waveform, share, what):
        mean, square = mean_and_square(*circuit(np.array([0.0, duty]), across, share, current / duty, henry))
        size = abs(current / duty) + (battery + link) / (henry * F)
        assert float(waveform.mean()[0, 0]) == pytest.approx(mean, abs=1e-9 * size), what
        assert float(waveform.mean_square()[0, 0]) == pytest.approx(square, rel=1e-9, abs=1e-9 * size**2), what

    compare(found.windings["inductor"].current, lambda t: 1.0, "inductor")
    compare(found.positions["battery_switch"].current, lambda t: float(charges(t)), "battery switch")
    compare(found.positions["link_switch"].current, lambda t: -(1.0 - charges(t)), "link switch")
    compare(found.exchanges["link_capacitor"].current, lambda t: 1.0 - charges(t), "link")


def ripple(duty, name="flying-capacitor"):
    found = ask(name, duty * 800.0, 800.0, 100.0, 100e-6)
    return float(found.windings["inductor"].current.peak_to_peak()[0, 0])


def test_e_d01_ripple_and_its_greatest_against_two_levels():
    assert ripple(0.25) == pytest.approx(10.0, rel=1e-3)
    three = max(ripple(d) for d in np.linspace(0.01, 0.99, 197))
    assert 800.0 / (4 * 100e-6 * F) / three == pytest.approx(4.0, rel=1e-6)


def test_e_d02_null_at_half_duty_and_doubled_ripple_frequency():
    assert ripple(0.5) == pytest.approx(0.0, abs=1e-9)
    current = ask("flying-capacitor", 200.0, 800.0, 10.0, 1e-4).windings["inductor"].current
    assert abs(current.harmonic(1)[0, 0]) == pytest.approx(0.0, abs=1e-9)
    assert abs(current.harmonic(2)[0, 0]) > 1.0


def test_e_d03_devices_and_flying_capacitor_at_half_the_link():
    found = ask("flying-capacitor", 300.0, 800.0, 10.0, 1e-4)
    assert float(found.positions["upper_switch"].blocks[0, 0]) == 400.0
    assert float(found.exchanges["flying_capacitor"].voltage[0, 0]) == 400.0


def test_e_d04_flying_capacitor_stress_without_ripple():
    flying = ask("flying-capacitor", 200.0, 800.0, 100.0, 1.0).exchanges["flying_capacitor"]
    assert float(flying.current.charge_swing()[0, 0]) / F / 20e-6 == pytest.approx(25.0, rel=1e-3)
    assert float(flying.current.rms()[0, 0]) == pytest.approx(70.711, rel=1e-3)


def test_flying_capacitor_ripple_grows_where_the_current_reverses_inside():
    # At zero mean the simple I min(D, 1 - D)/(f C) says nothing; the triangle still moves charge.
    flying = ask("flying-capacitor", 200.0, 800.0, 0.0, 1e-4).exchanges["flying_capacitor"]
    assert float(flying.current.charge_swing()[0, 0]) > 0.0


def test_e_a12_greatest_duty_ratio_sets_the_reach_of_the_inverting_leg():
    found = ask("inverting", 5.0, 20.0, 1.0, 1e-4)
    assert float(found.duty_ratio[0, 0]) == pytest.approx(0.8, rel=1e-9)
    assert float(found.windings["inductor"].current.mean()[0, 0]) == pytest.approx(1.0 / 0.8)


def test_both_are_continuous_across_half_duty():
    just = [ask("flying-capacitor", d * 800.0, 800.0, 40.0, 1e-4) for d in (0.5 - 1e-9, 0.5 + 1e-9)]
    for group in ("positions", "exchanges", "windings"):
        for name in getattr(just[0], group):
            low, high = (float(getattr(o, group)[name].current.mean_square()[0, 0]) for o in just)
            assert low == pytest.approx(high, rel=1e-6, abs=1e-6), name
