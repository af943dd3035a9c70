"""The main job on shipped scenarios and on bare plans: books, columns, limits, and an honest list of what is missing."""

import json
import shutil
from pathlib import Path

import numpy as np
import pytest

from tideleg import InputError
from tideleg.plan import load_plan, plan_from_mapping
from tideleg.running import run

SCENARIOS = Path(__file__).parents[2] / "profiles"
COLUMNS = [
    "time_s",
    "duration_s",
    "power_requested_w",
    "power_w",
    "curtailed_w",
    "curtailed_cause",
    "direction",
    "conduction",
    "soc",
    "battery_voltage_v",
    "battery_current_a",
    "link_voltage_v",
    "link_current_a",
    "duty_ratio",
    "loss_w",
    "inductor.current_mean_a",
    "inductor.current_rms_a",
    "inductor.current_ripple_a",
    "inductor.current_peak_a",
    "inductor.current_valley_a",
    "upper_switch.current_rms_a",
    "upper_switch.current_mean_a",
    "upper_switch.turn_on_current_a",
    "upper_switch.turn_off_current_a",
    "upper_switch.loss_w",
    "upper_switch.temperature_degc",
    "lower_switch.loss_w",
    "battery_capacitor.current_rms_a",
    "battery_capacitor.voltage_ripple_v",
    "link_capacitor.current_rms_a",
    "link_capacitor.voltage_ripple_v",
]


@pytest.fixture(scope="module")
def outcomes():
    return {name: run(SCENARIOS / name / "plan.toml") for name in ("kerbside", "orchard", "commuter")}


@pytest.mark.parametrize("name", ["kerbside", "orchard", "commuter"])
def test_the_books_of_every_scenario_close_below_a_billionth(outcomes, name):
    for mission in outcomes[name].missions:
        assert mission.energy.residual < 1e-9
        assert mission.energy.recomputed_residual < 1e-9
        assert mission.energy.curtailed_j == 0.0
    assert outcomes[name].holds, outcomes[name].verdict


def test_the_table_of_steps_has_its_columns_and_is_finite(outcomes):
    steps = outcomes["kerbside"].steps
    assert set(COLUMNS) <= set(steps.columns)
    assert list(steps.columns[:15]) == COLUMNS[:15]
    numbers = steps.select_dtypes("number").to_numpy()
    assert np.isfinite(numbers).all()
    assert set(steps["direction"]) == {"charge", "discharge"}


def test_columns_agree_with_each_other(outcomes):
    steps = outcomes["kerbside"].steps
    np.testing.assert_allclose(steps["inductor.current_mean_a"] * 4, steps["battery_current_a"], rtol=1e-9, atol=1e-9)
    np.testing.assert_allclose(
        steps["link_current_a"] * steps["link_voltage_v"], steps["power_w"], rtol=1e-12, atol=1e-6
    )
    ripple = steps["inductor.current_peak_a"] - steps["inductor.current_valley_a"]
    np.testing.assert_allclose(steps["inductor.current_ripple_a"], ripple, rtol=1e-9, atol=1e-9)
    both = steps["upper_switch.current_rms_a"] ** 2 + steps["lower_switch.current_rms_a"] ** 2
    np.testing.assert_allclose(4 * both, steps["inductor.current_rms_a"] ** 2, rtol=1e-9)  # two chips share a position


def test_losses_by_part_and_mechanism_sum_to_the_total(outcomes):
    for outcome in outcomes.values():
        for mission in outcome.missions:
            assert sum(e.total_j for e in mission.losses) == pytest.approx(mission.energy.loss_j, rel=1e-9)
    mechanisms = {e.mechanism for e in outcomes["kerbside"].missions[0].losses}
    assert len(mechanisms) >= 12


def test_a_limit_names_value_part_and_an_instant_that_holds_that_value(outcomes):
    outcome = outcomes["kerbside"]
    check = next(c for c in outcome.limits if c.name == "junction temperature" and c.part == "lower_switch")
    steps = outcome.missions[0].steps
    row = steps.index[steps["time_s"] == check.time_s][0]
    assert (
        steps.loc[row, "lower_switch.temperature_degc"] == check.value == steps["lower_switch.temperature_degc"].max()
    )
    assert check.margin == check.limit - check.value
    assert check.used == pytest.approx((check.value - 65.0) / (150.0 - 65.0))


