"""Coupled legs against the matrix equation of two coupled windings, solved here from the gate signals alone.

Published: equivalent inductances of inversely coupled legs, P.-L. Wong, P. Xu, B. Yang, F. C. Lee, IEEE Trans. Power
Electronics 16(4), 2001 (from memory), in the form ripple/ripple(k = 0) = (1 - k D/(1 - D))/(1 - k²) below half duty.
"""

from itertools import pairwise

import numpy as np
import pytest
from scipy.linalg import expm

from tideleg import Point
from tideleg.conformance import topology_checks
from tideleg.registry import installed

F = 40e3
PAIR = installed().topology("coupled-pair")


def ask(battery, link, current, inductance, coupling, resistance=0.0, **keys):
    made = PAIR.settings(switching_frequency=F, coupling=coupling, **keys)
    battery, link, current, resistance = (
        np.atleast_2d(np.asarray(v, dtype=float)) for v in (battery, link, current, resistance)
    )
    point = Point(battery, link, current, resistance, np.ones(battery.shape, dtype=bool))
    return PAIR.operate(point, made, {"inductor": inductance})


def circuit(duty, battery, link, total, henry, coupling, ohm=0.0, pieces=200):
    """Return (instants, currents of both legs) over one period: exact state transitions between gate edges."""
    matrix = np.linalg.inv(henry * np.array([[1.0, -coupling], [-coupling, 1.0]]))
    edges = np.unique(np.concatenate([[0.0, duty, 0.5, (0.5 + duty) % 1.0, 1.0], np.linspace(0, 1, pieces)]))
    system = np.zeros((3, 3))
    system[:2, :2] = -ohm * matrix
    whole, steps = np.eye(3), []
    for a, b in pairwise(edges):
        t = 0.5 * (a + b)
        v = np.array([battery - link * (t < duty), battery - link * ((t - 0.5) % 1.0 < duty)])
        system[:2, 2] = matrix @ v
        steps.append(expm(system * (b - a) / F))
        whole = steps[-1] @ whole
    if ohm:
        start = np.linalg.solve(np.eye(2) - whole[:2, :2], whole[:2, 2])
    else:
        assert np.abs(whole[:2, 2]).max() < 1e-6
        start = np.zeros(2)
    state, path = np.array([*start, 1.0]), []
    path.append(state[:2])
    for step in steps:
        state = step @ state
        path.append(state[:2])
    path = np.array(path)
    if not ohm:
        mean = np.sum(np.diff(edges)[:, None] * 0.5 * (path[1:] + path[:-1]), axis=0)
        path = path + total / 2 - mean
    return edges, path


def mean_square(edges, values):
    a, b = values[:-1], values[1:]
    return float(np.sum(np.diff(edges) * (a * a + a * b + b * b) / 3))


@pytest.mark.parametrize("seed", range(200))
def test_it_is_its_coupled_circuit(seed):
    rng = np.random.default_rng(seed)
    link, duty, coupling = rng.uniform(200, 1200), rng.uniform(0.04, 0.96), rng.uniform(0.0, 0.9)
    total, henry = rng.uniform(-300, 300), 10 ** rng.uniform(-4.5, -3)
    found = ask(duty * link, link, total, henry, coupling)
    edges, path = circuit(duty, duty * link, link, total, henry, coupling, pieces=2)
    size = abs(total) + link / (henry * F * (1 - coupling))
    one = path[:, 0]
    inductor = found.windings["inductor"].current
    assert float(inductor.mean()[0, 0]) == pytest.approx(total / 2, abs=1e-9 * size)
    assert float(inductor.mean_square()[0, 0]) == pytest.approx(mean_square(edges, one), rel=1e-6)
    assert float(inductor.peak()[0, 0]) == pytest.approx(one.max(), rel=1e-6, abs=1e-9 * size)
    assert float(inductor.valley()[0, 0]) == pytest.approx(one.min(), rel=1e-6, abs=1e-9 * size)
    both = path.sum(axis=1)
    port = found.exchanges["battery_capacitor"].current
    assert float(port.mean()[0, 0]) == pytest.approx(total, abs=1e-9 * size)
    assert float(port.mean_square()[0, 0]) == pytest.approx(mean_square(edges, both), rel=1e-6, abs=1e-9 * size**2)
    conducts = np.array([float(t < duty) for t in 0.5 * (edges[1:] + edges[:-1])])
    a, b = one[:-1] * conducts, one[1:] * conducts
    upper = float(np.sum(np.diff(edges) * (a * a + a * b + b * b) / 3))
    assert float(found.positions["upper_switch"].current.mean_square()[0, 0]) == pytest.approx(
        upper, rel=1e-6, abs=1e-9 * size**2
    )
    at_end = one[np.argmin(np.abs(edges - duty))]
    assert float(found.positions["upper_switch"].turn_on_current()[0, 0]) == pytest.approx(-one[0], abs=1e-7 * size)
    assert float(found.positions["upper_switch"].turn_off_current()[0, 0]) == pytest.approx(-at_end, abs=1e-7 * size)
    assert float(found.positions["lower_switch"].turn_on_current()[0, 0]) == pytest.approx(at_end, abs=1e-7 * size)
    assert float(found.positions["lower_switch"].turn_off_current()[0, 0]) == pytest.approx(one[0], abs=1e-7 * size)


