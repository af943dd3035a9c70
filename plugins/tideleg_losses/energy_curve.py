"""Energy of one edge from a table of points over current, and over voltage and temperature where given."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tideleg import FloatArray, Line, PointTable, Values
from tideleg_losses.family import Family, family
from tideleg_losses.gate_axis import AXIS, at_gate_resistance


@dataclass(frozen=True)
class EnergyCurve:
    """E(i, V, T) from points.

    Below the least current of a curve without a point at zero a straight line goes to no energy at no current. A table
    of one voltage is scaled by (V/V_test)^exponent; beyond the voltages of a table its end is scaled so. A table of
    one temperature is scaled by 1 + slope (T - T_test). See `family` for the rest.

    test_voltage, test_degc : where the table gives no voltages, no temperatures
    scale : such as from the gate resistance of the test to that in use [-]
    """

    points: Family
    test_voltage: Values
    voltage_exponent: Values
    test_degc: Values
    slope: Values
    scale: Values = 1.0

    def line(self, current: Values, voltage: Values, frequency: Values, degc: FloatArray) -> Line:
        """Return one such energy a period as power [W] and its slope [W/K]; an edge from zero voltage costs nothing."""
        energy, tilt = self.points.at(current, voltage, degc)
        factor = 1.0 + self.slope * (degc - self.test_degc)
        kept = np.maximum(factor, 0.0)
        rise = tilt * kept + energy * np.where(factor > 0.0, self.slope, 0.0)
        by_voltage = self._by_voltage(voltage) * frequency * self.scale
        return Line(np.asarray(energy * kept * by_voltage), np.asarray(rise * by_voltage))

    def outside(self, current: FloatArray, voltage: Values, degc: FloatArray) -> NDArray[np.bool_]:
        """Return where an edge with current asks beyond the points."""
        return np.asarray((current > 0.0) & self.points.outside(current, voltage, degc))

    def at_zero_current(self) -> float:
        """Return the greatest energy that the points give at zero current [J]."""
        return float(np.max(self.points.value[..., 0]))

    def _by_voltage(self, voltage: Values) -> FloatArray:
        low, high = self.points.over_voltage
        test = np.clip(voltage, low, high) if np.isfinite(low) else self.test_voltage
        test = np.asarray(test)
        ratio = np.where(test > 0.0, voltage / np.where(test > 0.0, test, 1.0), 0.0)
        return np.asarray(np.maximum(ratio, 0.0) ** self.voltage_exponent)


def edge_outside(law: object, current: FloatArray, voltage: Values, degc: FloatArray) -> NDArray[np.bool_]:
    """Return where an edge asks beyond the points of its law; a law scaled from one test point has none."""
    if isinstance(law, EnergyCurve):
        return law.outside(current, voltage, degc)
    return np.zeros(np.broadcast_shapes(np.shape(current), np.shape(degc)), dtype=np.bool_)


def energy_curve(
    table: PointTable,
    test_voltage: Values | None,
    exponent: Values,
    test_degc: Values,
    slope: Values,
    scale: Values = 1.0,
    gate_resistance: float | None = None,
) -> EnergyCurve:
    """Return the law of a table; see `EnergyCurve` for the numbers, `at_gate_resistance` for the last one.

    Raises
    ------
    ValueError
        If the table's grid has holes, or nothing says at which voltage it holds.
    """
    table = at_gate_resistance(table, gate_resistance)
    points = family(table, "origin")
    if "voltage" in table.axes and points.voltage.size == 1:
        test_voltage = float(points.voltage[0])
    if test_voltage is None and points.voltage.size == 1:
        raise ValueError("test_voltage is missing: the points hold at a voltage; give it, or a voltage with each point")
    if "temperature" in table.axes and points.degc.size > 1 and slope:
        raise ValueError("the points give temperatures, so that a slope of the energy does nothing; drop it")
    if "temperature" in table.axes:
        test_degc, slope = (float(points.degc[0]), slope if points.degc.size == 1 else 0.0)
    return EnergyCurve(points, test_voltage or 1.0, exponent, test_degc, slope, scale)


def gate_resistance_factor(
    table: PointTable | None, used: float | None, tested: float | None, key: str, curve: PointTable | None
) -> float:
    """Return the energy with the gate resistance in use over that with the one of the test [-].

    A straight line between neighbouring points; two points at least, and nothing beyond them. Without points the two
    resistances must be one. A curve with gate resistances of its own needs no factor.

    Raises
    ------
    ValueError
        If one of the two resistances is not given or lies beyond the points.
    """
    if curve is not None and AXIS in curve.axes:
        if table is not None:
            raise ValueError(f"{key}: the points of the curve give gate resistances as well; drop one of the two")
        return 1.0
    if used is None and table is None:
        return 1.0
    if used is None or tested is None:
        raise ValueError(
            f"{key}: the gate resistance in use and test_gate_resistance, at which the energy holds, go together; give"
            " both"
        )
    if table is None:
        if used == tested:
            return 1.0
        raise ValueError(
            f"{key} is missing: the energy holds at {tested:g} ohm, and {used:g} ohm is in use; give the energy at two"
            " gate resistances or more, all else alike"
        )
    ohms, energies = (np.array(column) for column in zip(*sorted(table.points), strict=True))
    for name, value in (("in use", used), ("of the test", tested)):
        if not ohms[0] <= value <= ohms[-1]:
            raise ValueError(
                f"{key}: the gate resistance {name}, {value:g} ohm, lies beyond its points from {ohms[0]:g} to"
                f" {ohms[-1]:g} ohm; nothing is extrapolated: give a point there"
            )
    return float(np.interp(used, ohms, energies) / np.interp(tested, ohms, energies))
