"""Capacitors, busbars and control: what they carry in each mode."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tideleg import Exchange, Flow, Position, Segment, Timing, Waveform
from tideleg_losses.busbar import Busbar
from tideleg_losses.capacitor import CapacitorEsr
from tideleg_losses.gate import Gate
from tideleg_losses.standby import Standby

TIMING = Timing(40e3, 200e-9)
WARM = np.array([80.0, 80.0])


def watts(model: Any, keys: dict[str, Any], part: Any) -> dict[str, Any]:
    bound = model.settings.model_validate(keys)
    return {term.mechanism: term.at(part, TIMING, WARM).watts for term in model.terms(bound)}


@settings(max_examples=40)
@given(st.floats(0.05, 0.95), st.floats(-200.0, 200.0), st.floats(0.0, 60.0), st.floats(0.0, 50.0))
def test_link_capacitor_of_a_leg(duty: float, current: float, ripple: float, external: float) -> None:
    # I_C² = D (1 - D) I² + D dI²/12 in either power direction: Erickson and Maksimović, Appendix A; ours adds the rest.
    run = Segment(0.0, duty, np.full(2, current - ripple / 2), np.full(2, current + ripple / 2))
    part = Exchange(Waveform((run,)), 40e3, 750.0)
    both = watts(CapacitorEsr(), {"esr": 2e-3, "external_ripple_current": external}, part)
    found = both["capacitor ESR"] + both["capacitor ripple of others"]
    due = 2e-3 * (duty * (1 - duty) * current**2 + duty * ripple**2 / 12.0 + external**2)
    assert found == pytest.approx(np.full(2, due), rel=1e-9, abs=1e-9)


def flow(active: float) -> Flow:
    one = np.ones(2)
    return Flow(400.0 * one, 750.0 * one, np.array([100.0, -100.0]), np.array([53.0, -53.0]), active * one)


def test_busbars_carry_the_mean_current_of_their_own_side_both_ways() -> None:
    found = watts(Busbar(), {"battery_side_resistance": 2e-4, "link_side_resistance": 3e-4}, flow(1.0))
    assert found["busbar battery side"] == pytest.approx(np.full(2, 2.0))
    assert found["busbar link side"] == pytest.approx(np.full(2, 3e-4 * 53.0**2))


@pytest.mark.parametrize("active", [0.0, 1.0])
def test_control_draws_its_standby_always_and_the_rest_while_switching(active: float) -> None:
    found = watts(Standby(), {"standby_power": 18.0, "switching_power": 22.0}, flow(active))
    assert found["standby"] == pytest.approx(np.full(2, 18.0))
    assert found["control while switching"] == pytest.approx(np.full(2, 22.0 * active))


def test_a_gate_costs_by_being_driven_not_by_its_current() -> None:
    still = Waveform((Segment(0.0, 0.5, np.zeros(2), np.zeros(2)),))
    part = Position(still, 750.0, 750.0, np.array([1.0, 0.0]))
    found = watts(Gate(), {"gate_charge": 230e-9, "gate_voltage": 22.0}, part)["gate"]
    assert found == pytest.approx(np.array([230e-9 * 22.0 * 40e3, 0.0]))
