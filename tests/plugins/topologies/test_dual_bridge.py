"""The dual active bridge against a circuit solved here from its gate signals alone, and its promises.

The circuit: two square waves of half duty across an inductor and a resistance in series. Without resistance every
piece between gate edges is straight and exact; with it every piece is an exponential, integrated by Gauss points.
"""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.optimize import brentq

from tideleg import InputError, Need, Point, plan_from_mapping, run
from tideleg.conformance import topology_checks
from tideleg.registry import installed
from tideleg.stage import build_stage
from tideleg_topologies.dual_bridge import topology
from tideleg_topologies.phase_shift import Drive, corners, shift_for

GAUSS, WEIGHT = np.polynomial.legendre.leggauss(24)
KEYS = {"switching_frequency": "40 kHz", "turns_ratio": 2.0, "dead_time": "200 ns"}


def ask(battery, link, current, *, henry=60e-6, resistance=0.0, active=True, **keys):
    model = topology()
    made = model.settings.model_validate({**KEYS, **keys})
    battery, link, current, resistance = np.broadcast_arrays(
        *(np.atleast_2d(np.asarray(v, dtype=float)) for v in (battery, link, current, resistance))
    )
    point = Point(battery, link, current, resistance, np.full(battery.shape, active))
    return model.operate(point, made, {"inductor": henry})


def one(values):
    return float(np.asarray(values).reshape(-1)[0])


class Circuit:
    """One period between gate edges, by place in the period; `battery(t)` and `link(t)` are the bridges' signs."""

    def __init__(self, battery, link_seen, phase, henry, frequency, ohm=0.0):
        self.lag = phase / (2 * math.pi)
        edges = np.unique(np.mod([0.0, 0.5, self.lag, self.lag + 0.5], 1.0))
        edges = np.append(edges[np.concatenate([[True], np.diff(edges) > 1e-15])], 1.0)
        self.width = np.diff(edges)
        middle = 0.5 * (edges[1:] + edges[:-1])
        self.battery = np.where(middle < 0.5, 1.0, -1.0)
        self.link = np.where(np.mod(middle - self.lag, 1.0) < 0.5, 1.0, -1.0)
        self.place, self.ohm, self.henry = edges, ohm, henry
        self.second = self.width / frequency
        self.voltage = battery * self.battery - link_seen * self.link
        self.start = self._start()

    def _after(self, k, begin, seconds):
        if self.ohm == 0.0:
            return begin + self.voltage[k] * seconds / self.henry
        final = self.voltage[k] / self.ohm
        return final + (begin - final) * np.exp(-self.ohm * seconds / self.henry)

    def _start(self):
        """Return the current at each edge: periodic, and of no mean."""

        def corners_from(first):
            values = [first]
            for k, seconds in enumerate(self.second):
                values.append(float(self._after(k, values[-1], seconds)))
            return np.array(values)

        if self.ohm == 0.0:
            values = corners_from(0.0)
            return values - np.sum(0.5 * (values[1:] + values[:-1]) * self.width)
        zero, more = corners_from(0.0)[-1], corners_from(1.0)[-1]
        return corners_from(zero / (1.0 - (more - zero)))  # the map over a period is affine

    def at(self, place):
        """Return the current at one place of the period."""
        k = min(int(np.searchsorted(self.place, place % 1.0, side="right")) - 1, len(self.width) - 1)
        share = (place % 1.0 - self.place[k]) / self.width[k]
        return float(self._after(k, self.start[k], share * self.second[k]))

    def of(self, taken):
        """Return mean and mean square of what a branch takes, `taken` being its share of the current in each piece."""
        mean = square = 0.0
        for k, width in enumerate(self.width):
            current = taken[k] * self._after(k, self.start[k], 0.5 * (GAUSS + 1.0) * self.second[k])
            mean += width * np.sum(0.5 * WEIGHT * current)
            square += width * np.sum(0.5 * WEIGHT * current**2)
        return mean, square

    def swing(self, taken):
        """Return the charge swing of the ac part over the period, in ampere periods; straight pieces only."""
        mean, _ = self.of(taken)
        charge, seen = 0.0, [0.0]
        for k, width in enumerate(self.width):
            a, b = taken[k] * self.start[k] - mean, taken[k] * self.start[k + 1] - mean
            if a * b < 0.0:
                seen.append(charge + 0.5 * a * width * a / (a - b))
            charge += 0.5 * (a + b) * width
            seen.append(charge)
        return max(seen) - min(seen)


