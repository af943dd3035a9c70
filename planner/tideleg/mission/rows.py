"""The rows of a profile as arrays by role: read in pieces, so that memory holds the numbers and not the text."""

from __future__ import annotations

import csv
import hashlib
import io
import itertools
import warnings
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from tideleg.errors import ProfileError
from tideleg.mission import cells
from tideleg.mission.layout import UNITS, Column, Found, Layout, find, rows_of

if TYPE_CHECKING:
    import pandas as pd

    from tideleg.waveform import FloatArray

CHUNK_ROWS = 200_000
SAMPLE_ROWS = 2_000
TAB = "\t"
TIME_SIZE = {"seconds": 1.0, "minutes": 60.0, "hours": 3600.0}


@dataclass(frozen=True)
class Rows:
    """All rows of a file.

    columns : by role; time in seconds, everything else in the file's own unit
    line : of each row, counted from 1
    found : the layout
    sha256 : of the file's bytes
    notes : what was taken for granted or left out, in sentences
    """

    columns: dict[str, FloatArray]
    line: FloatArray
    found: Found
    sha256: str
    notes: tuple[str, ...]


def read_rows(path: Path, layout: Layout, chunk_rows: int = CHUNK_ROWS) -> Rows:
    """Return the rows of a text file.

    Raises
    ------
    ProfileError
        If a row does not fit the header, or a cell is missing or no finite number; line and column are named.
    """
    found = find(path, layout)
    reader = _Reader(path, layout, found)
    rows = rows_of(path, layout, found)
    while chunk := list(itertools.islice(rows, chunk_rows)):
        reader.take(chunk)
    return reader.finish()


