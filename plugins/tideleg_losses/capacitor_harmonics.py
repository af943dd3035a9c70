"""Loss of a capacitor whose resistance changes with frequency: harmonic by harmonic of the real current.

The harmonics up to HARMONICS that lie within the table are each charged at their own resistance. What is left of the
exact ac mean square is charged at the greatest resistance that the table holds from there up, so the loss is never
below that of the full sum as far as the table knows.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from tideleg import Exchange, FloatArray, InputError, Line, Timing, Waveform
from tideleg_losses.esr_table import EsrTable
from tideleg_losses.spectrum import harmonic_squares

HARMONICS = 24
UNCOVERED_SHARE = 0.05
"""How much of the ac mean square may lie above the table [-]; a square current leaves 0.4/n above its order n."""

MOST_COUNTED = 500
"""Up to this order the harmonics of a narrow pulse are counted to see how much of it lies within the table."""


@dataclass(frozen=True)
class TabledEsrTerm:
    """Sum of ESR(n f, T) I_n² over the harmonics of the stage's current, by Parseval's theorem."""

    table: EsrTable
    mechanism: str = "capacitor ESR"
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Exchange, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss [W] and its slope [W/K].

        Raises
        ------
        InputError
            If the fundamental lies below the table, a temperature outside it, or more than UNCOVERED_SHARE of the
            squared ripple above it.
        """
        frequency = np.asarray(part.frequency, dtype=np.float64)
        ac = part.current.ac_mean_square()
        rest: Any = ac
        watts: Any = np.zeros_like(temperature)
        slope: Any = np.zeros_like(temperature)
        highest = self.table.frequencies[-1]
        covered: Any = np.zeros_like(frequency)  # the highest order that is charged by itself
        for order, whole in enumerate(harmonic_squares(part.current, self._orders(frequency)), start=1):
            within = order * frequency <= highest
            square = np.where(within, np.minimum(whole, rest), 0.0)
            ohms, rise = self.table.at(np.where(within, order * frequency, highest), temperature)
            watts, slope, rest = watts + ohms * square, slope + rise * square, rest - square
            covered = np.where(within, order, covered)
        self._refuse_uncovered(part.current, frequency, rest, ac)
        ohms, rise = self.table.greatest_above((covered + 1.0) * frequency, temperature)
        return Line(watts + ohms * rest, slope + rise * rest)

    def _orders(self, frequency: FloatArray) -> int:
        """Return how many harmonics are worth their time: those that lie within the table at some step."""
        within = int(np.floor(self.table.frequencies[-1] / float(np.min(frequency)) * (1.0 + 1e-12)))
        return min(max(within, 1), HARMONICS)

    def _refuse_uncovered(self, current: Waveform, frequency: FloatArray, rest: Any, ac: FloatArray) -> None:
        bound = UNCOVERED_SHARE * ac
        above = rest
        if np.any(above > bound):  # some of the rest may still lie within the table: count on, which is seldom needed
            above = ac - self._inside(current, frequency)
        if np.any(above > bound):
            share = float(np.max(above / np.where(ac > 0.0, ac, 1.0)))
            raise InputError(
                f"esr_table: ends at {self.table.frequencies[-1]:g} Hz, and {100.0 * share:.3g} % of the squared ripple"
                f" current lies above it; at most {100.0 * UNCOVERED_SHARE:g} % may. Nothing is extrapolated: add"
                f" points at higher frequencies, such as {HARMONICS * float(np.max(frequency)):.6g} Hz"
            )

    def _inside(self, current: Waveform, frequency: FloatArray) -> FloatArray:
        """Return the mean square of all harmonics within the table [A²]."""
        highest = self.table.frequencies[-1]
        orders = min(int(highest / float(np.min(frequency)) * (1.0 + 1e-12)), MOST_COUNTED)
        inside: Any = 0.0
        for order, square in enumerate(harmonic_squares(current, orders), start=1):
            inside = inside + np.where(order * frequency <= highest, square, 0.0)
        return np.asarray(inside)


@dataclass(frozen=True)
class TabledExternalTerm:
    """Sum of ESR(f, T) I² over the spectrum of others; it flows while the stage idles, too.

    spectrum : pairs of frequency [Hz] and rms current [A]
    """

    table: EsrTable
    spectrum: tuple[tuple[float, float], ...]
    mechanism: str = "capacitor ripple of others"
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Exchange, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss [W] and its slope [W/K]; a frequency or temperature outside the table raises InputError."""
        watts, slope = np.zeros_like(temperature), np.zeros_like(temperature)
        for frequency, rms in self.spectrum:
            ohms, rise = self.table.at(frequency, temperature)
            watts, slope = watts + ohms * rms * rms, slope + rise * rms * rms
        return Line(watts, slope)
