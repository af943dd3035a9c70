"""What tideleg exports is what it lists; hooks are documented; nothing heavy is loaded on import."""

from pathlib import Path

import pytest

import tideleg
from tideleg.contract import Hooks

STARTER = Path(__file__).parents[2] / "planner" / "tideleg" / "starter"
DEVELOPERS = Path(__file__).parents[2] / "DEVELOPERS.md"


@pytest.mark.parametrize("name", tideleg.__all__)
def test_every_listed_name_exists(name):
    assert getattr(tideleg, name) is not None


def test_nothing_public_is_left_unlisted():
    hidden = {"annotations", "import_module", "TYPE_CHECKING", "Any"}
    own = {n for n in vars(tideleg) if not n.startswith("_") and n not in hidden}
    modules = {n for n in own if type(getattr(tideleg, n)).__name__ == "module"} - {"quantity"}
    assert own - modules <= set(tideleg.__all__)


def test_an_unknown_name_is_an_attribute_error():
    with pytest.raises(AttributeError, match="no attribute 'runn'"):
        _ = tideleg.runn


def test_main_jobs_are_callable_with_docstrings():
    for name in (
        "load_plan",
        "plan_from_mapping",
        "run",
        "size",
        "compare",
        "read_profile",
        "passport",
        "write_results",
    ):
        assert callable(getattr(tideleg, name))
        assert getattr(tideleg, name).__doc__


@pytest.mark.parametrize("hook", [name for name in vars(Hooks) if not name.startswith("_")])
def test_every_hook_is_documented(hook):
    assert f"`{hook}`" in DEVELOPERS.read_text(encoding="utf-8")


def test_the_worked_topology_is_the_one_that_a_new_project_gets():
    # That project's own test puts it through the contract; see tests/planner/conformance.
    text = (STARTER / "topology.py.txt").read_text(encoding="utf-8").replace("PLUGIN_NAME", "my-leg")
    assert text.rstrip() in DEVELOPERS.read_text(encoding="utf-8")
    assert len(text.splitlines()) < 150
