"""What the harmonics of a winding current cost above its dc resistance: three ways to know the ac resistance.

Each term charges (F_n - 1) I_n² for the harmonics 1 to HARMONICS of the real current, and charges all that is left of
the ac mean square at REST_ORDER. For a current without jumps that is an upper bound: its harmonics fall at least as
1/n², so the mean n² of the rest is below REST_ORDER², and F rises more slowly than n².
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from tideleg import FloatArray, InputError, Line, Timing, Values, Waveform, Winding
from tideleg_losses.dowell import COPPER_SLOPE_20, copper_factor, litz_factor, skin_depth
from tideleg_losses.dowell_table import dowell_table
from tideleg_losses.spectrum import harmonic_squares

HARMONICS = 8
REST_ORDER = 2.0 * (HARMONICS + 1)
ORDERS = (*(float(n) for n in range(1, HARMONICS + 1)), REST_ORDER)
UNCOVERED_SHARE = 1e-3
"""How much of the ac mean square may lie above a table of ac resistance [-]; it is charged at the last ratio."""

MECHANISM = "winding ac"


def shares_of_order(current: Waveform) -> list[FloatArray]:
    """Return the ac mean square by order, as `ORDERS` counts them: harmonic by harmonic, then the rest [A²]."""
    squares = harmonic_squares(current, HARMONICS)
    left = current.ac_mean_square()
    for square in squares:
        left = left - square
    return [*squares, np.maximum(left, 0.0)]


@dataclass(frozen=True)
class DowellTerm:
    """R(T) (F_n - 1) I_n² over the harmonics, F after Dowell for layers of foil or round wire.

    resistance : dc, at 20 degC [Ω]
    height : of the conductor, porosity included [m]
    layers : [-]
    """

    resistance: Values
    height: Values
    layers: float
    mechanism: str = MECHANISM
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Winding, timing: Timing, temperature: FloatArray) -> Line:
        """Return the excess of one winding [W] and its slope [W/K].

        With q = rho(T)/rho(20) and phi falling as 1/sqrt(q): d(q E)/dT = q' (E - phi E'/2).
        """
        phi = np.asarray(self.height / skin_depth(timing.frequency, temperature))
        table = dowell_table(self.layers, ORDERS)
        excess, rise = table.weigh(phi, shares_of_order(part.current))
        watts = self.resistance * copper_factor(temperature) * excess
        return Line(watts, self.resistance * COPPER_SLOPE_20 * (excess - 0.5 * rise))


@dataclass(frozen=True)
class LitzTerm:
    """R(T) (F_n - 1) I_n² over the harmonics of a litz winding; F - 1 grows as n² and falls as 1/rho².

    turns, strands : [-]
    strand_diameter, width : of a strand and of the winding's layer in the window [m]
    """

    resistance: Values
    turns: Values
    strands: Values
    strand_diameter: Values
    width: Values
    mechanism: str = MECHANISM
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Winding, timing: Timing, temperature: FloatArray) -> Line:
        """Return the excess of one winding [W] and its slope [W/K].

        Raises
        ------
        InputError
            If the strands are thicker than the skin depth at the switching frequency, where the form does not hold.
        """
        self._refuse_thick_strands(timing.frequency)
        geometry = self.turns, self.strands, self.strand_diameter, self.width
        at_fundamental = litz_factor(timing.frequency, 20.0, *geometry) - 1.0
        weighed: Any = 0.0
        for order, square in zip(ORDERS, shares_of_order(part.current), strict=True):
            weighed = weighed + order * order * square
        warm = copper_factor(temperature)
        watts = self.resistance * at_fundamental * weighed / warm
        return Line(watts, -COPPER_SLOPE_20 / warm * watts)

    def _refuse_thick_strands(self, frequency: Values) -> None:
        depth = float(np.min(skin_depth(frequency, 20.0)))
        thickest = float(np.max(self.strand_diameter))
        if thickest > depth:
            raise InputError(
                f"winding_strand_diameter: found {1e3 * thickest:.4g} mm, more than the skin depth in copper at the"
                f" switching frequency, {1e3 * depth:.4g} mm; the litz form holds for thinner strands only: give"
                " thinner strands, a lower frequency, or a measured ac_resistance_ratio"
            )


@dataclass(frozen=True)
class RatioTerm:
    """R(T) (F_n - 1) I_n² over the harmonics, F read from a measured table, straight between its points.

    The ratio is held as it was measured while R warms up; F really falls a little, so a table from a cold winding is
    on the safe side.

    frequencies, ratios : of the table, rising [Hz], [-]
    """

    resistance: Values
    frequencies: tuple[float, ...]
    ratios: tuple[float, ...]
    mechanism: str = MECHANISM
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Winding, timing: Timing, temperature: FloatArray) -> Line:
        """Return the excess of one winding [W] and its slope [W/K].

        Raises
        ------
        InputError
            If the table does not reach down to the fundamental, or more than 0.1 % of the ac mean square lies above.
        """
        frequency = np.asarray(timing.frequency, dtype=np.float64)
        self._refuse_low(frequency)
        excess: Any = 0.0
        above: Any = 0.0
        total: Any = 0.0
        for order, square in zip(ORDERS, shares_of_order(part.current), strict=True):
            ratio = np.interp(order * frequency, self.frequencies, self.ratios)  # holds the last ratio above the end
            excess = excess + (ratio - 1.0) * square
            above = above + square * (order * frequency > self.frequencies[-1])
            total = total + square
        self._refuse_high(np.max(frequency), np.asarray(above), np.asarray(total))
        cold = self.resistance * excess
        return Line(cold * copper_factor(temperature), cold * COPPER_SLOPE_20 + np.zeros_like(temperature))

    def _refuse_low(self, frequency: FloatArray) -> None:
        lowest = float(np.min(frequency))
        if lowest < self.frequencies[0]:
            raise InputError(
                f"ac_resistance_ratio: begins at {self.frequencies[0]:g} Hz, above the switching frequency"
                f" {lowest:g} Hz; nothing is extrapolated: add a point at or below it"
            )

    def _refuse_high(self, frequency: float, above: FloatArray, total: FloatArray) -> None:
        if np.any(above > UNCOVERED_SHARE * total):
            share = float(np.max(above / np.where(total > 0.0, total, 1.0)))
            raise InputError(
                f"ac_resistance_ratio: ends at {self.frequencies[-1]:g} Hz, and up to {100.0 * share:.2g} % of the"
                f" squared ripple current lies above it; at most {100.0 * UNCOVERED_SHARE:g} % may. Nothing is"
                f" extrapolated: add points up to {REST_ORDER * frequency:.6g} Hz"
            )
