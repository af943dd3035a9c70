"""The split-link leg against its switched circuit, solved here from the gate signals and Kirchhoff's laws alone.

Rows E-D (three-level): T. Meynard and H. Foch, IEEE PESC 1992 (from memory); each half of the link dV = I_out D_boost/
(f C): charge balance, common practice.
"""

import numpy as np
import pytest

from tideleg import Point, plan_from_mapping, run
from tideleg.registry import installed

F = 50e3


def ask(battery, link, current, inductance, resistance=0.0):
    topology = installed().topology("split-link")
    made = topology.settings(switching_frequency=F)
    battery, link, current, resistance = (
        np.atleast_2d(np.asarray(v, dtype=float)) for v in (battery, link, current, resistance)
    )
    point = Point(battery, link, current, resistance, np.ones(battery.shape, dtype=bool))
    return topology.operate(point, made, {"inductor": inductance})


class Circuit:
    """One period in many small pieces between switching instants; positions are ideal, both halves at link/2."""

    def __init__(self, duty, link, battery, mean, inductance, resistance=0.0):
        edges = np.unique(np.mod([0.0, duty, 0.5, 0.5 + duty], 1.0))
        edges = np.concatenate([edges, [edges[0] + 1.0]])
        self.width = np.diff(edges)
        middle = np.mod(0.5 * (edges[1:] + edges[:-1]), 1.0)
        self.upper_out = (middle < duty).astype(float)  # A at the upper rail, else at the midpoint
        self.lower_out = (np.mod(middle - 0.5, 1.0) < duty).astype(float)  # B at the lower rail, else at the midpoint
        node_a = np.where(self.upper_out > 0, link, 0.5 * link)
        node_b = np.where(self.lower_out > 0, 0.0, 0.5 * link)
        driving = battery - (node_a - node_b)
        tau = inductance / resistance if resistance else np.inf
        seconds = self.width / F
        if resistance:
            decay = np.exp(-seconds / tau)
            rest = driving / resistance
            fixed = 0.0
            for d, r in zip(decay, rest, strict=True):
                fixed = fixed * d + r * (1 - d)
            start = fixed / (1 - np.prod(decay))
            corner = [start]
            for d, r in zip(decay, rest, strict=True):
                corner.append(r + (corner[-1] - r) * d)
            self.corner = np.array(corner)
        else:
            self.corner = np.concatenate([[0.0], np.cumsum(driving / inductance * seconds)])
            assert abs(self.corner[-1]) < 1e-9 * max(1.0, np.abs(self.corner).max())
            flat = np.sum(0.5 * (self.corner[1:] + self.corner[:-1]) * self.width)
            self.corner = self.corner + mean - flat

    def mean_and_square(self, share):
        a, b = self.corner[:-1] * share, self.corner[1:] * share
        return np.sum(self.width * (a + b) / 2), np.sum(self.width * (a * a + a * b + b * b) / 3)


@pytest.mark.parametrize("seed", range(200))
def test_it_is_its_switched_circuit(seed):
    rng = np.random.default_rng(seed)
    link, duty = rng.uniform(300, 1500), rng.uniform(0.03, 0.97)
    current, henry = rng.uniform(-200, 200), 10 ** rng.uniform(-5, -3)
    found = ask(duty * link, link, current, henry)
    circuit = Circuit(duty, link, duty * link, current, henry)
    size = abs(current) + link / (henry * F)

    def compare(waveform, share, what):
        mean, square = circuit.mean_and_square(share)
        assert float(waveform.mean()[0, 0]) == pytest.approx(mean, abs=1e-9 * size), what
        assert float(waveform.mean_square()[0, 0]) == pytest.approx(square, rel=1e-6, abs=1e-9 * size**2), what

    # Kirchhoff at node A, at node B (read where the leg is mirrored) and at the two rails.
    compare(found.windings["inductor"].current, np.ones_like(circuit.width), "inductor")
    compare(found.positions["upper_switch"].current, -circuit.upper_out, "outer position")
    compare(found.positions["upper_switch"].current, -circuit.lower_out, "the other outer position")
    compare(found.positions["lower_switch"].current, 1.0 - circuit.upper_out, "inner position")
    compare(found.exchanges["link_capacitor"].current, circuit.upper_out, "upper half of the link")
    middle = circuit.lower_out - circuit.upper_out
    assert float(found.columns["midpoint.current_mean_a"][0, 0]) == pytest.approx(0.0, abs=1e-9 * size)
    square = circuit.mean_and_square(middle)[1]
    assert float(found.columns["midpoint.current_rms_a"][0, 0]) ** 2 == pytest.approx(
        square, rel=1e-6, abs=1e-9 * size**2
    )
    ripple = circuit.corner.max() - circuit.corner.min()
    assert float(found.windings["inductor"].current.peak_to_peak()[0, 0]) == pytest.approx(ripple, rel=1e-6, abs=1e-9)
    # Turn-off of the outer position at the end of its run, in the same instant as the corner of the circuit.
    assert float(found.windings["inductor"].current.peak()[0, 0]) == pytest.approx(circuit.corner.max(), rel=1e-6)