def test_the_periodic_start_repeats(outcomes):
    steps = outcomes["orchard"].missions[0].steps
    # the plate's slowest mode is minutes, the day is long: the last step of the day meets the first again
    assert steps["inductor.temperature_mean_degc"].iloc[0] == pytest.approx(
        steps["inductor.temperature_degc"].iloc[-1], abs=1.5
    )


def test_the_summary_is_plain_json(outcomes):
    for outcome in outcomes.values():
        summary = json.loads(json.dumps(outcome.summary(), allow_nan=False))
        for key in [
            "schema_version",
            "title",
            "verdict",
            "limits",
            "energy",
            "worst",
            "thermal",
            "wear",
            "battery",
            "safety",
            "not_modelled",
        ]:
            assert key in summary
        assert len(summary["inputs"]["sha256"]) >= 2
        assert summary["safety"]["sentences"]


IDEAL = {
    "title": "ideal",
    "battery": {"open_circuit_voltage": "400 V"},
    "link": {"voltage": "800 V"},
    "stage": {
        "topology": "half-bridge",
        "switching_frequency": "20 kHz",
        "inductor": {"inductance": "500 uH"},
    },
    "mission": [{"profile": "p.csv"}],
}


def ideal(folder, rows, **changes):
    (folder / "p.csv").write_text(rows)
    return run(plan_from_mapping({**IDEAL, **changes}, folder=folder))


def test_ideal_parts_give_exact_lossless_currents_and_everything_is_listed_as_not_modelled(tmp_path):
    outcome = ideal(tmp_path, "time_s,power_w\n0,40000\n1,-40000\n2,0\n3,0\n")
    steps = outcome.steps
    # Closed form: I = P/V_battery, ripple V D (1 - D)/(L f) with D = 1/2: 800/(4 500e-6 20e3) = 20 A.
    np.testing.assert_allclose(steps["battery_current_a"], [100.0, -100.0, 0.0], atol=1e-12)
    np.testing.assert_allclose(steps["inductor.current_ripple_a"], 20.0, rtol=1e-12)
    np.testing.assert_allclose(steps["inductor.current_rms_a"] ** 2, [10000 + 400 / 12] * 2 + [400 / 12], rtol=1e-12)
    np.testing.assert_allclose(
        steps["link_capacitor.current_rms_a"] ** 2, [2500 + 400 / 24] * 2 + [400 / 24], rtol=1e-12
    )
    assert (steps["loss_w"] == 0.0).all()
    assert "soc" not in steps
    missing = " ".join(outcome.not_modelled)
    for word in (
        "channel conduction",
        "turn-on",
        "core",
        "winding dc",
        "capacitor ESR",
        "gate",
        "temperature of switch",
    ):
        assert word in missing
    assert outcome.efficiency == 1.0
    assert outcome.missions[0].energy.residual == 0.0


@pytest.mark.parametrize(
    "rows",
    [
        "time_s,duration_s,power_w\n0,3600,20000\n",
        "time_s,power_w\n0,0\n3600,0\n",
        "time_s,power_w\n0,-5000\n28800,-1\n28801,0\n",
        "time_s,power_kw\n0,-160\n0.5,160\n1,0\n",
    ],
)
def test_one_row_idle_charge_only_and_steep_profiles_run(tmp_path, rows):
    outcome = ideal(tmp_path, rows)
    assert outcome.holds
    assert max(outcome.missions[0].energy.residual, outcome.missions[0].energy.recomputed_residual) < 1e-12


def test_two_missions_stand_in_one_frame_and_both_are_counted(tmp_path):
    (tmp_path / "q.csv").write_text("time_s,power_w\n0,10000\n5,0\n")
    missions = [
        {"profile": "p.csv", "passes_per_year": 10},
        {"profile": "q.csv", "name": "short", "passes_per_year": 3},
    ]
    outcome = ideal(tmp_path, "time_s,power_w\n0,40000\n1,0\n", mission=missions)
    assert outcome.steps["mission"].tolist() == ["p", "short"]
    assert {c.mission for c in outcome.limits} == {"p", "short"}


def test_missions_of_one_name_are_refused(tmp_path):
    missions = [{"profile": "p.csv"}, {"profile": "p.csv"}]
    with pytest.raises(InputError, match="two missions are named 'p'"):
        ideal(tmp_path, "time_s,power_w\n0,1\n1,0\n", mission=missions)


