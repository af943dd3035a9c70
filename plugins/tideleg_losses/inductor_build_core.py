"""A core with turns and perhaps a gap: inductance over current, flux, and the gap for a wanted inductance."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from tideleg import FloatArray, InputError, Values
from tideleg_losses.dowell import VACUUM_PERMEABILITY
from tideleg_losses.gap import fringing_factor
from tideleg_losses.inductor_build_law import CoreLaw, TableLaw

WIDEST_GAP = 0.5
"""Widest gap over the height of the window [-]: McLyman's fringing factor is made for gaps well below it."""

HALVINGS = 80

HIGHEST_FIELD = 1e9
"""Far above what any core meets [A/m]."""


@dataclass(frozen=True)
class CoreShape:
    """Geometry and material of one core.

    name : [-]
    area, path_length, volume : effective, of the magnetic circuit [m²], [m], [m³]
    window_area : for the winding [m²]
    window_height : along the layers and the centre leg, which a layer fills; sets the fringing, too [m]
    mean_turn_length : [m]
    density : of the material [kg/m³]
    flux_limit : peak flux density that a design may use, hot [T]
    law : B over H
    steinmetz : k, alpha, beta for W/m³, Hz, T
    may_be_gapped : True for ferrite with a ground gap; False for powder, whose gap is spread through it
    """

    name: str
    area: float
    path_length: float
    volume: float
    window_area: float
    window_height: float
    mean_turn_length: float
    density: float
    flux_limit: float
    law: CoreLaw
    steinmetz: tuple[float, float, float]
    may_be_gapped: bool

    def __post_init__(self) -> None:
        numbers = (self.area, self.path_length, self.volume, self.window_area, self.window_height)
        if not all(0.0 < x < np.inf for x in (*numbers, self.mean_turn_length, self.density, self.flux_limit)):
            raise InputError(f"{self.name}: every length, area, volume, density and flux density is above zero")
        if self.may_be_gapped and isinstance(self.law, TableLaw):
            raise InputError(f"{self.name}: a gapped core needs a law that holds at any field, not a table")

    @property
    def mass(self) -> float:
        """Mass [kg]."""
        return self.volume * self.density

    @property
    def area_product(self) -> float:
        """Core area times window area [m⁴]."""
        return self.area * self.window_area


class Magnetized(NamedTuple):
    """State of a core at a current.

    flux_density : in the core [T]
    linkage : turns times flux [V s]
    differential_inductance : what a small ripple sees, d(linkage)/d(current) [H]
    """

    flux_density: FloatArray
    linkage: FloatArray
    differential_inductance: FloatArray


def effective_gap(core: CoreShape, gap: Values) -> FloatArray:
    """Return the gap that would have the same reluctance without fringing [m]: gap/F, F after McLyman, ch. 8.

    Raises
    ------
    InputError
        If the core takes no gap, or the gap is negative or wider than half the window.
    """
    wide = np.asarray(gap, dtype=np.float64)
    if not core.may_be_gapped and np.any(wide != 0.0):
        raise InputError(f"{core.name}: found a gap, but a powder core takes none; give 0")
    if np.any(wide < 0.0) or np.any(wide > WIDEST_GAP * core.window_height):
        worst = float(np.min(wide)) if np.any(wide < 0.0) else float(np.max(wide))
        raise InputError(
            f"{core.name}: found a gap of {1e3 * worst:.4g} mm; the fringing factor holds from 0 to"
            f" {1e3 * WIDEST_GAP * core.window_height:.4g} mm, half the height of the window"
        )
    present = wide > 0.0
    factor = fringing_factor(np.where(present, wide, core.window_height), core.area, core.window_height)
    return np.where(present, wide / factor, 0.0)


def inductance(core: CoreShape, turns: Values, gap: Values = 0.0) -> FloatArray:
    """Return L at zero current [H]: mu0 N² A/(gap/F + l/mu_r); mu_r is the law's slope at zero field."""
    slope = core.law.slope(0.0)
    reluctance = effective_gap(core, gap) / VACUUM_PERMEABILITY + core.path_length / slope
    return np.asarray(np.asarray(turns, dtype=np.float64) ** 2 * core.area / reluctance)


