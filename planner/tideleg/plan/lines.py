"""Finding the line of a dotted key in TOML text, so that an error can name it."""

from __future__ import annotations

import re

_TABLE = re.compile(r"^\s*\[\s*([^\[\]]+?)\s*\]\s*(#.*)?$")
_ARRAY = re.compile(r"^\s*\[\[\s*([^\[\]]+?)\s*\]\]\s*(#.*)?$")
_KEY = re.compile(r"""^\s*((?:[A-Za-z0-9_-]+|"[^"]*"|'[^']*')(?:\s*\.\s*(?:[A-Za-z0-9_-]+|"[^"]*"|'[^']*'))*)\s*=""")


def line_of(text: str, dotted: str) -> int | None:
    """Return the line (from 1) where a dotted key stands, or the nearest table around it; None where neither stands.

    Elements of arrays of tables are counted from 0: "mission.1.profile" is the profile of the second [[mission]].
    """
    places = _places(text)
    path = dotted.split(".")
    while path:
        if ".".join(path) in places:
            return places[".".join(path)]
        path.pop()
    return None


def _places(text: str) -> dict[str, int]:
    places: dict[str, int] = {}
    counts: dict[str, int] = {}
    table = ""
    for number, line in enumerate(text.splitlines(), start=1):
        array, plain, key = _ARRAY.match(line), _TABLE.match(line), _KEY.match(line)
        if array:
            name = _clean(array.group(1))
            counts[name] = counts.get(name, -1) + 1
            table = f"{name}.{counts[name]}"
            places.setdefault(name, number)
            places[table] = number
        elif plain:
            table = _within_arrays(_clean(plain.group(1)), counts)
            places.setdefault(table, number)
        elif key:
            dotted = _clean(key.group(1))
            places.setdefault(f"{table}.{dotted}" if table else dotted, number)
    return places


def _within_arrays(name: str, counts: dict[str, int]) -> str:
    """Return the name with the array's last element in it, to which a table under an array of tables belongs."""
    for array, last in counts.items():
        if name.startswith(f"{array}."):
            return f"{array}.{last}.{name[len(array) + 1 :]}"
    return name


def _clean(dotted: str) -> str:
    return ".".join(part.strip().strip("\"'") for part in dotted.split("."))
