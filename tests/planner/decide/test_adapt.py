"""One plan through every topology: each thing that had to change is said, chips are kept, and nothing else moves."""

from pathlib import Path

import pytest

from tideleg.decide.adapt import adapted, need_of
from tideleg.decide.compare import compare
from tideleg.errors import InputError
from tideleg.plan import load_plan
from tideleg.registry import installed
from tideleg.stage import build_stage

COMMUTER = Path(__file__).parents[3] / "profiles" / "commuter" / "plan.toml"
EVERY = [topology.name for topology in installed().topologies()]


def chips(plan):
    return sum(int(part.total) for part in build_stage(plan).parts if part.slot.kind == "switch")


@pytest.mark.parametrize("name", EVERY)
def test_every_topology_takes_the_plan_and_the_same_chips(name):
    plan = load_plan(COMMUTER)
    other, notes = adapted(plan, name, installed())
    stage = build_stage(other)
    assert stage.topology.name == name
    positions = sum(part.slot.copies for part in stage.parts if part.slot.kind == "switch")
    assert abs(chips(other) - chips(plan)) <= positions / 2
    assert (other.mission, other.battery, other.link, other.limits) == (
        plan.mission,
        plan.battery,
        plan.link,
        plan.limits,
    )
    changed = {
        key
        for key in {*other.stage.settings, *plan.stage.settings}
        if other.stage.settings.get(key) != plan.stage.settings.get(key)
    }
    assert all(any(key in note for note in notes) for key in changed)
    for table in set(other.stage.parts) ^ set(plan.stage.parts):
        assert any(table in note for note in notes)


def test_the_need_is_read_from_the_missions():
    need = need_of(load_plan(COMMUTER))
    assert need.link_voltage == load_plan(COMMUTER).link.voltage
    assert need.power > 1e4


def test_all_of_them_run_one_mission_and_the_table_of_fairness_has_every_row():
    found = compare([COMMUTER], topologies=EVERY)
    assert [c.label for c in found.contenders] == EVERY
    rows = {"chips", "chip conductance budget", "inductor energy at peak", "capacitor energy", "junction limit"}
    for contender in found.contenders:
        assert rows <= set(contender.fairness), contender.label
        assert (contender.outcome is None) == bool(contender.fault)
        if contender.outcome is not None:
            assert contender.outcome.missions[0].energy.recomputed_residual < 1e-9
    assert sum(c.outcome is not None for c in found.contenders) >= len(EVERY) - 2


def test_a_stage_that_cannot_operate_is_a_contender_with_its_reason(tmp_path):
    text = COMMUTER.read_text()
    folder = tmp_path / "c"
    folder.mkdir()
    for file in COMMUTER.parent.iterdir():
        if file.is_file():
            (folder / file.name).write_bytes(file.read_bytes())
    plan = load_plan(COMMUTER)
    low = min(plan.battery.open_circuit_voltage.value)
    voltage = next(line for line in text.splitlines() if line.startswith("voltage ="))
    trip = next((line for line in text.splitlines() if line.startswith("trip_voltage")), "")
    (folder / "plan.toml").write_text(
        text.replace(voltage, f'voltage = "{0.9 * low:.0f} V"').replace(trip, f'trip_voltage = "{0.95 * low:.0f} V"')
    )
    found = compare([folder / "plan.toml"], topologies=["half-bridge", "inverting"])
    assert "battery voltage is not below the link voltage" in found.contenders[0].fault
    assert found.contenders[0].fairness["capacitor energy"] == "unknown"


def test_an_unknown_topology_is_named():
    with pytest.raises(InputError, match="sidecar"):
        adapted(load_plan(COMMUTER), "sidecar", installed())


@pytest.mark.parametrize("name", ["dual-bridge", "inverting", "four-switch"])
def test_lives_follow_the_parts_that_the_topology_has(name):
    kerbside = load_plan(COMMUTER.parents[1] / "kerbside" / "plan.toml")
    other, notes = adapted(kerbside, name, installed())
    stage = build_stage(other)
    switches = {part.slot.table for part in stage.parts if part.slot.kind == "switch"}
    asked = {worn.part for worn in other.life.parts}
    assert switches <= asked
    assert {"link_capacitor", "coolant_pump"} <= asked
    assert any("life of switch" in note for note in notes) == (name == "dual-bridge")
