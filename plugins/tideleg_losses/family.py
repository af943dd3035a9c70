"""A family of digitised curves over current, voltage and temperature.

Over current and voltage a straight line joins neighbouring points. Over temperature a monotone cubic does: it meets
every point, never leaves the span of its two neighbours, and has a slope everywhere, which the relaxation of
temperatures needs. F. N. Fritsch and J. Butland, SIAM J. Sci. Stat. Comput. 5(2), 1984; ends after C. Moler,
Numerical Computing with MATLAB, SIAM, 2004, sec. 3.6 (both from memory).

Beyond the points a curve goes on straight where that costs more and is held where it would cost less. Nothing of this
is silent: `outside` says where it happens, and the share of time and energy is reported.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, NamedTuple

import numpy as np
from numpy.typing import NDArray

from tideleg import FloatArray, PointTable, Values

FAR = 10.0
"""The straight line beyond the greatest current ends at this multiple of it; there the value is held."""

ROUNDING = 1e-9
"""Share of an axis within which a value counts as inside: the rounding of a unit is no extrapolation."""


class Span(NamedTuple):
    """What the points cover of one axis; infinite where the axis is not given."""

    low: float
    high: float

    def beyond(self, values: Values) -> NDArray[np.bool_]:
        """Return where values lie outside."""
        room = ROUNDING * max(abs(self.low), abs(self.high)) if np.isfinite(self.low) else 0.0
        return np.asarray((np.asarray(values) < self.low - room) | (np.asarray(values) > self.high + room))


EVERYWHERE = Span(-np.inf, np.inf)


@dataclass(frozen=True)
class Family:
    """Curves on common knots.

    value, slope : (voltages, temperatures, currents), and its slope over temperature at each point [1/K]
    voltage, degc, current : the knots [V], [degC], [A]; one knot where the axis is not given
    over_* : what the points cover
    """

    voltage: FloatArray
    degc: FloatArray
    current: FloatArray
    value: FloatArray
    slope: FloatArray
    over_voltage: Span
    over_degc: Span
    over_current: Span

    def outside(self, current: Values, voltage: Values, degc: Values) -> NDArray[np.bool_]:
        """Return where the point asked lies beyond what the points cover."""
        beyond = self.over_current.beyond(current) | self.over_voltage.beyond(voltage) | self.over_degc.beyond(degc)
        return np.asarray(beyond)

    def at(self, current: Values, voltage: Values, degc: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return the value and its slope in temperature; a voltage beyond the points is taken at their end."""
        place = _Place.of(self.degc, degc)
        corners = []
        for v, by_voltage in _neighbours(self.voltage, voltage):
            for k, by_current in _neighbours(self.current, current):
                corners.append((v, k, by_voltage * by_current))
        low, high = place.knot, np.minimum(place.knot + 1, self.degc.size - 1)

        def gather(table: FloatArray, row: NDArray[np.intp]) -> FloatArray:
            return np.asarray(sum(table[v, row, k] * weight for v, k, weight in corners))

        return place.join(*(gather(t, row) for row in (low, high) for t in (self.value, self.slope)))

    def weighted(self, shares: FloatArray, degc: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return the sum over current knots of `shares` (..., S, currents) times the value there, and its slope.

        At the first voltage. The sum over knots comes first, for each temperature knot: it is one product of matrices.
        """
        place = _Place.of(self.degc, degc)
        low, high = place.knot[..., None], np.minimum(place.knot + 1, self.degc.size - 1)[..., None]
        wanted = np.broadcast_shapes(shares.shape[:-1], place.knot.shape)
        sums = (shares @ self.value[0].T, shares @ self.slope[0].T)
        tables = tuple(np.broadcast_to(t, (*wanted, self.degc.size)) for t in sums)
        rows = (np.broadcast_to(row, (*wanted, 1)) for row in (low, high))
        return place.join(*(np.take_along_axis(t, row, axis=-1)[..., 0] for row in rows for t in tables))


class _Place(NamedTuple):
    """Where temperatures lie: lower knot, share of the interval above it, its width, and beyond the ends."""

    knot: NDArray[np.intp]
    share: FloatArray
    width: FloatArray
    beyond: FloatArray

    @classmethod
    def of(cls, knots: FloatArray, degc: FloatArray) -> _Place:
        degc = np.asarray(degc, dtype=np.float64)
        index = np.clip(np.searchsorted(knots, degc, side="right") - 1, 0, max(knots.size - 2, 0))
        inside = np.clip(degc, knots[0], knots[-1])
        width = np.diff(knots)[index] if knots.size > 1 else np.ones_like(degc)
        beyond = degc - inside if knots.size > 1 else np.zeros_like(degc)
        return cls(index, (inside - knots[index]) / width, np.asarray(width), beyond)

    def join(
        self, value: FloatArray, slope: FloatArray, next_value: FloatArray, next_slope: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Return the cubic between two knots and its slope; beyond the ends a straight line or the end's value."""
        s, r, h = self.share, 1.0 - self.share, self.width
        rise = next_value - value
        found = value + s * s * (3.0 - 2.0 * s) * rise + s * r * h * (r * slope - s * next_slope)
        steep = 6.0 * s * r * rise / h + r * (1.0 - 3.0 * s) * slope + s * (3.0 * s - 2.0) * next_slope
        goes_on = np.where(self.beyond > 0.0, np.maximum(steep, 0.0), np.minimum(steep, 0.0))
        outside = self.beyond != 0.0
        return np.where(outside, found + goes_on * self.beyond, found), np.where(outside, goes_on, steep)


def _neighbours(knots: FloatArray, at: Values) -> list[tuple[NDArray[np.intp], FloatArray]]:
    """Return the two knots around each value with their weights; the end knot beyond the ends."""
    at = np.asarray(at, dtype=np.float64)
    if knots.size == 1:
        return [(np.zeros(at.shape, dtype=np.intp), np.ones(at.shape))]
    index = np.clip(np.searchsorted(knots, at, side="right") - 1, 0, knots.size - 2)
    share = np.clip((at - knots[index]) / (knots[index + 1] - knots[index]), 0.0, 1.0)
    return [(index, 1.0 - share), (index + 1, share)]


def family(table: PointTable, at_zero: Literal["hold", "origin"]) -> Family:
    """Return the family of curves that the points make.

    Points of one voltage and temperature make one curve over current; curves may have points at different currents.

    Parameters
    ----------
    at_zero : below a curve's least current its first value is held, or a line goes to zero at zero current

    Raises
    ------
    ValueError
        If a curve of the grid of voltages and temperatures is missing, or has a single point.
    """
    volts, temps = (_knots(table, axis) for axis in ("voltage", "temperature"))
    curves: dict[tuple[float, float], list[tuple[float, float]]] = {(v, t): [] for v in volts for t in temps}
    for point in table.points:
        by = dict(zip(table.axes, point, strict=False))
        curves[by.get("voltage", 0.0), by.get("temperature", 0.0)].append((by.get("current", 0.0), point[-1]))
    _refuse_holes(table, curves)
    spans = [Span(min(i for i, _ in curve), max(i for i, _ in curve)) for curve in curves.values()]
    over_current = Span(max(s.low for s in spans), min(s.high for s in spans))
    knots, grid = _on_common_knots(table, curves, at_zero)
    value = grid.reshape(len(volts), len(temps), knots.size)
    degc = np.asarray(temps)
    return Family(
        np.asarray(volts),
        degc,
        knots,
        value,
        monotone_slopes(degc, value),
        Span(volts[0], volts[-1]) if len(volts) > 1 else EVERYWHERE,
        Span(temps[0], temps[-1]) if len(temps) > 1 else EVERYWHERE,
        over_current if "current" in table.axes else EVERYWHERE,
    )


def _refuse_holes(table: PointTable, curves: dict[tuple[float, float], list[tuple[float, float]]]) -> None:
    where = {place: " and ".join(_words(table, *place)) or "all" for place in curves}
    for place, curve in curves.items():
        if not curve:
            what = f"no point stands at {where[place]}, though others give each alone"
            raise ValueError(f"{what}: give every curve of the grid")
    for place, curve in curves.items():
        if "current" in table.axes and len(curve) < 2:
            raise ValueError(f"one point at {where[place]} makes no curve over current; give two or more")


def _knots(table: PointTable, axis: str) -> list[float]:
    return sorted(set(table.column(axis))) if axis in table.axes else [0.0]


def _words(table: PointTable, volts: float, degc: float) -> list[str]:
    words = [f"{volts:g} V"] if "voltage" in table.axes else []
    return [*words, f"{degc:g} degC"] if "temperature" in table.axes else words


def _on_common_knots(
    table: PointTable, curves: dict[tuple[float, float], list[tuple[float, float]]], at_zero: str
) -> tuple[FloatArray, FloatArray]:
    """Return the currents at which any curve has a point, with 0 and a far one, and every curve there."""
    if "current" not in table.axes:
        return np.zeros(1), np.array([[curve[0][1]] for curve in curves.values()])
    currents = {0.0, *(i for curve in curves.values() for i, _ in curve)}
    knots = np.array(sorted(currents | {FAR * max(currents)}))
    return knots, np.stack([_on_knots(knots, sorted(curve), at_zero) for curve in curves.values()])


def _on_knots(knots: FloatArray, curve: list[tuple[float, float]], at_zero: str) -> FloatArray:
    if at_zero == "origin" and curve[0][0] > 0.0:
        curve = [(0.0, 0.0), *curve]
    x, y = (np.array(column) for column in zip(*curve, strict=True))
    rise = max((y[-1] - y[-2]) / (x[-1] - x[-2]), 0.0)
    return np.asarray(np.interp(knots, x, y) + rise * np.maximum(knots - x[-1], 0.0))


def monotone_slopes(x: FloatArray, y: FloatArray) -> FloatArray:
    """Return the slope at each knot (along axis 1 of y) with which a cubic leaves no interval's span; see the head."""
    if x.size == 1:
        return np.zeros_like(y)
    h = np.diff(x)[None, :, None]
    d = np.diff(y, axis=1) / h
    if x.size == 2:
        return np.concatenate([d, d], axis=1)
    before, after, h0, h1 = d[:, :-1], d[:, 1:], h[:, :-1], h[:, 1:]
    alike = before * after > 0.0
    w0, w1 = 2.0 * h1 + h0, h1 + 2.0 * h0
    safe_before, safe_after = np.where(alike, before, 1.0), np.where(alike, after, 1.0)
    inner = np.where(alike, (w0 + w1) / (w0 / safe_before + w1 / safe_after), 0.0)
    first = _end_slope(h[:, 0], h[:, 1], d[:, 0], d[:, 1])
    last = _end_slope(h[:, -1], h[:, -2], d[:, -1], d[:, -2])
    return np.concatenate([first[:, None], inner, last[:, None]], axis=1)


def _end_slope(h0: FloatArray, h1: FloatArray, d0: FloatArray, d1: FloatArray) -> FloatArray:
    """Return the slope of the parabola through the last three points, turned so that it does not overshoot."""
    slope = ((2.0 * h0 + h1) * d0 - h0 * d1) / (h0 + h1)
    slope = np.where(slope * d0 <= 0.0, 0.0, slope)
    return np.where((d0 * d1 < 0.0) & (np.abs(slope) > 3.0 * np.abs(d0)), 3.0 * d0, slope)
