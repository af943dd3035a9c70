"""How a profile is laid out in its file: what a person declares, and what can be told from its first and last lines.

Loggers, vehicle models and meters write titles above the header, disclaimers below the rows, semicolons, decimal commas
and units in the header. What is certain is taken and said; what is not is asked for, never guessed.
"""

from __future__ import annotations

import csv
import itertools
import re
from collections import deque
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Literal

from tideleg.errors import ProfileError

Stamps = Literal["seconds", "minutes", "hours", "clock", "iso", "day first", "month first"]

UNITS: Mapping[str, tuple[str, float]] = {
    "w": ("power", 1.0),
    "kw": ("power", 1e3),
    "mw": ("power", 1e6),
    "m/s": ("speed", 1.0),
    "km/h": ("speed", 1.0 / 3.6),
    "kmh": ("speed", 1.0 / 3.6),
    "kph": ("speed", 1.0 / 3.6),
    "mph": ("speed", 0.44704),
    "mi/h": ("speed", 0.44704),
    "s": ("time", 1.0),
    "sec": ("time", 1.0),
    "min": ("time", 60.0),
    "h": ("time", 3600.0),
    "hh:mm:ss": ("time", 1.0),
    "v": ("voltage", 1.0),
    "degc": ("temperature", 1.0),
    "°c": ("temperature", 1.0),
    "c": ("temperature", 1.0),
}
"""Units that may stand in a header or below it -> (what they measure, size in SI units)."""

SUFFIXES = {"_m_s": "m/s", "_km_h": "km/h", "_degc": "degc", "_mph": "mph", "_kw": "kw", "_mw": "mw", "_w": "w"}
SUFFIXES |= {"_v": "v", "_s": "s", "_min": "min", "_h": "h"}

NAMES: Mapping[str, tuple[str, ...]] = {
    "time": ("time", "elapsed time", "elapsed", "timestamp", "date time", "datetime"),
    "duration": ("duration",),
    "power": ("power",),
    "speed": ("speed", "vehicle speed", "velocity"),
    "link_voltage": ("link voltage",),
    "coolant": ("coolant",),
    "ambient": ("ambient",),
    "battery_temperature": ("battery",),
    "power_peak": ("power peak",),
    "power_valley": ("power valley",),
    "power_max": ("power max",),
    "power_min": ("power min",),
}
"""What a column may be called, unit apart, to be known by itself."""

ROLES = tuple(NAMES)
HEAD_LINES = 200
"""Lines in which the header is looked for."""

MOST_TRAILERS = 50


@dataclass(frozen=True)
class Layout:
    """What a person declares of a file; None where it is to be told from the file itself.

    columns : name of a column in the file by role: time, power or speed, and any of the others
    unit : of the power or speed column, where the header does not tell it
    encoding, separator, decimal, header_line, stamps : as they are
    longest_gap_s : steps longer than this are holes
    gap : what a hole is: refused; "hold": the row before it holds on; "zero": it holds for longest_gap_s, then nothing
    missing : what a row with an empty or non-finite cell is: refused; "drop": left out, and the row before it holds on
    """

    columns: Mapping[str, str] = field(default_factory=dict)
    unit: str | None = None
    encoding: str = "utf-8-sig"
    separator: str | None = None
    decimal: str | None = None
    header_line: int | None = None
    stamps: Stamps | None = None
    longest_gap_s: float | None = None
    gap: Literal["refuse", "hold", "zero"] = "refuse"
    missing: Literal["refuse", "drop"] = "refuse"


@dataclass(frozen=True)
class Column:
    """One column that is read.

    position : in the row; name : as in the file; unit : key of UNITS, or None
    """

    position: int
    name: str
    unit: str | None


@dataclass(frozen=True)
class Found:
    """A file's layout as found.

    separator : between cells
    width : how many columns the header has
    columns : by role
    header_line : counted from 1; first_line : of the first row (a line of units may lie between)
    """

    separator: str
    width: int
    columns: Mapping[str, Column]
    header_line: int
    first_line: int

    @property
    def value(self) -> str:
        """Return "power" or "speed"."""
        return "power" if "power" in self.columns else "speed"


