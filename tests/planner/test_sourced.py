"""A mission may take its profile from a source: exactly one origin, echoed, fingerprinted, and the same each time."""

import hashlib
import json

import jsonschema
import numpy as np
import pytest

from tideleg import MadeProfile, PlanError, PluginError
from tideleg.demand import profile_of, vehicle_of
from tideleg.facts import inputs_of
from tideleg.plan import load_plan, plan_schema, write_plan
from tideleg.registry import Plugin, Registry, installed
from tideleg.running import run
from tideleg.scenario import scenarios_folder

SHAVING = """
[[mission]]
name = "shaving"
source = "peak-shaving"
coolant = "65 degC"
ambient = "35 degC"
[mission.source_settings]
load = "load.csv"
threshold = "60 kW"
storage_energy = "2 kWh"
discharge_limit = "50 kW"
charge_limit = "20 kW"
"""
LOAD = "time_s,load_kw\n0,50\n60,90\n120,55\n180,70\n240,40\n300,0\n"


@pytest.fixture
def plan_file(tmp_path):
    head = (scenarios_folder() / "kerbside" / "plan.toml").read_text(encoding="utf-8").partition("[[mission]]")[0]
    shipped = load_plan(scenarios_folder() / "kerbside" / "plan.toml")
    for file in shipped.extra_files:
        target = tmp_path / file.relative_to(shipped.folder)
        target.parent.mkdir(parents=True, exist_ok=True)
        target.write_bytes(file.read_bytes())
    (tmp_path / "load.csv").write_text(LOAD)

    def write(mission=SHAVING):
        path = tmp_path / "plan.toml"
        path.write_text(head + mission, encoding="utf-8")
        return path

    return write


def test_a_sourced_mission_runs_and_echoes_what_was_done(plan_file):
    outcome = run(plan_file())
    (mission,) = outcome.missions
    assert mission.name == "shaving"
    assert "made by the source peak-shaving with load = load.csv, threshold = 60 kW" in mission.rules[0]
    assert any("stored energy" in rule for rule in mission.rules)
    assert outcome.inputs.sha256["load.csv"] == hashlib.sha256(LOAD.encode()).hexdigest()


def test_the_fingerprint_of_the_table_follows_its_content(plan_file):
    plan = load_plan(plan_file())
    one, again = profile_of(plan, plan.mission[0]), profile_of(plan, plan.mission[0])
    assert one.sha256 == again.sha256
    other = load_plan(plan_file(SHAVING.replace("60 kW", "61 kW")))
    assert profile_of(other, other.mission[0]).sha256 != one.sha256
    assert set(inputs_of(plan, [one]).sha256) >= {"load.csv", "shaving, table made by its source"}


@pytest.mark.parametrize(
    ("before", "after", "message"),
    [
        ('source = "peak-shaving"', "", "found neither of profile and source"),
        ('source = "peak-shaving"', 'source = "peak-shaving"\nprofile = "load.csv"', "found both of profile"),
        (
            'source = "peak-shaving"',
            'source = "peak-shaving"\nsign = "charge"',
            "sign tells how a profile file is read",
        ),
        ('threshold = "60 kW"', 'treshold = "60 kW"', r"line \d+, mission.0.source_settings.treshold"),
        ('"load.csv"', '"lod.csv"', r"mission.0.source_settings.load: found 'lod.csv', which is no file"),
        ('threshold = "60 kW"', 'threshold = "60 V"', "a unit of voltage"),
    ],
)
def test_what_cannot_be_used_is_named(plan_file, before, after, message):
    assert before in SHAVING
    with pytest.raises(PlanError, match=message):
        run(plan_file(SHAVING.replace(before, after)))


def test_settings_without_a_source_are_refused(plan_file):
    with pytest.raises(PlanError, match="source_settings stands without source"):
        load_plan(plan_file(SHAVING.replace('source = "peak-shaving"', 'profile = "load.csv"')))


def test_an_unknown_source_names_those_installed(plan_file):
    with pytest.raises(PluginError, match=r"no profile plugin named 'peak-shavin'.*Did you mean 'peak-shaving'"):
        run(plan_file(SHAVING.replace('"peak-shaving"', '"peak-shavin"')))


