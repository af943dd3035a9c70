"""From the table of steps to damage and life, against the rainflow package and formulas written here; and refusals."""

import json
import math
import shutil
from pathlib import Path

import numpy as np
import pytest
import rainflow
from scipy import stats

from tideleg import InputError, PluginError
from tideleg.decide.explain import explained
from tideleg.plan import load_plan, plan_from_mapping, plan_schema
from tideleg.registry import installed
from tideleg.running import run

KERBSIDE = Path(__file__).parents[2] / "profiles" / "kerbside"
BOLTZMANN = 1.380649e-23
YEAR_H = 8766.0

STOPS = "time_s,power_w\n" + "".join(f"{30 * i},{150000 if i % 2 == 0 else 0}\n" for i in range(40)) + "1200,0\n"
LIFE = {"switch": {"model": "coffin-manson-arrhenius", "constants": "lesit-1997", "spread": 0.5}}


def mapping(life, missions=None):
    return {
        "title": "Stops",
        "battery": {"open_circuit_voltage": "400 V", "resistance": "20 mohm"},
        "link": {"voltage": "750 V"},
        "stage": {
            "topology": "interleaved",
            "legs": 2,
            "switching_frequency": "20 kHz",
            "inductor": {"inductance": "200 uH"},
            "switch": {
                "on_resistance": "12 mohm",
                "junction_to_plate": [["0.1 K/W", "0.05 s"], ["0.2 K/W", "2 s"]],
            },
            "link_capacitor": {"esr": "5 mohm", "thermal_resistance": "2 K/W", "cooled_by": "plate"},
        },
        "cooling": {"plate_resistance": "20 K/kW", "plate_heat_capacity": "2000 J/K"},
        "mission": missions or [{"profile": "stops.csv", "passes_per_year": 5000, "coolant": "65 degC"}],
        "life": life,
    }


def answer(folder, life, missions=None, **keys):
    (folder / "stops.csv").write_text(STOPS)
    return run(plan_from_mapping(mapping(life, missions), folder=folder), **keys)


def part(outcome, name="lower_switch"):
    return next(p for p in outcome.wear.parts if p.part == name)


def test_damage_of_a_run_by_the_rainflow_package_and_the_formula(tmp_path):
    outcome = answer(tmp_path, {**LIFE, "residue": "half_cycles"})
    history = np.concatenate([[65.0], outcome.missions[0].steps["lower_switch.temperature_degc"].to_numpy()])
    by_hand = 0.0
    for swing, mean, count, _, _ in rainflow.extract_cycles(history):
        number = 302500 * swing**-5.039 * math.exp(9.891e-20 / (BOLTZMANN * (mean + 273.15)))
        by_hand += count / number
    assert by_hand > 0.0
    assert part(outcome).damage_per_pass["stops"] == pytest.approx(by_hand, rel=1e-9)
    assert part(outcome).damage_per_year == pytest.approx(5000 * by_hand, rel=1e-9)


def test_the_rise_from_the_soaked_start_is_a_cycle(tmp_path):
    # A mission that starts soaked at 65 degC: the greatest swing counted begins there, not at the first end of a step.
    outcome = answer(tmp_path, LIFE)
    heat = next(h for h in outcome.wear.heat if h.part == "lower_switch")
    assert heat.greatest_swing_k == pytest.approx(heat.greatest_degc - 65.0, abs=1e-9)


def test_a_start_at_a_temperature_and_a_periodic_start(tmp_path):
    mission = {"profile": "stops.csv", "passes_per_year": 5000, "coolant": "65 degC"}
    cold = answer(tmp_path, LIFE, [{**mission, "start": "20 degC"}])
    heat = next(h for h in cold.wear.heat if h.part == "lower_switch")
    assert heat.greatest_swing_k == pytest.approx(heat.greatest_degc - 20.0, abs=1e-9)
    again = answer(tmp_path, LIFE, [{**mission, "start": "periodic"}])
    warm = next(h for h in again.wear.heat if h.part == "lower_switch")
    assert warm.greatest_swing_k < heat.greatest_swing_k - 40.0
    assert part(again).damage_per_year < part(cold).damage_per_year


