"""Properties that every stage of two-level legs keeps, whatever the operating point.

Tolerances of 1e-12 relative are for rounding: both sides are closed forms of the same physics.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pydantic import ValidationError

from tideleg import (
    BOUNDARY,
    CONTINUOUS,
    DISCONTINUOUS,
    IDLE,
    Operation,
    Point,
    Topology,
)
from tideleg_topologies.half_bridge import topology as half_bridge
from tideleg_topologies.interleaved import topology as interleaved

EXACT = 1e-12
READINGS = ("mean", "mean_square", "peak", "valley", "charge_swing", "width")
MODULATIONS = ("synchronous", "diode")

few = settings(max_examples=80, deadline=None)
voltages = st.floats(20.0, 1500.0)
ratios = st.floats(0.02, 0.98)
wanted_currents = st.floats(-500.0, 500.0, allow_subnormal=False)
leg_counts = st.integers(1, 6)
modulations = st.sampled_from(MODULATIONS)


def run(
    battery: Any,
    link: Any,
    current: Any,
    *,
    legs: int = 1,
    modulation: str = "synchronous",
    frequency: Any = 20e3,
    inductance: Any = 100e-6,
    resistance: Any = 0.0,
    active: Any = True,
) -> Operation:
    topology: Topology = half_bridge() if legs == 1 else interleaved()
    keys = {"switching_frequency": 1.0, "modulation": modulation, "legs": legs}
    model = topology.settings.model_validate(keys).model_copy(update={"switching_frequency": frequency})
    given = [np.asarray(v, dtype=float) for v in (battery, link, current)]
    shape = np.broadcast_shapes(*(v.shape for v in given))
    on = np.broadcast_to(np.asarray(active), shape)
    point = Point(*(np.broadcast_to(v, shape) for v in given), resistance, on)
    return topology.operate(point, model, {"inductor": inductance})


def waveforms_of(operation: Operation) -> dict[str, Any]:
    found = {name: p.current for name, p in operation.positions.items()}
    found |= {name: w.current for name, w in operation.windings.items()}
    return found | {name: e.current for name, e in operation.exchanges.items()}


def numbers_of(operation: Operation) -> dict[str, Any]:
    """Return every number of an operation by a readable name."""
    found: dict[str, Any] = {"duty ratio": operation.duty_ratio, "conduction": operation.conduction}
    found["reason"] = operation.reason
    for name, current in waveforms_of(operation).items():
        found |= {f"{name} {reading}": getattr(current, reading)() for reading in READINGS}
        for index, segment in enumerate(current.segments):
            found |= {f"{name} tile {index} {key}": value for key, value in segment._asdict().items()}
    for name, position in operation.positions.items():
        found |= {f"{name} {key}": getattr(position, key) for key in ("blocks", "turn_on_voltage", "driven")}
        found[f"{name} turn-on"], found[f"{name} turn-off"] = position.turn_on_current(), position.turn_off_current()
    found |= {f"voltage {i}": v for i, v in enumerate(operation.windings["inductor"].voltages)}
    return found


@few
@given(voltages, ratios, wanted_currents, leg_counts, modulations, st.floats(0.0, 0.05))
def test_volt_seconds_balance(
    link: float, ratio: float, current: float, legs: int, modulation: str, drop: float
) -> None:
    # Steady state: no net volt-seconds on the inductor, drops and discontinuous conduction included.
    resistance = drop * link * min(ratio, 1.0 - ratio) / (abs(current) + 1.0)
    op = run(ratio * link, link, current, legs=legs, modulation=modulation, resistance=resistance)
    winding = op.windings["inductor"]
    total = sum(s.width * v for s, v in zip(winding.current.segments, winding.voltages, strict=True))
    assert total == pytest.approx(0.0, abs=EXACT * link)
    for segment, volts in zip(winding.current.segments, winding.voltages, strict=True):
        # and each run's rise is its voltage over its time: L di = v dt
        rise = volts * segment.width / (20e3 * 100e-6)
        assert segment.end - segment.start == pytest.approx(float(rise), rel=1e-9, abs=1e-9)


@few
@given(voltages, ratios, wanted_currents, leg_counts, modulations, st.floats(0.0, 0.05))
def test_charge_balance(link: float, ratio: float, current: float, legs: int, modulation: str, drop: float) -> None:
    resistance = drop * link * min(ratio, 1.0 - ratio) / (abs(current) + 1.0)
    op = run(ratio * link, link, current, legs=legs, modulation=modulation, resistance=resistance)
    upper, lower = op.positions["upper_switch"].current, op.positions["lower_switch"].current
    assert op.windings["inductor"].current.mean() * legs == pytest.approx(current, rel=EXACT, abs=1e-9)
    assert op.exchanges["battery_capacitor"].current.mean() == pytest.approx(current, rel=1e-11, abs=1e-9)
    assert op.exchanges["link_capacitor"].current.mean() == pytest.approx(
        float(-legs * upper.mean()), rel=1e-11, abs=1e-9
    )
    assert lower.mean() - upper.mean() == pytest.approx(current / legs, rel=EXACT, abs=1e-9)
    if np.all(op.conduction == CONTINUOUS):
        share = op.duty_ratio * current
        assert op.exchanges["link_capacitor"].current.mean() == pytest.approx(float(share), rel=1e-11, abs=1e-9)
        assert op.duty_ratio * link == pytest.approx(ratio * link - current / legs * resistance, rel=EXACT)


@few
@given(voltages, ratios, wanted_currents, leg_counts, modulations)
def test_lossless_power_balance(link: float, ratio: float, current: float, legs: int, modulation: str) -> None:
    # V_b I_b = V_link I_link to 1e-12 of the power that would circulate with the whole ripple.
    op = run(ratio * link, link, current, legs=legs, modulation=modulation)
    into_link = op.exchanges["link_capacitor"].current.mean() * link
    size = ratio * link * (abs(current) + legs * link * ratio * (1.0 - ratio) / (20e3 * 100e-6))
    assert into_link == pytest.approx(ratio * link * current, abs=EXACT * size)


@few
@given(voltages, ratios, st.floats(1e-6, 500.0), leg_counts, modulations)
def test_reversing_power_swaps_the_roles(link: float, ratio: float, current: float, legs: int, modulation: str) -> None:
    # Lossless, a leg seen upside down: battery voltage and its complement change places, so do the two positions.
    there = run(ratio * link, link, current, legs=legs, modulation=modulation)
    back = run((1.0 - ratio) * link, link, -current, legs=legs, modulation=modulation)
    for one, other in (("upper_switch", "lower_switch"), ("lower_switch", "upper_switch")):
        a, b = there.positions[one], back.positions[other]
        assert a.current.rms() == pytest.approx(float(b.current.rms()), rel=1e-9, abs=1e-9)
        assert a.current.mean() == pytest.approx(float(b.current.mean()), rel=1e-9, abs=1e-9)
        assert a.turn_on_current() == pytest.approx(float(b.turn_on_current()), rel=1e-9, abs=1e-9)
        assert a.turn_off_current() == pytest.approx(float(b.turn_off_current()), rel=1e-9, abs=1e-9)
        assert a.turn_on_voltage == pytest.approx(float(b.turn_on_voltage), rel=1e-9, abs=1e-9)
    ours, theirs = there.windings["inductor"].current, back.windings["inductor"].current
    assert ours.peak() == pytest.approx(float(-theirs.valley()), rel=1e-9, abs=1e-9)
    assert there.duty_ratio == pytest.approx(float(back.positions["lower_switch"].current.width()), rel=1e-9, abs=1e-12)
    # ... and at the same voltages the duty ratio does not move where conduction is continuous.
    same = run(ratio * link, link, -current, legs=legs, modulation="synchronous")
    assert same.duty_ratio == pytest.approx(ratio, rel=1e-12)


@few
@given(voltages, ratios, wanted_currents, leg_counts)
def test_synchronous_leg_is_never_discontinuous(link: float, ratio: float, current: float, legs: int) -> None:
    op = run(ratio * link, link, current, legs=legs, inductance=10e-6)
    assert op.conduction in (CONTINUOUS, BOUNDARY)
    assert op.windings["inductor"].current.width() == 1.0
    assert op.duty_ratio == pytest.approx(ratio, rel=EXACT)


@few
@given(voltages, ratios, st.floats(1e-6, 10.0), leg_counts, st.sampled_from([-1.0, 1.0]))
def test_emulated_rectifier_carries_no_reverse_current(
    link: float, ratio: float, load: float, legs: int, sign: float
) -> None:
    # `load` in half ripples of one leg: discontinuous below 1.
    half_ripple = 0.5 * link * ratio * (1.0 - ratio) / (20e3 * 100e-6)
    op = run(ratio * link, link, sign * load * half_ripple * legs, legs=legs, modulation="diode")
    current = op.windings["inductor"].current
    if load < 1.0 - 1e-8:
        assert op.conduction == DISCONTINUOUS
        assert current.width() == pytest.approx(load**0.5, rel=1e-9)
        assert current.valley() == 0.0 if sign > 0.0 else current.peak() == 0.0
        assert op.duty_ratio < ratio
    elif load > 1.0 + 1e-8:
        assert op.conduction == CONTINUOUS
        plain = run(ratio * link, link, sign * load * half_ripple * legs, legs=legs)
        ours, theirs = numbers_of(op), numbers_of(plain)
        for name, value in theirs.items():
            assert np.array_equal(ours[name], value), name


@pytest.mark.parametrize("resistance", [0.0, 0.02])
@pytest.mark.parametrize("sign", [-1.0, 1.0])
@pytest.mark.parametrize("legs", [1, 3])
def test_nothing_jumps_at_the_boundary(legs: int, sign: float, resistance: float) -> None:
    def at(load: float) -> dict[str, Any]:
        # half the ripple with the drop that belongs to it: a fixed point, reached in a few rounds
        half = 50.0
        for _ in range(60):
            ratio = (300.0 - sign * half * resistance) / 700.0
            half = 0.5 * 700.0 * ratio * (1.0 - ratio) / (20e3 * 100e-6)
        current = sign * load * half * legs
        return numbers_of(run(300.0, 700.0, current, legs=legs, modulation="diode", resistance=resistance))

    below, on, above = at(1.0 - 1e-7), at(1.0), at(1.0 + 1e-7)
    assert (below["conduction"], on["conduction"], above["conduction"]) == (DISCONTINUOUS, BOUNDARY, CONTINUOUS)
    every = [name for name in below if " tile " not in name]
    readings = [name for name in every if name.split()[-1] in (*READINGS, "turn-on", "turn-off", "turn_on_voltage")]
    assert len(readings) > 30
    for name in readings:
        # A step of 2e-7 in the load moves the narrowest of these by 2e-6 of its scale; a jump would show as 1e-2.
        assert below[name] == pytest.approx(float(above[name]), rel=1e-5, abs=1e-3), name


def test_conduction_at_the_boundary_is_named_in_both_modulations() -> None:
    half_ripple = 0.5 * 600.0 * 0.25 / (20e3 * 100e-6)
    currents = half_ripple * np.array([-1.0, -1.0 + 1e-8, 0.0, 1.0 - 1e-8, 1.0, 1.0 + 1e-8])
    synchronous = run(300.0, 600.0, currents).conduction
    diode = run(300.0, 600.0, currents, modulation="diode").conduction
    assert synchronous.tolist() == [BOUNDARY, CONTINUOUS, CONTINUOUS, CONTINUOUS, BOUNDARY, CONTINUOUS]
    assert diode.tolist() == [BOUNDARY, DISCONTINUOUS, IDLE, DISCONTINUOUS, BOUNDARY, CONTINUOUS]


def test_node_floats_at_the_battery_voltage_after_an_idle_part() -> None:
    half_ripple = 0.5 * 800.0 * 0.25 * 0.75 / (20e3 * 100e-6)
    idle = np.array([0.0, 0.01, 0.025, 0.05, 0.5])
    currents = half_ripple * (1.0 - idle) ** 2
    boost = run(200.0, 800.0, currents, modulation="diode").positions
    buck = run(200.0, 800.0, -currents, modulation="diode").positions
    ramp = np.minimum(idle / 0.05, 1.0)
    assert boost["lower_switch"].turn_on_voltage == pytest.approx(800.0 - 600.0 * ramp)
    assert buck["upper_switch"].turn_on_voltage == pytest.approx(800.0 - 200.0 * ramp)
    # the rectifying position takes over from a conducting one: it turns on at the full swing
    assert boost["upper_switch"].turn_on_voltage == pytest.approx(800.0)
    assert buck["lower_switch"].turn_on_voltage == pytest.approx(800.0)
    for positions in (boost, buck):
        assert np.all(positions["lower_switch"].blocks == 800.0)
        assert np.all(positions["upper_switch"].blocks == 800.0)


def test_discontinuous_charge_meets_its_own_next_period() -> None:
    # The charging triangle runs upper first, then lower: across the end of the period, without a break.
    op = run(200.0, 800.0, -5.0, modulation="diode")
    lower, upper = op.windings["inductor"].current.segments
    assert op.conduction == DISCONTINUOUS
    assert lower.place == 0.0
    assert upper.place + upper.width == 1.0
    assert upper.end == lower.start == op.windings["inductor"].current.valley()
    assert upper.start == lower.end == 0.0
    boost_lower, boost_upper = run(200.0, 800.0, 5.0, modulation="diode").windings["inductor"].current.segments
    assert boost_upper.place == boost_lower.width
    assert boost_upper.start == boost_lower.end > 0.0


@pytest.mark.parametrize("modulation", MODULATIONS)
@pytest.mark.parametrize("legs", [1, 4])
def test_gates_off_leave_nothing_but_the_frequency(legs: int, modulation: str) -> None:
    active = np.array([True, False, True, False])
    currents = np.array([40.0, 0.0, -40.0, 0.3])
    op = run(300.0, 700.0, currents, legs=legs, modulation=modulation, active=active)
    everywhere = run(300.0, 700.0, currents, legs=legs, modulation=modulation)
    assert op.conduction[~active].tolist() == [IDLE, IDLE]
    assert np.all(op.reason == 0)
    assert np.all(op.duty_ratio[~active] == 0.0)
    assert op.timing.frequency == 20e3
    assert op.exchanges["link_capacitor"].frequency == legs * 20e3
    for name, current in waveforms_of(op).items():
        for reading in ("mean", "mean_square", "peak", "valley", "charge_swing"):
            values = getattr(current, reading)()
            assert np.all(values[~active] == 0.0), (name, reading)
            same = getattr(waveforms_of(everywhere)[name], reading)()
            assert values[active] == pytest.approx(same[active], rel=EXACT), (name, reading)
    for segment in op.windings["inductor"].current.segments:
        assert np.all(segment.start[~active] == 0.0)
        assert np.all(segment.end[~active] == 0.0)
    for position in op.positions.values():
        assert position.driven.tolist() == [1.0, 0.0, 1.0, 0.0]
        assert np.all(position.current.width()[~active] == 0.0)
        assert not np.any(position.has_edges()[~active])


def test_no_power_idles_an_emulated_leg_and_circulates_in_a_synchronous_one() -> None:
    idle, synchronous = (run(300.0, 600.0, 0.0, legs=3, modulation=m) for m in ("diode", "synchronous"))
    assert idle.conduction == IDLE
    assert idle.duty_ratio == 0.0
    assert all(p.driven == 0.0 for p in idle.positions.values())
    assert all(current.rms() == 0.0 for current in waveforms_of(idle).values())
    assert synchronous.conduction == CONTINUOUS
    assert synchronous.duty_ratio == 0.5
    ripple = 600.0 * 0.25 / (20e3 * 100e-6)
    assert synchronous.windings["inductor"].current.valley() == pytest.approx(-0.5 * ripple)
    assert all(p.driven == 1.0 for p in synchronous.positions.values())


@pytest.mark.parametrize("modulation", MODULATIONS)
@pytest.mark.parametrize("legs", [1, 2, 5])
def test_infeasible_points_carry_a_reason_and_finite_numbers(legs: int, modulation: str) -> None:
    cases = [  # battery, link, current, resistance, reason
        (400.0, 700.0, 100.0, 0.01, 0),
        (699.999, 700.0, 50.0, 0.0, 0),  # ratio near one
        (1e-3, 700.0, 50.0, 0.0, 0),
        (400.0, 700.0, 0.0, 0.0, 0),
        (400.0, 700.0, 1e-300, 0.01, 0),
        (700.0, 700.0, 50.0, 0.0, 1),
        (800.0, 700.0, 50.0, 0.0, 1),
        (800.0, 700.0, -50.0, 0.1, 1),
        (800.0, 700.0, 0.0, 0.0, 1),
        (400.0, 0.0, 10.0, 0.0, 1),
        (0.0, 700.0, 50.0, 0.0, 2),
        (400.0, 700.0, 1e4 * legs, 0.05, 2),
        (690.0, 700.0, -1e3 * legs, 0.05, 2),
    ]
    battery, link, current, resistance, reason = (np.array(column) for column in zip(*cases, strict=True))
    op = run(battery, link, current, legs=legs, modulation=modulation, resistance=resistance)
    assert op.reason.tolist() == reason.tolist()
    for name, values in numbers_of(op).items():
        assert np.all(np.isfinite(values)), name
    assert np.all((op.duty_ratio >= 0.0) & (op.duty_ratio <= 1.0))
    feasible = reason == 0
    mean = op.windings["inductor"].current.mean() * legs
    assert mean[feasible] == pytest.approx(current[feasible], rel=1e-9)
    reasons = half_bridge().reasons
    assert "not below the link voltage" in reasons[0]
    assert "no duty ratio" in reasons[1]


def test_gates_off_need_no_duty_ratio_but_cannot_hold_back_a_higher_battery() -> None:
    # With its gates off the upper diode still conducts where the battery stands above the link.
    op = run([400.0, 800.0], 700.0, [1e5, 0.0], resistance=0.05, active=False)
    assert op.reason.tolist() == [0, 1]


def test_more_drop_means_less_duty_ratio_in_discharge_and_more_in_charge() -> None:
    out = run(350.0, 700.0, 100.0, resistance=np.array([0.0, 0.1, 0.2]))
    back = run(350.0, 700.0, -100.0, resistance=np.array([0.0, 0.1, 0.2]))
    # V_b - I R = D V_link, by hand: (350 -+ 10)/700 and (350 -+ 20)/700
    assert out.duty_ratio == pytest.approx([350.0 / 700.0, 340.0 / 700.0, 330.0 / 700.0], rel=EXACT)
    assert back.duty_ratio == pytest.approx([350.0 / 700.0, 360.0 / 700.0, 370.0 / 700.0], rel=EXACT)


@pytest.mark.parametrize("modulation", MODULATIONS)
@pytest.mark.parametrize("legs", [1, 3])
def test_candidates_broadcast_and_one_step_alone_equals_the_same_among_many(legs: int, modulation: str) -> None:
    random = np.random.default_rng(11)
    frequency = np.array([[10e3], [20e3], [80e3]])
    inductance = np.array([[200e-6], [50e-6], [300e-6]])
    resistance = random.uniform(0.0, 0.05, (3, 30))
    battery, current = random.uniform(100.0, 500.0, (1, 30)), random.uniform(-120.0, 120.0, (3, 30))
    current[:, 5] = 0.0
    keys = {"legs": legs, "modulation": modulation}
    every = run(battery, 600.0, current, frequency=frequency, inductance=inductance, resistance=resistance, **keys)
    names = [name for name in numbers_of(every) if " tile " not in name]
    for row, step in [(0, 0), (1, 5), (2, 29), (0, 17), (1, 12), (2, 3)]:
        alone = run(
            battery[0, step],
            600.0,
            current[row, step],
            frequency=float(frequency[row, 0]),
            inductance=float(inductance[row, 0]),
            resistance=float(resistance[row, step]),
            **keys,
        )
        ours, theirs = numbers_of(every), numbers_of(alone)
        for name in names:
            among = np.broadcast_to(ours[name], (3, 30))[row, step]
            assert among == pytest.approx(float(theirs[name]), rel=1e-12, abs=1e-12), (name, row, step)


@pytest.mark.parametrize("modulation", MODULATIONS)
def test_one_interleaved_leg_is_a_half_bridge(modulation: str) -> None:
    currents = np.linspace(-200.0, 200.0, 41)
    single = run(300.0, 700.0, currents, modulation=modulation)
    topology = interleaved()
    keys = {"switching_frequency": 20e3, "modulation": modulation, "legs": 1}
    point = Point(np.full(41, 300.0), np.full(41, 700.0), currents, 0.0, np.ones(41, dtype=bool))
    other = topology.operate(point, topology.settings.model_validate(keys), {"inductor": 100e-6})
    ours, theirs = numbers_of(single), numbers_of(other)
    assert ours.keys() == theirs.keys()
    for name, value in ours.items():
        assert np.array_equal(value, theirs[name]), name


def test_more_legs_share_the_current_and_ripple_faster() -> None:
    op = run(250.0, 700.0, 120.0, legs=4)
    assert op.windings["inductor"].current.mean() == pytest.approx(30.0)
    assert op.windings["inductor"].copies == op.positions["upper_switch"].copies == 4
    assert op.exchanges["battery_capacitor"].frequency == 80e3
    assert op.exchanges["battery_capacitor"].voltage == 250.0
    assert op.exchanges["link_capacitor"].voltage == 700.0
    assert op.timing.frequency == 20e3


@pytest.mark.parametrize(("topology", "legs"), [(half_bridge(), 1), (interleaved(), 3)])
def test_slots_and_operation_name_the_same_parts(topology: Topology, legs: int) -> None:
    keys = {"switching_frequency": "40 kHz", "legs": legs, "dead_time": "200 ns"}
    model = topology.settings.model_validate(keys)
    slots = {slot.name: slot for slot in topology.slots(model)}
    op = run(300.0, 700.0, 10.0, legs=legs)
    assert isinstance(topology, Topology)
    assert {n for n, s in slots.items() if s.kind == "switch"} == set(op.positions)
    assert {n for n, s in slots.items() if s.kind == "inductor"} == set(op.windings)
    assert {n for n, s in slots.items() if s.kind == "capacitor"} == set(op.exchanges)
    assert {n: s.copies for n, s in slots.items()} == {
        "upper_switch": legs,
        "lower_switch": legs,
        "inductor": legs,
        "battery_capacitor": 1,
        "link_capacitor": 1,
    }
    assert slots["upper_switch"].table == slots["lower_switch"].table == "switch"
    assert topology.source
    point = Point(np.array(300.0), np.array(700.0), np.array(10.0), 0.0, np.array(True))
    timing = topology.operate(point, model, {"inductor": 1e-4}).timing
    assert timing == (40e3, 200e-9)


@pytest.mark.parametrize(
    ("topology", "keys", "key", "words"),
    [
        (half_bridge(), {"switching_frequency": "0 Hz"}, "switching_frequency", "greater than 0"),
        (half_bridge(), {}, "switching_frequency", "required"),
        (half_bridge(), {"switching_frequency": "20 kHz", "legs": 2}, "legs", "should be 1"),
        (half_bridge(), {"switching_frequency": "20 kHz", "dead_time": "-1 ns"}, "dead_time", "greater than or equal"),
        (half_bridge(), {"switching_frequency": "20 kHz", "dead_time": "25 us"}, "dead_time", "less than 2.5e-05 s"),
        (
            half_bridge(),
            {"switching_frequency": "20 kHz", "modulation": "pwm"},
            "modulation",
            "'synchronous', 'diode' or",
        ),
        (half_bridge(), {"switching_frequency": "20 kHz", "idle": "sleep"}, "idle", "'switching' or 'off'"),
        (half_bridge(), {"switching_frequency": "20 uH"}, "switching_frequency", "unit of inductance"),
        (half_bridge(), {"switching_frequency": "20 kHz", "phases": 2}, "phases", "not permitted"),
        (interleaved(), {"switching_frequency": "20 kHz"}, "legs", "required"),
        (interleaved(), {"switching_frequency": "20 kHz", "legs": 0}, "legs", "greater than or equal to 1"),
        (interleaved(), {"switching_frequency": "20 kHz", "legs": 2.0}, "legs", "valid integer"),
        (interleaved(), {"switching_frequency": "20 kHz", "legs": True}, "legs", "valid integer"),
        (interleaved(), {"switching_frequency": "20 kHz", "legs": 2, "shift": 0.5}, "shift", "not permitted"),
    ],
)
def test_settings_refuse_what_makes_no_sense(topology: Topology, keys: dict[str, Any], key: str, words: str) -> None:
    with pytest.raises(ValidationError) as caught:
        topology.settings.model_validate(keys)
    faults = {".".join(map(str, fault["loc"])): fault["msg"] for fault in caught.value.errors()}
    assert words in faults[key]
