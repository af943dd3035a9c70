"""Tables of digitised points: how a person writes them, inline or as a CSV file, and what is read from them.

Inline they are pairs [[axis, value], ...] for one axis, or rows with names such as {current = "50 A", temperature =
"25 degC", energy = "1.2 mJ"}. In a CSV file the header names each column with its unit: "current_a,energy_mj" or
"current [A],energy [mJ]". Every point is read or the table is refused: nothing is repaired, dropped or filled.
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from typing import Any, NamedTuple

from tideleg.quantity import DIMENSIONS, column_unit, parse

_HEADER = re.compile(r"^\s*(\w+?)\s*(?:[\[(]\s*(.+?)\s*[\])])?\s*$")


class PointsFile(NamedTuple):
    """A CSV file of points as it stands: file name, header, rows of numbers, and the line of each row."""

    name: str
    header: tuple[str, ...]
    rows: tuple[tuple[float, ...], ...]
    lines: tuple[int, ...]

    def __str__(self) -> str:
        return f"{len(self.rows)} points of {self.name}"


class PointTable(NamedTuple):
    """Points in base units.

    axes : names of the axes that the points have
    points : (axis values in that order, then the value)
    """

    axes: tuple[str, ...]
    points: tuple[tuple[float, ...], ...]

    def column(self, axis: str) -> tuple[float, ...]:
        """Return one axis of all points."""
        return tuple(point[self.axes.index(axis)] for point in self.points)

    def values(self) -> tuple[float, ...]:
        """Return the value of all points."""
        return tuple(point[-1] for point in self.points)


class PointReader:
    """Reads one kind of table; use it as a pydantic `PlainValidator`, and its `schema` as `WithJsonSchema`.

    Parameters
    ----------
    value, dimension : name and dimension of what the table gives
    axes : name -> dimension, in the order of pairs; the first stands in pairs
    required : axes without which the table says nothing; of the others any may be left out
    above_zero : whether a value of zero is refused as well as a negative one
    """

    def __init__(
        self,
        value: str,
        dimension: str,
        axes: Mapping[str, str],
        *,
        required: Sequence[str] = (),
        above_zero: bool = False,
    ) -> None:
        self.value, self.dimensions = value, {**axes, value: dimension}
        self.axes, self.required, self.above_zero = tuple(axes), tuple(required), above_zero

    def __call__(self, given: Any) -> PointTable:
        """Return the table.

        Raises
        ------
        ValueError
            If a point cannot be read, stands twice, or there are fewer than two.
        """
        if isinstance(given, PointTable):
            return given
        words, rows = self._file(given) if isinstance(given, PointsFile) else self._inline(given)
        if len(rows) < 2:
            where = f" in {given.name}" if isinstance(given, PointsFile) else ""
            raise ValueError(f"found {len(rows)} point{where}; a table needs two or more")
        axes = tuple(axis for axis in self.axes if axis in rows[0])
        lacking = [axis for axis in self.required if axis not in axes] or ([] if axes else [" or ".join(self.axes)])
        if lacking:
            raise ValueError(f"the {lacking[0]} of the points is missing; {self._wanted()}")
        seen: dict[tuple[float, ...], str] = {}
        points = []
        for word, row in zip(words, rows, strict=True):
            if set(row) != {*axes, self.value}:
                raise ValueError(f"{word}: found {', '.join(row)}; every point gives {', '.join((*axes, self.value))}")
            place = tuple(row[axis] for axis in axes)
            if place in seen:
                raise ValueError(f"{word} stands at the same place as {seen[place]}; give each point once")
            seen[place] = word
            self._check(word, row)
            points.append((*place, row[self.value]))
        return PointTable(axes, tuple(points))

    def schema(self) -> dict[str, Any]:
        """Return the JSON Schema of the key."""
        units = {name: DIMENSIONS[dimension].example for name, dimension in self.dimensions.items()}
        pair = [units[self.axes[0]], units[self.value]]
        quantity = {"anyOf": [{"type": "number"}, {"type": "string"}]}
        row = {"type": "object", "properties": dict.fromkeys(units, quantity), "additionalProperties": False}
        pairs = {"type": "array", "items": quantity, "minItems": 2, "maxItems": 2}
        return {
            "description": f"points: {self._wanted()}",
            "anyOf": [{"type": "string"}, {"type": "array", "minItems": 2, "items": {"anyOf": [pairs, row]}}],
            "examples": [[pair, pair]],
        }

    def _wanted(self) -> str:
        first = self.axes[0]
        names = "; or rows with the keys " + ", ".join((*self.axes, self.value)) if len(self.axes) > 1 else ""
        columns = ",".join(f"{n}_{DIMENSIONS[d].base.lower()}" for n, d in self.dimensions.items())
        return f"give pairs [{first}, {self.value}]{names}; or a CSV file with columns such as {columns}"

    def _inline(self, given: Any) -> tuple[list[str], list[dict[str, float]]]:
        if not isinstance(given, (list, tuple)):
            raise ValueError(f"found {given!r}; {self._wanted()}")
        words = [f"point {number}" for number in range(1, len(given) + 1)]
        return words, [self._row(word, one) for word, one in zip(words, given, strict=True)]

    def _row(self, word: str, given: Any) -> dict[str, float]:
        if isinstance(given, (list, tuple)) and len(given) == 2:
            given = {self.axes[0]: given[0], self.value: given[1]}
        if not isinstance(given, Mapping):
            raise ValueError(f"{word}: found {given!r}; {self._wanted()}")
        row = {}
        for name, one in given.items():
            if name not in self.dimensions:
                raise ValueError(f"{word}: found the key {name!r}; allowed are {', '.join(self.dimensions)}")
            try:
                row[name] = parse(one, self.dimensions[name])
            except ValueError as error:
                raise ValueError(f"{word}: {name}: {error}") from None
        return row

    def _file(self, given: PointsFile) -> tuple[list[str], list[dict[str, float]]]:
        columns = [self._column(cell, given) for cell in given.header]
        names = [name for name, _ in columns]
        if len(set(names)) < len(names) or self.value not in names:
            raise ValueError(f"{given.name}: found the columns {', '.join(given.header)}; {self._wanted()}")
        rows = [{name: scale(x) for (name, scale), x in zip(columns, row, strict=True)} for row in given.rows]
        return [f"{given.name} line {line}" for line in given.lines], rows

    def _column(self, cell: str, given: PointsFile) -> tuple[str, Any]:
        match = _HEADER.match(cell)
        head, unit = (match.group(1), match.group(2)) if match else (cell, None)
        if unit is None and head in self.dimensions and self.dimensions[head] == "share":
            return head, float
        for name in sorted(self.dimensions, key=len, reverse=True):
            if head == name and unit is not None:
                return name, column_unit(unit, self.dimensions[name], f"{given.name} column {cell!r}")
            if unit is None and head.startswith(f"{name}_"):
                rest = head.removeprefix(f"{name}_")
                return name, column_unit(rest, self.dimensions[name], f"{given.name} column {cell!r}")
        raise ValueError(f"{given.name}: found the column {cell!r}; {self._wanted()}")

    def _check(self, word: str, row: Mapping[str, float]) -> None:
        value = row[self.value]
        if value < 0.0 or (self.above_zero and value == 0.0):
            allowed = "above zero" if self.above_zero else "zero or above"
            raise ValueError(f"{word}: found the {self.value} {value:g}; it must be {allowed}")
        for axis, least in (("current", 0.0), ("voltage", 0.0), ("resistance", 0.0), ("gate_resistance", 0.0)):
            if axis != self.value and row.get(axis, 0.0) < least:
                raise ValueError(f"{word}: {axis} {row[axis]:g} is negative; points hold magnitudes")