def test_missions_add_by_their_passes(tmp_path):
    mission = {"profile": "stops.csv", "coolant": "65 degC"}
    alone = part(answer(tmp_path, LIFE))
    both = part(
        answer(
            tmp_path,
            LIFE,
            [{**mission, "name": "one", "passes_per_year": 2000}, {**mission, "name": "two", "passes_per_year": 3000}],
        )
    )
    assert both.damage_per_year == pytest.approx(alone.damage_per_year, rel=1e-12)
    assert set(both.damage_per_pass) == {"one", "two"}
    assert both.damage_per_pass["one"] == pytest.approx(alone.damage_per_pass["stops"], rel=1e-12)


def test_life_is_a_lognormal_and_the_first_of_all_chips(tmp_path):
    outcome = answer(tmp_path, {**LIFE, "target": "5 years", "target_failures": "10 %"})
    one = part(outcome)
    law = stats.lognorm(s=0.5, scale=1.0 / one.damage_per_year)
    assert (one.life.p10, one.life.p50, one.life.p90) == pytest.approx(law.ppf([0.1, 0.5, 0.9]), rel=1e-9)
    assert one.copies == 2
    assert one.first_life.p10 == pytest.approx(law.ppf(1 - 0.9**0.5), rel=1e-9)
    assert one.life_at_target_years == pytest.approx(one.first_life.p10, rel=1e-12)
    assert one.margin_years == pytest.approx(one.first_life.p10 - 5.0, rel=1e-9)


def test_a_target_that_is_missed_breaks_the_verdict_and_one_that_is_met_does_not(tmp_path):
    first = answer(tmp_path, LIFE).wear.worst
    years = first.first_life.p10
    for factor, holds in ((0.9, True), (1.1, False)):
        outcome = answer(tmp_path, {**LIFE, "target": f"{factor * years} years"})
        checks = [c for c in outcome.limits if c.name.startswith("life") and c.part == first.part]
        assert [c.holds for c in checks] == [holds]
        assert checks[0].used == pytest.approx(factor, rel=1e-6)
        assert outcome.holds is holds
    assert "life by coffin-manson-arrhenius" in outcome.verdict


def test_the_damage_of_the_stretches_is_the_damage_of_the_pass(tmp_path):
    outcome = answer(tmp_path, LIFE)
    trace = part(outcome).along["stops"]
    assert trace.damage[-1] == pytest.approx(part(outcome).damage_per_pass["stops"], rel=1e-9)
    assert trace.time_s[-1] == 1200.0
    top = outcome.wear.consumers
    assert len(top) == 20
    assert [c.damage_per_year for c in top] == sorted((c.damage_per_year for c in top), reverse=True)
    assert all(0.0 <= c.begin_s < c.end_s <= 1200.0 for c in top)


def test_bands_of_swing_hold_every_cycle_and_all_damage(tmp_path):
    outcome = answer(tmp_path, LIFE)
    one, heat = part(outcome), next(h for h in outcome.wear.heat if h.part == "lower_switch")
    assert sum(b.damage_share for b in one.bands) == pytest.approx(1.0)
    assert sum(b.per_year for b in one.bands) == pytest.approx(heat.cycles_per_year)
    assert sum(heat.swing_counts) == pytest.approx(heat.cycles_per_year)
    assert sum(heat.band_hours) == pytest.approx(5000 * 1200 / 3600)
    steps = outcome.missions[0].steps
    mean = steps["lower_switch.temperature_mean_degc"].to_numpy()
    assert heat.mean_degc == pytest.approx(np.average(mean, weights=steps["duration_s"]), rel=1e-12)


