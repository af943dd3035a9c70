"""The folder of results: every format carries the caution, and earlier results are never half lost."""

import json

import numpy as np
import pandas as pd
import pytest

from tideleg.errors import InputError
from tideleg.report import folder as folder_module
from tideleg.report import write_results


@pytest.fixture
def written(bare, tmp_path):
    """Return the folder of earlier results; the bare outcome is the quickest to draw."""
    target = tmp_path / "results"
    write_results(bare, target)
    return target


def content(folder):
    return {p.relative_to(folder).as_posix(): p.read_bytes() for p in folder.rglob("*") if p.is_file()}


def test_every_format_carries_the_caution_and_the_list_is_true(outcome, tmp_path):
    target = tmp_path / "deep" / "results"
    names = {path.relative_to(target).as_posix() for path in write_results(outcome, target)}
    assert names == set(content(target))
    assert {"report.html", "summary.json", "steps.csv", "caution.txt", "figures/power.png"} <= names or len(
        outcome.missions
    ) > 1
    summary = json.loads((target / "summary.json").read_text(encoding="utf-8"))
    assert set(summary["files"]) == names
    assert summary["safety"]["sentences"] == list(outcome.safety.sentences)
    text = (target / "caution.txt").read_text(encoding="utf-8")
    page = (target / "report.html").read_text(encoding="utf-8")
    for sentence in outcome.safety.sentences:
        assert sentence in text
        assert sentence.replace("'", "&#39;") in page
    assert not list(tmp_path.rglob(".*"))


def refuse(word):
    raise AssertionError(f"{word} is no JSON")


def test_a_whole_folder_is_strict_json_pictures_and_a_plain_table_of_nine_digits(truck, tmp_path):
    folder = tmp_path / "r"
    pictures = [path for path in write_results(truck, folder) if path.suffix == ".png"]
    assert len(pictures) == 5
    assert all(path.read_bytes().startswith(b"\x89PNG") for path in pictures)

    found = json.loads((folder / "summary.json").read_text(encoding="utf-8"), parse_constant=refuse)
    assert found["schema_version"] == 1
    assert {"title", "verdict", "limits", "energy", "worst", "thermal", "safety", "not_modelled", "inputs"} <= set(
        found
    )

    steps = pd.read_csv(folder / "steps.csv")
    assert list(steps.columns) == list(truck.steps.columns)
    for name in steps.select_dtypes("number"):
        # nine significant digits: half a unit of the ninth is at most 5e-9 of the value
        np.testing.assert_allclose(steps[name], truck.steps[name], rtol=5.1e-9, err_msg=name)
    assert "How to read steps.csv" in (folder / "caution.txt").read_text(encoding="utf-8")


def test_the_same_outcome_gives_the_same_bytes(bare, tmp_path):
    write_results(bare, tmp_path / "a")
    write_results(bare, tmp_path / "b")
    assert content(tmp_path / "a") == content(tmp_path / "b")


def test_earlier_results_are_replaced_whole(written, truck):
    write_results(truck, written)
    assert (written / "figures" / "margins.png").is_file()
    assert not list(written.parent.glob(".*"))


@pytest.mark.parametrize("step", ["_png", "caution_text", "_swap"])
def test_earlier_results_stay_whole_when_anything_fails(written, bare, monkeypatch, step):
    before = content(written)

    def fail(*_):
        raise OSError(f"disk full in {step}")

    monkeypatch.setattr(folder_module, step, fail)
    with pytest.raises(OSError, match="disk full"):
        write_results(bare, written)
    assert content(written) == before
    assert list(written.parent.iterdir()) == [written]


def test_earlier_results_come_back_when_the_last_rename_fails(written, bare, monkeypatch):
    before = content(written)
    rename = type(written).rename

    def fail_for_new(self, other):
        if self.name == "new":
            raise OSError("no rename")
        return rename(self, other)

    monkeypatch.setattr(type(written), "rename", fail_for_new)
    with pytest.raises(OSError, match="no rename"):
        write_results(bare, written)
    assert content(written) == before


def test_what_a_person_put_beside_the_results_is_kept(written, bare):
    (written / "notes.txt").write_text("mine", encoding="utf-8")
    (written / "photos").mkdir()
    (written / "photos" / "bench.txt").write_text("mine too", encoding="utf-8")
    write_results(bare, written)
    assert (written / "notes.txt").read_text(encoding="utf-8") == "mine"
    assert (written / "photos" / "bench.txt").read_text(encoding="utf-8") == "mine too"
    assert "notes.txt" not in json.loads((written / "summary.json").read_text(encoding="utf-8"))["files"]


def test_a_persons_file_is_never_overwritten_by_a_new_result(written, bare):
    (written / "sized.toml").write_text("by hand", encoding="utf-8")
    with pytest.raises(InputError, match=r"sized\.toml was not written by an earlier run"):
        write_results(bare, written, extra={"sized.toml": "by tideleg"})
    assert (written / "sized.toml").read_text(encoding="utf-8") == "by hand"


@pytest.mark.parametrize(
    "summary", [None, "no json", "[]", "{}", '{"schema_version": 1, "safety": {}}', '{"files": []}']
)
def test_a_folder_that_is_not_ours_is_left_alone(bare, tmp_path, summary):
    (tmp_path / "thesis.tex").write_text("years of work", encoding="utf-8")
    if summary is not None:
        (tmp_path / "summary.json").write_text(summary, encoding="utf-8")
    before = content(tmp_path)
    with pytest.raises(InputError, match="holds no earlier results"):
        write_results(bare, tmp_path)
    assert content(tmp_path) == before


def test_an_empty_folder_is_used_and_a_file_is_refused(bare, tmp_path):
    (tmp_path / "empty").mkdir()
    write_results(bare, tmp_path / "empty")
    (tmp_path / "file").write_text("x", encoding="utf-8")
    with pytest.raises(InputError, match="is a file"):
        write_results(bare, tmp_path / "file")


def test_a_place_that_cannot_be_written_is_named(bare, tmp_path):
    (tmp_path / "file").write_text("x", encoding="utf-8")
    with pytest.raises(InputError, match="cannot be written"):
        write_results(bare, tmp_path / "file" / "results")


def test_a_link_to_a_folder_stays_a_link(bare, tmp_path):
    (tmp_path / "real").mkdir()
    (tmp_path / "latest").symlink_to(tmp_path / "real")
    paths = write_results(bare, tmp_path / "latest")
    assert (tmp_path / "latest").is_symlink()
    assert all(path.is_file() and path.parent.is_relative_to(tmp_path / "latest") for path in paths)


def test_extra_files_are_written_and_listed(bare, tmp_path):
    write_results(bare, tmp_path / "r", extra={"sized.toml": "title = 'x'\n"})
    assert (tmp_path / "r" / "sized.toml").read_text(encoding="utf-8") == "title = 'x'\n"
    assert "sized.toml" in json.loads((tmp_path / "r" / "summary.json").read_text(encoding="utf-8"))["files"]


@pytest.mark.parametrize("name", ["report.html", "../plan.toml", "a/b.txt"])
def test_extra_files_cannot_hide_results_or_leave_the_folder(bare, tmp_path, name):
    with pytest.raises(ValueError, match="extra file"):
        write_results(bare, tmp_path / "r", extra={name: "x"})
    assert list(tmp_path.iterdir()) == []
