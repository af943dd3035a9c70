"""Switches of several dies: an IGBT and its diode, and chips that share unevenly; their books, seats and refusals."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tideleg import InputError, NoEquilibriumError, PlanError, Segment, Waveform, plan_from_mapping, run

DIODE = {
    "knee_voltage": "1.0 V",
    "knee_voltage_slope": -1e-3,
    "knee_resistance": "3 mohm",
    "knee_resistance_slope": "0.2 %/K",
    "recovery_energy": "6 mJ",
    "recovery_in_turn_on": False,
    "test_current": "150 A",
    "test_voltage": "600 V",
    "junction_to_plate": [["0.20 K/W", "40 ms"]],
}
IGBT = {
    "rated_voltage": "1200 V",
    "knee_voltage": "0.9 V",
    "knee_resistance": "5 mohm",
    "turn_on_energy": "9 mJ",
    "turn_off_energy": "12 mJ",
    "test_current": "150 A",
    "test_voltage": "600 V",
    "gate_charge": "1 uC",
    "gate_voltage": "23 V",
    "junction_to_plate": [["0.12 K/W", "50 ms"]],
    "diode": DIODE,
}
MOSFET = {
    "on_resistance": "13 mohm",
    "on_resistance_slope": "0.4 %/K",
    "turn_on_energy": "1 mJ",
    "turn_off_energy": "0.6 mJ",
    "test_current": "60 A",
    "test_voltage": "800 V",
    "diode_voltage": "3 V",
    "gate_charge": "230 nC",
    "gate_voltage": "20 V",
    "in_parallel": 3,
    "junction_to_plate": [["0.3 K/W", "30 ms"]],
}
PROFILE = "time_s,power_w\n0,30000\n1,-25000\n2,0\n3,52000\n4,-60000\n5,1500\n6,0\n"


@pytest.fixture
def plan_of(tmp_path: Path) -> Any:
    (tmp_path / "p.csv").write_text(PROFILE)

    def make(switch: dict[str, Any], **more: Any) -> Any:
        data = {
            "title": "dies",
            "battery": {"open_circuit_voltage": "400 V", "resistance": "40 mohm"},
            "link": {"voltage": "700 V"},
            "stage": {
                "topology": "interleaved",
                "legs": 2,
                "switching_frequency": "12 kHz",
                "dead_time": "1 us",
                "inductor": {"inductance": "300 uH", "winding_resistance": "3 mohm"},
                "switch": switch,
            },
            "cooling": {"plate_resistance": "20 K/kW", "plate_heat_capacity": "500 J/K"},
            "limits": {"junction_temperature": "150 degC"},
            "mission": [{"profile": "p.csv", "coolant": "40 degC"}],
            **more,
        }
        return plan_from_mapping(data, folder=tmp_path)

    return make


AMPERES = st.floats(-300.0, 300.0)


@given(AMPERES, AMPERES, AMPERES, st.floats(0.0, 1.0), st.floats(0.0, 1.0))
def test_a_run_splits_at_zero_without_losing_or_counting_anything(
    a: float, b: float, c: float, place: float, share: float
) -> None:
    current = Waveform((Segment(place, 0.5 * share, a, b), Segment(place + 0.5 * share, 0.5 - 0.5 * share, b, c)))
    there, back = current.forward(), current.reverse()
    assert float(there.mean() + back.mean()) == pytest.approx(float(current.mean()), abs=1e-9)
    assert float(there.mean_square() + back.mean_square()) == pytest.approx(float(current.mean_square()), abs=1e-7)
    assert float(there.mean() - back.mean()) == pytest.approx(float(current.mean_magnitude()), abs=1e-9)
    assert float(there.valley()) >= 0.0 >= float(back.peak())
    assert float(there.width()) == pytest.approx(float(current.width()))


def test_an_igbt_and_its_diode_are_two_seats_with_columns_and_limits_of_their_own(plan_of: Any) -> None:
    outcome = run(plan_of(IGBT))
    steps = outcome.steps
    names = {part.name for part in outcome.parts}
    assert {"upper_switch", "upper_switch_diode", "lower_switch", "lower_switch_diode"} <= names
    assert {t.part for t in outcome.thermal} == names & {t.part for t in outcome.thermal}
    assert {c.part for c in outcome.limits if c.name == "junction temperature"} >= {
        "upper_switch_diode",
        "lower_switch",
    }
    # Discharge boosts: the lower IGBT and the upper diode carry; charge bucks: the upper IGBT and the lower diode.
    row = steps.iloc[3]
    assert row["lower_switch.current_rms_a"] > 40.0
    assert row["upper_switch_diode.current_mean_a"] > 20.0
    assert row["lower_switch_diode.current_mean_a"] == 0.0
    row = steps.iloc[4]
    assert row["lower_switch_diode.current_mean_a"] > 20.0
    assert row["lower_switch.current_rms_a"] == 0.0
    assert row["upper_switch_diode.current_mean_a"] == 0.0
    assert not any("dead time" in line or "recovery" in line for line in outcome.not_modelled)
    assert outcome.missions[0].energy.residual < 1e-9
    assert outcome.missions[0].energy.recomputed_residual < 1e-9


def test_the_losses_of_both_dies_are_those_of_the_split_run_at_their_own_temperatures(plan_of: Any) -> None:
    """Conduction of each step by numpy on 200000 moments of the inductor's triangle."""
    outcome = run(plan_of(IGBT))
    steps = outcome.steps
    for _, row in steps.iterrows():
        mean, ripple, duty = (row[k] for k in ("inductor.current_mean_a", "inductor.current_ripple_a", "duty_ratio"))
        u = (np.arange(200_000) + 0.5) / 200_000
        upper = -(mean + ripple / 2 - ripple * u)  # drain to source: against the current into the link
        igbt, diode = np.maximum(upper, 0.0), np.maximum(-upper, 0.0)
        t = row["upper_switch_diode.temperature_mean_degc"]
        volts, ohms = 1.0 - 1e-3 * (t - 25.0), 3e-3 * (1 + 2e-3 * (t - 25.0))
        due = duty * np.mean(volts * diode + ohms * diode**2)
        end = max(-upper[-1], 0.0)
        due += 12e3 * 6e-3 * (end / 150.0) ** 0.6 * (700.0 / 600.0) ** 0.6
        assert row["upper_switch_diode.loss_w"] == pytest.approx(due, rel=1e-4, abs=1e-3)
        due = duty * np.mean(0.9 * igbt + 5e-3 * igbt**2) + 12e3 * 1e-6 * 23.0
        by_voltage = (700.0 / 600.0) ** 1.3 * 12e3 / 150.0
        due += by_voltage * (9e-3 * max(upper[0], 0.0) + 12e-3 * max(upper[-1], 0.0))
        assert row["upper_switch.loss_w"] == pytest.approx(due, rel=1e-4, abs=1e-3)


