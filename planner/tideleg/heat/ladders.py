"""Foster and Cauer: two ways to write one thermal impedance.

A Foster chain is a curve fit whose inner nodes are no places; a Cauer ladder is one of masses that stand on each other,
so another network may be put behind it. Zth(s) is a fraction of two polynomials; its continued fraction is the ladder.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from fractions import Fraction

import numpy as np

from tideleg.errors import InputError
from tideleg.heat.reduction import modes
from tideleg.network import Mass, Network, Path, Seat

Polynomial = list[Fraction]
"""Coefficients, from the constant on."""


def foster_to_cauer(cells: Sequence[tuple[float, float]]) -> tuple[tuple[float, float], ...]:
    """Return the ladder that has the impedance of a Foster chain.

    Parameters
    ----------
    cells : (resistance [K/W], time constant [s]) of each cell, both above zero; equal time constants are one cell

    Returns
    -------
    tuple
        (resistance to the next place [K/W], heat capacity [J/K]) of each place, from the junction on; the last
        resistance ends at the base.

    Notes
    -----
    1/Z = s C + 1/(R + Z'): take out s C, turn over, take out R, repeat (continued fraction of a driving-point
    impedance; W. Cauer's form, from memory). Done in fractions of whole numbers, so no digit is lost however far apart
    the time constants lie.

    Examples
    --------
    >>> [(round(r, 7), round(c, 6)) for r, c in foster_to_cauer([(0.7, 0.7), (0.3, 3.0)])]
    [(0.8276873, 0.909091), (0.1723127, 16.196769)]
    """
    _refuse_bad(cells, "cell", "time constant", "s")
    merged: dict[Fraction, Fraction] = {}
    for resistance, tau in cells:
        merged[Fraction(tau)] = merged.get(Fraction(tau), Fraction(0)) + Fraction(resistance)
    above, below = _impedance(merged)
    ladder = []
    while len(below) > 1:
        to_place = below[-1] / above[-1]
        below = _less(below, to_place, [Fraction(0), *above])  # 1/Z - s C
        to_next = above[-1] / below[-1]
        above = _less(above, to_next, below)  # 1/(1/Z - s C) - R
        ladder.append((float(to_next), float(to_place)))
    return tuple(ladder)


def cauer_to_foster(ladder: Sequence[tuple[float, float]]) -> tuple[tuple[float, float], ...]:
    """Return the Foster cells (resistance [K/W], time constant [s]) of a ladder, quickest first: its modes.

    Parameters
    ----------
    ladder : (resistance [K/W], heat capacity [J/K]) of each place, as `foster_to_cauer` gives it
    """
    _refuse_bad(ladder, "place", "heat capacity", "J/K")
    masses = tuple(Mass(f"place {i}", capacity) for i, (_, capacity) in enumerate(ladder))
    names = [*(mass.name for mass in masses), "base"]
    paths = tuple(Path(names[i], names[i + 1], resistance) for i, (resistance, _) in enumerate(ladder))
    solved = modes(Network(("base",), masses, paths, (Seat("junction", names[0]),)))
    order = np.argsort(solved.time_constants)
    resistances = (solved.output[0] * solved.gain[:, 0])[order]
    return tuple(zip(resistances.tolist(), solved.time_constants[order].tolist(), strict=True))


def _impedance(cells: dict[Fraction, Fraction]) -> tuple[Polynomial, Polynomial]:
    """Return Z = sum of R/(1 + s tau) as one fraction, its upper and lower polynomial."""
    above: Polynomial = [Fraction(0)]
    below: Polynomial = [Fraction(1)]
    for tau, resistance in cells.items():
        above = _less(_times(above, tau), -resistance, below)
        below = _times(below, tau)
    return above[: len(below) - 1], below


def _times(polynomial: Polynomial, tau: Fraction) -> Polynomial:
    """Multiply by 1 + s tau."""
    return [a + tau * b for a, b in zip([*polynomial, Fraction(0)], [Fraction(0), *polynomial], strict=True)]


def _less(one: Polynomial, factor: Fraction, other: Polynomial) -> Polynomial:
    """Return one - factor other, without leading zeros."""
    length = max(len(one), len(other))
    padded = [[*p, *[Fraction(0)] * (length - len(p))] for p in (one, other)]
    rest = [a - factor * b for a, b in zip(*padded, strict=True)]
    while len(rest) > 1 and rest[-1] == 0:
        rest.pop()
    return rest


def _refuse_bad(rows: Sequence[tuple[float, float]], what: str, second: str, unit: str) -> None:
    if not rows:
        raise InputError(f"no {what} to convert; give at least one")
    for i, (resistance, value) in enumerate(rows):
        if not all(0.0 < number < math.inf for number in (resistance, value)):
            raise InputError(
                f"{what} {i + 1} has {resistance:g} K/W and {value:g} {unit}; resistance and {second} must be above"
                " zero and finite"
            )
