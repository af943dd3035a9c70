"""Losses of a switch position: which edge costs what, at hard and soft edges, in both directions, at rest."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tideleg import Position, Segment, Timing, Waveform
from tideleg_losses.channel import Channel, channel_mean_square
from tideleg_losses.dead_time import DeadTime
from tideleg_losses.edges import EnergyLaw
from tideleg_losses.output_charge import OutputCharge
from tideleg_losses.recovery import Recovery
from tideleg_losses.switching import Switching

TIMING = Timing(40e3, 250e-9)
WARM = np.array([80.0])
ENERGIES = {"turn_on_energy": 1e-3, "turn_off_energy": 6e-4, "test_current": 60.0, "test_voltage": 800.0}
AMPERES = st.floats(-300.0, 300.0)


def run(start: float, end: float, width: float = 0.4, voltage: float = 750.0, driven: float = 1.0) -> Position:
    return Position(Waveform((Segment(0.0, width, np.array([start]), np.array([end])),)), voltage, voltage, driven)


def watts(model: Any, keys: dict[str, Any], part: Position, timing: Timing = TIMING) -> dict[str, float]:
    bound = model.settings.model_validate(keys)
    return {term.mechanism: float(term.at(part, timing, WARM).watts[0]) for term in model.terms(bound)}


@settings(max_examples=60)
@given(AMPERES, AMPERES)
def test_the_edge_rule(start: float, end: float) -> None:
    """Turn-on at a positive start, turn-off and recovery by the sign of the end, dead time at each negative edge."""
    part = run(start, end)
    switching = watts(Switching(), ENERGIES, part)
    keys = {"recovery_energy": 1e-4, "test_current": 60.0, "test_voltage": 800.0}
    recovery = watts(Recovery(), keys, part)["recovery"]
    dead = watts(DeadTime(), {"diode_voltage": 3.0, "diode_resistance": 0.01}, part)["dead time"]
    by_voltage = (750.0 / 800.0) ** 1.3
    assert switching["turn-on"] == pytest.approx(40e3 * 1e-3 * max(start, 0.0) / 60.0 * by_voltage)
    assert switching["turn-off"] == pytest.approx(40e3 * 6e-4 * max(end, 0.0) / 60.0 * by_voltage)
    assert recovery == pytest.approx(40e3 * 1e-4 * (max(-end, 0.0) / 60.0 * 750.0 / 800.0) ** 0.6)
    diode = [max(-i, 0.0) for i in (start, end)]
    assert dead == pytest.approx(250e-9 * 40e3 * sum((3.0 + 0.01 * i) * i for i in diode))


@pytest.mark.parametrize("width", [0.0, 1.0])
def test_a_run_without_edges_costs_no_edge(width: float) -> None:
    part = run(-50.0, -50.0, width)
    assert set(watts(Switching(), ENERGIES, part).values()) == {0.0}
    assert watts(DeadTime(), {"diode_voltage": 3.0}, part)["dead time"] == 0.0
    keys = {"recovery_charge": 1e-6, "test_current": 60.0, "test_voltage": 800.0}
    assert watts(Recovery(), keys, part)["recovery"] == 0.0
    assert watts(OutputCharge(), {"output_charge": 3e-7, "test_voltage": 800.0}, part)["output charge"] == 0.0


def test_a_channel_held_on_conducts_all_period() -> None:
    keys = {"on_resistance": 0.01, "diode_voltage": 3.0}
    assert watts(Channel(), keys, run(-50.0, -50.0, 1.0, driven=0.0))["channel conduction"] == pytest.approx(25.0)


def test_output_charge_costs_only_where_the_gate_acts() -> None:
    keys = {"output_charge": 3e-7, "test_voltage": 800.0}
    assert watts(OutputCharge(), keys, run(5.0, 9.0))["output charge"] > 0.0
    assert watts(OutputCharge(), keys, run(5.0, 9.0, driven=0.0))["output charge"] == 0.0


@settings(max_examples=40)
@given(AMPERES, AMPERES, st.floats(0.05, 0.95))
def test_conduction_is_alike_both_ways_but_for_the_diode(start: float, end: float, width: float) -> None:
    part, other = run(start, end, width), run(-start, -end, width)
    bare = {"on_resistance": 0.01}
    assert watts(Channel(), bare, part) == watts(Channel(), bare, other)
    square = float(channel_mean_square(part, TIMING)[0])
    whole = float(part.current.mean_square()[0])
    diode = (min(start, 0.0) ** 2 + min(end, 0.0) ** 2) * 250e-9 * 40e3
    assert square == pytest.approx(max(whole - diode, 0.0), rel=1e-12, abs=1e-9)


def test_channel_and_diode_share_the_run_and_count_no_time_twice() -> None:
    # -100 A flat for 40 % of the period: the diode has it for 1 %, the channel for 39 %.
    part = run(-100.0, -100.0)
    timing = Timing(20e3, 250e-9)
    keys = {"on_resistance": 0.01, "diode_voltage": 3.0}
    assert watts(Channel(), keys, part, timing)["channel conduction"] == pytest.approx(0.01 * 100.0**2 * 0.39)
    assert watts(DeadTime(), {"diode_voltage": 3.0}, part, timing)["dead time"] == pytest.approx(3.0 * 100.0 * 0.01)


def test_without_diode_data_the_channel_keeps_the_dead_times() -> None:
    """Else the time that the diode conducts would cost nothing at all."""
    found = watts(Channel(), {"on_resistance": 0.01}, run(-100.0, -100.0))["channel conduction"]
    assert found == pytest.approx(0.01 * 100.0**2 * 0.4)


def test_dead_time_longer_than_the_run_leaves_the_channel_nothing() -> None:
    part = run(-100.0, -100.0, 0.01)
    keys = {"on_resistance": 0.01, "diode_voltage": 3.0}
    assert watts(Channel(), keys, part)["channel conduction"] == 0.0


def test_a_node_that_stands_below_zero_volts_costs_nothing_and_stays_finite() -> None:
    """As where a battery stands above its link: the topology gives such a step a reason, the losses a number."""
    part = run(20.0, 50.0)._replace(turn_on_voltage=np.array([-40.0]), blocks=np.array([-40.0]))
    assert set(watts(Switching(), ENERGIES, part).values()) == {0.0}
    assert watts(OutputCharge(), {"output_charge": 3e-7, "test_voltage": 800.0}, part)["output charge"] == 0.0


def test_a_lower_voltage_at_turn_on_makes_it_cheaper_than_the_turn_off() -> None:
    part = run(60.0, 60.0)._replace(turn_on_voltage=np.array([375.0]))
    high, low = watts(Switching(), ENERGIES, run(60.0, 60.0)), watts(Switching(), ENERGIES, part)
    assert low["turn-on"] == pytest.approx(high["turn-on"] * 0.5**1.3)
    assert low["turn-off"] == high["turn-off"]


def test_no_jump_into_soft_switching() -> None:
    model = OutputCharge()
    (term,) = model.terms(model.settings.model_validate({"output_charge": 3e-7, "test_voltage": 800.0}))
    current = np.linspace(-8.0, 8.0, 16_001)
    part = Position(Waveform((Segment(0.0, 0.4, current, current + 30.0),)), 750.0, 750.0, 1.0)
    found = term.at(part, TIMING, np.full_like(current, 80.0)).watts
    # Swung by 2 Q/t_d = 2.3 A; the first coulomb saves V, twice the mean: a milliampere may move 1/1150 of it.
    assert np.max(np.abs(np.diff(found))) < found.max() / 1100.0
    assert found[0] == 0.0
    assert found[-1] == found.max() > 0.0


def test_an_energy_law_reaches_its_test_point_and_never_pays_back() -> None:
    law = EnergyLaw(1e-3, 60.0, 800.0, 125.0, 1.0, 1.3, 0.006)
    degc = np.array([125.0, -41.0, -60.0])
    line = law.line(np.full(3, 60.0), 800.0, 40e3, degc)
    assert line.watts[0] == pytest.approx(40.0)
    assert line.watts[1] == pytest.approx(40.0 * (1 - 0.006 * 166))
    assert (line.watts[2], line.watts_per_kelvin[2]) == (0.0, 0.0)
