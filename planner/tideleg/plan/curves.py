"""Reading a curve over the state of charge: a constant, inline pairs, or a CSV file."""

from __future__ import annotations

import csv
from pathlib import Path
from typing import Any

from tideleg.errors import PlanError
from tideleg.plan.curve import Curve
from tideleg.quantity import parse

COLUMNS = {"open_circuit_voltage": ("open_circuit_voltage_v", "voltage")}
COLUMNS |= dict.fromkeys(("resistance", "resistance_charge"), ("resistance_ohm", "resistance"))


def read_curve(given: Any, key: str, folder: Path, files: list[Path]) -> Curve:
    """Return a curve from what the plan gives for `key`.

    Raises
    ------
    ValueError
        If the constant or the pairs cannot be used.
    PlanError
        If the CSV file cannot be used; file and line are named.
    """
    column, dimension = COLUMNS[key]
    if isinstance(given, list):
        pairs = [_pair(pair, dimension) for pair in given]
        return _checked(pairs, "point")
    if isinstance(given, str) and given.lower().endswith(".csv"):
        files.append(folder / given)
        return _from_csv(folder / given, column)
    return Curve((0.0,), (parse(given, dimension),))


def _pair(pair: Any, dimension: str) -> tuple[float, float]:
    if not isinstance(pair, list) or len(pair) != 2:
        raise ValueError(f"found {pair!r}; give pairs [state of charge, {dimension}], such as [0.5, 'value with unit']")
    return parse(pair[0], "share"), parse(pair[1], dimension)


def _checked(pairs: list[tuple[float, float]], word: str) -> Curve:
    if not pairs:
        raise ValueError("found an empty list; give at least one pair [state of charge, value]")
    for i, (soc, _) in enumerate(pairs, start=1):
        if not 0.0 <= soc <= 1.0:
            raise ValueError(f"{word} {i}: state of charge {soc:g} is outside 0 to 1")
        if i > 1 and soc <= pairs[i - 2][0]:
            raise ValueError(f"{word} {i}: state of charge {soc:g} does not rise above {pairs[i - 2][0]:g}")
    return Curve(tuple(s for s, _ in pairs), tuple(v for _, v in pairs))


def _from_csv(file: Path, column: str) -> Curve:
    try:
        text = file.read_text(encoding="utf-8-sig")
    except OSError as error:
        raise PlanError(f"the file cannot be read ({error.strerror}); check the name", file=file) from None
    except UnicodeDecodeError:
        raise PlanError("the file is not UTF-8 text; save it so", file=file) from None
    rows = list(csv.reader(text.splitlines()))
    header = [cell.strip() for cell in rows[0]] if rows else []
    if header != ["soc", column]:
        raise PlanError(f"found the columns {header}; wanted are soc,{column}", file=file, line=1)
    pairs: list[tuple[float, float]] = []
    for line, row in enumerate(rows[1:], start=2):
        if not row:
            continue
        try:
            soc, value = (parse(float(cell), "share") for cell in row)
        except ValueError:
            raise PlanError(f"found {','.join(row)!r}; wanted are two finite numbers", file=file, line=line) from None
        if not 0.0 <= soc <= 1.0 or (pairs and soc <= pairs[-1][0]):
            raise PlanError(f"state of charge {soc:g} must rise from row to row within 0 to 1", file=file, line=line)
        pairs.append((soc, value))
    if not pairs:
        raise PlanError("the file holds no rows", file=file)
    return Curve(tuple(s for s, _ in pairs), tuple(v for _, v in pairs))
