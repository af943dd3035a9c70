"""A capacitor's series resistance over frequency and temperature: checked on reading, never extrapolated.

Between points it is linear in temperature and in the logarithm of frequency: common practice, no source.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from tideleg import FloatArray, InputError, PointsFile, Values, quantity

COLUMNS = ("frequency_hz", "temperature_degc", "esr_ohm")
"""Header of a file; without the middle column the resistance is said to hold at every temperature."""

MOST_ROWS = 10_000
DIMENSIONS = {COLUMNS[0]: "frequency", COLUMNS[1]: "temperature", COLUMNS[2]: "resistance"}


@dataclass(frozen=True)
class EsrTable:
    """Series resistance at every pair of a frequency and a temperature.

    frequencies : increasing, above zero (F,) [Hz]
    temperatures : increasing (T,) [degC]; empty where the resistance is said to hold at every temperature
    ohms : (T, F), or (1, F) where temperatures is empty [Ω]
    """

    frequencies: FloatArray
    temperatures: FloatArray
    ohms: FloatArray

    def at(self, frequency: Values, temperature: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return the resistance [Ω] and its slope [Ω/K] at frequencies within the table.

        Raises
        ------
        InputError
            If a frequency or a temperature lies outside the table.
        """
        hertz = np.asarray(frequency, dtype=np.float64)
        self._refuse_frequency(hertz)
        knot = np.clip(np.searchsorted(self.frequencies, hertz, side="right") - 1, 0, len(self.frequencies) - 2)
        logs = np.log(self.frequencies)
        share = (np.log(hertz) - logs[knot]) / (logs[knot + 1] - logs[knot])
        before, after = self.ohms[:, knot], self.ohms[:, knot + 1]
        return self._blend(temperature, (1.0 - share) * before + share * after)

    def greatest_above(self, frequency: Values, temperature: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return the greatest resistance from a frequency to the end of the table [Ω], and its slope [Ω/K].

        Above the end it is that of the end. Never below the true maximum: it begins at the point before `frequency`.
        """
        knot = np.clip(np.searchsorted(self.frequencies, np.asarray(frequency), side="right") - 1, 0, None)
        ceiling = np.maximum.accumulate(self.ohms[:, ::-1], axis=1)[:, ::-1]
        return self._blend(temperature, ceiling[:, knot])

    def _blend(self, temperature: FloatArray, by_row: FloatArray) -> tuple[FloatArray, FloatArray]:
        if not len(self.temperatures):
            ohms = by_row[0] + np.zeros_like(temperature)
            return ohms, np.zeros_like(ohms)
        self._refuse_temperature(temperature)
        row = np.clip(np.searchsorted(self.temperatures, temperature, side="right") - 1, 0, len(self.temperatures) - 2)
        cold, hot = _pick(by_row, row), _pick(by_row, row + 1)
        slope = (hot - cold) / (self.temperatures[row + 1] - self.temperatures[row])
        return cold + slope * (temperature - self.temperatures[row]), slope

    def _refuse_frequency(self, hertz: FloatArray) -> None:
        low, high = self.frequencies[0], self.frequencies[-1]
        if np.any(hertz < low) or np.any(hertz > high):
            found = float(hertz[(hertz < low) | (hertz > high)].flat[0])
            raise InputError(
                f"esr_table: covers {low:g} Hz to {high:g} Hz, and {found:g} Hz is needed; nothing is extrapolated:"
                " add points"
            )

    def _refuse_temperature(self, degc: FloatArray) -> None:
        low, high = self.temperatures[0], self.temperatures[-1]
        if np.any(degc < low) or np.any(degc > high):
            worst = float(np.max(degc)) if np.any(degc > high) else float(np.min(degc))
            raise InputError(
                f"esr_table: covers {low:g} to {high:g} degC, and the capacitor comes to {worst:.4g} degC on the way"
                " to its temperature; nothing is extrapolated: add points there, or cool the capacitor better"
            )


def _pick(by_row: FloatArray, row: Any) -> FloatArray:
    """Return the value in the wanted row at each step: by_row (T, ...) and row (...) broadcast against each other."""
    shape = np.broadcast_shapes(by_row.shape[1:], np.shape(row))
    lined = by_row.reshape(len(by_row), *(1,) * (len(shape) + 1 - by_row.ndim), *by_row.shape[1:])
    spread = np.broadcast_to(lined, (len(by_row), *shape))
    return np.asarray(np.take_along_axis(spread, np.broadcast_to(row, shape)[None], axis=0)[0])


def read_esr_table(given: object) -> EsrTable:
    """Return the table that a plan gives: rows, or a CSV file of points, which the core has read.

    Raises
    ------
    ValueError
        If a row is no row, a number is out of range, a point stands twice, or the rows form no full grid.
    """
    if isinstance(given, PointsFile):
        return _table(_rows_of_file(given), f"{given.name}, ")
    if isinstance(given, str) or not isinstance(given, Sequence):
        raise ValueError(
            f"found {given!r}; give rows [frequency, temperature, esr] or [frequency, esr], or the name of a CSV file"
        )
    if len(given) > MOST_ROWS:
        raise ValueError(f"found {len(given)} rows; at most {MOST_ROWS} are read")
    rows = [(f"row {i + 1}", _numbers(row, f"row {i + 1}")) for i, row in enumerate(given)]
    return _table(rows, "")


def _numbers(row: object, where: str) -> tuple[float, ...]:
    if isinstance(row, str) or not isinstance(row, Sequence) or len(row) not in (2, 3):
        raise ValueError(f"{where}: found {row!r}; give [frequency, temperature, esr], or [frequency, esr]")
    names = COLUMNS if len(row) == 3 else (COLUMNS[0], COLUMNS[2])
    return _parsed(row, names, where)


def _parsed(row: Sequence[object], names: Sequence[str], where: str) -> tuple[float, ...]:
    try:
        return tuple(quantity.parse(cell, DIMENSIONS[name]) for cell, name in zip(row, names, strict=True))
    except ValueError as error:
        raise ValueError(f"{where}: {error}") from None


def _rows_of_file(file: PointsFile) -> list[tuple[str, tuple[float, ...]]]:
    if file.header not in (COLUMNS, (COLUMNS[0], COLUMNS[2])):
        raise ValueError(f"{file.name}, line 1: found {list(file.header)}; the header is {','.join(COLUMNS)}")
    if len(file.rows) > MOST_ROWS:
        raise ValueError(f"{file.name}: found {len(file.rows)} rows; at most {MOST_ROWS} are read")
    return [(f"line {line}", row) for line, row in zip(file.lines, file.rows, strict=True)]


def _table(rows: list[tuple[str, tuple[float, ...]]], file: str) -> EsrTable:
    if not rows:
        raise ValueError(f"{file}no rows; give two frequencies or more")
    points: dict[tuple[float, float | None], float] = {}
    for where, row in rows:
        if len(row) != len(rows[0][1]):
            raise ValueError(f"{file}{where}: rows with and without a temperature are mixed; give one kind")
        _refuse_impossible(row, f"{file}{where}")
        point = (row[0], row[1] if len(row) == 3 else None)
        if point in points:
            raise ValueError(f"{file}{where}: the point at {_words(*point)} stands twice; keep one")
        points[point] = row[-1]
    return _grid(points, file)


def _refuse_impossible(row: tuple[float, ...], where: str) -> None:
    if row[0] <= 0.0:
        raise ValueError(f"{where}: found {row[0]:g} Hz; a frequency is above zero")
    if len(row) == 3 and row[1] < -273.15:
        raise ValueError(f"{where}: found {row[1]:g} degC, below absolute zero")
    if row[-1] < 0.0 or not math.isfinite(row[-1]):
        raise ValueError(f"{where}: found {row[-1]:g} ohm; a resistance is zero or above")


def _words(hertz: float, degc: float | None) -> str:
    return f"{hertz:g} Hz" if degc is None else f"{hertz:g} Hz and {degc:g} degC"


def _grid(points: dict[tuple[float, float | None], float], file: str) -> EsrTable:
    frequencies = sorted({hertz for hertz, _ in points})
    temperatures = sorted({degc for _, degc in points if degc is not None})
    if len(frequencies) < 2:
        raise ValueError(f"{file}found one frequency, {frequencies[0]:g} Hz; give two or more, or esr as one number")
    if len(temperatures) == 1:
        raise ValueError(
            f"{file}found one temperature, {temperatures[0]:g} degC; give two or more, or leave the temperature out of"
            " every row to say that the resistance holds at all of them"
        )
    rows: list[float | None] = list(temperatures) or [None]
    for degc in rows:
        for hertz in frequencies:
            if (hertz, degc) not in points:
                raise ValueError(
                    f"{file}no row at {_words(hertz, degc)}; every frequency needs every temperature, so that nothing"
                    " is guessed: add it"
                )
    ohms = np.array([[points[hertz, degc] for hertz in frequencies] for degc in rows])
    return EsrTable(np.array(frequencies), np.array(temperatures), ohms)
