"""Energies over gate resistance: a table that has that axis is brought to the resistance in use."""

from __future__ import annotations

from collections import defaultdict

import numpy as np

from tideleg import PointTable

AXIS = "gate_resistance"

Curves = dict[tuple[float, ...], list[tuple[float, float]]]


def at_gate_resistance(table: PointTable, used: float | None) -> PointTable:
    """Return the table at one gate resistance, without that axis.

    Between the two resistances around the one in use a straight line, at every current of either curve that both
    cover. A table without the axis comes back as it is.

    Raises
    ------
    ValueError
        If the resistance in use is not given or lies beyond the points, or one of the two has a curve less.
    """
    if AXIS not in table.axes:
        return table
    ohms = sorted(set(table.column(AXIS)))
    if used is None:
        raise ValueError("the points give gate resistances, and the one in use is missing: give it, such as '5 ohm'")
    if not ohms[0] <= used <= ohms[-1]:
        raise ValueError(
            f"the gate resistance in use, {used:g} ohm, lies beyond the points from {ohms[0]:g} to {ohms[-1]:g} ohm;"
            " nothing is extrapolated: give points there"
        )
    axes = tuple(axis for axis in table.axes if axis != AXIS)
    low, high = max(r for r in ohms if r <= used), min(r for r in ohms if r >= used)
    one, other = _curves(table, axes, low), _curves(table, axes, high)
    if low == high:
        return _as_table(axes, one)
    if set(one) != set(other):
        raise ValueError(f"the points at {low:g} and at {high:g} ohm are not of the same voltages and temperatures")
    share = (used - low) / (high - low)
    return _as_table(axes, {place: _between(one[place], other[place], share) for place in one})


def _curves(table: PointTable, axes: tuple[str, ...], ohms: float) -> Curves:
    """Return the curves over current at one resistance, by what else the points give."""
    found: Curves = defaultdict(list)
    for point in table.points:
        by = dict(zip(table.axes, point, strict=False))
        if by[AXIS] == ohms:
            place = tuple(by[axis] for axis in axes if axis != "current")
            found[place].append((by["current"], point[-1]))
    return {place: sorted(curve) for place, curve in found.items()}


def _between(
    one: list[tuple[float, float]], other: list[tuple[float, float]], share: float
) -> list[tuple[float, float]]:
    (x0, y0), (x1, y1) = (np.array(curve).T for curve in (one, other))
    knots = np.unique(np.concatenate([x0, x1]))
    knots = knots[(knots >= max(x0[0], x1[0])) & (knots <= min(x0[-1], x1[-1]))]
    values = (1.0 - share) * np.interp(knots, x0, y0) + share * np.interp(knots, x1, y1)
    return list(zip(knots.tolist(), values.tolist(), strict=True))


def _as_table(axes: tuple[str, ...], curves: Curves) -> PointTable:
    points = []
    for place, curve in curves.items():
        for current, value in curve:
            rest = iter(place)
            points.append((*(current if axis == "current" else next(rest) for axis in axes), value))
    return PointTable(axes, tuple(points))