def test_the_drops_of_both_dies_shift_the_duty_ratio(plan_of: Any) -> None:
    """Volt-seconds of the leg by hand: one die drops its voltage while the lower, the other while the upper conducts."""
    for _, row in run(plan_of(IGBT)).steps.iterrows():
        mean, ripple, duty = (row[k] for k in ("inductor.current_mean_a", "inductor.current_ripple_a", "duty_ratio"))
        if abs(mean) < 1.3 * ripple:
            continue
        size, discharges = abs(mean), mean > 0.0
        at_igbt = 0.9 + 5e-3 * size
        hot = row[
            "upper_switch_diode.temperature_mean_degc" if discharges else "lower_switch_diode.temperature_mean_degc"
        ]
        at_diode = 1.0 - 1e-3 * (hot - 25.0) + 3e-3 * (1 + 2e-3 * (hot - 25.0)) * size
        share_of_diode = duty if discharges else 1.0 - duty
        drop = share_of_diode * at_diode + (1.0 - share_of_diode) * at_igbt + 3e-3 * size
        due = (row["battery_voltage_v"] - np.sign(mean) * drop) / 700.0
        # The mean of the square is that of the flat current but for its ripple: a few hundredths of the drop at most.
        assert abs(duty - due) < 0.06 * drop / 700.0
        assert abs(row["battery_voltage_v"] / 700.0 - due) > 0.5 * drop / 700.0


def test_gate_heat_stays_in_the_driver_and_each_die_heats_by_its_own_loss(plan_of: Any) -> None:
    frame = run(plan_of(IGBT, mission=[{"profile": "p.csv", "coolant": "40 degC", "start": "periodic"}])).steps
    last = frame.iloc[-1]
    assert last["upper_switch.temperature_degc"] != last["upper_switch_diode.temperature_degc"]