def gap_for(core: CoreShape, turns: float, wanted: float) -> float:
    """Return the gap with which so many turns have the wanted inductance at zero current, fringing included [m].

    Raises
    ------
    InputError
        If even no gap gives too little, or the widest gap too much.
    """
    gap = float(gaps_for(core, turns, wanted))
    if np.isnan(gap):
        most, least = (float(inductance(core, turns, g)) for g in (0.0, WIDEST_GAP * core.window_height))
        raise InputError(
            f"{core.name}: {turns:g} turns give from {1e6 * least:.4g} uH (widest gap) to {1e6 * most:.4g} uH (no gap),"
            f" not {1e6 * wanted:.4g} uH"
        )
    return gap


def gaps_for(core: CoreShape, turns: Values, wanted: Values) -> FloatArray:
    """Return the gap for each number of turns and wanted inductance, which broadcast [m]; NaN where there is none."""
    widest = WIDEST_GAP * core.window_height
    shape = np.broadcast_shapes(np.shape(turns), np.shape(wanted))

    def too_much(gap: FloatArray) -> FloatArray:
        return np.asarray(inductance(core, turns, gap) - wanted)

    gap = _halve(too_much, np.zeros(shape), np.full(shape, widest))
    possible = (inductance(core, turns, widest) <= wanted) & (inductance(core, turns) >= wanted)
    return np.where(possible, gap, np.nan)


def magnetize(core: CoreShape, turns: Values, gap: Values, current: Values) -> Magnetized:
    """Return flux and inductance at a current, saturation included; all arguments broadcast.

    Ampere's law N I = H l + (B/mu0) gap/F is solved for H by halving: its right side rises with H. Without a gap
    H = N I/l at once.
    """
    drive = np.asarray(turns * np.abs(current), dtype=np.float64)
    spread = effective_gap(core, gap) / VACUUM_PERMEABILITY
    highest = np.asarray(drive / core.path_length)
    if np.any(spread > 0.0):

        def too_little(field: FloatArray) -> FloatArray:
            return np.asarray(drive - field * core.path_length - core.law.flux_density(field) * spread)

        shape = np.broadcast_shapes(drive.shape, spread.shape)
        field = _halve(too_little, np.zeros(shape), np.broadcast_to(highest, shape))
    else:
        field = highest
    flux = np.asarray(core.law.flux_density(field) * np.sign(current))
    slope = core.law.slope(field)
    squared = np.asarray(turns, dtype=np.float64) ** 2
    differential = squared * core.area * slope / (core.path_length + spread * slope)
    return Magnetized(flux, np.asarray(turns * core.area * flux), np.asarray(differential))


def flux_density_of_linkage(core: CoreShape, turns: Values, linkage: Values) -> FloatArray:
    """Return B [T] from a flux linkage [V s], such as L I_pk: B = linkage/(N A)."""
    return np.asarray(linkage / (turns * core.area))


def saturation_current(core: CoreShape, turns: float, gap: float, share: float = 0.7) -> float:
    """Return the current at which the differential inductance is down to a share of that at zero current [A].

    Raises
    ------
    InputError
        If the share is not between 0 and 1, or the inductance does not fall so far by the drive at which the law ends.
    """
    if not 0.0 < share < 1.0:
        raise InputError(f"share of inductance: found {share:g}; give one between 0 and 1")
    spread = float(effective_gap(core, gap)) / VACUUM_PERMEABILITY
    at_rest = float(core.law.slope(0.0))

    def too_much(field: FloatArray) -> FloatArray:
        slope = core.law.slope(field)
        left = slope / (core.path_length + spread * slope)
        return np.asarray(left - share * at_rest / (core.path_length + spread * at_rest))

    highest = 1.0
    while float(too_much(np.asarray(highest))) > 0.0:
        highest *= 2.0
        if highest > HIGHEST_FIELD:
            raise InputError(f"{core.name}: the inductance never falls to {share:g} of that at zero current")
    field = _halve(too_much, np.zeros(()), np.asarray(highest))
    return float((field * core.path_length + core.law.flux_density(field) * spread) / turns)


def _halve(positive_below: Callable[[FloatArray], FloatArray], low: FloatArray, high: FloatArray) -> FloatArray:
    """Return where a falling function crosses zero between low and high, by halving, to the last bits."""
    for _ in range(HALVINGS):
        middle = 0.5 * (low + high)
        below = positive_below(middle) > 0.0
        low, high = np.where(below, middle, low), np.where(below, high, middle)
    return np.asarray(0.5 * (low + high))
