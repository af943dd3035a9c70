"""Resistance of a winding against frequency and temperature: pure functions.

P. L. Dowell, Effects of eddy currents in transformer windings, Proc. IEE 113(8), 1966, in its real form; copper after
IEC 60028 (1925).
"""

from __future__ import annotations

import math

import numpy as np

from tideleg import FloatArray, Values

COPPER_RESISTIVITY_20 = 1.7241e-8
"""Annealed copper at 20 degC [Ω m], IEC 60028."""

COPPER_SLOPE_20 = 0.00393
"""Rise of the resistance of copper relative to 20 degC [1/K], IEC 60028."""

VACUUM_PERMEABILITY = 4e-7 * np.pi
"""[H/m]"""


def copper_factor(degc: Values) -> FloatArray:
    """Return R(T)/R(20 degC) of copper [-]."""
    return np.asarray(1.0 + COPPER_SLOPE_20 * (np.asarray(degc) - 20.0))


def skin_depth(frequency: Values, degc: Values) -> FloatArray:
    """Return the depth sqrt(rho/(pi f mu0)) in copper [m]."""
    return np.sqrt(COPPER_RESISTIVITY_20 * copper_factor(degc) / (np.pi * frequency * VACUUM_PERMEABILITY))


def dowell_factor(phi: Values, layers: float) -> FloatArray:
    """Return R_ac/R_dc of a winding of foil layers [-].

    Parameters
    ----------
    phi : height of the conductor over the skin depth, porosity included, h sqrt(eta)/delta [-]
    layers : number of layers [-]

    Notes
    -----
    F = phi [(sinh 2phi + sin 2phi)/(cosh 2phi - cos 2phi) + 2/3 (m² - 1)(sinh phi - sin phi)/(cosh phi + cos phi)].
    Below phi = 0.1 the series 1 + (5 m² - 1) phi⁴/45 replaces the quotients, whose differences cancel.
    """
    phi = np.asarray(phi, dtype=np.float64)
    small = phi < 0.1
    x = np.clip(np.where(small, 1.0, phi), None, 300.0)
    skin = (np.sinh(2 * x) + np.sin(2 * x)) / (np.cosh(2 * x) - np.cos(2 * x))
    proximity = (np.sinh(x) - np.sin(x)) / (np.cosh(x) + np.cos(x))
    full = x * (skin + 2.0 / 3.0 * (layers * layers - 1.0) * proximity)
    series = 1.0 + (5.0 * layers * layers - 1.0) * phi**4 / 45.0
    return np.where(small, series, full)


def round_wire_height(diameter: Values) -> Values:
    """Return the height of the square foil that stands for a round wire [m]: d sqrt(pi)/2, equal area."""
    return diameter * (0.5 * math.sqrt(math.pi))


def litz_factor(
    frequency: Values, degc: Values, turns: Values, strands: Values, strand_diameter: Values, window_width: Values
) -> FloatArray:
    """Return R_ac/R_dc of a litz winding [-]; valid for strands thinner than about one skin depth.

    1 + pi² w² mu0² N² n² d⁶/(768 rho² b²): C. R. Sullivan, IEEE Trans. Power Electronics 14(2), 1999 (from memory).
    """
    resistivity = COPPER_RESISTIVITY_20 * copper_factor(degc)
    omega = 2.0 * np.pi * np.asarray(frequency)
    above = (np.pi * omega * VACUUM_PERMEABILITY * turns * strands) ** 2 * strand_diameter**6
    return np.asarray(1.0 + above / (768.0 * resistivity**2 * window_width**2))