def lines_of(path: Path, encoding: str) -> Iterator[str]:
    """Yield the lines of a text file without their ends.

    Raises
    ------
    ProfileError
        If the file cannot be read, or is not in that encoding; the line is named.
    """
    number = 0
    try:
        with path.open(encoding=encoding, newline=None) as handle:
            for line in handle:
                number += 1
                yield line.rstrip("\n")
    except FileNotFoundError:
        raise ProfileError("the file does not exist; check the path", file=path) from None
    except OSError as error:
        raise ProfileError(f"the file cannot be read ({error.strerror})", file=path) from None
    except UnicodeDecodeError as error:
        at = number + 1 + error.object[: error.start].count(b"\n")
        raise ProfileError(
            "the file is not UTF-8 text; save it so, or declare layout = { encoding = 'latin-1' } in the mission",
            file=path,
            line=at,
        ) from None
    except LookupError:
        raise ProfileError(
            f"found the encoding {encoding!r}, which is not known; utf-8 and latin-1 are", file=path
        ) from None


def find(path: Path, layout: Layout) -> Found:
    """Return the layout of a file: declared, or told by its header.

    Raises
    ------
    ProfileError
        If no header is found, or its columns are not certain; what to declare is said.
    """
    head = list(itertools.islice(lines_of(path, layout.encoding), HEAD_LINES))
    if not any(line.strip() for line in head):
        raise ProfileError("the file is empty", file=path)
    if layout.header_line is not None and layout.header_line > len(head):
        raise ProfileError(
            f"found {len(head)} lines, and the header is declared in line {layout.header_line}", file=path
        )
    wanted = range(len(head)) if layout.header_line is None else (layout.header_line - 1,)
    for index in wanted:
        for separator in _separators(layout):
            cells = _cells(head[index], separator)
            columns = _columns(cells, layout)
            if _is_whole(columns, layout):
                _refuse_unsure(path, index + 1, cells, columns, layout)
                return _with_units(path, head, index, separator, len(cells), columns, layout)
    raise _no_header(path, head, layout)


def _separators(layout: Layout) -> tuple[str, ...]:
    return (layout.separator,) if layout.separator is not None else ("\t", ";", ",")


def _cells(line: str, separator: str) -> list[str]:
    cells = [cell.strip().strip('"') for cell in next(csv.reader([line], delimiter=separator), [])]
    while len(cells) > 1 and not cells[-1]:
        cells.pop()  # a separator at the end of the row
    return cells


def _columns(cells: Sequence[str], layout: Layout) -> dict[str, Column]:
    """Return the columns by role: those that are declared, then those whose names are known."""
    found: dict[str, Column] = {}
    for role, name in layout.columns.items():
        if name in cells:
            found[role] = Column(cells.index(name), name, _name_and_unit(name)[1])
    for position, cell in enumerate(cells):
        name, unit = _name_and_unit(cell)
        known = next((role for role, names in NAMES.items() if name in names), None)
        if known is None or known in found or any(c.position == position for c in found.values()):
            continue
        if layout.columns and known in ("power", "speed") and {"power", "speed"} & set(layout.columns):
            continue
        found[known] = Column(position, cell, unit)
    return found


def _name_and_unit(cell: str) -> tuple[str, str | None]:
    """Return the name without its unit, and the unit: in brackets, after a slash or comma, or as a suffix."""
    text = cell.strip().lower()
    bracketed = re.fullmatch(r"(.*?)\s*[\[(]\s*([^\])]*?)\s*[\])]", text)
    if bracketed and bracketed[2] in UNITS:
        return _plain(bracketed[1]), bracketed[2]
    for suffix, by_suffix in SUFFIXES.items():
        if text.endswith(suffix):
            return _plain(text[: -len(suffix)]), by_suffix
    spoken = re.fullmatch(r"(.*?)(?:,| in| /)\s*(\S+)", text)
    if spoken and spoken[2] in UNITS:
        return _plain(spoken[1]), spoken[2]
    return _plain(text), None


def _plain(name: str) -> str:
    return " ".join(name.replace("_", " ").split())


def _is_whole(columns: Mapping[str, Column], layout: Layout) -> bool:
    """Whether a line can be the header: it has the declared columns, or a time and a power or a speed."""
    if any(role not in columns for role in layout.columns):
        return False
    return "time" in columns and bool({"power", "speed"} & set(columns))


def _refuse_unsure(path: Path, line: int, cells: list[str], columns: Mapping[str, Column], layout: Layout) -> None:
    double = [cell for cell in cells if cell and cells.count(cell) > 1]
    if double:
        raise ProfileError(f"the column {double[0]!r} stands twice", file=path, line=line)
    values = [columns[role].name for role in ("power", "speed") if role in columns]
    twins = [cell for cell in cells if _name_and_unit(cell)[0] in ("power", "speed") and cell not in values]
    if not layout.columns and (len(values) > 1 or twins):
        told = ", ".join([*values, *twins])
        what = f"one column of power or speed is needed; found {told}. Name it, layout = {{ power = '...' }}"
        raise ProfileError(what, file=path, line=line)
    if not layout.columns:
        known = {column.position for column in columns.values()}
        unknown = [cell for i, cell in enumerate(cells) if i not in known]
        if unknown:
            allowed = "time_s, duration_s, power_w (kw, mw), speed_m_s (km_h, mph), link_voltage_v, coolant_degc, ..."
            raise ProfileError(
                f"found the column {unknown[0]!r}; allowed are {allowed} Rename or remove it, or name the columns to"
                " read in the mission, such as layout = { time = 'time_s', power = 'power_w' }: others stay unread",
                file=path,
                line=line,
            )


