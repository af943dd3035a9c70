"""A plan is read whole, or refused with file, line, key, what was found and what to do."""

import pytest

from tideleg import PlanError
from tideleg.plan import format_quantity, load_plan, plan_from_mapping, plan_schema, read_table, write_plan
from tideleg.plan.lines import line_of
from tideleg.quantity import DIMENSIONS, parse
from tideleg.registry import installed
from tideleg.stage import build_stage

PLAN = """\
title = "bench"
[battery]
open_circuit_voltage = [[0, "324 V"], [1, "453 V"]]
resistance = "50 mohm"
capacity = "180 Ah"
start_soc = 0.6

[link]
voltage = "750 V"

[stage]
topology = "interleaved"
legs = 4
switching_frequency = "40 kHz"

[stage.inductor]
inductance = "110 uH"  # wound by us

[stage.switch]
in_parallel = 2
on_resistance = "8 mohm"

[[mission]]
profile = "p.csv"
coolant = "65 degC"
"""


@pytest.fixture
def folder(tmp_path):
    (tmp_path / "p.csv").write_text("time_s,power_w\n0,1000\n1,0\n")
    return tmp_path


@pytest.fixture
def plan_file(folder):
    def write(text=PLAN):
        path = folder / "plan.toml"
        path.write_text(text)
        return path

    return write


def test_a_good_plan_is_read_in_base_units(plan_file):
    plan = load_plan(plan_file())
    assert plan.battery.open_circuit_voltage.value == (324.0, 453.0)
    assert plan.battery.capacity == 180 * 3600
    assert plan.link.voltage == 750.0
    assert plan.stage.parts["inductor"]["inductance"] == "110 uH"
    assert plan.mission[0].start == "soaked"
    assert build_stage(plan).inductance["inductor"] == pytest.approx(110e-6)


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ('voltage = "750 V"', 'voltge = "750 V"', r"plan.toml, line \d+, link.voltage: this key is missing"),
        ('voltage = "750 V"', 'voltge = "750 V"', r"line 9, link.voltge: unknown key 'voltge'. Did you mean 'voltage'"),
        ('"180 Ah"', '"180 A"', r"line 5, battery.capacity: found '180 A', where the unit is a unit of current"),
        ('"50 mohm"', '"50 parsec"', r"line 4, battery.resistance: found '50 parsec', where the unit is not known"),
        ("start_soc = 0.6", "start_soc = 1.6", r"line 6, battery.start_soc"),
        ("start_soc = 0.6", "", "start_soc is missing"),
        ('capacity = "180 Ah"', "", "capacity is missing"),
        ("[0, ", "[0.2, ", "nothing is extrapolated"),
        (
            "start_soc = 0.6",
            'start_soc = 0.6\nvoltage_max = "320 V"',
            "voltage_max: found 320 V, below the battery at rest",
        ),
        (
            "start_soc = 0.6",
            'start_soc = 0.6\nvoltage_min = "460 V"',
            "voltage_min: found 460 V, above the battery at rest",
        ),
        ('"750 V"', '"-750 V"', r"line 9, link.voltage"),
        ('"p.csv"', '"q.csv"', r"line 24, mission.0.profile: found 'q.csv', which is no file"),
        ("[link]", "[lnk]", r"the table \[link\] is missing"),
        ("title = ", "title ", "not valid TOML"),
        ("[[mission]]", "[mission]", "mission"),
        ('coolant = "65 degC"', 'coolant = "65 K"', r"line 25, mission.0.coolant: found '65 K'"),
        ('coolant = "65 degC"', "coolant = true", r"mission.0.coolant: found True"),
        ("[link]", '[limits]\nripple_ration = "40 %"\n[link]', "Did you mean 'ripple_ratio'"),
        ("[link]", "[vehicle]\nmass = 1\n[link]", "exactly one of the two forms"),
        ("[link]", "[size]\nlegs_max = 0\n[link]", "size.legs_max"),
    ],
)
def test_each_fault_names_file_line_key_and_remedy(plan_file, old, new, said):
    with pytest.raises(PlanError, match=said):
        load_plan(plan_file(PLAN.replace(old, new, 1)))


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ('"110 uH"', '"-110 uH"', r"line 17, stage.inductor.inductance"),
        ('inductance = "110 uH"', "", "stage.inductor.inductance: this key is missing"),
        ('"8 mohm"', '"8 mohn"', r"line 21, stage.switch.on_resistance: found '8 mohn'"),
        ("on_resistance", "on_resistence", r"line 21, stage.switch.on_resistence: unknown key"),
        ("legs = 4", "legs = 4\nlegz = 3", r"line 14, stage.legz: unknown key 'legz'. Did you mean 'legs'"),
        ("legs = 4", "legs = 2.5", "stage.legs"),
        ('"40 kHz"', '"0 Hz"', "stage.switching_frequency"),
        ("[stage.switch]", "[stage.swich]", r"line 19, stage.swich: found the table"),
        ('"interleaved"', '"interleaved-leg"', "Did you mean 'interleaved'"),
        ("[link]", '[losses]\nleave_out = ["chanel"]\n[link]', "found 'chanel'"),
        ("[link]", "[cooling]\nmodel = 'fan'\n[link]", "no cooling plugin named 'fan'"),
        ("[link]", "[cooling]\nplate_resistence = 1\n[link]", "Did you mean 'plate_resistance'"),
    ],
)
def test_what_plugins_refuse_is_named_as_well(plan_file, old, new, said):
    from tideleg import InputError

    plan = load_plan(plan_file(PLAN.replace(old, new, 1)))
    with pytest.raises(InputError, match=said):
        build_stage(plan)


