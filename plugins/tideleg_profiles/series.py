"""Reading the series that a source works on: a CSV with time_s and one column whose name ends in its unit."""

from __future__ import annotations

import csv
import math
from collections.abc import Mapping
from pathlib import Path
from typing import NamedTuple

import numpy as np

from tideleg import FloatArray, ProfileError

HOLDING = "a row holds from its time stamp to the next; the last row only closes the file"
POWER_UNITS = {"w": 1.0, "kw": 1e3, "mw": 1e6}


class Series(NamedTuple):
    """A series held step by step; arrays (S,).

    time, duration : start, from zero, and length of each step [s]
    value : in the base unit of its column
    """

    time: FloatArray
    duration: FloatArray
    value: FloatArray


def columns_of(quantity: str) -> Mapping[str, float]:
    """Return the names of a power column, such as load_kw, with their size in watts."""
    return {f"{quantity}_{unit}": size for unit, size in POWER_UNITS.items()}


def read_series(path: Path, columns: Mapping[str, float]) -> Series:
    """Return time_s and the one column of `columns` in a CSV with a header.

    Raises
    ------
    ProfileError
        If the file cannot be used as it stands; line and column are named. Nothing is repaired.
    """
    rows = _rows(path)
    (_, header), body = rows[0], rows[1:]
    names = [cell.strip() for cell in header]
    wanted = [name for name in names if name in columns]
    if "time_s" not in names or len(wanted) != 1 or len(names) != 2:
        what = f"needs the column time_s and one of {', '.join(columns)}; found {', '.join(names)}"
        raise ProfileError(what, file=path, line=1)
    if len(body) < 2:
        raise ProfileError(f"found {len(body)} rows; two at least are needed, the last closes the file", file=path)
    name = wanted[0]
    cells = [_pair(path, line, row, names) for line, row in body]
    table = np.array(cells, dtype=np.float64)
    time, value = table[:, names.index("time_s")], table[:, names.index(name)] * columns[name]
    steps = np.diff(time)
    if np.any(steps <= 0.0):
        at = int(np.argmax(steps <= 0.0)) + 1
        what = f"{time[at]:g} s does not come after {time[at - 1]:g} s; time must rise from row to row"
        raise ProfileError(what, file=path, line=body[at][0], column="time_s")
    return Series(time[:-1] - time[0], steps, value[:-1])


def _rows(path: Path) -> list[tuple[int, list[str]]]:
    """Return the filled rows with their line in the file, from 1."""
    try:
        text = path.read_text(encoding="utf-8-sig")
    except OSError as error:
        raise ProfileError(f"the file cannot be read ({error.strerror})", file=path) from None
    except UnicodeDecodeError:
        raise ProfileError("the file is not UTF-8 text; save it so", file=path) from None
    reader = csv.reader(text.splitlines())
    rows = [(reader.line_num, row) for row in reader if any(cell.strip() for cell in row)]
    if not rows:
        raise ProfileError("the file is empty", file=path)
    return rows


def _pair(path: Path, line: int, row: list[str], names: list[str]) -> list[float]:
    if len(row) != len(names):
        what = f"found {len(row)} cells under {len(names)} columns; decimals are written with a point"
        raise ProfileError(what, file=path, line=line)
    return [_number(path, line, cell, name) for cell, name in zip(row, names, strict=True)]


def _number(path: Path, line: int, cell: str, column: str) -> float:
    try:
        value = float(cell)
    except ValueError:
        value = math.nan
    if not math.isfinite(value):
        what = f"found {cell.strip()!r}, which is no finite number. Fill it or drop the row; nothing is guessed"
        raise ProfileError(what, file=path, line=line, column=column)
    return value