@pytest.mark.parametrize(
    ("switch", "words"),
    [
        ({k: v for k, v in IGBT.items() if k != "diode"}, r"\[stage.switch.diode\] is missing"),
        ({**MOSFET, "diode": DIODE}, "counts reverse current, which"),
        ({**IGBT, "recovery_energy": "1 mJ", "recovery_in_turn_on": False}, "counts reverse current, which"),
        ({**IGBT, "diode_voltage": "1 V"}, "counts reverse current, which"),
        ({**IGBT, "on_resistance": "1 mohm"}, "two loss plugins offer 'channel conduction'"),
        ({**IGBT, "diode": {**DIODE, "knee_volts": 1}}, "unknown key 'knee_volts'"),
        ({**IGBT, "diode": {**DIODE, "recovery_in_turn_on": None}}, "recovery_in_turn_on is missing"),
        ({**IGBT, "driver": {"gate_charge": 1}}, r"found the table \[stage.switch.driver\]"),
    ],
)
def test_reverse_current_carried_twice_or_by_nothing_is_refused(plan_of: Any, switch: Any, words: str) -> None:
    with pytest.raises(InputError, match=words):
        run(plan_of(switch))


def test_a_table_inside_another_part_is_refused(plan_of: Any) -> None:
    data = plan_of(IGBT)
    inner = {**data.stage.parts, "inductor": {**data.stage.parts["inductor"], "core": {"k": 1}}}
    with pytest.raises(PlanError, match="no inductor has"):
        run(data.model_copy(update={"stage": data.stage.model_copy(update={"parts": inner})}))


def test_the_unlucky_chip_decides_and_the_books_hold_all_chips(plan_of: Any) -> None:
    even, uneven = run(plan_of(MOSFET)), run(plan_of({**MOSFET, "sharing_spread": "15 %"}))
    a, b = even.steps.iloc[3], uneven.steps.iloc[3]
    assert b["upper_switch.current_rms_a"] == pytest.approx(1.15 * a["upper_switch.current_rms_a"], rel=1e-3)
    assert b["upper_switch_others.current_rms_a"] == pytest.approx(0.925 * a["upper_switch.current_rms_a"], rel=1e-3)
    assert (
        b["upper_switch.temperature_degc"]
        > a["upper_switch.temperature_degc"]
        > b["upper_switch_others.temperature_degc"]
    )
    junctions = [c for c in uneven.limits if c.name == "junction temperature"]
    assert {c.part for c in junctions} == {"upper_switch", "lower_switch"}
    assert {t.part for t in uneven.thermal} == {"upper_switch", "lower_switch"}
    frame = uneven.steps
    chips = frame["upper_switch.loss_w"] + 2.0 * frame["upper_switch_others.loss_w"]
    position = [e for e in uneven.missions[0].losses if e.part in ("upper_switch", "upper_switch_others")]
    assert 2.0 * float((chips * frame["duration_s"]).sum()) == pytest.approx(sum(e.total_j for e in position), rel=1e-9)
    assert uneven.missions[0].energy.recomputed_residual < 1e-9
    assert {p.name: (p.copies, p.in_parallel) for p in uneven.parts}["upper_switch_others"] == (2, 2)


def test_a_diode_has_as_many_chips_as_its_switch_unless_it_says_so(plan_of: Any) -> None:
    two = {**IGBT, "in_parallel": 2, "sharing_spread": "10 %"}
    parts = {p.name: p.in_parallel for p in run(plan_of(two)).parts}
    assert (parts["lower_switch_diode"], parts["lower_switch_diode_others"]) == (1, 1)
    own = {**two, "diode": {**DIODE, "in_parallel": 3, "sharing_spread": 0}}
    parts = {p.name: p.in_parallel for p in run(plan_of(own)).parts}
    assert parts["lower_switch_diode"] == 3
    assert "lower_switch_diode_others" not in parts