class Broken:
    name, source, file_keys = "peak-shaving", "nowhere", ()
    settings = installed().profile_source("peak-shaving").settings

    def __init__(self, made):
        self.made = made

    def make(self, settings, folder):
        return self.made


@pytest.mark.parametrize(
    ("made", "message"),
    [
        (MadeProfile(np.arange(3.0), np.ones(3), np.array([1.0, np.nan, 0.0]), ("r",)), "not finite"),
        (MadeProfile(np.array([0.0, 2.0]), np.ones(2), np.ones(2), ("r",)), "gap or an overlap"),
        (MadeProfile(np.arange(2.0), np.ones(2), np.ones(3), ("r",)), "three equal ones"),
        (MadeProfile(np.zeros(1), np.zeros(1), np.ones(1), ("r",)), "longer than zero"),
        (MadeProfile(np.zeros(1), np.ones(1), np.ones(1), ()), "its rules are empty"),
    ],
)
def test_a_table_that_breaks_the_contract_is_the_plugins_fault(plan_file, made, message):
    plan = load_plan(plan_file())
    registry = Registry([Plugin("peak-shaving", "profile", Broken(made), "m", "stranger", "1")], ())
    with pytest.raises(PluginError, match=rf"from stranger 1\) made a profile that .*{message}"):
        profile_of(plan, plan.mission[0], registry)


def test_a_written_plan_still_finds_the_files_of_its_source(plan_file, tmp_path):
    plan = load_plan(plan_file())
    target = tmp_path / "deeper" / "sized.toml"
    write_plan(plan, {}, target, "moved")
    again = load_plan(target)
    assert again.mission[0].source_settings["load"] == "../load.csv"
    assert profile_of(again, again.mission[0]).sha256 == profile_of(plan, plan.mission[0]).sha256


def test_the_schema_knows_the_keys_of_each_source():
    r = installed()
    schema = plan_schema(r.topologies(), r.loss_models(), r.cooling_models(), profile_sources=r.profile_sources())
    mission = {"$defs": schema["$defs"], "$ref": "#/$defs/MissionTable"}
    json.dumps(schema)
    keys = {"duration": "1 h", "step": "1 s", "rms_power": "20 kW", "corner_frequency": "10 mHz", "seed": 4}
    jsonschema.validate({"source": "duty", "source_settings": keys}, mission)
    jsonschema.validate({"profile": "p.csv"}, mission)
    for bad in (
        {"source": "duty", "source_settings": {**keys, "sed": 1}},
        {"source": "duty", "source_settings": {}},
        {"source": "duty", "profile": "p.csv", "source_settings": keys},
        {"source": "dutty", "source_settings": keys},
        {},
    ):
        with pytest.raises(jsonschema.ValidationError):
            jsonschema.validate(bad, mission)


def test_the_seed_of_a_duty_is_echoed_and_decides_the_table(plan_file):
    text = """
[[mission]]
source = "duty"
[mission.source_settings]
duration = "10 min"
step = "1 s"
rms_power = "20 kW"
corner_frequency = "10 mHz"
seed = 3
"""
    one, other = (load_plan(plan_file(text.replace("seed = 3", f"seed = {seed}"))) for seed in (3, 4))
    first, second = profile_of(one, one.mission[0]), profile_of(other, other.mission[0])
    assert first.name == "duty"
    assert any("seed 3" in rule for rule in first.rules)
    assert first.sha256 != second.sha256


def test_a_fade_of_regeneration_is_read_in_metres_a_second_and_its_order_is_checked(plan_file):
    fade = '\n[vehicle]\nmass = "1500 kg"\ndrag_area = "0.7 m2"\nrolling_resistance = 0.012\nregeneration_fade = {}\n'
    plan = load_plan(plan_file(SHAVING + fade.format('["5 km/h", "18 km/h"]')))
    assert vehicle_of(plan).regeneration_fade_m_s == pytest.approx((5 / 3.6, 5.0))
    with pytest.raises(PlanError, match="give the speed without regeneration first"):
        load_plan(plan_file(SHAVING + fade.format('["18 km/h", "5 km/h"]')))