def test_a_limit_that_nothing_can_be_held_against_leaves_the_answer_unproven(tmp_path):
    outcome = ideal(tmp_path, "time_s,power_w\n0,1\n1,0\n", limits={"junction_temperature": "150 degC"})
    assert not outcome.holds
    assert "not proven" in outcome.verdict
    assert any("junction temperature" in line for line in outcome.not_modelled)


def test_curtailment_fails_a_mission_unless_it_is_allowed(tmp_path):
    battery = {"open_circuit_voltage": "400 V", "current_limit_discharge": "50 A"}
    rows = "time_s,power_w\n0,40000\n1,0\n"
    outcome = ideal(tmp_path, rows, battery=battery)
    assert not outcome.holds
    assert outcome.binding.name == "curtailed energy"
    assert outcome.steps["power_w"].tolist() == [20000.0]
    assert outcome.steps["curtailed_cause"].tolist() == ["discharge current limit"]
    assert ideal(tmp_path, rows, battery=battery, limits={"curtailed_energy": "60 %"}).holds


def test_an_empty_battery_curtails_all_that_was_asked_and_no_more(tmp_path):
    battery = {"open_circuit_voltage": "400 V", "capacity": "1 Ah", "start_soc": 0.0}
    stage = {**IDEAL["stage"], "control": {"standby_power": "50 W"}}
    outcome = ideal(tmp_path, "time_s,power_w\n0,40000\n60,0\n", battery=battery, stage=stage)
    energy = outcome.missions[0].energy
    assert energy.curtailed_j == energy.requested_j == 40000.0 * 60
    assert energy.link_in_j == pytest.approx(50.0 * 60)  # the link keeps the control alive
    assert outcome.steps["curtailed_cause"].tolist() == ["lowest state of charge"]


@pytest.mark.parametrize(
    ("changes", "said"),
    [
        (
            {"link": {"voltage": "390 V"}},
            r"0 s: topology 'half-bridge' cannot operate: the battery voltage is not below",
        ),
        ({"battery": {"open_circuit_voltage": "795 V", "resistance": "0.2 ohm"}}, "cannot operate"),
        ({"stage": {**IDEAL["stage"], "topology": "quarter-bridge"}}, "no topology plugin named 'quarter-bridge'"),
        (
            {
                "battery": {"open_circuit_voltage": "400 V", "resistance": "2 ohm"},
                "mission": [{"profile": "p.csv", "sign": "charge"}],
            },
            "more than the battery could give",
        ),
        ({"limits": {"junction_temperature": "10 degC"}}, None),
    ],
)
def test_what_cannot_be_is_said_with_its_instant(tmp_path, changes, said):
    rows = "time_s,power_w\n0,-40000\n1,0\n"
    if said is None:
        assert not ideal(tmp_path, rows, **changes).holds
        return
    with pytest.raises(InputError, match=said):
        ideal(tmp_path, rows, **changes)


def test_rc_pairs_of_the_plan_reach_the_battery(tmp_path):
    # At rest before, 100 A held for 20 s by the current limit: V = 400 - 100 (0.05 (1 - (1 - 1/e)) ...) on average.
    battery = {
        "open_circuit_voltage": "400 V",
        "current_limit_discharge": "100 A",
        "rc_pairs": [["50 mohm", "20 s"]],
    }
    outcome = ideal(tmp_path, "time_s,power_w\n0,60000\n20,0\n", battery=battery)
    mean_rise = 1.0 - (1.0 - np.exp(-1.0))
    assert outcome.steps["battery_voltage_v"].iloc[0] == pytest.approx(400.0 - 5.0 * mean_rise, rel=1e-9)
    assert outcome.steps["battery_heat_w"].iloc[0] == pytest.approx(500.0 * mean_rise, rel=1e-6)


def test_ripple_of_others_on_the_port_counts_in_the_capacitors_current(tmp_path):
    stage = {**IDEAL["stage"], "link_capacitor": {"external_ripple_current": "30 A", "rated_current": "55 A"}}
    outcome = ideal(tmp_path, "time_s,power_w\n0,40000\n1,0\n", stage=stage)
    check = next(c for c in outcome.limits if c.name == "link capacitor current")
    assert check.value == pytest.approx(np.sqrt(2500 + 400 / 24 + 900))
    assert not check.holds


