"""The part tables under [stage]: part files merged in, CSV files of points read, grades and placeholders set aside."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, NamedTuple

from tideleg.errors import PlanError
from tideleg.plan.generic import GENERIC, generic_file, generic_names
from tideleg.plan.points_file import read_points
from tideleg.plan.source import Source, read_toml

GRADES = ("measured", "datasheet", "typical", "guess")
"""What a person may say a number is worth, best first."""

APART = ("part", "grades", "placeholder")
"""Keys of a part table that are no data of the part."""


@dataclass
class PartNotes:
    """What is known about the keys of part tables besides their values; dotted keys.

    origins : file of each key that came from a part file
    grades : worth of each key that has one
    overridden : what the part file gives for a key that the plan gives itself
    placeholders : tables whose part is invented
    part_files : the part file of each table that has one, as written
    files : every part and points file that was read
    """

    origins: dict[str, Path] = field(default_factory=dict)
    grades: dict[str, str] = field(default_factory=dict)
    overridden: dict[str, Any] = field(default_factory=dict)
    placeholders: list[str] = field(default_factory=list)
    part_files: dict[str, str] = field(default_factory=dict)
    files: list[Path] = field(default_factory=list)


def part_tables(data: Mapping[str, Any], source: Source) -> tuple[dict[str, dict[str, Any]], PartNotes]:
    """Return every table under [stage] with its part file merged in under the plan's own keys, and what is noted.

    Raises
    ------
    PlanError
        If a part file or a CSV file is missing or cannot be used; file, key and line are named.
    """
    notes = PartNotes()
    tables = {name: keys for name, keys in data.items() if isinstance(keys, dict)}
    merged = {
        name: _table(keys, _Place(f"stage.{name}", f"stage.{name}", source), notes, {}) for name, keys in tables.items()
    }
    return merged, notes


class _Place(NamedTuple):
    """Where a table stands: its dotted key in the plan, and in the file (plan or part file) that is being read."""

    key: str
    at: str
    source: Source
    in_part_file: bool = False

    def inner(self, name: str) -> _Place:
        return self._replace(key=f"{self.key}.{name}", at=f"{self.at}.{name}" if self.at else name)

    def fault(self, what: str) -> PlanError:
        return self.source.fault(self.at, what)


def _table(own: Mapping[str, Any], place: _Place, notes: PartNotes, under: Mapping[str, Any]) -> dict[str, Any]:
    """Return the keys of one table over those that lie `under` it; notes are taken on the way."""
    merged = {**under, **_from_part_file(own, place, notes)}
    for name, value in own.items():
        here = place.inner(name)
        if name in APART:
            continue
        if isinstance(value, dict):
            before = merged.get(name)
            merged[name] = _table(value, here, notes, before if isinstance(before, dict) else {})
            continue
        if name in merged:
            notes.overridden[here.key] = merged[name]
            notes.grades.pop(here.key, None)
            notes.origins.pop(here.key, None)
        merged[name] = _points(value, here, notes) if _is_csv(value) else value
        if place.in_part_file and place.source.file is not None:
            notes.origins[here.key] = place.source.file
    _note_grades(own, merged, place, notes)
    placeholder = own.get("placeholder", False)
    if not isinstance(placeholder, bool):
        raise place.inner("placeholder").fault(f"found {placeholder!r}; give true or false")
    if placeholder:
        notes.placeholders.append(place.key)
    return merged


def _from_part_file(own: Mapping[str, Any], place: _Place, notes: PartNotes) -> dict[str, Any]:
    """Return what the part file of a table gives; nothing where it names none."""
    if "part" not in own:
        return {}
    here, name = place.inner("part"), str(own["part"])
    if place.in_part_file:
        raise here.fault("a part file names no other part file; give the keys here")
    file = generic_file(name) if name.startswith(GENERIC) else place.source.folder / name
    if not file.is_file():
        known = f"; generic parts are {', '.join(generic_names())}" if name.startswith(GENERIC) else "; check the name"
        raise here.fault(f"found {name!r}, which is no file{known}")
    data, text = read_toml(file)
    notes.files.append(file)
    notes.part_files[place.key] = name
    return _table(data, _Place(place.key, "", Source(file, text, file.parent), in_part_file=True), notes, {})


def _is_csv(value: Any) -> bool:
    return isinstance(value, str) and value.lower().endswith(".csv")


def _points(value: str, place: _Place, notes: PartNotes) -> Any:
    file = place.source.folder / value
    if not file.is_file():
        raise place.fault(f"found {value!r}, which is no file; check the name")
    notes.files.append(file)
    return read_points(file)


def _note_grades(own: Mapping[str, Any], merged: Mapping[str, Any], place: _Place, notes: PartNotes) -> None:
    """Note the grades that a table states; "*" stands for every number of the same table that has none."""
    grades, where = own.get("grades", {}), place.inner("grades")
    if not isinstance(grades, dict):
        raise where.fault(f"found {grades!r}; give a table of keys and grades: {', '.join(GRADES)}")
    for name, grade in grades.items():
        if grade not in GRADES:
            raise where.inner(name).fault(f"found {grade!r}; grades are {', '.join(GRADES)}")
        if name != "*" and (name not in merged or isinstance(merged[name], dict)):
            raise where.inner(name).fault(f"no key {name!r} stands in this table; grade the keys that do")
    every = grades.get("*")
    stated = {name: every for name, value in own.items() if every is not None and _is_number(name, value)}
    stated |= {name: grade for name, grade in grades.items() if name != "*"}
    notes.grades.update({f"{place.key}.{name}": str(grade) for name, grade in stated.items()})


def _is_number(name: str, value: Any) -> bool:
    """Whether a key gives data that can be more or less sure: a number, a quantity, or a table of them."""
    if name in (*APART, "name") or isinstance(value, (bool, dict)):
        return False
    return not isinstance(value, str) or _is_csv(value) or value.lstrip(" +-.")[:1].isdigit()
