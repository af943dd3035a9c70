"""How far the current swings the switch node within the dead time, and what a turn-on costs from where it stopped.

Both positions have an output charge Q(V) that stores E(V), the integral of v dQ. While the node falls from V to v
across the position that is about to turn on, that one gives back Q(V) - Q(v) and the opposite one takes Q(V - v): the
current must move both. What is left at v is lost: E(v) of its own, and of the charge that the link still gives to the
opposite one, V (Q(V) - Q(V - v)), what that does not store. From v = V this is Q V, from v = 0 nothing (charge
balance).
"""

from __future__ import annotations

import functools
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from tideleg import FloatArray, Values
from tideleg_losses.family import Span

_HALVINGS = 40
_GRID = 4001


class ChargeLaw(Protocol):
    """Q(V) of one chip and what it stores."""

    def at(self, voltage: Values) -> FloatArray:
        """Return the charge [C]."""
        ...

    def outside(self, voltage: Values) -> NDArray[np.bool_]:
        """Return where the voltage lies beyond the data."""
        ...

    def hard_share(self, moved: FloatArray, voltage: Values) -> FloatArray:
        """Return what is left of Q V when the current has moved so much charge in the dead time [-], 1 to 0."""
        ...


def charge_at(voltage: Values, charge: Values, test_voltage: Values, exponent: Values) -> FloatArray:
    """Return Q (V/V_test)^exponent [C]; none at zero voltage or below."""
    return np.asarray(charge * np.maximum(voltage / test_voltage, 0.0) ** exponent)


def stored_energy(charge: Values, voltage: Values, exponent: Values) -> Values:
    """Return E_oss, the integral of v dQ: Q V p/(1 + p) with Q growing as V^p [J].

    C V²/2 with the capacitance at one voltage is wrong by far, because the capacitance falls with voltage.
    """
    return charge * voltage * exponent / (1.0 + exponent)


def charge_moved(current: FloatArray, dead_time: Values) -> FloatArray:
    """Return the charge that the current takes from the node in the dead time before a turn-on [C].

    Only current below zero swings the node down; it is taken as constant within the dead time.
    """
    return np.maximum(-current, 0.0) * dead_time


@dataclass(frozen=True)
class PowerLaw:
    """Q (V/V_test)^exponent [C]."""

    charge: Values
    test_voltage: Values
    exponent: float

    def at(self, voltage: Values) -> FloatArray:
        """Return the charge of one chip [C]."""
        return charge_at(voltage, self.charge, self.test_voltage, self.exponent)

    def outside(self, voltage: Values) -> NDArray[np.bool_]:
        """Return where no law holds: nowhere."""
        return np.zeros(np.shape(voltage), dtype=np.bool_)

    def hard_share(self, moved: FloatArray, voltage: Values) -> FloatArray:
        """Return what is left of Q V [-]; the same function of the charge over 2 Q(V) at every voltage."""
        both = 2.0 * self.at(voltage)
        # No charge to swing: it is swung by any current, and costs nothing anyway.
        ratio = np.where(both > 0.0, moved / np.where(both > 0.0, both, 1.0), 1.0)
        ratios, shares = _shares_of_power_law(float(self.exponent))
        return np.asarray(np.interp(ratio, ratios, shares))


@functools.cache
def _shares_of_power_law(p: float) -> tuple[FloatArray, FloatArray]:
    """Return charge moved over 2 Q, rising, and the share of Q V that is left, over a dense grid of v/V.

    The grid is dense at both ends, where the capacitance of one position is greatest.
    """
    u = np.sin(np.linspace(0.0, 0.5 * np.pi, _GRID)) ** 2
    moved = 0.5 * (1.0 - u**p + (1.0 - u) ** p)
    stored = p / (1.0 + p)
    left = (1.0 - (1.0 - u) ** p) - stored * (1.0 - (1.0 - u) ** (1.0 + p)) + stored * u ** (1.0 + p)
    return moved[::-1], left[::-1]


@dataclass(frozen=True)
class ChargeCurve:
    """Q(V) on straight lines between points and from no charge at no voltage; it goes on straight above the last."""

    voltage: tuple[float, ...]
    charge: tuple[float, ...]
    scale: Values = 1.0

    def at(self, voltage: Values) -> FloatArray:
        """Return the charge of one chip [C]."""
        v, q = self._knots()
        rise = (q[-1] - q[-2]) / (v[-1] - v[-2])
        over = np.maximum(np.asarray(voltage) - v[-1], 0.0)
        return np.asarray(self.scale * (np.interp(np.maximum(voltage, 0.0), v, q) + rise * over))

    def stored(self, voltage: Values) -> FloatArray:
        """Return E(V) of one chip [J]: on a straight piece dQ is C dv, and the integral of v dQ is C v²/2."""
        v, q = self._knots()
        capacitance = np.diff(q) / np.diff(v)
        at_knots = np.concatenate([[0.0], np.cumsum(capacitance * (v[1:] ** 2 - v[:-1] ** 2) / 2.0)])
        volts = np.maximum(np.asarray(voltage, dtype=np.float64), 0.0)
        k = np.clip(np.searchsorted(v, volts, side="right") - 1, 0, v.size - 2)
        return np.asarray(self.scale * (at_knots[k] + capacitance[k] * (volts * volts - v[k] ** 2) / 2.0))

    def outside(self, voltage: Values) -> NDArray[np.bool_]:
        """Return where the voltage lies beyond the points."""
        return Span(self.voltage[0], self.voltage[-1]).beyond(voltage)

    def hard_share(self, moved: FloatArray, voltage: Values) -> FloatArray:
        """Return what is left of Q V [-]: the voltage at which the charge is used up by halving, then its energy."""
        moved, voltage = np.broadcast_arrays(np.asarray(moved, dtype=np.float64), np.asarray(voltage, dtype=np.float64))
        whole = self.at(voltage)
        between = (moved > 0.0) & (moved < 2.0 * whole)
        share = np.where(moved > 0.0, 0.0, 1.0)
        if not np.any(between):
            return share + np.zeros_like(whole)
        low, high = np.zeros_like(whole), np.maximum(voltage, 0.0) + np.zeros_like(whole)
        for _ in range(_HALVINGS):
            middle = 0.5 * (low + high)
            enough = whole - self.at(middle) + self.at(voltage - middle) > moved
            low, high = np.where(enough, middle, low), np.where(enough, high, middle)
        rest = 0.5 * (low + high)
        lost = voltage * (whole - self.at(voltage - rest)) - self.stored(voltage) + self.stored(voltage - rest)
        lost = lost + self.stored(rest)
        full = whole * voltage
        return np.where(between, lost / np.where(full > 0.0, full, 1.0), share)

    def _knots(self) -> tuple[FloatArray, FloatArray]:
        if self.voltage[0] == 0.0:
            return np.array(self.voltage), np.array(self.charge)
        return np.array([0.0, *self.voltage]), np.array([0.0, *self.charge])
