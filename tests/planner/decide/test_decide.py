"""Sizing proves what it chose; comparing refuses what is not alike; changes are re-runs."""

import shutil
from pathlib import Path

import pytest

from tideleg import InputError
from tideleg.decide.compare import compare
from tideleg.decide.explain import explained
from tideleg.decide.size import size
from tideleg.decide.trial import rounded_down, rounded_up
from tideleg.plan import load_plan, plan_from_mapping
from tideleg.running import run

SCENARIOS = Path(__file__).parents[3] / "profiles"


@pytest.fixture
def commuter(tmp_path):
    shutil.copytree(SCENARIOS / "commuter", tmp_path / "commuter")
    return tmp_path / "commuter" / "plan.toml"


def test_a_sized_stage_holds_and_each_value_says_what_set_it(commuter, tmp_path):
    text = commuter.read_text().replace("legs = 2", "legs = 7").replace("in_parallel = 2", "in_parallel = 5")
    commuter.write_text(
        text.replace("[limits]", '[limits]\nbattery_voltage_ripple = "0.5 V"\nlink_voltage_ripple = "2 V"')
    )
    sized = size(commuter, destination=tmp_path / "out" / "sized.toml")
    assert sized.outcome.holds, sized.outcome.verdict
    keys = {d.key: d for d in sized.decisions}
    assert {"stage.legs", "stage.inductor.inductance", "stage.switch.in_parallel", "cooling.plate_resistance"} <= set(
        keys
    )
    assert keys["stage.legs"].value == 2
    assert keys["stage.legs"].before == "7"
    assert all(d.set_by for d in sized.decisions)
    assert "of wltc_class3b" in keys["stage.inductor.inductance"].at
    heading = (tmp_path / "out" / "sized.toml").read_text().split("title")[0]
    assert "# stage.legs = 2 (was 7): leg current" in heading
    again = run(tmp_path / "out" / "sized.toml")
    assert again.holds
    tight = {c.name: c.used for c in reversed(again.limits)}  # the tightest of each name
    assert 0.9 < tight["ripple ratio"] <= 1.0
    weakest = keys["cooling.plate_resistance"].value == "200 K/kW"  # the end of the range that [size] allows
    assert weakest or 0.8 < max(tight["junction temperature"], tight["inductor temperature"]) <= 1.0


def test_less_inductance_or_a_weaker_plate_than_sized_would_fail(commuter, tmp_path):
    sized = size(commuter, destination=tmp_path / "s.toml")
    keys = {d.key: d.value for d in sized.decisions}
    henry = float(str(keys["stage.inductor.inductance"]).split()[0])
    text = (tmp_path / "s.toml").read_text()
    worse = text.replace(f'"{keys["stage.inductor.inductance"]}"', f'"{0.9 * henry} uH"')
    (tmp_path / "w.toml").write_text(worse)
    assert not run(tmp_path / "w.toml").holds


def test_values_left_out_are_sized_from_nothing(commuter, tmp_path):
    commuter.write_text(commuter.read_text().replace('inductance = "120 uH"\n', ""))
    with pytest.raises(InputError, match="inductance: this key is missing"):
        run(commuter)
    sized = size(commuter, destination=tmp_path / "s.toml")
    assert sized.outcome.holds


def test_without_limits_nothing_is_chosen_and_it_says_why(commuter):
    text = commuter.read_text()
    start, end = text.index("[limits]"), text.index("[[mission]]")
    commuter.write_text((text[:start] + text[end:]).replace('leg_current = "110 A"', ""))
    sized = size(commuter)
    assert sized.decisions == ()
    assert len(sized.notes) >= 5


def test_an_impossible_junction_limit_is_said_and_the_proof_fails(commuter):
    commuter.write_text(commuter.read_text().replace('"150 degC"', '"55.5 degC"'))
    sized = size(commuter)
    assert not sized.outcome.holds
    assert any("do not hold the temperatures" in note for note in sized.notes)


