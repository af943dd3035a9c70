"""The relaxation: its books close, it does not depend on blocks, and it says when there is no answer."""

from dataclasses import dataclass
from types import SimpleNamespace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tideleg import Line, Mass, Network, NoEquilibriumError, Path, Seat
from tideleg import march as marching
from tideleg.battery import Battery
from tideleg.heat import modes
from tideleg.march import Demand, march, start
from tideleg.registry import installed
from tideleg.stage import WHOLE_STAGE, BoundTerm, Stage, StagePart

LINK = 750.0
CELLS = ((0.05, 0.002), (0.10, 0.05), (0.15, 0.4))


@dataclass(frozen=True)
class Ohmic:
    """A channel whose resistance grows with temperature; R_25 and slope are invented."""

    ohms: float = 8e-3
    slope: float = 5e-3
    mechanism: str = "channel"
    ohmic: bool = True
    heats: bool = True

    def at(self, part, timing, temperature):
        square = part.current.mean_square()
        return Line(self.ohms * (1 + self.slope * (temperature - 25)) * square, self.ohms * self.slope * square)


@dataclass(frozen=True)
class Edges:
    """Turn-on and turn-off energy, linear in the edge current; 10 uJ/A is invented."""

    energy: float = 1e-5
    mechanism: str = "edges"
    ohmic: bool = False
    heats: bool = True

    def at(self, part, timing, temperature):
        current = np.maximum(part.turn_on_current(), 0) + np.maximum(part.turn_off_current(), 0)
        return Line(timing.frequency * self.energy * current + 0 * temperature, 0 * temperature)


def stage(terms=(Ohmic(), Edges()), plate=0.01, cooled=True, **keys):
    topology = next(t for t in installed().topologies() if t.name == "interleaved")
    given_keys = topology.settings(**{"legs": 4, "switching_frequency": "40 kHz", **keys})
    parts = []
    for slot in (*topology.slots(given_keys), *WHOLE_STAGE):
        own = tuple(BoundTerm(topology, term) for term in terms) if slot.kind == "switch" else ()
        base = SimpleNamespace(inductance=110e-6, capacitance=None, rated_voltage=None, rated_current=None)
        parts.append(StagePart(slot, base, 2 if slot.kind == "switch" else 1, own))
    seats = tuple(Seat(name, "plate", CELLS, 8) for name in ("upper_switch", "lower_switch"))
    network = Network(("coolant",), (Mass("plate", 2000.0),), (Path("plate", "coolant", plate),), seats)
    thermal = modes(network) if cooled else None
    return Stage(topology, given_keys, tuple(parts), thermal, {"inductor": 110e-6}, (), installed())


def battery(**changes):
    soc = np.linspace(0, 1, 11)
    usual = {
        "soc": soc,
        "open_circuit_voltage": 324 + 129 * soc,
        "discharge_resistance": np.full(11, 0.05),
        "charge_resistance": np.full(11, 0.05),
        "capacity": 180 * 3600.0,
        "start_soc": 0.6,
    }
    return Battery(**{**usual, **changes})


def demand(power, seconds, *, cooled=True, terminals="link"):
    power = np.asarray(power, dtype=float)
    seconds = np.broadcast_to(np.asarray(seconds, dtype=float), power.shape)
    coolant = np.full(power.shape, 65.0)
    boundary = coolant[None, :] if cooled else np.zeros((0, len(power)))
    wide = np.full(power.shape, np.inf)
    return Demand(power, terminals, seconds, np.full(power.shape, LINK), boundary, coolant, wide, -wide)


def run(one, pack, wanted, temperature=None):
    return list(march(one, pack, wanted, start(one, pack, wanted, temperature)))


def joined(blocks, get):
    return np.concatenate([np.atleast_2d(get(block))[0] for block in blocks], axis=-1)


def residuals(blocks, wanted):
    given = joined(blocks, lambda b: b.battery.power)
    link = joined(blocks, lambda b: b.power)
    loss = joined(blocks, lambda b: b.losses.total)
    checked = joined(blocks, lambda b: b.checked.total)
    throughput = np.sum(np.abs(given) * wanted.duration)
    return [np.sum(np.abs(given - link - x) * wanted.duration) / throughput for x in (loss, checked)]


@settings(max_examples=25, deadline=None)
@given(
    st.lists(st.floats(-110e3, -100.0) | st.floats(100.0, 160e3) | st.just(0.0), min_size=1, max_size=80),
    st.sampled_from([0.05, 1.0, 30.0, 3600.0]),
    st.sampled_from(["link", "battery"]),
    st.sampled_from(["synchronous", "diode"]),
)
def test_both_closures_are_far_below_a_billionth_of_the_throughput(power, seconds, terminals, modulation):
    wanted = demand(power, seconds, terminals=terminals)
    blocks = run(stage(modulation=modulation), battery(), wanted)
    if np.any(joined(blocks, lambda b: b.battery.power)):
        assert max(residuals(blocks, wanted)) < 1e-9


