"""The command line as a stranger uses it: exit statuses, one clear message, earlier results untouched."""

import json
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

from tideleg.command import main

SCENARIOS = Path(__file__).parents[3] / "profiles"


@pytest.fixture
def commuter(tmp_path):
    shutil.copytree(SCENARIOS / "commuter", tmp_path / "commuter")
    return tmp_path / "commuter"


def test_help_and_import_load_neither_pandas_nor_matplotlib():
    code = (
        "import sys, tideleg, tideleg.command\n"
        "try:\n    tideleg.command.main(['--help'])\nexcept SystemExit:\n    pass\n"
        "heavy = [m for m in ('pandas', 'matplotlib', 'jinja2', 'tideleg_topologies') if m in sys.modules]\n"
        "sys.exit(f'loaded {heavy}' if heavy else 0)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
    for command in ("run", "size", "compare", "profile", "parts", "plugins", "schema", "start"):
        assert command in done.stdout


def test_run_prints_the_page_and_leaves_every_file_with_the_caution(commuter, capsys):
    assert main(["run", str(commuter / "plan.toml"), "--brief"]) == 0
    page = capsys.readouterr().out
    assert "Holds all" in page
    assert "HIGH VOLTAGE" in page
    folder = commuter / "results"
    names = {p.relative_to(folder).as_posix() for p in folder.rglob("*") if p.is_file()}
    assert {"report.html", "summary.json", "steps.csv", "caution.txt", "figures/margins.png"} <= names
    html = (folder / "report.html").read_text()
    assert "HIGH VOLTAGE" in html
    assert "http" not in html.replace("http-equiv", "")
    assert "HIGH VOLTAGE" in (folder / "caution.txt").read_text()
    summary = json.loads((folder / "summary.json").read_text())
    assert summary["verdict"]["holds"] is True
    assert "HIGH VOLTAGE" in summary["safety"]["sentences"][0]
    assert len((folder / "steps.csv").read_text().splitlines()) == 1801


def test_enforce_turns_a_broken_limit_into_status_three(commuter, capsys):
    plan = commuter / "plan.toml"
    plan.write_text(plan.read_text().replace('"150 degC"', '"60 degC"'))
    assert main(["run", str(plan), "--brief"]) == 0
    assert main(["run", str(plan), "--brief", "--enforce"]) == 3
    assert "Does not hold" in capsys.readouterr().out


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ('voltage = "700 V"', 'volts = "700 V"', "link.voltage"),
        ('voltage = "700 V"', 'voltage = "700 A"', "where the unit is a unit of current"),
        ('profile = "wltc_class3b.csv"', 'profile = "none.csv"', "which is no file"),
        ('"120 uH"', '"-120 uH"', "stage.inductor.inductance"),
        ('"interleaved"', '"braided"', "no topology plugin named 'braided'"),
        ('voltage = "700 V"', 'voltage = "300 V"', "the battery voltage is not below the link voltage"),
        ("[vehicle]", "[vehicles]", "vehicles: unknown key"),
        ("[[mission]]", "[[mision]]", "mission: this key is missing"),
    ],
)
def test_bad_input_is_status_two_one_message_and_earlier_results_stay(commuter, capsys, old, new, said):
    plan = commuter / "plan.toml"
    (commuter / "results").mkdir()
    (commuter / "results" / "summary.json").write_text("{}")
    plan.write_text(plan.read_text().replace(old, new, 1))
    assert main(["run", str(plan)]) == 2
    shown = capsys.readouterr()
    assert said in shown.err
    assert "Traceback" not in shown.err
    assert shown.out == ""
    assert (commuter / "results" / "summary.json").read_text() == "{}"
    assert [p.name for p in (commuter / "results").iterdir()] == ["summary.json"]


@pytest.mark.parametrize(
    ("text", "said"),
    [("", "is empty"), ("time_s,speed_km_h\n0,0\n0,1\n", "line 3"), ("time_s,speed_km_h\n0,0\n1,nan\n", "found 'nan'")],
)
def test_a_bad_profile_is_status_two(commuter, capsys, text, said):
    (commuter / "wltc_class3b.csv").write_text(text)
    assert main(["run", str(commuter / "plan.toml")]) == 2
    assert said in capsys.readouterr().err


def test_no_equilibrium_is_said_without_results(commuter, capsys):
    plan = commuter / "plan.toml"
    text = plan.read_text().replace('"17 mohm"', '"900 mohm"').replace('"0.4 %/K"', '"1.1 %/K"')
    plan.write_text(text)
    assert main(["run", str(plan)]) == 3
    assert "no thermal equilibrium" in capsys.readouterr().err
    assert not (commuter / "results").exists()