@pytest.mark.parametrize(("value", "up", "down"), [(1.0312e-4, 1.1e-4, 1.0e-4), (4.0, 4.0, 4.0), (0.0999, 0.10, 0.099)])
def test_rounding_is_to_the_safe_side(value, up, down):
    assert rounded_up(value) == pytest.approx(up, rel=1e-12)
    assert rounded_down(value) == pytest.approx(down, rel=1e-12)


def test_compare_says_what_was_given_and_what_was_changed(commuter):
    found = compare([commuter], topologies=["half-bridge", "interleaved"])
    assert [c.label for c in found.contenders] == ["half-bridge", "interleaved"]
    assert "chips" not in found.unequal  # kept as a budget
    assert "inductor energy at peak" in found.unequal
    assert "legs = 1 instead of 2" in found.contenders[0].adaptations[0]
    assert {"chip voltage rating", "capacitor energy", "junction limit"} <= set(found.contenders[0].fairness)
    assert found.contenders[0].outcome.efficiency < found.contenders[1].outcome.efficiency


def test_compare_refuses_other_missions_and_too_little(commuter, tmp_path):
    other = tmp_path / "other"
    shutil.copytree(commuter.parent, other)
    (other / "plan.toml").write_text(
        (other / "plan.toml").read_text().replace('coolant = "55 degC"', 'coolant = "54 degC"')
    )
    with pytest.raises(InputError, match="its missions differ"):
        compare([commuter, other / "plan.toml"])
    with pytest.raises(InputError, match="at least two plans"):
        compare([commuter])
    with pytest.raises(InputError, match="one plan and at least two topologies"):
        compare([commuter], topologies=["half-bridge"])


def test_every_change_is_a_run_of_its_own(commuter):
    plan = load_plan(commuter)
    outcome = explained(plan, run(plan))
    by_words = {change.what: change for change in outcome.changes}
    warmer = by_words["coolant 10 K warmer"]
    hottest = max(t.greatest_degc for t in outcome.thermal if t.part.endswith("switch"))
    assert warmer.greatest_junction_degc > hottest + 9.0
    assert by_words["switching frequency 25 % higher"].efficiency < outcome.efficiency
    assert by_words["3 chips in parallel instead of 2"].greatest_junction_degc < hottest
    assert len(outcome.changes) == 5


def test_the_aged_pack_stands_beside_the_new_one(commuter):
    plan = load_plan(commuter)
    new, aged = explained(plan, run(plan)).packs
    assert (new.pack, aged.pack) == ("new", "aged: resistance times 1.7, capacity 80 %")
    assert aged.battery_heat_share > 1.5 * new.battery_heat_share
    assert aged.least_voltage_v < new.least_voltage_v
    (name,) = new.end_soc
    assert aged.end_soc[name] < new.end_soc[name]


def test_an_ideal_battery_does_not_age(tmp_path):
    (tmp_path / "p.csv").write_text("time_s,power_w\n0,1000\n1,0\n")
    plan = plan_from_mapping(
        {
            "title": "ideal",
            "battery": {"open_circuit_voltage": "400 V"},
            "link": {"voltage": "800 V"},
            "stage": {
                "topology": "half-bridge",
                "switching_frequency": "20 kHz",
                "inductor": {"inductance": "500 uH"},
            },
            "mission": [{"profile": "p.csv"}],
        },
        folder=tmp_path,
    )
    assert explained(plan, run(plan)).packs == ()


def test_a_plan_that_asks_for_a_life_is_sized_too(tmp_path):
    shutil.copytree(Path(__file__).parents[3] / "profiles" / "kerbside", tmp_path / "k")
    path = tmp_path / "k" / "plan.toml"
    profile = tmp_path / "k" / "kerbside.csv"
    profile.write_text("\n".join(profile.read_text().splitlines()[:400]) + "\n")
    path.write_text(path.read_text().replace("passes_per_year = 2600", "passes_per_year = 2000"))
    sized = size(path)
    assert sized.outcome.wear.parts  # the proof tells the life, though the first rounds do not ask it
