"""A year of missions: hours, shares of loss, standby; and a mission that equals its parts."""

import shutil
from pathlib import Path

import pytest

from tideleg import InputError, plan_from_mapping, run
from tideleg.plan import load_plan

COMMUTER = Path(__file__).parents[2] / "profiles" / "commuter"
PLAN = {
    "title": "two missions",
    "battery": {"open_circuit_voltage": "400 V", "resistance": "50 mohm", "capacity": "100 Ah", "start_soc": "60 %"},
    "link": {"voltage": "800 V"},
    "stage": {
        "topology": "half-bridge",
        "switching_frequency": "20 kHz",
        "inductor": {"inductance": "500 uH"},
        "switch": {"on_resistance": "10 mohm"},
        "control": {"standby_power": "12 W", "switching_power": "20 W"},
    },
    "mission": [
        {"profile": "out.csv", "passes_per_year": 300},
        {"profile": "home.csv", "passes_per_year": 200, "start_soc": "40 %"},
    ],
}


def made(folder, **changes):
    (folder / "out.csv").write_text("time_s,power_w\n0,20000\n3600,0\n")
    (folder / "home.csv").write_text("time_s,power_w\n0,-10000\n7200,0\n")
    return plan_from_mapping({**PLAN, **changes}, folder=folder)


def test_a_year_counts_missions_standby_and_parking(tmp_path):
    outcome = run(made(tmp_path, year={"standby_hours": 1000}))
    year = outcome.year
    assert [(m.mission, m.hours) for m in year.missions] == [("out", 300.0), ("home", 400.0)]
    assert year.parked_hours == pytest.approx(8766 - 1700)
    assert year.standby_kwh == pytest.approx(12.0)  # the control while nothing switches, 12 W for 1000 h
    for mission, result in zip(year.missions, outcome.missions, strict=True):
        assert mission.loss_kwh == pytest.approx(result.passes_per_year * result.energy.loss_j / 3.6e6)
    assert sum(m.loss_share for m in year.missions) + year.standby_share == pytest.approx(1.0)
    assert outcome.summary()["year"]["standby_hours"] == 1000


def test_each_mission_starts_with_its_own_charge(tmp_path):
    outcome = run(made(tmp_path))
    assert [m.battery.start_soc for m in outcome.missions] == [0.6, 0.4]
    assert outcome.missions[1].battery.end_soc > 0.4


@pytest.mark.parametrize(
    ("changes", "said"),
    [
        ({"year": {"standby_hours": 9000}}, "year.standby_hours: missions"),
        ({"mission": [{"profile": "out.csv", "passes_per_year": 9000}]}, "9000 passes last 9000 h; a year has 8766 h"),
        (
            {"mission": [{"profile": "out.csv", "start_soc": "40 %"}], "battery": {"open_circuit_voltage": 400.0}},
            "no capacity",
        ),
    ],
)
def test_a_year_that_cannot_be_is_refused(tmp_path, changes, said):
    with pytest.raises(InputError, match=said):
        run(made(tmp_path, **changes))


def test_sub_missions_are_the_concatenated_run(tmp_path):
    """Two halves of a drive as missions of their own, the second from the charge that the first leaves.

    The thermal start is the periodic one in all, so that neither starts colder than it would be met.
    """
    shutil.copytree(COMMUTER, tmp_path / "c")
    text = (tmp_path / "c" / "plan.toml").read_text()
    plan = load_plan(tmp_path / "c" / "plan.toml")
    name = plan.mission[0].profile
    lines = (tmp_path / "c" / name).read_text().splitlines()
    header, rows = lines[0], [line.split(",") for line in lines[1:]]
    seconds = [float(row[0]) for row in rows]
    later = [",".join([f"{s + seconds[-1]:g}", *row[1:]]) for s, row in zip(seconds, rows, strict=True)]
    twice = "\n".join([header, *(",".join(r) for r in rows[:-1]), *later]) + "\n"
    (tmp_path / "c" / "twice.csv").write_text(twice)

    def outcome_of(*changes):
        only = plan.mission[0]
        missions = tuple(only.model_copy(update={"start": "periodic", **change}) for change in changes)
        return run(plan.model_copy(update={"mission": missions}))

    assert 'profile = "' in text
    whole = outcome_of({"profile": "twice.csv", "name": "whole"}).missions[0]
    middle = float(whole.steps["soc"].iloc[len(rows) - 2])
    first, second = outcome_of({"name": "first"}, {"name": "second", "start_soc": middle}).missions
    for what in ("throughput_j", "link_out_j", "link_in_j", "battery_out_j", "battery_in_j", "loss_j"):
        parts = getattr(first.energy, what) + getattr(second.energy, what)
        assert parts == pytest.approx(getattr(whole.energy, what), rel=1e-3), what
    assert second.battery.end_soc == pytest.approx(whole.battery.end_soc, abs=1e-6)
