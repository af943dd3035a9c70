"""Shares of the period in which the four-switch leg charges, passes and discharges its inductor, mode by mode.

A period has three parts, of which a mode may leave out one:

- charge, share c: the battery on the inductor (battery upper and link lower switch on);
- direct: the inductor between both ports (both upper switches on);
- discharge, share e: the inductor on the link (battery lower and link upper switch on).

Volt-seconds with the ohmic drop R I_L of the mean inductor current: V_battery (1 - e) - V_link (1 - c) = R I_L. The
battery's current flows outside the discharge only, so I_L follows from it and from the shares.

Arrays (..., S); shares in parts of the period.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tideleg import FloatArray, Point, Values

LEAST_PULSE = 1e-10
"""Share of the period that a switching leg's pulse never falls below [-].

It lies above the width that counts as rounding, so a leg that switches keeps its edges, and their loss does not jump
where a pulse vanishes within a mode: a jump could leave the relaxation without a fixed point.
"""

ROUNDS = 8
"""Rounds of the blend band's drop; each leaves less than R I/V of the error before, mostly some hundredths."""

_LEAST = 1e-100
"""Keeps quotients finite where a port has no voltage; such steps carry a reason."""


class Shares(NamedTuple):
    """How a period is divided.

    charge, discharge : [-]
    lost : where no duty ratio carries the current
    unheld : where the mode cannot hold at these voltages
    """

    charge: FloatArray
    discharge: FloatArray
    lost: NDArray[np.bool_]
    unheld: NDArray[np.bool_]


class Corners(NamedTuple):
    """Inductor current at the beginning of charge, direct and discharge [A]; the last ends at the first."""

    charge: FloatArray
    direct: FloatArray
    discharge: FloatArray


def boost(point: Point) -> Shares:
    """Return the shares where the battery upper switch stays on: e = 0, I_L is the battery current."""
    ratio = _boost_ratio(point)
    charge = np.clip(1.0 - ratio, LEAST_PULSE, 1.0 - LEAST_PULSE)
    return Shares(charge, np.zeros_like(charge), ratio <= 0.0, ratio > 1.0)


def buck(point: Point) -> Shares:
    """Return the shares where the link upper switch stays on: c = 0."""
    duty, lost = _buck_duty(point)
    discharge = np.clip(1.0 - duty, LEAST_PULSE, 1.0 - LEAST_PULSE)
    return Shares(np.zeros_like(discharge), discharge, lost, (duty > 1.0) & ~lost)


def pairs(point: Point) -> Shares:
    """Return the shares where both pairs switch together: c = D, e = 1 - D, I_L = I/D; a square in D."""
    link, both = point.link_voltage, np.maximum(point.battery_voltage + point.link_voltage, _LEAST)
    root = link * link + 4.0 * both * point.path_resistance * point.battery_current
    duty = (link + np.sqrt(np.maximum(root, 0.0))) / (2.0 * both)
    lost = (root < 0.0) | (duty <= 0.0) | (duty >= 1.0)
    charge = np.clip(duty, LEAST_PULSE, 1.0 - LEAST_PULSE)
    return Shares(charge, 1.0 - charge, lost, np.zeros_like(lost))


