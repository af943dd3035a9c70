"""Dowell's factor of many harmonics at once, from a table that is made once: exact would cost microseconds a step."""

from __future__ import annotations

import functools
from dataclasses import dataclass

import numpy as np

from tideleg import FloatArray
from tideleg_losses.dowell import dowell_factor

SPACING = 0.01
HIGHEST = 20.0
"""The table runs over phi of the fundamental from 0 to HIGHEST in steps of SPACING.

Cubics between the knots take value and slope there; they are off by less than 2e-7 m² in the factor of any harmonic
(m layers). Above HIGHEST, Dowell's form is a straight line to 1e-8, and the table goes on as that line.
"""


@dataclass(frozen=True)
class DowellTable:
    """F - 1 of several harmonics over phi of the fundamental, with one cubic an interval.

    cubics : (4, orders, knots) coefficients in the share of the interval that is passed [-]
    """

    cubics: FloatArray

    def weigh(self, phi: FloatArray, squares: list[FloatArray]) -> tuple[FloatArray, FloatArray]:
        """Return the sum of (F_n - 1) I_n² over the harmonics [A²], and phi times its derivative by phi [A²].

        Parameters
        ----------
        phi : conductor height over skin depth at the fundamental, broadcastable to (..., S) [-]
        squares : mean square of each harmonic, in the order of the table [A²]
        """
        position = phi / SPACING
        knot = np.minimum(position, self.cubics.shape[2] - 1).astype(np.intp)
        passed = position - knot
        sums = []
        for of_power in self.cubics:
            terms = (np.take(row, knot) * square for row, square in zip(of_power, squares, strict=True))
            sums.append(functools.reduce(np.add, terms))
        level, first, second, third = sums
        value = level + passed * (first + passed * (second + passed * third))
        slope = first + passed * (2.0 * second + 3.0 * passed * third)
        return value, slope * position


@functools.lru_cache(maxsize=32)
def dowell_table(layers: float, orders: tuple[float, ...]) -> DowellTable:
    """Return the table for a winding of so many layers and the harmonics of these orders."""
    knots = np.arange(0.0, HIGHEST + 0.5 * SPACING, SPACING)
    scale = np.sqrt(np.asarray(orders))[:, None]
    phi = scale * knots
    nearby = 1e-4
    value = dowell_factor(phi, layers) - 1.0
    step = SPACING * scale * (dowell_factor(phi + nearby, layers) - dowell_factor(np.abs(phi - nearby), layers))
    step = step / (2.0 * nearby)  # F is even in phi, so the difference at zero is zero, as it should be
    line = SPACING * scale * (2.0 * layers * layers + 1.0) / 3.0
    rise = np.diff(value, axis=1)
    second = 3.0 * rise - 2.0 * step[:, :-1] - step[:, 1:]
    third = step[:, :-1] + step[:, 1:] - 2.0 * rise
    # From zero F - 1 rises as phi⁴, where the cubic of that slope would first dip below zero; phi³ does not.
    second[:, 0], third[:, 0] = 0.0, rise[:, 0]
    nothing = np.zeros((len(orders), 1))
    first = np.concatenate([step[:, :-1], line], axis=1)
    return DowellTable(np.stack([value, first, np.hstack([second, nothing]), np.hstack([third, nothing])]))
