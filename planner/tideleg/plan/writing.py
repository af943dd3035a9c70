"""Writing a plan back: the person's own file with some keys changed, comments and order kept.

tomlkit does the round trip: it keeps comments, which a plain TOML writer loses.
"""

from __future__ import annotations

import math
import os
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any

import tomlkit
from tomlkit.items import Table

from tideleg.plan.curves import COLUMNS
from tideleg.plan.generic import GENERIC
from tideleg.plan.tables import Plan
from tideleg.quantity import DIMENSIONS, parse
from tideleg.registry import installed

_STEPS = ((1e9, "G"), (1e6, "M"), (1e3, "k"), (1.0, ""), (1e-3, "m"), (1e-6, "u"), (1e-9, "n"), (1e-12, "p"))


def format_quantity(value: float, dimension: str) -> str:
    """Return a quantity as a person writes it; `quantity.parse` gives the same number back to 12 digits.

    Examples
    --------
    >>> format_quantity(1.2e-4, "inductance")
    '120 uH'
    """
    known = DIMENSIONS[dimension]
    if dimension == "thermal resistance" and abs(value) < 0.5:
        return f"{1e3 * value:.12g} K/kW"
    units = [unit for unit, size in known.prefixed.items() if size == 1.0]
    if not units or value == 0.0:
        return f"{value:.12g} {known.base}"
    size, prefix = next((step for step in _STEPS if abs(value) >= step[0] * (1 - 1e-12)), _STEPS[-1])
    text = f"{value / size:.12g} {prefix}{units[0]}"
    assert math.isclose(parse(text, dimension), value, rel_tol=1e-11)
    return text


def write_plan(plan: Plan, changes: Mapping[str, object], destination: Path, heading: str) -> None:
    """Write a copy of a plan with dotted keys changed or added.

    Relative file names are rewritten so that they hold from the destination; inline keys win over part files, so a
    changed key of a part file is written inline. The file is written beside and then renamed.

    Raises
    ------
    ValueError
        If the plan was made in Python and has no file to copy.
    """
    if plan.file is None:
        raise ValueError("a plan made in Python has no file to copy; save it as TOML first")
    document = tomlkit.parse(plan.text)
    sources = {source.name: source.file_keys for source in installed().profile_sources()}
    _move_files(document, plan.folder, destination.parent, sources)
    for key, value in changes.items():
        _set(document, key.split("."), value)
    lines = "".join(f"# {line}\n" for line in heading.splitlines())
    destination.parent.mkdir(parents=True, exist_ok=True)
    beside = destination.with_name(f".{destination.name}.part")
    beside.write_text(lines + tomlkit.dumps(document), encoding="utf-8")
    beside.replace(destination)


def _set(document: Any, path: list[str], value: object) -> None:
    place = document
    for name in path[:-1]:
        if name.isdigit():
            place = place[int(name)]
        else:
            if name not in place:
                place[name] = tomlkit.table()
            place = place[name]
    place[path[-1]] = value


def _move_files(document: Any, before: Path, after: Path, file_keys: Mapping[str, tuple[str, ...]]) -> None:
    """Rewrite the relative file names of a plan for another folder."""

    def moved(name: str) -> str:
        return name if Path(name).is_absolute() else Path(os.path.relpath(before / name, after)).as_posix()

    for mission in document.get("mission", []):
        if "profile" in mission:
            mission["profile"] = moved(str(mission["profile"]))
        settings = mission.get("source_settings", {})
        for key in (key for key in file_keys.get(str(mission.get("source")), ()) if key in settings):
            settings[key] = moved(str(settings[key]))
    for key in COLUMNS:
        given = document.get("battery", {}).get(key)
        if isinstance(given, str) and given.lower().endswith(".csv"):
            document["battery"][key] = moved(str(given))
    for table in document.get("stage", {}).values():
        if isinstance(table, Table):
            _move_part_files(table, moved)


def _move_part_files(table: Table, moved: Callable[[str], str]) -> None:
    """Rewrite the part file and the CSV files of points that a part table names, also in the tables inside it."""
    for key, value in table.items():
        if isinstance(value, Table):
            _move_part_files(value, moved)
        elif isinstance(value, str) and value.startswith(GENERIC):
            continue
        elif isinstance(value, str) and (key == "part" or value.lower().endswith(".csv")):
            table[key] = moved(str(value))