def draw(seed, most):
    """Return a random design and current: `most` is the greatest share of what 90° carries."""
    rng = np.random.default_rng(seed)
    battery, ratio, off = rng.uniform(40, 900), 10 ** rng.uniform(-0.7, 0.7), 2 ** rng.uniform(-1, 1)
    frequency, henry = 10 ** rng.uniform(4, 5.5), 10 ** rng.uniform(-6, -3.5)
    link = battery * off * ratio
    current = rng.uniform(-most, most) * battery * off / (8 * henry * frequency)
    return battery, link, current, henry, frequency, ratio, rng


@pytest.mark.parametrize("seed", range(200))
def test_lossless_it_is_its_switched_circuit(seed):
    battery, link, current, henry, frequency, ratio, _ = draw(seed, 0.999)
    found = ask(battery, link, current, henry=henry, switching_frequency=frequency, turns_ratio=ratio, dead_time=0.0)
    phase = one(found.columns["phase_shift_rad"])
    circuit = Circuit(battery, link / ratio, phase, henry, frequency)
    size = np.abs(circuit.start).max()
    tiny = 1e-6 * size

    def same(value, wanted, scale=1.0):
        assert one(value) == pytest.approx(wanted, rel=1e-6, abs=tiny * scale)

    assert one(found.reason) == 0
    assert abs(phase) <= math.pi / 2
    assert circuit.of(circuit.battery)[0] == pytest.approx(current, abs=tiny)  # the phase carries what was asked
    coil = found.windings["inductor"].current
    same(coil.mean(), 0.0)
    same(coil.rms(), circuit.of(np.ones(len(circuit.width)))[1] ** 0.5)
    same(coil.peak(), circuit.start.max())
    same(coil.valley(), circuit.start.min())
    near, far = found.positions["battery_switch"], found.positions["link_switch"]
    for position, taken, edge, sign in (
        (near, circuit.battery, 0.0, 1.0),
        (far, circuit.link / ratio, circuit.lag, -1.0 / ratio),
    ):
        mean, square = circuit.of(np.where(taken > 0.0, sign, 0.0))
        same(position.current.mean(), mean)
        same(position.current.rms(), square**0.5)
        same(position.turn_on_current(), sign * circuit.at(edge))
        same(position.turn_off_current(), sign * circuit.at(edge + 0.5))
    for name, taken in (("battery_capacitor", circuit.battery), ("link_capacitor", circuit.link / ratio)):
        exchange = found.exchanges[name]
        mean, square = circuit.of(taken)
        same(exchange.current.mean(), mean)
        same(exchange.current.rms(), square**0.5)
        same(exchange.current.ac_rms(), (square - mean**2) ** 0.5)
        # the folded period is half as long: its charge counts half as many ampere periods
        same(exchange.current.charge_swing() / one(exchange.frequency), circuit.swing(taken) / frequency, 1 / frequency)
    assert one(found.exchanges["link_capacitor"].current.mean()) * link == pytest.approx(
        battery * current, rel=1e-9, abs=1e-9 * battery * size
    )


