"""Modes of the four-switch leg step by step, and whole runs of a battery whose range overlaps the link."""

import json

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tideleg import InputError, Rest, march
from tideleg.command import main
from tideleg.conformance import topology_checks
from tideleg.registry import installed
from tideleg.running import run

F = 50e3
TOPOLOGY = installed().topology("four-switch")


def settings(**keys):
    return TOPOLOGY.settings(**{"switching_frequency": F, **keys})


# ---- choice of modes


def rest(ratio):
    ratio = np.atleast_2d(ratio)
    link = np.full(ratio.shape, 400.0)
    return Rest(np.ones(ratio.shape[-1]), 400.0 * ratio, link, link * 0, link > 0, lambda code: link * 0)


def plain_modes(ratios, band, hysteresis):
    """Walk the steps one by one."""
    mode, found = None, []
    low, high = 1.0 - band, 1.0 + band
    for ratio in ratios:
        if mode is None:
            mode = "boost" if ratio <= low else "blend" if ratio <= high else "buck"
        if mode == "boost":
            mode = "buck" if ratio > high + hysteresis else "blend" if ratio > low + hysteresis else "boost"
        elif mode == "blend":
            mode = "buck" if ratio > high + hysteresis else "boost" if ratio < low - hysteresis else "blend"
        else:
            mode = "boost" if ratio < low - hysteresis else "blend" if ratio < high - hysteresis else "buck"
        found.append(mode)
    return found


NEAR_BORDERS = st.sampled_from([0.85, 0.93, 0.945, 0.955, 0.97, 1.0, 1.03, 1.045, 1.055, 1.07, 1.15])


@given(
    ratios=st.lists(NEAR_BORDERS | st.floats(0.8, 1.2), min_size=2, max_size=40),
    hysteresis=st.sampled_from([0.0, 0.01, 0.03, 0.049]),
    share=st.floats(0.0, 1.0),
)
def test_modes_are_those_of_a_plain_walk_whole_and_in_blocks(ratios, hysteresis, share):
    cut = 1 + int(share * (len(ratios) - 2))
    made = settings(blend_band=0.05, mode_hysteresis=hysteresis)
    # what a share times 400 V over 400 V rounds to is what both must see
    seen = np.array(ratios) * 400.0 / 400.0
    whole = TOPOLOGY.choose(rest(ratios), made, None).code
    words = [TOPOLOGY.choices(made)[code] for code in whole[0]]
    assert words == plain_modes(seen, 0.05, hysteresis)
    carry, pieces = None, []
    for piece in (ratios[:cut], ratios[cut:]):
        choice = TOPOLOGY.choose(rest(piece), made, carry)
        carry = choice.carry
        pieces.append(choice.code)
    np.testing.assert_array_equal(np.concatenate(pieces, axis=-1), whole)


def test_candidates_choose_each_for_itself():
    made = settings(blend_band=0.1, mode_hysteresis=0.02)
    rows = np.array([[0.8, 0.91, 0.95, 0.89, 0.8], [1.2, 1.09, 1.05, 1.11, 1.3], [0.8, 1.2, 0.95, 0.91, 1.1]])
    code = TOPOLOGY.choose(rest(rows), made, None).code
    assert code.tolist() == [[0, 0, 1, 1, 0], [2, 2, 1, 1, 2], [0, 2, 1, 1, 1]]
    again = TOPOLOGY.choose(rest(rows[:, 3:]), made, code[:, 2:3])
    np.testing.assert_array_equal(again.code, code[:, 3:])


def test_both_pairs_leave_nothing_to_choose():
    assert TOPOLOGY.choices(settings(control="pairs")) == ()
    assert TOPOLOGY.choices(settings()) == ("boost", "blend", "buck")
    assert TOPOLOGY.plain_choice(settings()) is None


# ---- the whole planner


OVERLAP = """
title = "Overlapping ranges"
[battery]
open_circuit_voltage = [[0.0, "320 V"], [0.5, "400 V"], [1.0, "480 V"]]
resistance = "60 mohm"
capacity = "5 Ah"
start_soc = "95 %"
[link]
voltage = "400 V"
capacitance = "1 mF"
[stage]
topology = "four-switch"
switching_frequency = "50 kHz"
dead_time = "200 ns"
blend_band = "6 %"
mode_hysteresis = "1 %"
minimum_pulse = "300 ns"
[stage.inductor]
inductance = "120 uH"
winding_resistance = "4 mohm"
[stage.switch]
on_resistance = "8 mohm"
gate_charge = "200 nC"
gate_voltage = "20 V"
turn_on_energy = "300 uJ"
turn_off_energy = "200 uJ"
test_current = "50 A"
test_voltage = "400 V"
[stage.battery_capacitor]
capacitance = "100 uF"
[stage.link_capacitor]
capacitance = "100 uF"
[[mission]]
profile = "p.csv"
"""


MODE_KEYS = 'blend_band = "6 %"\nmode_hysteresis = "1 %"'


