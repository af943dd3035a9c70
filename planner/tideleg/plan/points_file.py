"""Reading a CSV file of digitised points that a part table names: numbers and lines, no meaning."""

from __future__ import annotations

import csv
import math
from pathlib import Path

from tideleg.errors import PlanError
from tideleg.points import PointsFile


def read_points(file: Path) -> PointsFile:
    """Return the header and the rows of a CSV file; lines that begin with # and empty lines say nothing.

    Raises
    ------
    PlanError
        If the file cannot be read, a cell is no finite number, or a row is longer or shorter than the header.
    """
    try:
        text = file.read_text(encoding="utf-8-sig")
    except OSError as error:
        raise PlanError(f"the file cannot be read ({error.strerror}); check the name", file=file) from None
    except UnicodeDecodeError:
        raise PlanError("the file is not UTF-8 text; save it so", file=file) from None
    numbered = [(n, row) for n, row in enumerate(csv.reader(text.splitlines()), start=1) if _says_something(row)]
    if not numbered:
        raise PlanError("the file holds no header; give one such as current_a,energy_mj", file=file)
    header = tuple(cell.strip() for cell in numbered[0][1])
    rows = tuple(_numbers(row, len(header), file, line) for line, row in numbered[1:])
    return PointsFile(file.name, header, rows, tuple(line for line, _ in numbered[1:]))


def _says_something(row: list[str]) -> bool:
    return any(cell.strip() for cell in row) and not row[0].lstrip().startswith("#")


def _numbers(row: list[str], columns: int, file: Path, line: int) -> tuple[float, ...]:
    if len(row) != columns:
        what = f"found {len(row)} cells; the header has {columns} (decimal points, commas between cells)"
        raise PlanError(what, file=file, line=line)
    numbers = []
    for cell in row:
        try:
            number = float(cell)
        except ValueError:
            number = math.nan
        if not math.isfinite(number):
            raise PlanError(f"found {cell.strip()!r}; wanted is a finite number", file=file, line=line)
        numbers.append(number)
    return tuple(numbers)