def test_a_folder_of_other_files_is_left_alone(commuter, capsys, tmp_path):
    (tmp_path / "mine").mkdir()
    (tmp_path / "mine" / "letter.txt").write_text("keep")
    assert main(["run", str(commuter / "plan.toml"), "--brief", "--out", str(tmp_path / "mine")]) == 2
    assert "holds no earlier results" in capsys.readouterr().err
    assert (tmp_path / "mine" / "letter.txt").read_text() == "keep"


def test_a_failure_while_writing_keeps_the_earlier_results(commuter, monkeypatch):
    assert main(["run", str(commuter / "plan.toml"), "--brief"]) == 0
    before = (commuter / "results" / "summary.json").read_text()
    from tideleg.report import folder

    def fail(*_):
        raise OSError("disk full")

    monkeypatch.setattr(folder, "_write_all", fail)
    with pytest.raises(OSError, match="disk full"):
        main(["run", str(commuter / "plan.toml"), "--brief"])
    assert (commuter / "results" / "summary.json").read_text() == before
    assert sorted(p.name for p in commuter.iterdir() if p.name.startswith(".")) == []


def test_profile_tells_and_speaks_json(capsys, commuter):
    path = str(SCENARIOS / "kerbside" / "kerbside.csv")
    assert main(["profile", path]) == 0
    assert "peak discharge" in capsys.readouterr().out
    assert main(["profile", path, "--json"]) == 0
    assert json.loads(capsys.readouterr().out)["peak_discharge_w"] == 164000
    speed = str(commuter / "wltc_class3b.csv")
    assert main(["profile", speed]) == 2
    assert main(["profile", speed, "--plan", str(commuter / "plan.toml")]) == 0


def test_plugins_and_schema(capsys):
    assert main(["plugins"]) == 0
    assert "interleaved" in capsys.readouterr().out
    assert main(["plugins", "--json"]) == 0
    listed = json.loads(capsys.readouterr().out)
    assert {"kind", "name", "version", "module", "distribution"} == set(listed["plugins"][0])
    assert main(["schema"]) == 0
    assert json.loads(capsys.readouterr().out)["title"] == "Plan"


def test_start_lists_copies_and_never_overwrites(capsys, tmp_path):
    assert main(["start"]) == 0
    assert "kerbside" in capsys.readouterr().out
    assert main(["start", "kerbside", str(tmp_path / "mine")]) == 0
    assert (tmp_path / "mine" / "plan.toml").is_file()
    assert main(["start", "kerbside", str(tmp_path / "mine")]) == 2
    assert main(["start", "kerbsite", str(tmp_path / "other")]) == 2
    assert main(["start", "kerbside"]) == 2


def test_compare_from_the_command_line(capsys, commuter):
    plan = str(commuter / "plan.toml")
    assert main(["compare", plan, "--topology", "half-bridge", "--topology", "interleaved"]) == 0
    shown = capsys.readouterr().out
    assert "differs" in shown
    assert "HIGH VOLTAGE" in shown
    assert main(["compare", plan]) == 2
    assert main(["compare", plan, plan, "--json"]) == 0
    json.loads(capsys.readouterr().out)


def test_size_from_the_command_line_writes_a_plan_that_runs(capsys, commuter):
    assert main(["size", str(commuter / "plan.toml"), "--enforce"]) == 0
    shown = capsys.readouterr().out
    assert "set by" in shown
    assert "battery capacitance kept" in shown
    assert main(["run", str(commuter / "sized" / "sized.toml"), "--brief", "--enforce"]) == 0
    assert sorted(p.name for p in commuter.iterdir() if p.name.startswith(".")) == []


def test_a_logs_columns_can_be_named_on_the_command_line(capsys, tmp_path):
    (tmp_path / "log.csv").write_bytes("Zeit °;P\n00:00:00;1\n00:01:00;2\n00:02:00;0\n".encode("latin-1"))
    file = str(tmp_path / "log.csv")
    assert main(["profile", file]) == 2
    assert "encoding = 'latin-1'" in capsys.readouterr().err
    asked = ["profile", file, "--encoding", "latin-1", "--time", "Zeit °", "--power", "P", "--unit", "kW", "--json"]
    assert main(asked) == 0
    told = json.loads(capsys.readouterr().out)
    assert any("clock times" in rule for rule in told["rules"])
    assert main([*asked, "--pictures", str(tmp_path / "seen")]) == 0
    assert len([p for p in (tmp_path / "seen").iterdir() if p.stat().st_size > 1000]) == 4
