"""What every loss at a switching edge reads: which edges are hard, and how an energy scales from its test point."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tideleg import FloatArray, Line, Position, Timing, Values

COLDEST_DEGC, HOTTEST_DEGC = -40.0, 250.0
"""Between these a law that is straight in temperature must stay above zero; a law that does not is refused."""


def hard_turn_on_current(part: Position) -> FloatArray:
    """Return the current that the position turns on into [A]; zero where it is at or below zero (soft)."""
    return np.maximum(part.turn_on_current(), 0.0)


def hard_turn_off_current(part: Position) -> FloatArray:
    """Return the current that the position turns off [A]; zero where it is at or below zero (its diode carries on)."""
    return np.maximum(part.turn_off_current(), 0.0)


def diode_current_at_begin(part: Position) -> FloatArray:
    """Return the current that the position's diode carries in the dead time before its run [A], a magnitude."""
    return np.maximum(-part.turn_on_current(), 0.0)


def diode_current_at_end(part: Position) -> FloatArray:
    """Return the current that the position's diode carries in the dead time after its run [A], a magnitude."""
    return np.maximum(-part.turn_off_current(), 0.0)


@dataclass(frozen=True)
class EnergyLaw:
    """An energy at one edge, known at a test point: E (I/I_test)^ki (V/V_test)^kv (1 + slope (T - T_test)).

    Semikron, Application Manual Power Semiconductors, 2nd ed., 2015, loss scaling (form from memory). With a current
    exponent above zero it is continuous through zero current. Numbers may be arrays that broadcast to (..., S).

    energy : at the test point [J]
    test_current, test_voltage, test_degc : the test point [A], [V], [degC]
    current_exponent, voltage_exponent : [-]
    slope : relative rise per kelvin, from the test temperature [1/K]
    """

    energy: Values
    test_current: Values
    test_voltage: Values
    test_degc: Values
    current_exponent: Values
    voltage_exponent: Values
    slope: Values

    def energy_when_tested(self, current: Values, voltage: Values) -> FloatArray:
        """Return the energy at the test temperature [J]; an edge from zero voltage or below costs nothing."""
        by_current = np.asarray(current / self.test_current) ** self.current_exponent
        by_voltage = np.maximum(voltage / self.test_voltage, 0.0) ** self.voltage_exponent
        return np.asarray(self.energy * by_current * by_voltage)

    def line(self, current: Values, voltage: Values, frequency: Values, degc: FloatArray) -> Line:
        """Return one such energy a period as power [W] and its slope [W/K].

        The law was accepted because it stays above zero from -40 to 250 degC. Beyond that a passing estimate of the
        relaxation could make it negative; it is then zero, since no edge gives energy back.
        """
        watts = self.energy_when_tested(current, voltage) * frequency
        factor = 1.0 + self.slope * (degc - self.test_degc)
        return Line(watts * np.maximum(factor, 0.0), watts * np.where(factor > 0.0, self.slope, 0.0))


@dataclass(frozen=True)
class HeldInTurnOn:
    """A mechanism that the person states to be part of turn_on_energy: it adds nothing, and is not missing either."""

    mechanism: str
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Position, timing: Timing, temperature: FloatArray) -> Line:
        """Return zero."""
        nothing = np.zeros_like(temperature)
        return Line(nothing, nothing)


def refuse_vanishing_slope(key: str, slope: float, test_degc: float) -> None:
    """Raise ValueError where 1 + slope (T - T_test) is not above zero from -40 to 250 degC."""
    for degc in (COLDEST_DEGC, HOTTEST_DEGC):
        if 1.0 + slope * (degc - test_degc) <= 0.0:
            gone = test_degc - 1.0 / slope
            raise ValueError(
                f"{key}: found {slope:g} 1/K from test_temperature {test_degc:g} degC, with which the energy vanishes"
                f" at {gone:.0f} degC; it must stay above zero from {COLDEST_DEGC:g} to {HOTTEST_DEGC:g} degC:"
                " give a smaller slope, or data at another test_temperature"
            )