def _with_units(
    path: Path, head: list[str], index: int, separator: str, width: int, columns: dict[str, Column], layout: Layout
) -> Found:
    """Take units from the line below the header where one stands there, and refuse a value whose unit is not known."""
    first = index + 2
    below = _cells(head[index + 1], separator) if index + 1 < len(head) else []
    if below and all(not cell or cell.strip("[]() ").lower() in UNITS for cell in below) and any(below):
        first += 1
        for role, column in columns.items():
            if column.unit is None and column.position < len(below):
                told = below[column.position].strip("[]() ").lower()
                columns[role] = Column(column.position, column.name, told or None)
    role = "power" if "power" in columns else "speed"
    column = columns[role]
    unit = layout.unit.lower() if layout.unit is not None else column.unit
    if unit is None or unit not in UNITS:
        found = "none is given" if unit is None else f"found {unit!r}"
        allowed = ", ".join(u for u, (what, _) in UNITS.items() if what == role)
        raise ProfileError(
            f"the unit of {column.name!r} is not known: {found}. Put it into the header, or declare layout = {{ unit ="
            f" 'kW' }}; allowed are {allowed}",
            file=path,
            line=index + 1,
        )
    if UNITS[unit][0] != role:
        what = f"{column.name!r} is read as {role} and has the unit {unit!r}, which is one of {UNITS[unit][0]}"
        raise ProfileError(what, file=path, line=index + 1)
    columns[role] = Column(column.position, column.name, unit)
    return Found(separator, width, columns, index + 1, first)


def _no_header(path: Path, head: list[str], layout: Layout) -> ProfileError:
    first = next(n for n, line in enumerate(head) if line.strip())
    line = layout.header_line or first + 1
    cells = [cell for cell in max((_cells(head[line - 1], s) for s in _separators(layout)), key=len) if cell]
    missing = [f"{role} = {name!r}" for role, name in layout.columns.items() if name not in cells]
    if missing:
        return ProfileError(
            f"the declared column {missing[0]} is missing; found {', '.join(cells)}", file=path, line=line
        )
    has = _columns(cells, layout)
    lacks = "the column time_s" if "time" not in has else "a column of power or speed"
    return ProfileError(
        f"{lacks} is missing; found {', '.join(repr(c) for c in cells[:12])}. One column of power or speed is needed"
        " beside the time (power_w, power_kw, power_mw, speed_m_s, speed_km_h, speed_mph); name others in the"
        " mission, such as layout = { time = 'Time', power = 'P_link (kW)' }",
        file=path,
        line=line,
    )


def rows_of(path: Path, layout: Layout, found: Found) -> Iterator[tuple[int, str]]:
    """Yield (line number, text) of every row; lines below the last row that hold no row are left out.

    Only a few last lines are held back, so a file of any length passes.
    """
    held: deque[tuple[int, str]] = deque()
    for number, line in enumerate(lines_of(path, layout.encoding), start=1):
        if number < found.first_line or not line.strip():
            continue
        held.append((number, line))
        if len(held) > MOST_TRAILERS:
            yield held.popleft()
    while held and is_trailer(held[-1][1], found):
        held.pop()
    yield from held


def is_trailer(line: str, found: Found) -> bool:
    """Whether a last line is no row: its time cell holds no digit, or it has a single cell where rows have more."""
    cells = _cells(line, found.separator)
    if len(cells) <= found.columns["time"].position:
        return True
    filled = [cell for cell in cells if cell]
    return not re.search(r"\d", cells[found.columns["time"].position]) or (len(filled) == 1 and found.width > 1)


def find_columns(path: Path, names: Sequence[str]) -> Found:
    """Return the layout of a file that has column names and no lines.

    Raises
    ------
    ProfileError
        If its columns are not certain.
    """
    layout = Layout()
    columns = _columns(names, layout)
    if not _is_whole(columns, layout):
        raise _no_header(path, [",".join(names)], layout)
    _refuse_unsure(path, 1, list(names), columns, layout)
    return _with_units(path, [",".join(names)], 0, ",", len(names), columns, layout)