def test_missing_file_and_other_text(folder):
    with pytest.raises(PlanError, match="does not exist"):
        load_plan(folder / "none.toml")
    (folder / "latin.toml").write_bytes("title = '°'".encode("latin-1"))
    with pytest.raises(PlanError, match="not UTF-8"):
        load_plan(folder / "latin.toml")


def test_a_part_file_is_merged_under_inline_keys_and_named_in_faults(plan_file, folder):
    (folder / "chip.toml").write_text('on_resistance = "9 mohm"\ngate_charge = "1 uC"\ngate_voltage = "20 V"\n')
    plan = load_plan(plan_file(PLAN.replace("in_parallel = 2", 'part = "chip.toml"')))
    assert plan.stage.parts["switch"]["on_resistance"] == "8 mohm"
    assert plan.stage.parts["switch"]["gate_charge"] == "1 uC"
    assert [f.name for f in plan.extra_files] == ["chip.toml"]
    (folder / "chip.toml").write_text('name = "x"\n\ngate_charge = "1 uH"\ngate_voltage = "20 V"\n')
    with pytest.raises(PlanError, match=r"chip.toml, line 3, stage.switch.gate_charge: found '1 uH'"):
        build_stage(load_plan(folder / "plan.toml"))
    with pytest.raises(PlanError, match="stage.switch.part: found 'none.toml'"):
        load_plan(plan_file(PLAN.replace("in_parallel = 2", 'part = "none.toml"')))


def test_cells_become_a_pack(plan_file):
    text = PLAN.replace("capacity", "cells_in_series = 100\ncells_in_parallel = 2\ncapacity")
    text = text.replace('"324 V"', '"3.24 V"').replace('"453 V"', '"4.53 V"').replace("50 mohm", "1 mohm")
    plan = load_plan(plan_file(text))
    assert plan.battery.open_circuit_voltage.value == pytest.approx((324.0, 453.0))
    assert plan.battery.resistance.value == pytest.approx((0.05,))
    assert plan.battery.capacity == pytest.approx(2 * 180 * 3600)


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("soc,open_circuit_voltage_v\n0,300\n0,310\n", "line 3: state of charge 0 does not rise"),
        ("soc,open_circuit_voltage_v\n0,300\nx,310\n", "line 3: found 'x,310'"),
        ("soc,volt\n0,300\n", "wanted are soc,open_circuit_voltage_v"),
        ("soc,open_circuit_voltage_v\n", "no rows"),
        ("", "found the columns"),
    ],
)
def test_a_curve_file_is_taken_or_refused(plan_file, folder, text, said):
    (folder / "ocv.csv").write_text("soc,open_circuit_voltage_v\n0,300\n1,400\n")
    path = plan_file(PLAN.replace('[[0, "324 V"], [1, "453 V"]]', '"ocv.csv"'))
    assert load_plan(path).battery.open_circuit_voltage.value == (300.0, 400.0)
    (folder / "ocv.csv").write_text(text)
    with pytest.raises(PlanError, match=said):
        load_plan(path)


def test_a_plan_from_a_mapping_needs_no_file(folder):
    import tomllib

    plan = plan_from_mapping(tomllib.loads(PLAN), folder=folder)
    assert plan.file is None
    with pytest.raises(ValueError, match="has no file to copy"):
        write_plan(plan, {}, folder / "x.toml", "h")


def test_writing_keeps_comments_moves_files_and_can_be_read_again(plan_file, folder):
    plan = load_plan(plan_file())
    target = folder / "deep" / "sized.toml"
    write_plan(
        plan, {"stage.inductor.inductance": "99 uH", "cooling.plate_resistance": "5 K/kW"}, target, "by us\nfor us"
    )
    text = target.read_text()
    assert text.startswith("# by us\n# for us\n")
    assert "# wound by us" in text
    again = load_plan(target)
    assert again.stage.parts["inductor"]["inductance"] == "99 uH"
    assert again.cooling.settings == {"plate_resistance": "5 K/kW"}
    assert (target.parent / again.mission[0].profile).resolve() == (folder / "p.csv").resolve()