@settings(max_examples=25, deadline=None)
@given(st.lists(st.floats(-900e3, 900e3), min_size=1, max_size=60), st.sampled_from([1.0, 600.0]))
def test_requested_is_delivered_plus_curtailed(power, seconds):
    wanted = demand(power, seconds)
    pack = battery(capacity=5 * 3600.0, discharge_current_limit=400.0, charge_current_limit=300.0)
    blocks = run(stage(), pack, wanted)
    delivered, curtailed = joined(blocks, lambda b: b.power), joined(blocks, lambda b: b.curtailed)
    np.testing.assert_allclose(delivered + curtailed, power, rtol=1e-9, atol=1e-6)
    cause = joined(blocks, lambda b: b.battery.cause)
    assert np.all((np.abs(curtailed) > 0) <= (cause > 0))


def test_the_result_does_not_depend_on_where_blocks_end(monkeypatch):
    rng = np.random.default_rng(3)
    wanted = demand(rng.uniform(-100e3, 150e3, 700), 1.0)
    whole = run(stage(), battery(), wanted)
    monkeypatch.setattr(marching, "BLOCK", 97)
    cut = run(stage(), battery(), wanted)
    for get in (lambda b: b.end[0], lambda b: b.losses.total, lambda b: b.battery.soc_end):
        # 10 uK is the tolerance of the relaxation; each block adds at most that.
        np.testing.assert_allclose(joined(cut, get), joined(whole, get), rtol=1e-7, atol=1e-5)


def test_splitting_each_step_tenfold_changes_nothing_at_constant_loss():
    constant = (Edges(energy=1e-5),)
    power = np.array([80e3, -60e3, 0.0, 120e3, 10e3])
    pack = battery(capacity=np.inf, discharge_resistance=np.zeros(11), charge_resistance=np.zeros(11))
    coarse = run(stage(constant), pack, demand(power, 7.0))
    fine = run(stage(constant), pack, demand(np.repeat(power, 10), 0.7))
    for k in range(2):
        ends = joined(fine, lambda b, k=k: b.end[k])[9::10]
        np.testing.assert_allclose(joined(coarse, lambda b, k=k: b.end[k]), ends, rtol=0, atol=1e-9)


def test_no_losses_means_battery_power_is_link_power_exactly():
    wanted = demand([50e3, -50e3, 0.0], 1.0, cooled=False)
    blocks = run(stage((), cooled=False), battery(), wanted)
    np.testing.assert_allclose(joined(blocks, lambda b: b.battery.power), wanted.power, rtol=1e-13, atol=1e-9)


def test_one_step_alone_equals_the_same_step_among_many_from_rest():
    many = run(stage(), battery(), demand([90e3, 20e3, -40e3], 2.0))
    alone = run(stage(), battery(), demand([90e3], 2.0))
    assert joined(alone, lambda b: b.end[0])[0] == pytest.approx(joined(many, lambda b: b.end[0])[0], abs=2e-5)


def test_an_hour_step_ends_at_the_steady_state():
    blocks = run(stage(), battery(capacity=np.inf), demand([60e3], 36000.0))
    block = blocks[0]
    steady = stage().modes.steady(block.losses.heat[:, 0, :], np.full((1, 1), 65.0))
    np.testing.assert_allclose(block.end[:, 0, :], steady, atol=1e-6)


def test_a_stage_that_idles_off_neither_switches_nor_loses():
    blocks = run(stage(idle="off"), battery(), demand([0.0, 40e3, 0.0], 1.0))
    loss = joined(blocks, lambda b: b.losses.total)
    assert loss[0] == loss[2] == 0.0
    assert loss[1] > 0.0


def test_runaway_is_named_with_part_instant_and_gain_and_never_clamped():
    hot = stage((Ohmic(ohms=30e-3, slope=0.02),), plate=0.2)
    with pytest.raises(NoEquilibriumError, match=r"no thermal equilibrium: (upper|lower)_switch .* at \d+.*loop gain"):
        run(hot, battery(capacity=np.inf), demand(np.full(400, 150e3), 60.0))


def test_a_profiles_own_bounds_curtail_with_their_cause():
    wanted = demand([100e3, -100e3], 1.0)
    bounded = Demand(
        *[getattr(wanted, f) for f in ("power", "terminals", "duration", "link_voltage", "boundary", "held")],
        np.full(2, 70e3),
        np.full(2, -30e3),
    )
    blocks = run(stage(), battery(), bounded)
    np.testing.assert_allclose(joined(blocks, lambda b: b.power), [70e3, -30e3], rtol=1e-9)
    assert joined(blocks, lambda b: b.battery.cause).tolist() == [1, 1]