@pytest.mark.parametrize("seed", range(200))
def test_with_resistance_it_is_the_exponential_circuit_within_a_fifth_of_a_percent(seed):
    battery, link, current, henry, frequency, ratio, rng = draw(seed, 0.95)
    ohm = rng.uniform(0.0, 0.02) * henry * frequency
    keys = {"switching_frequency": frequency, "turns_ratio": ratio, "dead_time": 0.0}
    found = ask(battery, link, current, henry=henry, resistance=ohm, **keys)
    circuit = Circuit(battery, link / ratio, one(found.columns["phase_shift_rad"]), henry, frequency, ohm)
    small = 2e-3 * np.abs(circuit.start).max()
    coil = found.windings["inductor"].current
    assert one(found.exchanges["battery_capacitor"].current.mean()) == pytest.approx(current, rel=1e-12)
    assert circuit.of(circuit.battery)[0] == pytest.approx(current, abs=small)
    assert one(coil.rms()) == pytest.approx(circuit.of(np.ones(len(circuit.width)))[1] ** 0.5, abs=small)
    assert one(coil.peak()) == pytest.approx(circuit.start.max(), abs=small)
    assert one(coil.valley()) == pytest.approx(circuit.start.min(), abs=small)
    begins = one(found.positions["battery_switch"].turn_on_current())
    assert begins == pytest.approx(circuit.at(0.0), abs=small)
    edge = one(found.positions["link_switch"].turn_on_current()) * -ratio
    assert edge == pytest.approx(circuit.at(circuit.lag), abs=small)
    for name, taken in (("battery_capacitor", circuit.battery), ("link_capacitor", circuit.link)):
        exchange = found.exchanges[name].current.scaled(ratio if "link" in name else 1.0)
        mean, square = circuit.of(taken)
        assert one(exchange.mean()) == pytest.approx(mean, abs=small)
        assert one(exchange.ac_rms()) == pytest.approx((square - mean**2) ** 0.5, abs=small)


@pytest.mark.parametrize("seed", range(100))
def test_with_six_times_that_resistance_the_straight_pieces_err_no_more_than_documented(seed):
    battery, link, current, henry, frequency, ratio, _ = draw(seed, 0.95)
    ohm = 0.02 * 2 * math.pi * henry * frequency
    keys = {"switching_frequency": frequency, "turns_ratio": ratio, "dead_time": 0.0}
    found = ask(battery, link, current, henry=henry, resistance=ohm, **keys)
    circuit = Circuit(battery, link / ratio, one(found.columns["phase_shift_rad"]), henry, frequency, ohm)
    size = np.abs(circuit.start).max()
    bound = ohm / (24 * henry * frequency) * np.abs(np.diff(circuit.start)).max()
    assert abs(circuit.of(circuit.battery)[0] - current) <= 1.001 * bound
    begins = one(found.positions["battery_switch"].turn_on_current())
    assert begins == pytest.approx(circuit.at(0.0), abs=5e-4 * size)
    rms = circuit.of(np.ones(len(circuit.width)))[1] ** 0.5
    assert one(found.windings["inductor"].current.rms()) == pytest.approx(rms, abs=5e-3 * size)


def test_with_resistance_the_inductor_still_rises_as_its_own_voltage_over_inductance():
    found = ask(350.0, 800.0, [-15.0, -2.0, 2.0, 15.0], resistance=0.3)
    winding = found.windings["inductor"]
    seconds = 0.0
    for segment, voltage in zip(winding.current.segments, winding.voltages, strict=True):
        rise = voltage * segment.width / (60e-6 * 40e3)
        np.testing.assert_allclose(segment.end - segment.start, rise, rtol=1e-9, atol=1e-12)
        seconds = seconds + voltage * segment.width
    np.testing.assert_allclose(seconds, 0.0, atol=1e-10)


def test_drops_move_the_phase_and_the_link_pays_for_them():
    free, held = (ask(400.0, 800.0, 12.0, resistance=r) for r in (0.0, 0.3))
    assert one(held.columns["phase_shift_rad"]) != pytest.approx(one(free.columns["phase_shift_rad"]), rel=1e-3)
    given_ = one(held.exchanges["link_capacitor"].current.mean()) * 800.0
    lost = 0.3 * one(held.windings["inductor"].current.mean_square())
    assert given_ + lost == pytest.approx(400.0 * 12.0, rel=1e-3)
    assert lost / (400.0 * 12.0) > 0.01