@pytest.mark.parametrize("dimension", sorted(DIMENSIONS))
@pytest.mark.parametrize("value", [1.2e-4, 1.0, 0.0, 123456.789, -3.3e-7, 9.99999999999e5])
def test_formatted_quantities_come_back(dimension, value):
    assert parse(format_quantity(value, dimension), dimension) == pytest.approx(value, rel=1e-11, abs=1e-18)


def test_lines_are_found_in_tables_arrays_and_nested_tables():
    text = 'a = 1\n[[m]]\nx = 1\n[[m]]\nx = 2\n[m.deep]\ny = 3\n["q w"]\n"k" = 1\n'
    assert [line_of(text, key) for key in ("a", "m.0.x", "m.1.x", "m.1.deep.y", "m.1.z", "q w.k", "none")] == [
        1,
        3,
        5,
        7,
        4,
        9,
        None,
    ]


def test_the_schema_is_one_of_draft_2020_12_and_knows_every_plugin_key():
    r = installed()
    schema = plan_schema(r.topologies(), r.loss_models(), r.cooling_models())
    stage = schema["$defs"]["StageTable"]["properties"]
    assert schema["$schema"].endswith("2020-12/schema")
    assert "interleaved" in stage["topology"]["enum"]
    assert {"on_resistance", "gate_charge", "junction_to_plate", "in_parallel"} <= set(stage["switch"]["properties"])
    assert "inductance" in stage["inductor"]["properties"]
    assert "plate_resistance" in schema["$defs"]["CoolingTable"]["properties"]


@pytest.mark.parametrize("name", ["kerbside", "orchard", "commuter"])
def test_the_schema_accepts_every_shipped_plan_and_refuses_a_slip(name):
    import tomllib
    from pathlib import Path

    import jsonschema

    r = installed()
    schema = plan_schema(r.topologies(), r.loss_models(), r.cooling_models())
    jsonschema.Draft202012Validator.check_schema(schema)
    validator = jsonschema.Draft202012Validator(schema)
    file = Path(__file__).parents[3] / "profiles" / name / "plan.toml"
    data = tomllib.loads(file.read_text(encoding="utf-8"))
    assert [error.message for error in validator.iter_errors(data)] == []
    data["stage"]["legz"] = 3
    assert not validator.is_valid(data)


def test_the_schema_knows_diodes_points_and_grades_and_refuses_slips_in_them():
    import copy

    import jsonschema

    r = installed()
    validator = jsonschema.Draft202012Validator(plan_schema(r.topologies(), r.loss_models(), r.cooling_models()))
    rows = [
        {"current": "50 A", "temperature": "25 degC", "energy": "1 mJ"},
        {"current": 9, "temperature": 25, "energy": 0},
    ]
    diode = {"knee_voltage": "1 V", "recovery_energy_curve": rows, "recovery_in_turn_on": False}
    switch = {"part": "x.toml", "turn_on_energy_curve": "e.csv", "turn_off_energy_curve": [["5 A", "1 mJ"], [50, 1e-2]]}
    switch |= {"grades": {"*": "guess"}, "placeholder": True, "sharing_spread": "10 %", "diode": diode}
    plan = {
        "title": "t",
        "battery": {"open_circuit_voltage": 400},
        "link": {"voltage": 700},
        "stage": {
            "topology": "half-bridge",
            "switching_frequency": "9 kHz",
            "inductor": {"inductance": 1e-4},
            "switch": switch,
        },
        "mission": [{"profile": "p.csv"}],
    }
    assert [error.message for error in validator.iter_errors(plan)] == []
    slips = [
        ("grades", {"*": "sure"}),
        ("placeholder", "yes"),
        ("diode", {"knee_volts": 1}),
        ("turn_off_energy_curve", [["5 A", "1 mJ", 3], [50, 1e-2]]),
        ("turn_off_energy_curve", [{"amps": 3, "energy": 1}, {"current": 3, "energy": 1}]),
    ]
    for key, wrong in slips:
        other = copy.deepcopy(plan)
        other["stage"]["switch"][key] = wrong
        assert not validator.is_valid(other), key


def test_one_table_shared_by_models_refuses_what_nobody_declares(plan_file):
    from tideleg.plan import InductorBase, SwitchBase

    plan = load_plan(plan_file())
    found = read_table(plan, "stage.x", {"in_parallel": 3, "inductance": "1 uH"}, {"s": SwitchBase, "i": InductorBase})
    assert (found["s"].in_parallel, found["i"].inductance) == (3, pytest.approx(1e-6))
    with pytest.raises(PlanError, match="unknown key 'inparallel'"):
        read_table(plan, "stage.x", {"inparallel": 3, "inductance": 1}, {"s": SwitchBase, "i": InductorBase})