def test_what_lies_outside_the_data_is_told_from_a_tenth_on(tmp_path):
    outcome = answer(tmp_path, LIFE)
    told = [w for w in outcome.warnings if "outside the data" in w]
    shares = {p.part: p.outside_share for p in outcome.wear.parts}
    assert len(told) == sum(share > 0.1 for share in shares.values())
    own = {"model": "coffin-manson-arrhenius", "factor": 302500, "exponent": -5.039, "spread": 0.5,
           "activation_energy": 9.891e-20, "swing_range": ["0 K", "150 K"], "mean_range": ["0 degC", "150 degC"]}  # fmt: skip
    wide = answer(tmp_path, {"switch": own})
    assert part(wide).damage_per_year == pytest.approx(part(outcome).damage_per_year, rel=1e-12)
    assert not [w for w in wide.warnings if "outside the data" in w]
    narrow = answer(tmp_path, {"switch": {**own, "swing_range": ["149 K", "150 K"]}})
    assert part(narrow).outside_share == pytest.approx(1.0)
    assert [w for w in narrow.warnings if "100 % of the damage" in w]


def test_a_capacitor_by_hand(tmp_path):
    keys = {"model": "capacitor-life", "rated_life": "5000 h", "rated_temperature": "105 degC", "rated_at": "core",
            "law": "ten-kelvin", "voltage_law": "power", "rated_voltage": "900 V", "voltage_exponent": 7,
            "temperature_range": ["40 degC", "105 degC"], "spread": 0.3}  # fmt: skip
    outcome = answer(tmp_path, {"link_capacitor": keys})
    steps = outcome.missions[0].steps
    degc = steps["link_capacitor.temperature_mean_degc"].to_numpy()
    hours = 5000 * 2 ** ((105 - degc) / 10) * (900 / 750) ** 7
    by_hand = np.sum(steps["duration_s"].to_numpy() / 3600 / hours)
    assert part(outcome, "link_capacitor").damage_per_pass["stops"] == pytest.approx(by_hand, rel=1e-9)
    assert degc.mean() > 65.0  # the ripple's heat is in the temperature


def test_hours_of_a_pump_and_starts_of_a_contactor(tmp_path):
    pump = {"model": "running-hours", "rated_hours": "30000 h", "runs": "always", "spread": 0.3}
    contactor = {"model": "running-hours", "rated_starts": 100000, "runs": "always", "spread": 0.2}
    outcome = answer(tmp_path, {"coolant_pump": pump, "main_contactor": contactor})
    assert part(outcome, "coolant_pump").damage_per_year == pytest.approx(5000 * (1200 / 3600) / 30000)
    assert part(outcome, "main_contactor").damage_per_year == pytest.approx(5000 / 100000)


def test_without_life_models_page_one_says_so_for_each_part(tmp_path):
    data = mapping({})
    del data["life"]
    (tmp_path / "stops.csv").write_text(STOPS)
    outcome = run(plan_from_mapping(data, folder=tmp_path))
    assert outcome.wear.worst is None
    assert [h.part for h in outcome.wear.heat]
    told = [line for line in outcome.not_modelled if line.startswith("life of")]
    names = {"switch", "inductor", "battery_capacitor", "link_capacitor"}
    assert set(told) == {f"life of {name.replace('_', ' ')}: no [life.{name}] given" for name in names}


def test_more_than_a_year_in_a_year_is_refused(tmp_path):
    with pytest.raises(InputError, match="a year has 8766 h: give fewer passes"):
        answer(tmp_path, LIFE, [{"profile": "stops.csv", "passes_per_year": 40000, "coolant": "65 degC"}])


def test_a_residue_that_is_left_out_is_told_and_counts_less(tmp_path):
    left_out = answer(tmp_path, {**LIFE, "residue": "closed_only"})
    assert any("closed_only" in w for w in left_out.warnings)
    assert part(left_out).damage_per_year < part(answer(tmp_path, LIFE)).damage_per_year