@pytest.mark.parametrize("switch", [IGBT, {**MOSFET, "sharing_spread": 0.2}])
def test_every_loss_term_adds_up_to_the_whole_by_part_position_and_direction(plan_of: Any, switch: Any) -> None:
    more = {
        "inductor": {"inductance": "300 uH", "winding_resistance": "3 mohm"},
        "switch": switch,
        "link_capacitor": {"capacitance": "200 uF", "esr": "2 mohm"},
        "battery_capacitor": {"capacitance": "200 uF", "esr": "2 mohm"},
        "busbar": {"battery_side_resistance": "0.2 mohm", "link_side_resistance": "0.2 mohm"},
        "control": {"standby_power": "12 W"},
    }
    base = plan_of(switch)
    plan = base.model_copy(update={"stage": base.stage.model_copy(update={"parts": more})})
    outcome = run(plan)
    (mission,) = outcome.missions
    assert len(mission.losses) >= 12
    assert sum(e.total_j for e in mission.losses) == pytest.approx(mission.energy.loss_j, rel=1e-9)
    steps = mission.steps
    for name, field in (("discharge", "discharge_j"), ("charge", "charge_j"), ("idle", "idle_j")):
        rows = steps[steps["direction"] == name]
        whole = float((rows["loss_w"] * rows["duration_s"]).sum())
        assert sum(getattr(e, field) for e in mission.losses) == pytest.approx(whole, rel=1e-9)
    copies = {p.name: p.copies * p.in_parallel for p in outcome.parts}
    for part in {e.part for e in mission.losses}:
        mine = sum(e.total_j for e in mission.losses if e.part == part)
        column = float((steps[f"{part}.loss_w"] * steps["duration_s"]).sum()) * copies[part]
        assert column == pytest.approx(mine, rel=1e-9)


def test_what_was_asked_beyond_a_table_stands_in_warnings_summary_and_on_page_one(plan_of: Any, tmp_path: Path) -> None:
    (tmp_path / "eon.csv").write_text("# digitised\ncurrent_a,energy_mj\n5,0.1\n40,0.7\n")
    keys = {k: v for k, v in MOSFET.items() if k != "turn_on_energy"} | {"turn_on_energy_curve": "eon.csv"}
    outcome = run(plan_of({**keys, "in_parallel": 1, "test_voltage": "800 V"}))
    steps = outcome.steps
    on = steps["lower_switch.turn_on_current_a"]
    beyond = ((on > 40.0) | (on < 5.0)) & (on > 0.0)
    (entry,) = [e for e in outcome.missions[0].outside if (e.part, e.mechanism) == ("lower_switch", "turn-on")]
    assert entry.time_share == pytest.approx(float((beyond * steps["duration_s"]).sum() / steps["duration_s"].sum()))
    assert 0.0 < entry.energy_share <= 1.0
    assert any("turn-on of lower switch was asked beyond its points" in line for line in outcome.warnings)
    assert outcome.summary()["outside_tables"]["p"][0]["time_share"] > 0.01
    from tideleg.report import words

    assert "EXTRAPOLATED" in words.answers(outcome)[-1][1]
    facts = {p.name: p.facts for p in outcome.parts}
    assert facts["lower_switch"]["turn on energy curve"] == "2 points of eon.csv"
    assert "eon.csv" in outcome.inputs.sha256


def test_within_its_table_nothing_is_said(plan_of: Any, tmp_path: Path) -> None:
    (tmp_path / "eon.csv").write_text("current [A],energy [mJ]\n0,0\n500,9\n")
    keys = {k: v for k, v in MOSFET.items() if k != "turn_on_energy"} | {"turn_on_energy_curve": "eon.csv"}
    outcome = run(plan_of(keys))
    assert outcome.missions[0].outside == ()
    assert not any("beyond its points" in line for line in outcome.warnings)


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("current_a,energy_mj\n5,0.1\n40\n", "line 3: found 1 cells"),
        ("current_a,energy_mj\n5,0.1\n40,x\n", "line 3: found 'x'"),
        ("current_a,energy_mv\n5,0.1\n40,1\n", "unit 'mv' is"),
        ("current_a,power_w\n5,0.1\n40,1\n", "found the column 'power_w'"),
        ("current_a,energy_mj\n5,0.1\n", "found 1 point"),
        ("current_a,energy_mj\n5,0.1\n7,1\n5,0.2\n", "line 4 stands at the same place as eon.csv line 2"),
        ("", "holds no header"),
        ("current_a;energy_mj\n5;0,1\n", "cells"),
    ],
)
def test_a_file_of_points_is_read_whole_or_refused_with_its_line(
    plan_of: Any, tmp_path: Path, text: str, words: str
) -> None:
    (tmp_path / "eon.csv").write_text(text)
    keys = {k: v for k, v in MOSFET.items() if k != "turn_on_energy"} | {"turn_on_energy_curve": "eon.csv"}
    with pytest.raises(InputError, match=words) as caught:
        run(plan_of(keys))
    assert "eon.csv" in str(caught.value)


