"""The scenarios that ship with the package: where they lie, and copying one out."""

from __future__ import annotations

import shutil
import tomllib
from pathlib import Path

from tideleg.errors import InputError

_HERE = Path(__file__).resolve().parent
_IN_WHEEL = _HERE / "scenarios"
_IN_CHECKOUT = _HERE.parents[1] / "profiles"


def scenarios_folder() -> Path:
    """Return the folder of scenarios: inside the installed package, or `profiles` of a checkout."""
    return _IN_WHEEL if _IN_WHEEL.is_dir() else _IN_CHECKOUT


def scenario_names() -> dict[str, str]:
    """Return the shipped scenarios, name -> title of its plan."""
    plans = sorted(scenarios_folder().glob("*/plan.toml"))
    return {plan.parent.name: str(tomllib.loads(plan.read_text(encoding="utf-8"))["title"]) for plan in plans}


def copy_scenario(name: str, folder: Path) -> list[Path]:
    """Copy one scenario into a new folder and return the files made.

    Raises
    ------
    InputError
        If there is no such scenario, or the folder exists and is not empty: nothing is overwritten.
    """
    names = scenario_names()
    if name not in names:
        raise InputError(f"found no scenario {name!r}; shipped are {', '.join(names)}")
    if folder.exists() and (not folder.is_dir() or any(folder.iterdir())):
        raise InputError(f"{folder} exists and is not empty; give a new folder, nothing is overwritten")
    source = scenarios_folder() / name
    ignored = shutil.ignore_patterns("__pycache__", "results", "*.pyc")
    shutil.copytree(source, folder, ignore=ignored, dirs_exist_ok=True)
    return sorted(path for path in folder.rglob("*") if path.is_file())