@given(
    st.floats(-1.0, 1.0),
    st.floats(0.5, 2.0),
    st.floats(0.0, 0.3),
)
def test_the_few_passes_converge_to_the_current_asked(share, off, damping):
    drive = Drive(np.array([400.0]), np.array([400.0 * off]), 2.4, np.array([damping]))
    lead = -1.0 if share < 0.0 else 1.0
    top = shift_for(np.array([lead * 1e-3]), drive).greatest[0]
    current = np.array([share * top])
    found = shift_for(current, drive)
    assert not found.lost[0]
    c = corners(found.share, np.array([lead]), drive)
    mean = c.widths[0] * (c.begin + c.corner) + c.widths[1] * (c.corner - c.begin)
    np.testing.assert_allclose(mean, current, rtol=1e-11, atol=1e-11)

    def short_of(x):
        c = corners(np.array([x]), np.array([lead]), drive)
        return float((c.widths[0] * (c.begin + c.corner) + c.widths[1] * (c.corner - c.begin) - current)[0])

    if 0.01 < abs(share) < 0.98:  # the smaller root, found here without a derivative
        assert found.share[0] == pytest.approx(brentq(short_of, 0.0, found.share[0] + 1e-3 * 0.25), abs=1e-9)
        grid = np.linspace(0.0, 0.999 * found.share[0], 50)
        assert all(lead * short_of(x) < 0.0 for x in grid)


@given(st.floats(0.5, 2.0), st.floats(-0.99, 0.99))
def test_the_bounds_of_soft_switching_agree_with_the_signs_at_the_edges(off, share):
    battery, link = 400.0, 800.0 * off
    current = share * 0.5 * link / (8 * 60e-6 * 40e3)
    found = ask(battery, link, current)
    phase = abs(one(found.columns["phase_shift_rad"]))
    for bridge in ("battery", "link"):
        bound = one(found.columns[f"{bridge}_bridge_zvs_phase_rad"])
        begins = one(found.positions[f"{bridge}_switch"].turn_on_current())
        if abs(phase - bound) > 1e-9:
            assert (begins < 0.0) == (phase > bound), bridge
    assert min(one(found.columns[f"{b}_bridge_zvs_phase_rad"]) for b in ("battery", "link")) == 0.0


def test_reach_and_the_caution_near_it():
    greatest = 400.0 / (8 * 60e-6 * 40e3)  # P_max/V_battery = V'/(8 f L)
    for sign in (1.0, -1.0):
        found = ask(350.0, 800.0, sign * greatest * np.array([0.2, 0.899, 0.901, 0.9999, 1.0001, 3.0]))
        assert found.reason.tolist() == [[0, 0, 0, 0, 1, 1]]
        assert found.caution.tolist() == [[0, 0, 1, 1, 1, 1]]
        np.testing.assert_allclose(found.columns["phase_shift_rad"][0, 4:], sign * math.pi / 2)
    words = topology().cautions
    assert "90 %" in words[0]
    assert "dead time" in words[1]


def test_a_phase_within_the_dead_time_is_a_caution():
    current = np.linspace(0.0, 4.0, 401)
    found = ask(400.0, 800.0, current)
    lasts = found.columns["phase_shift_rad"] / (2 * math.pi * 40e3)
    np.testing.assert_array_equal(found.caution == 2, lasts < 200e-9)
    assert 0 < np.sum(found.caution == 2) < 401
    assert not np.any(ask(400.0, 800.0, current, dead_time=0.0).caution)
    assert not np.any(ask(400.0, 800.0, current, active=False).caution)