@pytest.mark.parametrize(
    ("life", "words"),
    [
        ({"switch": {"model": "coffin-manson"}}, "Did you mean 'coffin-manson-arrhenius'"),
        ({"switch": {"constants": "lesit-1997"}}, "life.switch.model: this key is missing"),
        ({"switch": {**LIFE["switch"], "spred": 1}}, "life.switch.spred"),
        ({"switch": {"model": "coffin-manson-arrhenius", "constants": "lesit-1997"}}, "life.switch.spread"),
        ({"link_capacitor": LIFE["switch"]}, "link_capacitor is a capacitor"),
        ({"swich": LIFE["switch"]}, "which the stage does not have; it has"),
        ({"target": "5 K"}, "life.target"),
        ({"residue": "halves"}, "life.residue"),
        ({"targt": "5 years"}, "targt"),
        ({"switch": []}, "life.switch"),
        ({"parts": []}, "parts"),
    ],
)
def test_refusals_name_the_key(tmp_path, life, words):
    with pytest.raises((InputError, PluginError)) as caught:
        answer(tmp_path, life)
    assert words in str(caught.value)


def test_a_part_without_temperature_has_no_life(tmp_path):
    data = mapping(LIFE)
    del data["stage"]["switch"]["junction_to_plate"]
    (tmp_path / "stops.csv").write_text(STOPS)
    with pytest.raises(InputError, match="no thermal path"):
        run(plan_from_mapping(data, folder=tmp_path))


def test_faults_name_file_and_line(tmp_path):
    folder = tmp_path / "kerbside"
    shutil.copytree(KERBSIDE, folder)
    file = folder / "plan.toml"
    text = file.read_text().replace('constants = "lesit-1997"', 'constants = "lesit-1998"')
    file.write_text(text)
    line = 1 + text.splitlines().index('constants = "lesit-1998"')
    with pytest.raises(InputError, match=f"plan.toml.*{line}") as caught:
        run(file)
    assert "life.switch.constants" in str(caught.value)


@pytest.fixture(scope="module")
def truck():
    plan = load_plan(KERBSIDE / "plan.toml")
    return plan, run(plan)


def test_coarser_profiles_keep_the_energy_and_lose_the_damage(truck):
    plan, fine = truck
    net = [fine.missions[0].energy.link_out_j - fine.missions[0].energy.link_in_j]
    damage = [part(fine).damage_per_year]
    for merged in (10, 100, 600):  # 0.1 s to 1 s, 10 s, 60 s
        other = run(plan, merged_steps=merged)
        net.append(other.missions[0].energy.link_out_j - other.missions[0].energy.link_in_j)
        damage.append(part(other).damage_per_year)
    np.testing.assert_allclose(net, net[0], rtol=1e-9)
    assert damage[0] > 1.5 * damage[1] > 30.0 * damage[2] > 1000.0 * damage[3]
    assert damage[0] > 1e4 * damage[3]


def test_the_resolution_test_and_the_changes_tell_the_damage(truck):
    plan, outcome = truck
    full = explained(plan, outcome)
    assert all(c.damage_change is not None and c.damage_change < 0.0 for c in full.coarser)
    by_words = {c.what: c.damage for c in full.changes}
    assert by_words["coolant 10 K warmer"] > 1.5
    assert by_words["coolant 10 K cooler"] < 0.7
    assert by_words["3 chips in parallel instead of 2"] < 0.5


def test_summary_holds_wear_as_plain_json(truck):
    text = json.dumps(truck[1].summary(), allow_nan=False)
    wear = json.loads(text)["wear"]
    assert set(wear) == {"residue", "heat", "parts", "consumers"}
    first = wear["parts"][0]
    assert {"part", "model", "damage_per_year", "life", "first_life", "margin_years", "outside_share", "box"} <= set(
        first
    )
    assert "cycles" not in first
    assert "along" not in first
    assert wear["heat"]["lower_switch"]["greatest_degc"] > 90.0
    assert len(wear["consumers"]) == 20


def test_the_schema_takes_the_shipped_plan_and_refuses_a_misspelt_life_key():
    import tomllib

    import jsonschema

    registry = installed()
    schema = plan_schema(
        registry.topologies(), registry.loss_models(), registry.cooling_models(), registry.life_models()
    )
    data = tomllib.loads((KERBSIDE / "plan.toml").read_text(encoding="utf-8"))
    jsonschema.validate(data, schema)
    data["life"]["switch"]["spred"] = 1
    with pytest.raises(jsonschema.ValidationError):
        jsonschema.validate(data, schema)
