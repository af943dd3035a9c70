"""Part files: merged under the plan's keys, echoed, graded, and shown where they are invented."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest

from tideleg import PlanError, load_plan, plan_from_mapping, run
from tideleg.command import main
from tideleg.plan import GRADES, write_plan
from tideleg.plan.generic import FOLDER, copy_generic, generic_names
from tideleg.report import words

PLAN = """
title = "parts"
[battery]
open_circuit_voltage = "400 V"
[link]
voltage = "{link}"
[stage]
topology = "half-bridge"
switching_frequency = "{frequency}"
[stage.inductor]
inductance = "300 uH"
winding_resistance = "4 mohm"
[stage.switch]
part = "{part}"
{more}
[cooling]
plate_resistance = "10 K/kW"
[limits]
junction_temperature = "160 degC"
[[mission]]
profile = "p.csv"
coolant = "40 degC"
"""
PART = """name = "chip"
on_resistance = "8 mohm"
turn_on_energy_curve = "data/eon.csv"
test_voltage = "700 V"
gate_charge = "1 uC"
gate_voltage = "20 V"
junction_to_plate = [["0.2 K/W", "20 ms"]]
[grades]
"*" = "datasheet"
gate_charge = "guess"
turn_on_energy_curve = "measured"
"""


@pytest.fixture
def write(tmp_path: Path) -> Any:
    (tmp_path / "p.csv").write_text("time_s,power_w\n0,12000\n1,-9000\n2,0\n3,0\n")
    (tmp_path / "parts" / "data").mkdir(parents=True)
    (tmp_path / "parts" / "data" / "eon.csv").write_text("current_a,energy_mj\n0,0\n80,1.2\n")

    def plan(
        part: str = "parts/chip.toml",
        text: str = PART,
        more: str = "",
        frequency: str = "20 kHz",
        link: str = "700 V",
    ) -> Path:
        if not part.startswith("generic:"):
            (tmp_path / part).write_text(text)
        (tmp_path / "plan.toml").write_text(PLAN.format(part=part, more=more, frequency=frequency, link=link))
        return tmp_path / "plan.toml"

    return plan


def test_the_plan_wins_over_its_part_file_and_both_are_echoed(write: Any) -> None:
    plan = load_plan(write(more='on_resistance = "9 mohm"\nin_parallel = 2'))
    keys = plan.stage.keys_of("switch")
    assert (keys["on_resistance"], keys["gate_charge"], keys["in_parallel"]) == ("9 mohm", "1 uC", 2)
    outcome = run(plan)
    facts = {p.name: p.facts for p in outcome.parts}["upper_switch"]
    assert facts["on resistance"] == "9 mohm"
    assert facts["of the part file, replaced by the plan"] == "on resistance 8 mohm"
    assert facts["part file"] == "parts/chip.toml"
    assert facts["turn on energy curve"] == "2 points of eon.csv (measured)"
    assert {"chip.toml", "eon.csv"} <= set(outcome.inputs.sha256)


def test_grades_travel_to_facts_summary_and_page_one(write: Any) -> None:
    outcome = run(write())
    part = {p.name: p for p in outcome.parts}["lower_switch"]
    assert part.facts["gate charge"] == "1 uC (guess)"
    assert part.grades["on_resistance"] == "datasheet"
    assert "name" not in part.grades
    summary = json.loads(json.dumps(outcome.summary()))
    graded = {entry["key"]: entry for entry in summary["grades"]}
    assert graded["stage.switch.gate_charge"]["grade"] == "guess"
    assert graded["stage.switch.gate_charge"]["touches"] == [
        "gate of upper_switch".replace("_", " "),
        "gate of lower switch",
    ]
    losses = {e.mechanism: 0.0 for e in outcome.missions[0].losses}
    for entry in outcome.missions[0].losses:
        losses[entry.mechanism] += entry.total_j
    whole = sum(losses.values())
    assert graded["stage.switch.gate_charge"]["loss_share"] == pytest.approx(losses["gate"] / whole, rel=1e-9)
    assert graded["stage.switch.on_resistance"]["loss_share"] == pytest.approx(
        losses["channel conduction"] / whole, rel=1e-9
    )
    assert graded["stage.switch.junction_to_plate"]["touches"][0] == "temperature of upper switch"
    told = words.sureness(outcome)
    assert any(line.startswith("guess: stage.switch.gate_charge") for line in told)
    assert not any(line.startswith("guess: stage.switch.on_resistance") for line in told)
    assert (
        next(p for p in summary["parts"] if p["name"] == "upper_switch")["grades"]["turn_on_energy_curve"] == "measured"
    )


def test_a_key_that_the_plan_gives_loses_the_grade_of_the_file_and_may_take_its_own(write: Any) -> None:
    plan = load_plan(write(more='gate_charge = "2 uC"\non_resistance = "9 mohm"\ngrades = {on_resistance = "typical"}'))
    assert "stage.switch.gate_charge" not in plan.stage.grades
    assert plan.stage.grades["stage.switch.on_resistance"] == "typical"
    assert plan.stage.grades["stage.switch.test_voltage"] == "datasheet"


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (
            'gate_charge = "guess"',
            'gate_charge = "sure"',
            "found 'sure'; grades are measured, datasheet, typical, guess",
        ),
        ('gate_charge = "guess"', 'gate_charg = "guess"', "no key 'gate_charg' stands in this table"),
        ('gate_voltage = "20 V"', 'gate_voltage = "20 A"', "gate_voltage: found '20 A'"),
        ('name = "chip"', 'part = "other.toml"', "a part file names no other part file"),
        ('name = "chip"', "placeholder = 1", "found 1; give true or false"),
        ("data/eon.csv", "data/none.csv", "found 'data/none.csv', which is no file"),
    ],
)
def test_what_is_wrong_in_a_part_file_is_named_with_its_file_and_line(
    write: Any, old: str, new: str, message: str
) -> None:
    with pytest.raises(PlanError) as caught:
        run(write(text=PART.replace(old, new)))
    assert message in str(caught.value)
    assert "chip.toml" in str(caught.value)
    assert caught.value.line == next(n for n, line in enumerate(PART.splitlines(), 1) if old in line)


def test_a_diode_in_a_part_file_is_merged_key_by_key(write: Any) -> None:
    text = """knee_voltage = "0.9 V"
