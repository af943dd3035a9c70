"""First guesses of volume and mass from published proxies; every density is data of the person. Pure functions."""

from __future__ import annotations

import numpy as np

from tideleg import FloatArray, Values


def cooling_index(thermal_resistance: Values, volume: Values) -> Values:
    """Return 1/(R_th V) [W/(K m³)]: Drofenik, Laimer, Kolar, PCIM 2005 (from memory). 1 W/(K dm³) is 1e3 of it."""
    return 1.0 / (thermal_resistance * volume)


def cooler_power_density(efficiency: Values, sink_rise: Values, index: Values) -> Values:
    """Return the greatest OUTPUT power over cooler volume [W/m³]: eta/(1 - eta) dT index, same source."""
    return efficiency / (1.0 - efficiency) * sink_rise * index


def capacitor_volume(capacitance: Values, voltage: Values, energy_density: Values) -> Values:
    """Return C V²/2 over a stated energy density [J/m³] as a volume [m³]."""
    return 0.5 * capacitance * voltage * voltage / energy_density


def magnetic_scaling(area_product_ratio: Values) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return how volume, surface and weight grow with the area product: powers 0.75, 0.5 and 0.75 [-].

    For geometrically similar cores: C. W. T. McLyman, Transformer and Inductor Design Handbook (from memory).
    """
    ratio = np.asarray(area_product_ratio, dtype=np.float64)
    return ratio**0.75, ratio**0.5, ratio**0.75