def test_without_power_there_is_no_phase_and_equal_voltages_carry_nothing():
    still = ask(400.0, 800.0, 0.0)
    assert one(still.columns["phase_shift_rad"]) == 0.0
    assert one(still.windings["inductor"].current.rms()) == 0.0
    apart = ask(360.0, 800.0, 0.0)  # a triangle of 40 V over half a period, v/(4 L f) either way, and no power
    assert one(apart.windings["inductor"].current.peak()) == pytest.approx(40.0 / (4 * 60e-6 * 40e3), rel=1e-12)
    assert one(apart.exchanges["battery_capacitor"].current.mean()) == pytest.approx(0.0, abs=1e-12)


def test_the_transformer_sees_the_link_over_its_turns_and_balances():
    found = ask(350.0, 900.0, [-18.0, -3.0, 0.0, 5.0, 18.0])
    winding = found.windings["transformer"]
    assert not winding.lone
    flux, ends = 0.0, []
    for segment, voltage in zip(winding.current.segments, winding.voltages, strict=True):
        flux = flux + segment.width * voltage
        ends.append(flux)
    np.testing.assert_allclose(flux, 0.0, atol=1e-12)
    np.testing.assert_allclose(np.ptp(ends, axis=0), 450.0 / 2.0, rtol=1e-12)  # 450 V for half a period, per period
    assert winding.current is found.windings["inductor"].current


KEYS = {"switching_frequency": "40 kHz", "turns_ratio": 2.0, "dead_time": "200 ns"}


@pytest.mark.parametrize("check", topology_checks(topology(), KEYS, inductance=60e-6, current=24.0), ids=str)
def test_contract(check):
    check()


def test_values_to_start_from_leave_room_for_the_power():
    # P_max = V1 V2'/(8 f L) with the ports matched: De Doncker et al., 1991.
    start = topology().starting_values(Need(400.0, 800.0, 50e3, 40e3))
    assert start["turns_ratio"] == 2.0
    assert 400.0 * 400.0 / (8.0 * 40e3 * start["inductor.inductance"]) == pytest.approx(50e3 / 0.8)
    assert installed().topology("dual-bridge").feeds_link_through_diodes is False


# --- whole plans -----------------------------------------------------------------------------------------------------

SWITCH = {"turn_on_energy": "80 uJ", "turn_off_energy": "60 uJ", "test_current": "20 A", "test_voltage": "400 V"}
PLAN = {
    "title": "isolated",
    "battery": {
        "open_circuit_voltage": "380 V",
        "resistance": "50 mohm",
        "capacity": "20 Ah",
        "start_soc": 0.7,
    },
    "link": {"voltage": "800 V"},
    "stage": {
        "topology": "dual-bridge",
        **KEYS,
        "battery_switch": {"on_resistance": "20 mohm", **SWITCH},
        "link_switch": {"on_resistance": "60 mohm", **SWITCH},
        "inductor": {"inductance": "60 uH", "winding_resistance": "12 mohm"},
        "transformer": {"winding_resistance": "18 mohm"},
        "battery_capacitor": {"capacitance": "40 uF", "esr": "2 mohm"},
        "link_capacitor": {"capacitance": "20 uF", "esr": "3 mohm"},
    },
    "mission": [{"profile": "p.csv", "name": "shuttle", "coolant": "20 degC"}],
}


def planned(folder, rows, **stage):
    (folder / "p.csv").write_text(rows)
    return plan_from_mapping({**PLAN, "stage": {**PLAN["stage"], **stage}}, folder=folder)


ROWS = "time_s,power_w\n0,4000\n10,-4000\n20,0\n30,300\n40,-7300\n50,0\n60,0\n"


