"""Gapped inductors: pure functions that relate turns, gap, flux and energy. SI units."""

from __future__ import annotations

import numpy as np

from tideleg import FloatArray, Values
from tideleg_losses.dowell import VACUUM_PERMEABILITY


def turns_for_flux(inductance: Values, peak_current: Values, flux_density: Values, area: Values) -> FloatArray:
    """Return N = L I_pk/(B A) [-]; the PEAK current sets the flux."""
    return np.asarray(inductance * peak_current / (flux_density * area))


def gap_length(
    turns: Values, area: Values, inductance: Values, path: Values = 0.0, permeability: Values = 1.0
) -> Values:
    """Return the gap mu0 N² A/L less the core's own path l/mu_r [m]."""
    return VACUUM_PERMEABILITY * turns * turns * area / inductance - path / permeability


def gapped_inductance(
    turns: Values, area: Values, gap: Values, path: Values = 0.0, permeability: Values = 1.0
) -> Values:
    """Return L = mu0 N² A/(gap + path/mu_r) [H], without fringing."""
    return VACUUM_PERMEABILITY * turns * turns * area / (gap + path / permeability)


def fringing_factor(gap: Values, area: Values, window_height: Values) -> FloatArray:
    """Return 1 + gap/sqrt(A) ln(2 G/gap) [-].

    C. W. T. McLyman, Transformer and Inductor Design Handbook, ch. 8 (from memory).
    """
    return np.asarray(1.0 + gap / np.sqrt(area) * np.log(2.0 * window_height / gap))


def area_product(
    inductance: Values, peak_current: Values, rms_current: Values, flux_density: Values, density: Values, fill: Values
) -> Values:
    """Return A_c W_a = L I_pk I_rms/(B J K_u) [m⁴]; `density` of the current [A/m²], `fill` of the window [-]."""
    return inductance * peak_current * rms_current / (flux_density * density * fill)
