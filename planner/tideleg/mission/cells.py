"""Cells of a profile: text to numbers and to seconds, for whole columns, or the first cell that is none."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, Literal

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    import pandas as pd

    from tideleg.waveform import FloatArray

Decimal = Literal[".", ","]

NUMBER = r"[+-]?\d*{d}?\d+(?:[eE][+-]?\d+)?"
GROUPED = r"[+-]?\d{{1,3}}(?:{g}\d{{3}})+(?:{d}\d+)?"
GROUPS_ONLY = re.compile(r"[+-]?\d{1,3}(?:,\d{3})+")


class UncertainNumbersError(ValueError):
    """A comma may be a decimal comma or a thousands separator: only the person knows."""


def decimal_of(cells: list[str], separator: str) -> Decimal:
    """Return the decimal sign of sample cells.

    Raises
    ------
    UncertainNumbersError
        If a comma may be either: every cell that has one has groups of three digits behind it.
    """
    with_comma = [cell for cell in cells if "," in cell]
    if not with_comma:
        return "."
    both = [cell for cell in with_comma if "." in cell]
    if both:
        return "," if both[0].rindex(",") > both[0].rindex(".") else "."
    if all(GROUPS_ONLY.fullmatch(cell.strip()) for cell in with_comma):
        raise UncertainNumbersError(with_comma[0].strip())
    return "," if separator != "," else "."


def numbers(cells: pd.Series[str], decimal: Decimal) -> FloatArray:
    """Return a column as numbers; nan where a cell is none. Groups of three digits are taken where they are whole."""
    import pandas as pd

    text = cells.str.strip().str.replace("\u00a0", " ", regex=False)
    group = "," if decimal == "." else "."
    grouped = text.str.fullmatch(GROUPED.format(g=f"[{group}' ]", d=re.escape(decimal)))
    plain = text.str.fullmatch(NUMBER.format(d=re.escape(decimal)))
    bare = text.where(~grouped, text.str.replace(f"[{group}' ]", "", regex=True))
    read = pd.to_numeric(bare.str.replace(decimal, ".", regex=False), errors="coerce")
    values = np.array(read, dtype=np.float64)
    allowed = np.asarray(plain.fillna(False).to_numpy(dtype=bool) | grouped.fillna(False).to_numpy(dtype=bool))
    return np.where(allowed, values, np.nan)


CLOCK = r"(?P<h>\d{1,3}):(?P<m>\d{2})(?::(?P<s>\d{2}(?:[.,]\d+)?))?"
DATE = r"(?P<a>\d{1,2})[./-](?P<b>\d{1,2})[./-](?P<y>\d{4})(?:[ T]+(?P<t>\d{1,2}:\d{2}(?::\d{2}(?:[.,]\d+)?)?))?"
ISO = r"\d{4}-\d{2}-\d{2}.*"


def stamps_kind(cell: str) -> str:
    """Return what a time cell looks like: "seconds", "clock", "iso" or "date"; "" for none of them."""
    text = cell.strip()
    if re.fullmatch(ISO, text):
        return "iso"
    if re.fullmatch(DATE, text):
        return "date"
    if re.fullmatch(CLOCK, text):
        return "clock"
    return "seconds" if re.search(r"\d", text) else ""


def clock_seconds(cells: pd.Series[str]) -> FloatArray:
    """Return hh:mm or hh:mm:ss as seconds of the day; nan where a cell is none."""
    parts = cells.str.strip().str.extract(f"^{CLOCK}$")
    seconds = parts["s"].fillna("0").str.replace(",", ".", regex=False).astype(float)
    hours, minutes = parts["h"].astype(float), parts["m"].astype(float)
    wrong = (minutes >= 60.0) | (seconds >= 60.0)
    return np.where(wrong, np.nan, np.asarray(3600.0 * hours + 60.0 * minutes + seconds, dtype=np.float64))


HALF_DAY_S, DAY_S = 43200.0, 86400.0


def past_midnight(seconds: FloatArray) -> FloatArray:
    """Return clock times as elapsed time: a fall by more than half a day is the next day."""
    falls = np.diff(seconds, prepend=seconds[:1]) < -HALF_DAY_S
    return np.asarray(seconds + DAY_S * np.cumsum(falls))


def iso_seconds(cells: pd.Series[str]) -> FloatArray:
    """Return ISO 8601 stamps as seconds; offsets are taken off, so that a clock change is no jump. nan for no stamp."""
    import pandas as pd

    stamps = pd.to_datetime(cells.str.strip(), format="ISO8601", utc=True, errors="coerce")
    return _seconds(stamps)


def has_offset(cells: pd.Series[str]) -> NDArray[np.bool_]:
    """Return which ISO stamps carry Z or an offset; a mixture cannot be put in order."""
    return np.asarray(cells.str.strip().str.contains(r"(?:Z|[+-]\d{2}:?\d{2})$"), dtype=bool)


def date_order(cells: pd.Series[str]) -> str:
    """Return "day first" or "month first" where a number above 12 tells, "" where none does."""
    parts = cells.str.strip().str.extract(f"^{DATE}$")
    first, second = parts["a"].dropna().astype(int), parts["b"].dropna().astype(int)
    if (first > 12).any() and not (second > 12).any():
        return "day first"
    return "month first" if (second > 12).any() and not (first > 12).any() else ""


def date_seconds(cells: pd.Series[str], order: str) -> FloatArray:
    """Return dd/mm/yyyy or mm/dd/yyyy stamps, with or without a clock time, as seconds; nan for no stamp."""
    import pandas as pd

    parts = cells.str.strip().str.extract(f"^{DATE}$")
    day, month = ("a", "b") if order == "day first" else ("b", "a")
    text = parts["y"] + "-" + parts[month].str.zfill(2) + "-" + parts[day].str.zfill(2)
    days = _seconds(pd.to_datetime(text, format="%Y-%m-%d", errors="coerce", utc=True))
    clock = clock_seconds(parts["t"].fillna("00:00:00"))
    return np.asarray(days + clock)


def _seconds(stamps: pd.Series[pd.Timestamp]) -> FloatArray:
    import pandas as pd

    since = stamps - pd.Timestamp("2000-01-01", tz="UTC")
    return np.asarray(since.dt.total_seconds(), dtype=np.float64)