def blend(point: Point, band: float, rise_per_volt: Values) -> Shares:
    """Return the shares where both legs switch in every period.

    Parameters
    ----------
    point : Point
    band : half width of the blend band in r = (1 - c)/(1 - e), the voltage ratio less drops [-]
    rise_per_volt : 1/(L f) [A/V]

    Notes
    -----
    Across the band c falls in a straight line from that of pure boost at its lower border, c = band, to none at its
    upper one: c = (1 + band - r)/2. Volt-seconds then give e = 1 - (1 - c)/r, none at the lower border and that of
    pure buck at the upper. Without a step the waveforms so become those of the pure modes (modelling choice). Outside
    the band, where hysteresis or a drop may hold this mode, the shorter pulse stays at `LEAST_PULSE`.
    """
    ratio = _boost_ratio(point)
    duty, lost = _buck_duty(point)
    battery, link = np.maximum(point.battery_voltage, _LEAST), np.maximum(point.link_voltage, _LEAST)
    charge, discharge = _in_band(point, band, rise_per_volt)
    like_boost = (ratio <= 1.0 - band) | (discharge < LEAST_PULSE)
    like_buck = ~like_boost & ((duty * (1.0 + band) <= 1.0) | (charge < LEAST_PULSE))
    # what the least pulse takes from the volt-seconds of one leg, the other one gives back
    charge = np.where(like_boost, 1.0 - ratio + LEAST_PULSE * battery / link, np.where(like_buck, 0.0, charge))
    discharge = np.where(like_buck, 1.0 - duty + LEAST_PULSE * link / battery, np.where(like_boost, 0.0, discharge))
    most = 1.0 - 2.0 * LEAST_PULSE
    none = np.where(like_boost, ratio <= 0.0, like_buck & lost)
    return Shares(np.clip(charge, LEAST_PULSE, most), np.clip(discharge, LEAST_PULSE, most), none, np.zeros_like(none))


def corners(point: Point, charge: FloatArray, discharge: FloatArray, rise_per_volt: Values) -> Corners:
    """Return the inductor current at the three corners of the period, so that the battery's mean is the one asked."""
    direct = 1.0 - charge - discharge
    drop = ohmic_drop(point, charge, discharge)
    rise = (point.battery_voltage - drop) * charge * rise_per_volt
    rise_direct = (point.battery_voltage - point.link_voltage - drop) * direct * rise_per_volt
    above_first = 0.5 * charge * rise + direct * (rise + 0.5 * rise_direct)
    first = (point.battery_current - above_first) / (1.0 - discharge)
    return Corners(first, first + rise, first + rise + rise_direct)


def ohmic_drop(point: Point, charge: FloatArray, discharge: FloatArray) -> FloatArray:
    """Return the drop that these shares leave room for [V]: R times the mean inductor current."""
    return point.battery_voltage * (1.0 - discharge) - point.link_voltage * (1.0 - charge)


def _boost_ratio(point: Point) -> FloatArray:
    """Return 1 - c of pure boost [-]: battery voltage less the drop, over the link voltage."""
    drop = point.path_resistance * point.battery_current
    return np.asarray((point.battery_voltage - drop) / np.maximum(point.link_voltage, _LEAST))


def _buck_duty(point: Point) -> tuple[FloatArray, NDArray[np.bool_]]:
    """Return D = 1 - e of pure buck, from V_battery D - V_link = R I/D, and where no D solves it."""
    battery, link = np.maximum(point.battery_voltage, _LEAST), point.link_voltage
    root = link * link + 4.0 * battery * point.path_resistance * point.battery_current
    duty = (link + np.sqrt(np.maximum(root, 0.0))) / (2.0 * battery)
    return duty, (root < 0.0) | (duty <= 0.0)


def _in_band(point: Point, band: float, rise_per_volt: Values) -> tuple[FloatArray, FloatArray]:
    """Return charge and discharge share by the rule of the band.

    With a drop, (1 - c)(V_battery/r - V_link) = drop is a square in r. The drop in turn follows from the mean inductor
    current at these shares, its ripple included; rounds of the two settle quickly, since the drop moves the shares
    little.
    """
    battery, link = point.battery_voltage, np.maximum(point.link_voltage, _LEAST)
    resistive = bool(np.any(point.path_resistance))
    drop = point.path_resistance * point.battery_current
    for _ in range(ROUNDS if resistive else 1):
        middle = battery - (1.0 - band) * link - 2.0 * drop
        ratio = (middle + np.sqrt(middle * middle + 4.0 * (1.0 - band) * link * battery)) / (2.0 * link)
        ratio = np.clip(ratio, 1.0 - band, 1.0 + band)  # beyond it the pure modes take over
        charge = 0.5 * (1.0 + band - ratio)
        discharge = 1.0 - (1.0 - charge) / ratio
        if resistive:
            at = corners(point, charge, discharge, rise_per_volt)
            mean = point.battery_current + discharge * 0.5 * (at.discharge + at.charge)
            drop = point.path_resistance * mean
    return charge, discharge