@pytest.mark.parametrize("seed", range(60))
def test_drops_shift_the_duty_ratio_as_the_exponential_solution_has_it(seed):
    rng = np.random.default_rng(1000 + seed)
    link, duty = rng.uniform(300, 1500), rng.uniform(0.1, 0.9)
    henry = 10 ** rng.uniform(-5, -3)
    current = rng.choice([-1, 1]) * rng.uniform(20, 200)
    resistance = 0.01 * min(duty, 1 - duty) * 0.5 * link / abs(current)
    battery = duty * link
    found = ask(battery, link, current, henry, resistance)
    stated = float(found.duty_ratio[0, 0])
    circuit = Circuit(stated, link, battery, current, henry, resistance)
    mean = np.sum(circuit.width * 0.5 * (circuit.corner[1:] + circuit.corner[:-1]))
    assert mean == pytest.approx(current, rel=2e-3)
    assert float(found.windings["inductor"].current.rms()[0, 0]) == pytest.approx(
        np.sqrt(circuit.mean_and_square(1.0)[1]), rel=2e-3
    )


def test_each_half_of_the_link_has_the_ripple_of_the_published_form():
    # Three-level boost with split output capacitors, no inductor ripple: dV = I_out D_boost/(f C) below half duty.
    duty, current, farad = 0.7, 100.0, 20e-6
    found = ask(duty * 800.0, 800.0, current, 1.0)
    swing = float(found.exchanges["link_capacitor"].current.charge_swing()[0, 0]) / F / farad
    assert swing == pytest.approx(current * duty * (1 - duty) / (F * farad), rel=1e-3)


def test_ripple_is_a_quarter_of_the_two_level_worst_case():
    duties = np.linspace(0.01, 0.99, 197)
    found = ask(duties * 800.0, np.full(197, 800.0), np.full(197, 10.0), 1e-4)
    worst = float(found.windings["inductor"].current.peak_to_peak().max())
    assert 800.0 / (4 * 1e-4 * F) / worst == pytest.approx(4.0, rel=1e-6)


def test_a_stage_on_a_split_link_runs_and_each_half_stands_at_half_the_link(tmp_path):
    (tmp_path / "p.csv").write_text("time_s,power_w\n0,20000\n1,-10000\n2,0\n")
    plan = plan_from_mapping(
        {
            "title": "split",
            "battery": {"open_circuit_voltage": "350 V", "resistance": "50 mohm"},
            "link": {"voltage": "800 V", "trip_voltage": "850 V"},
            "stage": {
                "topology": "split-link",
                "switching_frequency": "40 kHz",
                "switch": {"on_resistance": "10 mohm", "rated_voltage": "650 V"},
                "inductor": {"inductance": "150 uH"},
                "link_capacitor": {"capacitance": "100 uF", "rated_voltage": "500 V"},
            },
            "limits": {"voltage_utilisation": 0.8},
            "mission": [{"profile": "p.csv", "coolant": "40 degC"}],
        },
        folder=tmp_path,
    )
    outcome = run(plan)
    assert outcome.steps["link_capacitor.voltage_v"].tolist() == [400.0, 400.0]
    checks = {check.name: check for check in outcome.limits}
    assert checks["capacitor voltage"].value == 400.0
    assert checks["voltage utilisation"].value == pytest.approx(425.0 / 650.0)
    # Two halves of 100 uF in series make 50 uF across the link.
    assert outcome.safety.stored_energy_j == pytest.approx(0.5 * 50e-6 * 850.0**2)
