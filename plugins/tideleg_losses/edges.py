"""What every loss at a switching edge reads: which edges are hard, and how energies scale from their test point."""

from __future__ import annotations

import numpy as np

from tideleg import FloatArray, Position, Values


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


def scaled_energy(
    energy: Values,
    current: Values,
    voltage: Values,
    test_current: Values,
    test_voltage: Values,
    current_exponent: Values,
    voltage_exponent: Values,
) -> FloatArray:
    """Return E (I/I_test)^ki (V/V_test)^kv [J].

    Semikron, Application Manual Power Semiconductors, 2nd ed., 2015, loss scaling (form from memory). With a positive
    current exponent it is continuous through zero current.
    """
    shares = (
        np.asarray(current / test_current) ** current_exponent,
        np.asarray(voltage / test_voltage) ** voltage_exponent,
    )
    return np.asarray(energy * shares[0] * shares[1])