class _Reader:
    """Takes rows piece by piece and keeps their numbers."""

    def __init__(self, path: Path, layout: Layout, found: Found) -> None:
        self.path, self.layout, self.found = path, layout, found
        self.decimal: cells.Decimal = "."
        self.stamps = ""
        self.dropped = 0
        self.first_dropped = 0
        self.pieces: list[dict[str, FloatArray]] = []
        self.lines: list[FloatArray] = []

    def take(self, chunk: list[tuple[int, str]]) -> None:
        """Read one piece of rows."""
        if not self.pieces:
            self._look(chunk[:SAMPLE_ROWS])
        lines = np.array([number for number, _ in chunk], dtype=np.float64)
        text = "\n".join(line for _, line in chunk)
        piece = self._quickly(text, len(chunk)) if self.stamps in TIME_SIZE else None
        if piece is None:
            piece = self._carefully(text, chunk)
        good = np.all([np.isfinite(values) for values in piece.values()], axis=0)
        if not np.all(good):
            if self.layout.missing == "refuse":
                raise self._bad_cell(int(np.argmin(good)), piece, chunk)
            self.first_dropped = self.first_dropped or int(lines[int(np.argmin(good))])
            self.dropped += int(np.count_nonzero(~good))
            piece = {role: values[good] for role, values in piece.items()}
            lines = lines[good]
        self.pieces.append(piece)
        self.lines.append(lines)

    def finish(self) -> Rows:
        """Return everything that was taken."""
        if not self.pieces or not any(len(lines) for lines in self.lines):
            raise ProfileError("the file holds a header and no rows", file=self.path)
        columns = {role: np.concatenate([piece[role] for piece in self.pieces]) for role in self.pieces[0]}
        if self.stamps == "clock":
            columns["time"] = cells.past_midnight(columns["time"])
        return Rows(columns, np.concatenate(self.lines), self.found, _digest(self.path), tuple(self._notes()))

    def _look(self, sample: list[tuple[int, str]]) -> None:
        """Tell the kind of time stamps and the decimal sign from the first rows."""
        table = list(csv.reader([line for _, line in sample], delimiter=self.found.separator))
        time, others = self.found.columns["time"], self._columns(without_time=True)
        stamp = next((row[time.position] for row in table if len(row) > time.position), "")
        self.stamps = self.layout.stamps or cells.stamps_kind(stamp) or "seconds"
        if self.stamps == "seconds" and time.unit in ("min", "h"):
            self.stamps = {"min": "minutes", "h": "hours"}[time.unit]
        if self.stamps in TIME_SIZE:
            others = {**others, "time": time}
        if self.layout.decimal is not None:
            self.decimal = "," if self.layout.decimal == "," else "."
        else:
            texts = [row[c.position] for row in table for c in others.values() if len(row) > c.position]
            try:
                self.decimal = cells.decimal_of(texts, self.found.separator)
            except cells.UncertainNumbersError as error:
                line = next(n for n, text in sample if str(error) in text)
                raise ProfileError(
                    f"found {str(error)!r}: the comma may be a decimal comma or part thousands; declare"
                    " layout = { decimal = ',' } or layout = { decimal = '.' }",
                    file=self.path,
                    line=line,
                ) from None
        if self.stamps == "date":
            import pandas as pd

            order = cells.date_order(pd.Series([row[time.position] for row in table if len(row) > time.position]))
            if not order:
                raise ProfileError(
                    f"found {stamp!r}: no date in the first {len(table)} rows tells whether the day or the month comes"
                    " first; declare layout = { stamps = 'day first' } or 'month first'",
                    file=self.path,
                    line=sample[0][0],
                    column=time.name,
                )
            self.stamps = order

    def _columns(self, without_time: bool = False) -> dict[str, Column]:
        return {role: c for role, c in self.found.columns.items() if not (without_time and role == "time")}

    def _quickly(self, text: str, rows: int) -> dict[str, FloatArray] | None:
        """Return plain numbers by the parser's own float reading; None where a piece needs a closer look."""
        import pandas as pd

        if text.count(self.found.separator) != rows * (self.found.width - 1):
            return None  # more or fewer cells somewhere, or a separator inside quotes
        roles = {column.position: role for role, column in self.found.columns.items()}
        try:
            with warnings.catch_warnings():
                warnings.simplefilter("error", pd.errors.ParserWarning)
                table = pd.read_csv(
                    io.StringIO(text),
                    sep=self.found.separator,
                    decimal=self.decimal,
                    header=None,
                    usecols=sorted(roles),
                    dtype=np.float64,
                    index_col=False,
                )
        except (ValueError, pd.errors.ParserError, pd.errors.ParserWarning):
            return None
        piece = {role: np.asarray(table[position], dtype=np.float64) for position, role in roles.items()}
        if not all(np.all(np.isfinite(values)) for values in piece.values()):
            return None
        piece["time"] = piece["time"] * TIME_SIZE[self.stamps]
        return piece

    def _carefully(self, text: str, chunk: list[tuple[int, str]]) -> dict[str, FloatArray]:
        """Return the columns cell by cell, nan where a cell is none."""
        import pandas as pd

        width = self.found.width
        try:
            with warnings.catch_warnings():
                warnings.simplefilter("error", pd.errors.ParserWarning)
                table = pd.read_csv(
                    io.StringIO(text),
                    sep=self.found.separator,
                    header=None,
                    names=list(range(width + 1)),
                    dtype=str,
                    keep_default_na=False,
                    index_col=False,
                )
        except (pd.errors.ParserError, pd.errors.ParserWarning):
            raise self._misfit(chunk) from None
        table = table.fillna("")
        if (table[width].str.strip() != "").any() or len(table) != len(chunk):
            raise self._misfit(chunk)
        piece = {
            role: cells.numbers(table[column.position], self.decimal)
            for role, column in self._columns(without_time=True).items()
        }
        piece["time"] = self._times(table[self.found.columns["time"].position], chunk)
        return piece

    def _times(self, text: pd.Series[str], chunk: list[tuple[int, str]]) -> FloatArray:
        if self.stamps in TIME_SIZE:
            return cells.numbers(text, self.decimal) * TIME_SIZE[self.stamps]
        if self.stamps == "clock":
            return cells.clock_seconds(text)
        if self.stamps == "iso":
            offset = cells.has_offset(text)
            if np.any(offset) and not np.all(offset):
                row = int(np.argmax(offset != offset[0]))
                what = "some stamps carry an offset or Z and some do not; they cannot be put in order"
                raise ProfileError(what, file=self.path, line=chunk[row][0], column=self.found.columns["time"].name)
            return cells.iso_seconds(text)
        return cells.date_seconds(text, self.stamps)

    def _misfit(self, chunk: list[tuple[int, str]]) -> ProfileError:
        """Return the error for the first row that has more cells than the header."""
        for number, line in chunk:
            row = next(csv.reader([line], delimiter=self.found.separator), [])
            if any(cell.strip() for cell in row[self.found.width :]) or line.count('"') % 2:
                what = f"{len(row)} cells, the header has {self.found.width}"
                return ProfileError(f"the rows do not fit the header: {what}", file=self.path, line=number)
        what = "the rows do not fit the header: a quoted cell runs over lines"
        return ProfileError(what, file=self.path, line=chunk[0][0])

    def _bad_cell(self, row: int, piece: dict[str, FloatArray], chunk: list[tuple[int, str]]) -> ProfileError:
        role = next(role for role, values in piece.items() if not np.isfinite(values[row]))
        number, line = chunk[row]
        column = self.found.columns[role]
        given = next(csv.reader([line], delimiter=self.found.separator), [])
        cell = given[column.position].strip() if len(given) > column.position else ""
        is_stamp = role == "time" and self.stamps not in TIME_SIZE
        kind = "no time stamp of the kind of the first one" if is_stamp else "no finite number"
        what = f"found {cell!r}, which is {kind}" if cell else "the value is missing"
        to_drop = "To leave such rows out and let the row before hold on, declare layout = { missing = 'drop' }"
        return ProfileError(
            f"{what}. Fill it or drop the row; nothing is guessed. {to_drop}",
            file=self.path,
            line=number,
            column=column.name,
        )

    def _notes(self) -> Iterator[str]:
        found = self.found
        if found.header_line > 1:
            yield f"the header stands in line {found.header_line}; lines before it are left out"
        if found.separator != ",":
            yield f"columns are parted by {'tabs' if found.separator == TAB else 'semicolons'}"
        if self.decimal == ",":
            yield "numbers have a decimal comma"
        if self.stamps not in TIME_SIZE:
            words = {"clock": "clock times, past midnight where they fall", "iso": "ISO 8601 stamps, offsets taken off"}
            yield f"time stamps are {words.get(self.stamps, f'dates, {self.stamps}')}"
        elif self.stamps != "seconds":
            yield f"time stamps are in {self.stamps}"
        value = found.columns[found.value]
        if self.layout.columns or self.layout.unit:
            yield f"column {value.name!r} is read as {found.value} in {value.unit}"
        if self.layout.columns and found.width > len(found.columns):
            yield f"{found.width - len(found.columns)} other columns are left unread"
        if self.dropped:
            yield (
                f"{self.dropped} rows with a missing or non-finite cell are left out, the first in line"
                f" {self.first_dropped}: the row before each holds on"
            )


def _digest(path: Path) -> str:
    with path.open("rb") as handle:
        return hashlib.file_digest(handle, "sha256").hexdigest()


def in_si(rows: Rows) -> FloatArray:
    """Return the power [W] or the speed [m/s] of every row."""
    column = rows.found.columns[rows.found.value]
    assert column.unit is not None
    return rows.columns[rows.found.value] * UNITS[column.unit][1]