def test_the_caution_follows_the_topology(tmp_path):
    rows = "time_s,power_w\n0,40000\n1,0\n"
    link = {"voltage": "800 V", "capacitance": "1 mF"}
    straight = ideal(tmp_path, rows, link=link)
    turned = ideal(tmp_path, rows, link=link, stage={**IDEAL["stage"], "topology": "inverting"})
    assert "through the upper diodes" in " ".join(straight.safety.sentences)
    text = " ".join(turned.safety.sentences)
    assert "upper diodes" not in text
    assert "no diode of this topology feeds it" in text
    assert turned.missions[0].energy.residual < 1e-12


def test_a_flying_capacitor_stage_runs_with_its_own_capacitor(tmp_path):
    parts = {
        **IDEAL["stage"],
        "topology": "flying-capacitor",
        "flying_capacitor": {"capacitance": "20 uF", "rated_voltage": "450 V"},
    }
    outcome = ideal(tmp_path, "time_s,power_w\n0,40000\n1,-40000\n2,0\n", stage=parts)
    assert outcome.holds
    assert outcome.steps["flying_capacitor.voltage_v"].tolist() == [400.0, 400.0]
    assert outcome.steps["inductor.current_ripple_a"].tolist() == pytest.approx([0.0, 0.0], abs=1e-9)
    assert outcome.steps["upper_switch.blocked_voltage_v"].max() == 400.0


def test_a_saturation_current_is_held_against_the_peak(tmp_path):
    stage = {**IDEAL["stage"], "inductor": {"inductance": "500 uH", "saturation_current": "105 A"}}
    outcome = ideal(tmp_path, "time_s,power_w\n0,40000\n1,0\n", stage=stage)
    check = next(c for c in outcome.limits if c.name == "inductor saturation current")
    assert (check.value, check.holds) == (pytest.approx(110.0), False)


def test_a_missing_coolant_is_asked_for(tmp_path):
    shutil.copytree(SCENARIOS / "commuter", tmp_path / "c")
    path = tmp_path / "c" / "plan.toml"
    path.write_text(path.read_text().replace('coolant = "55 degC"\n', ""))
    with pytest.raises(InputError, match="mission.0.coolant: the cooling needs the coolant temperature"):
        run(path)


def test_generated_profiles_are_what_their_scripts_write(tmp_path):
    import runpy

    for name in ("kerbside", "orchard"):
        script = tmp_path / name / "generate.py"
        shutil.copytree(SCENARIOS / name, script.parent)
        (script.parent / f"{name}.csv").unlink()
        runpy.run_path(str(script), run_name="__main__")
        assert (script.parent / f"{name}.csv").read_bytes() == (SCENARIOS / name / f"{name}.csv").read_bytes()
        assert (script.parent / f"{name}.csv").stat().st_size < 1_000_000


def test_kerbside_is_what_its_plan_says():
    outcome = load_plan(SCENARIOS / "kerbside" / "plan.toml")
    assert (outcome.battery.open_circuit_voltage.value[0], outcome.battery.open_circuit_voltage.value[-1]) == (324, 453)
    assert outcome.stage.settings["legs"] == 4


SHED = {
    **IDEAL["stage"],
    "topology": "interleaved",
    "legs": 3,
    "shedding": "threshold",
    "shedding_current": "60 A",
    "shedding_dwell": "2 s",
    "switch": {"on_resistance": "10 mohm"},
}


def test_shedding_reports_its_changes_and_what_it_saves(tmp_path):
    rows = "time_s,power_w\n0,8000\n10,60000\n20,8000\n40,0\n"
    outcome = ideal(tmp_path, rows, stage=SHED)
    # 400 V: 20 A needs one leg of 60 A, 150 A needs three; the third block falls at once: 10 s have passed.
    assert outcome.steps["active_legs"].tolist() == ["1", "3", "1"]
    choice = outcome.missions[0].choice
    assert choice.name == "active_legs"
    assert dict(choice.share_of_time) == pytest.approx({"1": 0.75, "2": 0.0, "3": 0.25})
    assert choice.changes_per_hour == pytest.approx(2 / (40 / 3600))
    always = ideal(tmp_path, rows, stage={k: v for k, v in SHED.items() if not k.startswith("shedding")})
    # No temperature is modelled, so what choosing saves is the difference of two runs.
    difference = always.missions[0].energy.loss_j - outcome.missions[0].energy.loss_j
    assert choice.saved_j == pytest.approx(difference, rel=1e-3)
    assert difference < 0.0  # with ohmic loss alone, shedding costs
    assert outcome.summary()["missions"][0]["choice"]["plain"] == "3"


