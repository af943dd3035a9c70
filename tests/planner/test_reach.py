"""Reach: the topology's own answer at every step of a mission, before any loss; checked on hand-made missions."""

import json

import numpy as np
import pytest

from tideleg import plan_from_mapping, reach, run
from tideleg.command import main
from tideleg.errors import InputError
from tideleg.report.reach_map import draw_reach, write_reach

PLAN = {
    "title": "reach",
    "battery": {"open_circuit_voltage": "400 V", "resistance": "100 mohm"},
    "link": {"voltage": "800 V"},
    "stage": {"topology": "half-bridge", "switching_frequency": "20 kHz", "inductor": {"inductance": "500 uH"}},
    "mission": [{"profile": "p.csv"}],
}
ROWS = "time_s,power_w,link_voltage_v\n0,20000,800\n10,20000,380\n15,-20000,800\n30,-20000,401\n40,0,800\n"


def made(folder, rows=ROWS, **changes):
    (folder / "p.csv").write_text(rows)
    return plan_from_mapping({**PLAN, **changes}, folder=folder)


def test_it_tells_what_stands_in_the_way_and_when(tmp_path):
    (one,) = reach(made(tmp_path))
    assert one.reason.tolist() == [0, 1, 0, 1]
    # 400 V battery: 405.06 V at -20 kW through 100 mohm is above 401 V; the step of 380 V is below either way.
    assert one.ratio.tolist() == pytest.approx([394.94 / 800, 394.94 / 380, 404.94 / 800, 404.94 / 401], rel=1e-4)
    word = "the battery voltage is not below the link voltage"
    assert dict(one.share_of_time) == pytest.approx({"operates": 25 / 40, word: 15 / 40})
    assert one.first_s[word] == 10.0
    assert not one.whole


def test_the_map_is_the_topology_asked_point_by_point(tmp_path):
    (one,) = reach(made(tmp_path))
    around = one.around
    assert around.reason.shape == (160, 160)
    assert np.array_equal(around.reason > 0, np.broadcast_to(around.ratio[:, None] >= 1.0, around.reason.shape))
    assert around.power_w[0] < one.power_w.min()
    assert around.power_w[-1] > one.power_w.max()
    assert around.ratio[0] < one.ratio.min() < one.ratio.max() < around.ratio[-1]


def test_a_mission_out_of_reach_is_drawn_though_a_run_refuses_it(tmp_path):
    plan = made(tmp_path)
    with pytest.raises(InputError, match="tideleg reach"):
        run(plan)
    picture = draw_reach(reach(plan)[0])
    assert "cannot be operated" in picture.caption
    assert "37.5 % of the time" in picture.alt


def test_choices_are_made_for_the_cloud_and_for_every_point_of_the_map(tmp_path):
    stage = {
        **PLAN["stage"],
        "topology": "interleaved",
        "legs": 3,
        "shedding": "threshold",
        "shedding_current": "20 A",
        "minimum_pulse": "2 us",
    }
    (one,) = reach(made(tmp_path, "time_s,power_w\n0,20000\n10,0\n", stage=stage))
    assert one.whole
    assert np.any(one.around.reason == 0)


def test_one_step_of_no_power_has_a_map(tmp_path):
    (one,) = reach(made(tmp_path, "time_s,power_w\n0,0\n10,0\n"))
    assert one.whole
    assert np.all(np.diff(one.around.power_w) > 0)
    assert draw_reach(one).caption.endswith(".")


def test_the_command_tells_and_draws_and_carries_the_caution(tmp_path, capsys):
    made(tmp_path)
    (tmp_path / "plan.toml").write_text(
        'title = "reach"\n[battery]\nopen_circuit_voltage = "400 V"\nresistance = "100 mohm"\n[link]\nvoltage = "800 V"\n'
        '[stage]\ntopology = "half-bridge"\nswitching_frequency = "20 kHz"\n[stage.inductor]\ninductance = "500 uH"\n'
        '[[mission]]\nprofile = "p.csv"\n'
    )
    assert main(["reach", str(tmp_path / "plan.toml"), "--out", str(tmp_path / "pictures")]) == 0
    shown = capsys.readouterr().out
    assert "37.5 %" in shown
    assert "HIGH VOLTAGE" in shown
    assert (tmp_path / "pictures" / "reach.png").stat().st_size > 5000
    assert main(["reach", str(tmp_path / "plan.toml"), "--json"]) == 0
    told = json.loads(capsys.readouterr().out)
    assert told["missions"][0]["whole"] is False
    assert any("HIGH VOLTAGE" in line for line in told["caution"])


def test_a_folder_that_cannot_be_written_is_said(tmp_path):
    found = reach(made(tmp_path))
    (tmp_path / "file").write_text("")
    with pytest.raises(InputError, match="cannot be written"):
        write_reach(found, tmp_path / "file" / "below")