@pytest.mark.parametrize("seed", range(60))
def test_drops_shift_the_duty_ratio_as_the_exponential_solution_has_it(seed):
    rng = np.random.default_rng(500 + seed)
    link, duty, coupling = rng.uniform(200, 1200), rng.uniform(0.1, 0.9), rng.uniform(0.0, 0.8)
    henry = 10 ** rng.uniform(-4, -3)
    total = rng.choice([-1, 1]) * rng.uniform(50, 300)
    ohm = 0.01 * min(duty, 1 - duty) * link / abs(total / 2)
    found = ask(duty * link, link, total, henry, coupling, ohm)
    edges, path = circuit(float(found.duty_ratio[0, 0]), duty * link, link, total, henry, coupling, ohm)
    mean = float(np.sum(np.diff(edges) * 0.5 * (path[1:, 0] + path[:-1, 0])))
    assert mean == pytest.approx(total / 2, rel=2e-3)
    # Resistance also bends the ripple, by about R/(2 L f) of it.
    assert float(found.windings["inductor"].current.rms()[0, 0]) == pytest.approx(
        np.sqrt(mean_square(edges, path[:, 0])), rel=2e-3
    )


@pytest.mark.parametrize("coupling", [0.0, 0.2, 0.5])
@pytest.mark.parametrize("duty", [0.1, 0.3, 0.45])
def test_published_ripple_of_a_coupled_leg(duty, coupling):
    found = ask(duty * 800.0, 800.0, 100.0, 2e-4, coupling)
    alone = 800.0 * duty * (1 - duty) / (2e-4 * F)
    # The published ratio is that of the active piece; it is the whole ripple while that piece is the steepest climb.
    wanted = alone * (1 - coupling * duty / (1 - duty)) / (1 - coupling**2)
    upper = found.positions["upper_switch"]
    step = abs(float(upper.turn_on_current()[0, 0] - upper.turn_off_current()[0, 0]))
    assert step == pytest.approx(wanted, rel=1e-9)


def test_without_coupling_it_is_two_interleaved_legs():
    rng = np.random.default_rng(3)
    duty, current = rng.uniform(0.05, 0.95, 50), rng.uniform(-200, 200, 50)
    link = np.full(50, 700.0)
    pair = ask(duty * link, link, current, 1e-4, 0.0)
    topology = installed().topology("interleaved")
    point = Point(*(np.atleast_2d(v) for v in (duty * link, link, current, np.zeros(50))), np.ones((1, 50), dtype=bool))
    legs = topology.operate(point, topology.settings(switching_frequency=F, legs=2), {"inductor": 1e-4})
    for group in ("positions", "windings", "exchanges"):
        for name, reading in getattr(legs, group).items():
            other = getattr(pair, group)[name].current
            assert other.mean_square() == pytest.approx(reading.current.mean_square(), rel=1e-9, abs=1e-9), name
            assert other.charge_swing() == pytest.approx(reading.current.charge_swing(), rel=1e-9, abs=1e-9), name


def test_the_battery_port_sees_the_leakage_inductance_only():
    found = ask(250.0, 800.0, 100.0, 2e-4, 0.5)
    alone = ask(250.0, 800.0, 100.0, 1e-4, 0.0)  # L (1 - k), uncoupled
    assert found.exchanges["battery_capacitor"].current.peak_to_peak() == pytest.approx(
        alone.exchanges["battery_capacitor"].current.peak_to_peak(), rel=1e-9
    )


@pytest.mark.parametrize("check", topology_checks(PAIR, {"switching_frequency": "40 kHz", "coupling": 0.4}), ids=str)
def test_it_keeps_every_promise(check):
    check()