def test_a_file_that_is_not_there_is_named_with_its_key(plan_of: Any) -> None:
    with pytest.raises(PlanError, match="stage.switch.turn_on_energy_curve: found 'none.csv', which is no file"):
        plan_of({**MOSFET, "turn_on_energy_curve": "none.csv"})


def test_a_step_in_which_nothing_flows_asks_no_table(plan_of: Any, tmp_path: Path) -> None:
    """The factor curve ends below the coolant's temperature: every step with current lies outside, the idle ones not."""
    keys = {k: v for k, v in MOSFET.items() if k != "on_resistance_slope"}
    keys |= {"on_resistance_factor": [["0 degC", 0.97], ["25 degC", 1.0], ["35 degC", 1.05]]}
    plan = plan_of(keys)
    off = {**plan.stage.settings, "idle": "off"}
    outcome = run(plan.model_copy(update={"stage": plan.stage.model_copy(update={"settings": off})}))
    entry = next(e for e in outcome.missions[0].outside if e.mechanism == "channel conduction")
    rows = outcome.steps
    flows = rows[f"{entry.part}.current_rms_a"] > 0.0
    assert entry.time_share == pytest.approx(float((flows * rows["duration_s"]).sum() / rows["duration_s"].sum()))
    assert entry.energy_share == 1.0
    assert 0.5 < entry.time_share < 1.0


def test_page_one_names_what_is_above_a_hundredth_and_the_warnings_all() -> None:
    from tideleg.coverage import flagged, outside_warnings
    from tideleg.outcome import OutsideEntry

    small, by_time, by_energy = (
        OutsideEntry("a_switch", "turn-on", t, e) for t, e in ((0.01, 0.01), (0.011, 0), (0, 0.011))
    )
    assert flagged((small, by_time, by_energy)) == (by_time, by_energy)
    assert len(outside_warnings("m", (small, by_time, by_energy))) == 3


@pytest.mark.parametrize(
    ("topology", "modulation"),
    [
        ("half-bridge", "synchronous"),
        ("half-bridge", "diode"),
        ("interleaved", "diode"),
        ("flying-capacitor", "synchronous"),
        ("inverting", "synchronous"),
    ],
)
def test_every_topology_takes_two_dies_in_every_position(plan_of: Any, topology: str, modulation: str) -> None:
    plan = plan_of({**IGBT, "in_parallel": 2})
    settings = {"switching_frequency": "12 kHz", "modulation": modulation, "dead_time": "1 us"}
    if topology == "interleaved":
        settings["legs"] = 2
    stage = plan.stage.model_copy(update={"topology": topology, "settings": settings})
    cooling = plan.cooling.model_copy(update={"settings": {"plate_resistance": "5 K/kW"}})
    outcome = run(plan.model_copy(update={"stage": stage, "cooling": cooling}))
    parts = [p.name for p in outcome.parts]
    switches = [p.name for p in outcome.parts if p.kind == "switch"]
    assert all(f"{name}_diode" in parts for name in switches)
    frame = outcome.steps
    for name in switches:
        both = frame[f"{name}.current_rms_a"] ** 2 + frame[f"{name}_diode.current_rms_a"] ** 2
        assert np.all(both > 0.0) or modulation == "diode"
    assert outcome.missions[0].energy.recomputed_residual < 1e-9


def test_a_resistance_that_runs_away_beyond_its_points_finds_no_equilibrium(plan_of: Any, tmp_path: Path) -> None:
    """Held at its last point it would settle below 300 degC, falsely; it goes on as steeply as it ended."""
    (tmp_path / "p.csv").write_text("time_s,power_w\n0,52000\n2000,52000\n4000,0\n")
    keys = {k: v for k, v in MOSFET.items() if k != "on_resistance_slope"} | {"in_parallel": 1}
    keys |= {"on_resistance_factor": [["0 degC", 0.9], ["25 degC", 1.0], ["100 degC", 1.6], ["150 degC", 2.4]]}
    with pytest.raises(NoEquilibriumError, match="no thermal equilibrium"):
        run(plan_of(keys, cooling={"plate_resistance": "0.7 K/W"}))