[diode]
knee_voltage = "1 V"
knee_resistance = "3 mohm"
[diode.grades]
"*" = "typical"
"""
    plan = load_plan(write(text=text, more='[stage.switch.diode]\nknee_resistance = "4 mohm"'))
    assert plan.stage.keys_of("switch.diode") == {"knee_voltage": "1 V", "knee_resistance": "4 mohm"}
    assert plan.stage.grades == {"stage.switch.diode.knee_voltage": "typical"}
    assert plan.stage.overridden == {"stage.switch.diode.knee_resistance": "3 mohm"}
    with pytest.raises(PlanError, match="knee_voltage") as caught:
        run(write(text=text.replace('"1 V"', '"1 A"')))
    assert (caught.value.line, "chip.toml" in str(caught.value)) == (3, True)


def test_a_table_inside_a_part_file_that_no_part_has_is_named_with_the_file(write: Any) -> None:
    with pytest.raises(PlanError, match="chip.toml.*which no switch has"):
        run(write(text=PART.replace("[grades]", "[driver]\nvoltage = 3\n[grades]")))


def test_any_part_table_takes_a_part_file(write: Any, tmp_path: Path) -> None:
    (tmp_path / "coil.toml").write_text(
        'inductance = "300 uH"\nwinding_resistance = "4 mohm"\n[grades]\n"*" = "guess"\n'
    )
    text = write().read_text().replace('inductance = "300 uH"\nwinding_resistance = "4 mohm"', 'part = "coil.toml"')
    (tmp_path / "plan.toml").write_text(text)
    outcome = run(tmp_path / "plan.toml")
    graded = {entry.key: entry for entry in outcome.grades}
    assert graded["stage.inductor.winding_resistance"].loss_share > 0.0
    assert graded["stage.inductor.inductance"].grade == "guess"


@pytest.mark.parametrize("name", list(generic_names()))
def test_every_generic_part_runs_in_its_class_and_says_that_it_is_invented(write: Any, name: str) -> None:
    rated = float(name.partition("-")[2].removesuffix("v"))
    link, battery = 0.6 * rated, 0.35 * rated
    path = write(part=name, frequency="10 kHz" if "igbt" in name else "40 kHz", link=f"{link} V")
    path.write_text(path.read_text().replace('open_circuit_voltage = "400 V"', f'open_circuit_voltage = "{battery} V"'))
    power = 20.0 * rated if rated > 100 else 2000.0
    (path.parent / "p.csv").write_text(f"time_s,power_w\n0,{power}\n1,{-power}\n2,0\n3,0\n")
    outcome = run(path)
    assert outcome.placeholders
    assert any("PLACEHOLDER" in line for line in words.sureness(outcome))
    assert "PLACEHOLDER" in words.answers(outcome)[-1][1]
    assert outcome.stage_facts["PLACEHOLDER parts"] == "switch"
    assert all(entry.grade == "guess" for entry in outcome.grades)
    assert outcome.efficiency > 0.93
    assert outcome.missions[0].outside == (), outcome.missions[0].outside
    assert {e.mechanism for e in outcome.missions[0].losses} >= {"channel conduction", "turn-on", "turn-off", "gate"}
    keys = load_plan(path).stage.keys_of("switch")
    assert keys["rated_voltage"] == f"{rated:g} V"


def test_the_generic_classes_are_those_of_the_trade() -> None:
    classes = {name.partition("-")[2] for name in generic_names()}
    assert classes == {"100v", "650v", "750v", "1200v", "1700v"}
    assert all("placeholder" in words_ for words_ in generic_names().values())
    assert set(GRADES) == {"measured", "datasheet", "typical", "guess"}


def test_an_unknown_generic_part_is_refused_with_the_known_ones(write: Any) -> None:
    with pytest.raises(PlanError, match=r"stage.switch.part: found 'generic:none'.*generic:igbt-1200v"):
        load_plan(write(part="generic:none"))


def test_parts_lists_and_copies_without_overwriting(tmp_path: Path, capsys: Any) -> None:
    assert main(["parts"]) == 0
    assert "generic:mosfet-1200v" in capsys.readouterr().out
    assert main(["parts", "generic:igbt-1200v", str(tmp_path / "own")]) == 0
    names = {path.name for path in (tmp_path / "own").iterdir()}
    assert names == {path.name for path in FOLDER.glob("igbt-1200v*")}
    assert main(["parts", "generic:igbt-1200v", str(tmp_path / "own")]) == 2
    assert main(["parts", "generic:igbt-1200v"]) == 2
    assert main(["parts", "none", str(tmp_path)]) == 2


def test_a_plan_that_is_written_elsewhere_still_finds_its_parts_and_points(write: Any, tmp_path: Path) -> None:
    plan = load_plan(write(more='turn_off_energy_curve = "parts/data/eon.csv"'))
    write_plan(plan, {"stage.inductor.inductance": "250 uH"}, tmp_path / "out" / "sized.toml", "moved")
    again = load_plan(tmp_path / "out" / "sized.toml")
    assert again.stage.keys_of("switch") == plan.stage.keys_of("switch")
    generic = load_plan(write(part="generic:mosfet-1200v"))
    write_plan(generic, {}, tmp_path / "out" / "generic.toml", "moved")
    assert load_plan(tmp_path / "out" / "generic.toml").stage.keys_of("switch") == generic.stage.keys_of("switch")


def test_a_copy_of_a_generic_part_gives_what_the_generic_one_does(write: Any, tmp_path: Path) -> None:
    first = run(write(part="generic:mosfet-1200v"))
    copy_generic("generic:mosfet-1200v", tmp_path / "mine")
    path = write(part="generic:mosfet-1200v")
    path.write_text(path.read_text().replace("generic:mosfet-1200v", "mine/mosfet-1200v.toml"))
    second = run(path)
    assert first.missions[0].energy == second.missions[0].energy


def test_a_plan_made_in_python_takes_part_files_too(write: Any, tmp_path: Path) -> None:
    import tomllib

    data = tomllib.loads(write().read_text())
    plan = plan_from_mapping(data, folder=tmp_path)
    assert plan.stage.grades["stage.switch.gate_charge"] == "guess"


def test_the_share_of_a_guess_is_weighted_by_the_passes_of_each_mission(write: Any, tmp_path: Path) -> None:
    path = write()
    (tmp_path / "q.csv").write_text("time_s,power_w\n0,2000\n2,500\n3,0\n")
    more = '[[mission]]\nprofile = "q.csv"\npasses_per_year = 50\ncoolant = "40 degC"\n'
    path.write_text(path.read_text().replace('coolant = "40 degC"', 'passes_per_year = 3\ncoolant = "40 degC"') + more)
    outcome = run(path)
    gate = sum(m.passes_per_year * e.total_j for m in outcome.missions for e in m.losses if e.mechanism == "gate")
    whole = sum(m.passes_per_year * e.total_j for m in outcome.missions for e in m.losses)
    entry = next(e for e in outcome.grades if e.key == "stage.switch.gate_charge")
    assert entry.loss_share == pytest.approx(gate / whole, rel=1e-9)


@pytest.mark.parametrize("file", sorted(FOLDER.glob("*.toml")), ids=lambda f: f.stem)
def test_the_schema_of_a_part_file_accepts_every_generic_part_and_refuses_a_slip(file: Path, capsys: Any) -> None:
    import tomllib

    import jsonschema

    assert main(["schema", "--part", "switch"]) == 0
    schema = json.loads(capsys.readouterr().out)
    jsonschema.Draft202012Validator.check_schema(schema)
    validator = jsonschema.Draft202012Validator(schema)
    data = tomllib.loads(file.read_text(encoding="utf-8"))
    assert [error.message for error in validator.iter_errors(data)] == []
    assert not validator.is_valid({**data, "part": "other.toml"})
    assert not validator.is_valid({**data, "on_resistence": 1})