def test_a_leg_that_rests_costs_nothing(tmp_path):
    one = ideal(tmp_path, "time_s,power_w\n0,8000\n10,0\n", stage=SHED)
    single = {k: v for k, v in SHED.items() if not k.startswith("shedding")} | {"legs": 1}
    alone = ideal(tmp_path, "time_s,power_w\n0,8000\n10,0\n", stage=single)
    assert one.missions[0].energy.loss_j == pytest.approx(alone.missions[0].energy.loss_j, rel=1e-9)
    assert one.steps["upper_switch.loss_w"].tolist() == [0.0]
    assert one.steps["lead_upper_switch.loss_w"].tolist() == pytest.approx(alone.steps["upper_switch.loss_w"].tolist())


CELLS = {
    "open_circuit_voltage": [
        [0.0, "340 V", "-10 degC"],
        [1.0, "400 V", "-10 degC"],
        [0, "350 V", 25],
        [1, "410 V", 25],
    ],
    "resistance": [[0.5, "0.4 ohm", "-10 degC"], [0.5, "0.1 ohm", "25 degC"]],
    "capacity": "20 Ah",
    "start_soc": "50 %",
}


def test_a_battery_depends_on_its_temperature(tmp_path):
    rows = "time_s,power_w\n0,20000\n1,0\n"
    mission = {"profile": "p.csv"}
    warm = ideal(tmp_path, rows, battery=CELLS, mission=[{**mission, "battery_temperature": "25 degC"}])
    cold = ideal(tmp_path, rows, battery=CELLS, mission=[{**mission, "battery_temperature": "-10 degC"}])
    assert warm.steps["battery_voltage_v"][0] == pytest.approx(380 - 0.1 * warm.steps["battery_current_a"][0], rel=1e-4)
    assert cold.steps["battery_voltage_v"][0] == pytest.approx(370 - 0.4 * cold.steps["battery_current_a"][0], rel=1e-4)
    with pytest.raises(
        InputError, match=r"mission.0.battery_temperature: .*covers -10 to 25 degC and nothing is extrapol"
    ):
        ideal(tmp_path, rows, battery=CELLS, mission=[{**mission, "battery_temperature": "30 degC"}])
    with pytest.raises(InputError, match="give battery_temperature"):
        ideal(tmp_path, rows, battery=CELLS)


def test_a_cold_battery_is_curtailed_and_says_why(tmp_path):
    battery = {"open_circuit_voltage": "400 V", "resistance": "50 mohm", "charge_temperature": ["0 degC", "45 degC"]}
    mission = [{"profile": "p.csv", "battery_temperature": "-5 degC"}]
    outcome = ideal(tmp_path, "time_s,power_w\n0,20000\n1,-20000\n2,0\n", battery=battery, mission=mission)
    assert outcome.steps["curtailed_cause"].tolist() == ["", "battery temperature"]
    assert outcome.steps["battery_power_available_w"].tolist() == [pytest.approx(400**2 / 0.2), 0.0]
    energy = outcome.missions[0].energy
    assert energy.requested_j == pytest.approx(energy.link_out_j + energy.link_in_j + energy.curtailed_j, rel=1e-9)


def test_a_mission_that_leaves_the_battery_emptier_is_warned_of(tmp_path):
    battery = {"open_circuit_voltage": "400 V", "capacity": "10 Ah", "start_soc": "50 %"}
    one_way = ideal(tmp_path, "time_s,power_w\n0,20000\n60,0\n", battery=battery)
    assert any("state of charge moves from 50.0 to" in warning for warning in one_way.warnings)
    assert one_way.missions[0].battery.stored_change_j == pytest.approx(-20000 * 60, rel=1e-6)
    back = ideal(tmp_path, "time_s,power_w\n0,20000\n60,-20000\n120,0\n", battery=battery)
    assert not any("state of charge moves" in warning for warning in back.warnings)