def overlapping(folder, watts, seconds=10.0, mode_keys=MODE_KEYS, links=None):
    """Write a plan and its profile: constant steps of power, and of link voltage where given."""
    (folder / "plan.toml").write_text(OVERLAP.replace(MODE_KEYS, mode_keys))
    rows = [f"{seconds * k!r},{float(p)!r}" for k, p in enumerate([*watts, 0.0])]
    head = "time_s,power_w"
    if links is not None:
        head, rows = f"{head},link_voltage_v", [f"{row},{v}" for row, v in zip(rows, [*links, 400.0], strict=True)]
    (folder / "p.csv").write_text("\n".join([head, *rows]) + "\n")
    return folder / "plan.toml"


# down from 472 V through the link's 400 V and back up
DAY = [14e3] * 40 + [-14e3] * 38


def test_a_day_across_the_link_voltage_runs_through_every_mode(tmp_path):
    outcome = run(overlapping(tmp_path, DAY))
    steps, mission = outcome.steps, outcome.missions[0]
    assert mission.energy.residual < 1e-9
    assert mission.energy.recomputed_residual < 1e-9
    order = [m for m, before in zip(steps["mode"], [None, *steps["mode"][:-1]], strict=True) if m != before]
    assert order == ["buck", "blend", "boost", "blend", "buck"]
    assert np.isfinite(steps.select_dtypes("number").to_numpy()).all()
    boost = steps["mode"] == "boost"
    assert (steps.loc[boost, "battery_upper_switch.turn_on_current_a"] == 0.0).all()
    assert (steps.loc[boost, "battery_leg_duty_ratio"] == 1.0).all()
    ratio = steps["battery_leg_duty_ratio"] / steps["link_leg_duty_ratio"]
    drop = 1.0 - ratio * steps["battery_voltage_v"] / steps["link_voltage_v"]
    assert np.abs(drop).max() < 0.01
    assert (np.sign(-drop) == np.sign(steps["power_w"])).all()
    text = " ".join(outcome.safety.sentences)
    assert "no diode of this topology feeds it" in text


def test_a_slow_walk_over_both_borders_settles_and_a_held_blend_keeps_its_loss(tmp_path):
    # Under load the ratio passes a border before the ratio at rest does: there the blend is held past it.
    watts = np.concatenate([np.full(3000, 12e3), np.full(2900, -12e3)])
    outcome = run(overlapping(tmp_path, watts, seconds=0.15))
    steps = outcome.steps
    assert outcome.missions[0].energy.residual < 1e-9
    assert {"boost", "blend", "buck"} == set(steps["mode"])
    blend = (steps["mode"] == "blend") & (steps["mode"].shift() == "blend") & (steps["power_w"].diff() == 0.0)
    held = blend & (steps["battery_voltage_v"] < 0.94 * 400.0)
    assert held.sum() > 50
    assert steps["loss_w"].diff()[blend].abs().max() < 0.1  # one leg's edges and gates are some 14 W


def test_modes_carry_from_block_to_block(tmp_path, monkeypatch):
    # 472 V at rest: the link walks within the hysteresis of both borders, where only the step before decides.
    ratios = [1.2, *[1.065, 1.055] * 5, 1.0, *[1.065, 1.055] * 5, 0.8, *[0.945, 0.935] * 5, 1.0, *[0.945, 0.935] * 5]
    plan = overlapping(tmp_path, [100.0] * len(ratios), seconds=1e-3, links=[round(472.0 / r, 6) for r in ratios])
    monkeypatch.setattr(march, "BLOCK", 4)
    modes = run(plan).steps["mode"].tolist()
    assert modes == plain_modes(ratios, 0.06, 0.01)
    assert modes[1:11] == ["buck"] * 10
    assert modes[12:22] == ["blend"] * 10
    assert modes[23:33] == ["boost"] * 10


def test_both_pairs_run_and_cost_more(tmp_path):
    blended = run(overlapping(tmp_path, DAY))
    paired = run(overlapping(tmp_path, DAY, mode_keys='control = "pairs"'))
    assert "mode" not in paired.steps
    assert paired.missions[0].energy.loss_j > 1.2 * blended.missions[0].energy.loss_j
    assert paired.missions[0].energy.residual < 1e-9


def test_a_mode_that_cannot_hold_stops_the_run_with_its_words(tmp_path):
    path = overlapping(tmp_path, [20e3] * 4)
    text = path.read_text().replace('"60 mohm"', '"900 mohm"').replace('"95 %"', '"68 %"')
    path.write_text(text)
    with pytest.raises(InputError, match=r"cannot hold at the voltage under load.*widen stage\.blend_band"):
        run(path)


@pytest.mark.parametrize("keys", [{}, {"blend_band": 0.3, "mode_hysteresis": 0.0}, {"control": "pairs"}])
def test_it_keeps_every_promise_with_overlapping_ranges(keys):
    made = {"switching_frequency": F, **keys}
    for check in topology_checks(TOPOLOGY, made, battery=(250.0, 450.0), link=(300.0, 400.0)):
        check()


def test_plugins_check_with_an_overlapping_plan(tmp_path, capsys):
    assert main(["plugins", "check", "four-switch", "--plan", str(overlapping(tmp_path, DAY))]) == 0
    assert "every promise kept" in capsys.readouterr().out
    assert main(["plugins", "--json"]) == 0
    listed = json.loads(capsys.readouterr().out)
    assert "four-switch" in {plugin["name"] for plugin in listed["plugins"]}
