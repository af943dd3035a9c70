"""The part tables under [stage]: part files merged in, CSV files of points read, grades set aside."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any, NamedTuple

from tideleg.errors import PlanError
from tideleg.plan.lines import line_of
from tideleg.plan.points_file import read_points
from tideleg.plan.source import Source, read_toml


class PartTables(NamedTuple):
    """Part tables as plugins will validate them.

    parts : keys by table; a table in a table (such as a switch's diode) stays nested
    origins : file of each key that came from a part file, by dotted key
    files : every part and points file that was read
    """

    parts: dict[str, dict[str, Any]]
    origins: dict[str, Path]
    files: tuple[Path, ...]


def part_tables(data: Mapping[str, Any], source: Source) -> PartTables:
    """Return every table under [stage] with its part file merged in under the plan's own keys.

    Raises
    ------
    PlanError
        If a part file or a CSV file is missing or cannot be used; file, key and line are named.
    """
    found = PartTables({}, {}, ())
    for table, keys in data.items():
        if isinstance(keys, dict):
            merged, found = _merged(keys, f"stage.{table}", source, found)
            found.parts[table] = merged
    return found


def _merged(own: Mapping[str, Any], key: str, source: Source, found: PartTables) -> tuple[dict[str, Any], PartTables]:
    """Return one table with what its part file gives for the keys that it does not give itself."""
    given: dict[str, Any] = {}
    if "part" in own:
        file = source.folder / str(own["part"])
        if not file.is_file():
            raise source.fault(f"{key}.part", f"found {str(own['part'])!r}, which is no file; check the name")
        data, text = read_toml(file)
        if "part" in data:
            raise PlanError("a part file names no other part file", file=file, key="part", line=line_of(text, "part"))
        given, found = _merged(data, "", Source(file, text, file.parent), found._replace(files=(*found.files, file)))
        found.origins.update({f"{key}.{name}": file for name in _names(given) if not _stands(own, name)})
    merged = dict(given)
    for name, value in own.items():
        if isinstance(value, dict):
            inner, found = _merged(value, _dotted(key, name), source, found)
            merged[name] = {**given[name], **inner} if isinstance(given.get(name), dict) else inner
        elif isinstance(value, str) and value.lower().endswith(".csv"):
            file = source.folder / value
            if not file.is_file():
                raise source.fault(_dotted(key, name), f"found {value!r}, which is no file; check the name")
            merged[name] = read_points(file)
            found = found._replace(files=(*found.files, file))
        elif name != "part":
            merged[name] = value
    return merged, found


def _dotted(key: str, name: str) -> str:
    return f"{key}.{name}" if key else name


def _names(table: Mapping[str, Any]) -> list[str]:
    """Return the dotted names of all keys of a table and of the tables in it."""
    names = []
    for name, value in table.items():
        inner = _names(value) if isinstance(value, dict) else []
        names += [f"{name}.{one}" for one in inner] or [name]
    return names


def _stands(table: Mapping[str, Any], name: str) -> bool:
    """Whether a dotted name is given in a table."""
    for part in name.split("."):
        if not isinstance(table, Mapping) or part not in table:
            return False
        table = table[part]
    return True
