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
        return _checked([_point(point, dimension) for point in given], [f"point {i}" for i in range(1, len(given) + 1)])
    if isinstance(given, str) and given.lower().endswith(".csv"):
        files.append(folder / given)
        return _from_csv(folder / given, column)
    return Curve((0.0,), (parse(given, dimension),))


Point = tuple[float, float, float | None]


def _point(point: Any, dimension: str) -> Point:
    if not isinstance(point, list) or len(point) not in (2, 3):
        raise ValueError(
            f"found {point!r}; give pairs [state of charge, {dimension}], such as [0.5, 'value with unit'], or with"
            " several temperatures triples [state of charge, value, temperature]"
        )
    degc = parse(point[2], "temperature") if len(point) == 3 else None
    return parse(point[0], "share"), parse(point[1], dimension), degc


def _checked(points: list[Point], places: list[str]) -> Curve:
    """Return the curve if its points are in order; `places` name them in what is said."""
    if not points:
        raise ValueError("found an empty list; give at least one pair [state of charge, value]")
    if len({degc is None for _, _, degc in points}) > 1:
        raise ValueError("some points have a temperature and some have none; give it to all or to none")
    for (soc, _, _), place in zip(points, places, strict=True):
        if not 0.0 <= soc <= 1.0:
            raise ValueError(f"{place}: state of charge {soc:g} is outside 0 to 1")
    for (before, _, cool), (soc, _, warm), place in zip(points, points[1:], places[1:], strict=False):
        if cool is not None and warm is not None and warm < cool:
            raise ValueError(f"{place}: temperature {warm:g} degC is below {cool:g} degC; give the coldest curve first")
        if cool == warm and soc <= before:
            raise ValueError(f"{place}: state of charge {soc:g} does not rise above {before:g}")
    degc = tuple(d for _, _, d in points if d is not None)
    return Curve(tuple(s for s, _, _ in points), tuple(v for _, v, _ in points), degc)


def _from_csv(file: Path, column: str) -> Curve:
    try:
        text = file.read_text(encoding="utf-8-sig")
    except OSError as error:
        raise PlanError(f"the file cannot be read ({error.strerror}); check the name", file=file) from None
    except UnicodeDecodeError:
        raise PlanError("the file is not UTF-8 text; save it so", file=file) from None
    rows = list(csv.reader(text.splitlines()))
    header = [cell.strip() for cell in rows[0]] if rows else []
    if header not in (["soc", column], ["soc", column, "temperature_degc"]):
        what = f"found the columns {header}; wanted are soc,{column} and, for several temperatures, temperature_degc"
        raise PlanError(what, file=file, line=1)
    points: list[Point] = []
    lines: list[int] = []
    for line, row in enumerate(rows[1:], start=2):
        if not row:
            continue
        try:
            soc, value, *rest = (parse(float(cell), "share") for cell in row)
            (degc,) = rest or (None,)
        except ValueError:
            wanted = "two" if len(header) == 2 else "three"
            raise PlanError(
                f"found {','.join(row)!r}; wanted are {wanted} finite numbers", file=file, line=line
            ) from None
        if (degc is None) != (len(header) == 2):
            raise PlanError(f"found {len(row)} cells; the header has {len(header)}", file=file, line=line)
        points.append((soc, value, degc))
        lines.append(line)
        try:
            _checked(points[-2:], [f"line {n}" for n in lines[-2:]])
        except ValueError as error:
            raise PlanError(str(error).partition(": ")[2] or str(error), file=file, line=line) from None
    if not points:
        raise PlanError("the file holds no rows", file=file)
    return _checked(points, [f"line {line}" for line in lines])
