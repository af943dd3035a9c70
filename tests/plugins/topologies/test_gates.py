"""Gate pulses: which diode carries in a dead time, told from the sign of the current at each edge.

The reference walks one period of gate commands and lets the sign of the current at each edge say where the node goes
in the dead time; common practice (dead-time compensation), no source.
"""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tideleg import Point
from tideleg.registry import installed
from tideleg_topologies.gates import Pulses, gates

F = 50e3


def node_share(command, dead, at_rise, at_fall):
    """Return the share of the period in which the node is at the link, walked edge by edge.

    The upper command lasts from 0 to `command`; each gate turns on `dead` late. `at_rise` is the inductor current (into
    the node) when the upper command begins, `at_fall` when it ends.
    """
    # Before the rise the lower gate has just turned off: a current into the node lifts it at once, else it waits.
    begin = 0.0 if at_rise > 0 else dead
    # After the fall the upper gate has just turned off: a current into the node holds it up for the dead time.
    end = command + (dead if at_fall > 0 else 0.0)
    return end - begin


@given(
    command=st.floats(0.1, 0.9),
    dead=st.floats(0.0, 0.04),
    valley=st.floats(-100, 100),
    ripple=st.floats(0.1, 80),
)
def test_the_shift_is_what_the_edges_do(command, dead, valley, ripple):
    peak = valley + ripple
    # The inductor current is at its peak when the upper position takes over, at its valley when it leaves.
    conducts = node_share(command, dead, at_rise=peak, at_fall=valley)
    found = gates(Pulses(conducts, 1.0 - conducts, valley, peak), F, dead / F, 0.0)
    if abs(valley) > 1e-9 and abs(peak) > 1e-9:
        assert float(found.duty_shift) == pytest.approx(conducts - command, abs=1e-12)
        assert float(found.link_side) == pytest.approx(max(command - dead, 0.0), abs=1e-12)
        assert float(found.battery_side) == pytest.approx(max(1.0 - command - dead, 0.0), abs=1e-12)


def operate(battery, current, **keys):
    topology = installed().topology("half-bridge")
    made = topology.settings(switching_frequency=F, **keys)
    battery, current = np.broadcast_arrays(np.atleast_2d(battery), np.atleast_2d(current))
    battery, current = battery.astype(float), current.astype(float)
    point = Point(
        battery, np.full(battery.shape, 800.0), current, np.zeros(battery.shape), np.ones(battery.shape, bool)
    )
    return topology, topology.operate(point, made, {"inductor": 1e-3})


def test_shift_has_the_sign_of_the_power_and_none_where_the_current_reverses():
    _, found = operate(400.0, [100.0, -100.0, 0.0], dead_time=200e-9)
    assert found.columns["dead_time_duty_shift"][0].tolist() == pytest.approx([0.01, -0.01, 0.0])
    assert found.reason[0].tolist() == [0, 0, 0]


def test_a_ratio_near_one_leaves_no_pulse_and_says_so():
    topology, found = operate([792.0, 700.0], [100.0, 100.0], minimum_pulse=300e-9)
    assert found.reason[0].tolist() == [3, 0]  # 1 % of 20 us is 200 ns
    assert "minimum_pulse" in topology.reasons[2]


def test_the_rectifying_gate_may_vanish_and_its_diode_carries():
    topology, found = operate([16.0, 400.0], [100.0, 100.0], dead_time=300e-9)
    assert found.caution[0].tolist() == [2, 0]  # upper conducts 400 ns, two dead times take 600 ns
    assert found.columns["link_side_gate_duty_ratio"][0, 0] == 0.0
    assert "diode" in topology.cautions[1]


def test_light_load_pulses_are_said_to_be_skipped_not_refused():
    topology, found = operate([400.0], [0.0005], modulation="diode", minimum_pulse=300e-9)
    assert (found.reason[0, 0], found.caution[0, 0]) == (0, 1)
    assert "skip" in topology.cautions[0]


@pytest.mark.parametrize("name", ["flying-capacitor", "split-link", "inverting"])
def test_every_leg_refuses_a_pulse_that_is_too_short(name):
    topology = installed().topology(name)
    made = topology.settings(switching_frequency=F, minimum_pulse="400 ns")
    link = 800.0 if name != "inverting" else 8.0  # inverting: D = 8/(792 + 8)
    point = Point(*(np.full((1, 1), v) for v in (792.0, link, 50.0, 0.0)), np.ones((1, 1), bool))
    found = topology.operate(point, made, {"inductor": 1e-3})
    assert "minimum_pulse" in topology.reasons[int(found.reason[0, 0]) - 1]