def test_battery_ripple_is_held_against_its_limit(tmp_path):
    stage = {**IDEAL["stage"], "battery_capacitor": {"capacitance": "100 uF"}}
    battery = {"open_circuit_voltage": "400 V", "resistance": "50 mohm"}
    outcome = ideal(
        tmp_path,
        "time_s,power_w\n0,20000\n1,0\n",
        stage=stage,
        battery=battery,
        limits={"battery_ripple_current": "1 A"},
    )
    check = next(c for c in outcome.limits if c.name == "battery ripple current")
    # 20 A of triangle at 20 kHz: the capacitor's 80 mohm against 50 mohm of battery.
    share = (1 / (2 * np.pi * 20e3 * 100e-6)) / np.hypot(1 / (2 * np.pi * 20e3 * 100e-6), 0.05)
    assert check.value == pytest.approx(20.0 / np.sqrt(12.0) * share, rel=0.02)
    assert not check.holds


def test_cycles_of_the_charge_stand_by_depth_beside_equal_full_cycles(tmp_path):
    battery = {"open_circuit_voltage": "400 V", "capacity": "10 Ah", "start_soc": "50 %"}
    # 4 kW at 400 V is 10 A: one hour is the whole capacity. Out 10 %, back 10 %, out 2 %, back 2 %.
    rows = "time_s,power_w\n0,4000\n360,-4000\n720,4000\n792,-4000\n864,0\n"
    found = ideal(tmp_path, rows, battery=battery).missions[0].battery
    by_depth = {(low, high): count for low, high, count in found.depth_cycles}
    # ASTM E1049-85, 5.4.4, by hand: 50, 40, 50, 48, 50 %: one cycle of 10 % and one of 2 %.
    assert sum(by_depth.values()) == 2.0
    assert by_depth[0.02, 0.05] + by_depth.get((0.01, 0.02), 0.0) == 1.0
    assert found.equivalent_full_cycles == pytest.approx(0.12, rel=1e-6)
    assert found.throughput_wh == pytest.approx(4000 * 864 / 3600, rel=1e-9)


def capacitors(tmp_path, rows, **keys):
    stage = {**IDEAL["stage"], "link_capacitor": keys}
    return ideal(tmp_path, rows, stage=stage, limits={"capacitor_voltage_utilisation": "90 %"})


def test_a_capacitors_voltage_share_counts_half_its_ripple(tmp_path):
    keys = {"rated_voltage": "1000 V", "capacitance": "10 uF"}
    outcome = capacitors(tmp_path, "time_s,power_w\n0,40000\n1,0\n", **keys)
    steps = outcome.steps
    due = (steps["link_voltage_v"] + 0.5 * steps["link_capacitor.voltage_ripple_v"]) / 1000.0
    np.testing.assert_allclose(steps["link_capacitor.voltage_share"], due, rtol=1e-12)
    check = next(c for c in outcome.limits if c.name == "capacitor voltage utilisation")
    assert check.value == pytest.approx(due.max())
    assert check.holds == bool(due.max() <= 0.9)
    assert check.limit == 0.9


def test_a_spectrum_of_others_counts_in_the_capacitors_current(tmp_path):
    keys = {"esr": "1 mohm", "external_ripple_spectrum": [["300 Hz", "18 A"], ["10 kHz", "24 A"]]}
    outcome = capacitors(tmp_path, "time_s,power_w\n0,40000\n1,0\n", **keys)
    assert outcome.steps["link_capacitor.current_rms_a"].iloc[0] == pytest.approx(
        np.sqrt(2500 + 400 / 24 + 900), rel=1e-4
    )


def test_a_file_of_resistances_lies_beside_the_plan_and_is_fingerprinted(tmp_path):
    (tmp_path / "esr.csv").write_text("frequency_hz,esr_ohm\n1000,0.004\n1e8,0.004\n")
    rows = "time_s,power_w\n0,40000\n1,0\n"
    by_file = capacitors(tmp_path, rows, esr_table="esr.csv").steps["link_capacitor.loss_w"]
    np.testing.assert_allclose(by_file, capacitors(tmp_path, rows, esr="4 mohm").steps["link_capacitor.loss_w"])
    assert "esr.csv" in capacitors(tmp_path, rows, esr_table="esr.csv").inputs.sha256


def test_a_faulty_file_of_resistances_is_named_with_its_key(tmp_path):
    (tmp_path / "esr.csv").write_text("frequency_hz,esr_ohm\n1000,-0.004\n1e8,0.004\n")
    with pytest.raises(InputError, match=r"stage\.link_capacitor\.esr_table.*esr.csv, line 2: found -0\.004 ohm"):
        capacitors(tmp_path, "time_s,power_w\n0,40000\n1,0\n", esr_table="esr.csv")
