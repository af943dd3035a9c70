"""What the life of a capacitor hangs on: factors over hot spot and voltage, and how phases of a mission combine.

A run gives the inputs, step by step: `<capacitor>.temperature_mean_degc` and `<capacitor>.voltage_share`. The rated
life, its temperature (hot spot or ambient, as its maker defines it) and the exponents are data of the part.
"""

from __future__ import annotations

import numpy as np

from tideleg import FloatArray, InputError, Values

BOLTZMANN_EV = 8.617333262e-5
"""Boltzmann's constant [eV/K], CODATA 2018."""

ZERO_DEGC_K = 273.15


def ten_kelvin_factor(rated_degc: Values, degc: Values) -> FloatArray:
    """Return 2^((T0 - T)/10) [-]: the rule for upper categories to 105 degC (Rubycon, technical note, 5-1)."""
    return np.asarray(2.0 ** ((np.asarray(rated_degc) - degc) / 10.0))


def arrhenius_factor(energy_ev: Values, rated_degc: Values, degc: Values) -> FloatArray:
    """Return exp[(Ea/k)(1/T - 1/T0)] [-], in kelvin."""
    inverse = 1.0 / (np.asarray(degc) + ZERO_DEGC_K) - 1.0 / (np.asarray(rated_degc) + ZERO_DEGC_K)
    return np.asarray(np.exp(energy_ev / BOLTZMANN_EV * inverse))


def power_voltage_factor(voltage_share: Values, exponent: Values) -> FloatArray:
    """Return (V0/V)^n [-] from V/V0: Wang and Blaabjerg, reliability of dc-link capacitors (from memory).

    They give n from 7 to 9.4 for metallised polypropylene.
    """
    return np.asarray((1.0 / np.asarray(voltage_share, dtype=np.float64)) ** exponent)


def linear_voltage_factor(voltage_share: Values) -> FloatArray:
    """Return 4.3 - 3.3 Va/Vr [-]: Parler, papers on electrolytic life (form found, constants from memory)."""
    return np.asarray(4.3 - 3.3 * np.asarray(voltage_share, dtype=np.float64))


def stress_exponent(voltage_share: Values) -> FloatArray:
    """Return 2.6087 (r + 0.5167) [-]: Electronic Concepts, Explanation of Life Projection, after Moynihan 1987."""
    return np.asarray(2.6087 * (np.asarray(voltage_share, dtype=np.float64) + 0.5167))


def combined_life(share_of_time: FloatArray, life: FloatArray) -> float:
    """Return 1/sum(share_i/L_i), in the unit of `life`: each hour uses up 1/L of the whole.

    Raises
    ------
    InputError
        If the shares do not add up to 1, or a life is not above zero.
    """
    shares, lives = np.asarray(share_of_time, dtype=np.float64), np.asarray(life, dtype=np.float64)
    if abs(float(np.sum(shares)) - 1.0) > 1e-9 or np.any(shares < 0.0):
        raise InputError(f"shares of time add up to {float(np.sum(shares)):g}; they must be positive and add up to 1")
    if not np.all(lives > 0.0):
        raise InputError(f"found a life of {float(np.min(lives)):g}; each must be above zero")
    return float(1.0 / np.sum(shares / lives))


def equivalent_temperature(share_of_time: FloatArray, degc: FloatArray) -> float:
    """Return the constant temperature with the same life by the 10-kelvin rule [degC]; not the mean temperature."""
    life = combined_life(share_of_time, ten_kelvin_factor(0.0, degc))
    return float(-10.0 * np.log2(life))