def test_a_plan_runs_both_ways_and_its_books_close(tmp_path):
    outcome = run(planned(tmp_path, ROWS))
    steps = outcome.steps
    energy = outcome.missions[0].energy
    assert energy.residual < 1e-9
    assert energy.recomputed_residual < 1e-9
    np.testing.assert_allclose(steps["power_w"], [4000, -4000, 0, 300, -7300, 0], atol=1e-6)
    phase = steps["phase_shift_rad"].to_numpy()
    assert phase[0] > 0.0 > phase[1]
    assert (steps["duty_ratio"] == 0.5).all()
    assert set(steps["conduction"]) == {"continuous"}
    assert (steps["battery_bridge_zvs_phase_rad"] > 0.0).all()  # 380 V stands below 800/2 V
    assert (steps["link_bridge_zvs_phase_rad"] == 0.0).all()
    for part in ("battery_switch", "link_switch", "inductor", "transformer", "battery_capacitor", "link_capacitor"):
        assert (steps[f"{part}.loss_w"] > 0.0).all(), part
    # soft in the strong steps, as the sign of the current says; at rest the battery bridge switches hard
    assert (steps["battery_switch.turn_on_current_a"].to_numpy()[[0, 1]] < 0.0).all()
    assert steps["battery_switch.turn_on_current_a"].iloc[2] > 0.0
    names = {(e.part, e.mechanism) for e in outcome.missions[0].losses}
    assert {("transformer", "winding dc"), ("link_switch", "turn-off")} <= names


def test_the_path_resistance_counts_the_series_current_once(tmp_path):
    stage = build_stage(planned(tmp_path, ROWS))
    shape = (1, 3)
    point = Point(
        np.full(shape, 380.0),
        np.full(shape, 800.0),
        np.array([[10.0, -10.0, 2.0]]),
        np.zeros(shape),
        np.full(shape, True),
    )
    losses = stage.losses(point, {part.slot.name: np.full(shape, 20.0) for part in stage.parts})
    # Two switches of each bridge in the way; those of the link at the squared turns ratio; on_resistance holds at
    # 25 degC and has no slope here, copper at 20 degC.
    wanted = 2 * 20e-3 + 2 * 60e-3 / 2.0**2 + 12e-3 + 18e-3
    np.testing.assert_allclose(losses.path_resistance, wanted, rtol=1e-12)


def test_an_idle_stage_may_rest_with_its_gates_off(tmp_path):
    steps = run(planned(tmp_path, ROWS, idle="off")).steps
    assert steps["conduction"].iloc[2] == "idle"
    assert steps["inductor.current_rms_a"].iloc[2] == 0.0
    assert steps["duty_ratio"].iloc[2] == 0.0
    assert steps["phase_shift_rad"].iloc[2] == 0.0


def test_a_plan_warns_of_the_border_with_time_and_instant(tmp_path):
    warnings = run(planned(tmp_path, ROWS, dead_time="500 ns")).warnings
    near = next(w for w in warnings if "90 %" in w)
    assert near.startswith("shuttle: ")
    assert "16.7 % of the time, first at 40 s" in near
    within = next(w for w in warnings if "dead time" in w)
    assert "50 % of the time, first at 20 s" in within
    assert not any("90 %" in w for w in run(planned(tmp_path, "time_s,power_w\n0,4000\n9,0\n")).warnings)


@pytest.mark.parametrize("power", [9000, -9000])
def test_more_than_a_right_angle_carries_is_refused_with_the_reason(tmp_path, power):
    with pytest.raises(InputError, match=r"'dual-bridge' cannot operate: more current is asked than a phase of 90°"):
        run(planned(tmp_path, f"time_s,power_w\n0,100\n1,{power}\n2,0\n"))


@pytest.mark.parametrize(
    ("keys", "word"),
    [({"turns_ratio": 0.0}, "turns_ratio"), ({"modulation": "diode"}, "modulation"), ({"legs": 2}, "legs")],
)
def test_keys_that_make_no_sense_are_refused_by_name(tmp_path, keys, word):
    with pytest.raises(InputError, match=word):
        build_stage(planned(tmp_path, ROWS, **keys))


def test_the_turns_ratio_has_no_default(tmp_path):
    plan = planned(tmp_path, ROWS)
    del plan.stage.settings["turns_ratio"]
    with pytest.raises(InputError, match="turns_ratio"):
        build_stage(plan)
