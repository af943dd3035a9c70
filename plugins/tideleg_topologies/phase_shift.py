"""Single phase shift between two square waves across a series inductor: the phase for a current, and the corners.

The battery bridge is positive from 0 to half a period; the link bridge follows it by the phase (or leads it, where the
phase is negative). Each half period therefore holds two straight pieces of the inductor current, and the second half
mirrors the first. With x the share of the PERIOD by which one bridge follows the other, |phase| = 2π x.

The ohmic drop enters each piece by the mean of its two ends: i1 - i0 = (v - R (i0 + i1)/2) w/(L f). Half-wave symmetry
i2 = -i0 then closes two linear equations, and the mean battery current is, with c = R/(2 L f) and p = x (1/2 - x),

    I = p (± 2 V' + c (V/2 - V'/2 + 2 V' x)) / (L f (1 + c² p)),    V battery, V' link seen from the battery side,

the sign that of the phase. Without resistance that is V' phase (π - |phase|)/(2 π² f L).
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tideleg import FloatArray, Values

QUARTER = 0.25
"""Greatest x: a quarter of the period, where the bridges stand at right angles."""

PASSES = 4
"""Steps to the phase with drops; the lossless phase is already near, and each step cubes the error."""

MISSED = 1e-9
"""Share of the current by which the phase may miss it before the point is called one that cannot be operated [-]."""

_LEAST = 1e-100
"""Keeps quotients finite where a port has no voltage."""


class Drive(NamedTuple):
    """What stands across the series inductor.

    battery : battery voltage [V]
    link : link voltage over the turns ratio, seen from the battery side [V]
    step : inductance times switching frequency [Ω]
    damping : c = R/(2 L f) [-]
    """

    battery: FloatArray
    link: FloatArray
    step: Values
    damping: Values


class Corners(NamedTuple):
    """The two pieces of the first half period; the second half period is their negative.

    lead : 1 where the battery bridge leads or neither does, -1 where the link bridge leads
    widths : of both pieces, shares of the period; they add to a half [-]
    voltages : across inductor and resistance together in both pieces [V]
    begin : current where the battery bridge turns positive; the second piece ends at its negative [A]
    corner : current between the pieces, where the link bridge switches [A]
    """

    lead: FloatArray
    widths: tuple[FloatArray, FloatArray]
    voltages: tuple[FloatArray, FloatArray]
    begin: FloatArray
    corner: FloatArray


class Shift(NamedTuple):
    """The phase found for a current.

    share : x, magnitude of the phase over a whole turn, 0 to a quarter [-]
    greatest : current that a right angle would carry in the wanted direction, 0 where none [A]
    lost : where the wanted current cannot be carried
    """

    share: FloatArray
    greatest: FloatArray
    lost: NDArray[np.bool_]


def shift_for(current: FloatArray, drive: Drive) -> Shift:
    """Return the smaller phase that carries a mean battery current [A], positive = discharge.

    Notes
    -----
    Without drops the phase is (π/2) (1 - sqrt(1 - |I|/I_max)), I_max = V'/(8 f L). With them, the cubic
    p (K + B x) - w (1 + c² p) is brought to zero by Euler's iteration: each step solves the parabola that touches it
    for the smaller root. The term of third order is small, so the parabola is near the cubic and the iteration
    converges also where the slope vanishes towards a right angle, which Newton's would not.
    """
    lead = np.where(current < 0.0, -1.0, 1.0)
    wanted = np.abs(current) * drive.step
    constant = 2.0 * drive.link + 0.5 * lead * drive.damping * (drive.battery - drive.link)
    per_share = 2.0 * lead * drive.damping * drive.link
    square = drive.damping * drive.damping
    top = QUARTER * QUARTER
    lossless = np.minimum(wanted / np.maximum(2.0 * top * drive.link, _LEAST), 1.0)
    share = QUARTER * lossless / (1.0 + np.sqrt(1.0 - lossless))  # 1 - sqrt(1 - y), without its cancellation
    for _ in range(PASSES if np.any(drive.damping) else 0):
        half, product = 0.5 - 2.0 * share, share * (0.5 - share)
        gain = constant + per_share * share - wanted * square
        excess = product * gain - wanted
        slope = half * gain + product * per_share
        bend = 2.0 * half * per_share - 2.0 * gain
        root = np.sqrt(np.maximum(slope * slope - 2.0 * excess * bend, 0.0))
        share = np.clip(share - 2.0 * excess / np.maximum(slope + root, _LEAST), 0.0, QUARTER)
    greatest = np.maximum(top * (constant + QUARTER * per_share) / (1.0 + square * top), 0.0) / drive.step
    missed = np.abs(share * (0.5 - share) * (constant + per_share * share - wanted * square) - wanted)
    short = missed > MISSED * np.maximum(wanted, MISSED * drive.link)
    return Shift(share, greatest, (np.abs(current) > greatest) | short)


def corners(share: FloatArray, lead: FloatArray, drive: Drive) -> Corners:
    """Return the pieces of the current for a phase; `lead` as in `Corners`, `share` as in `Shift`."""
    leads = lead > 0.0
    both, between = drive.battery + drive.link, drive.battery - drive.link
    rest = 0.5 - share
    first, second = np.where(leads, share, rest), np.where(leads, rest, share)
    one, two = np.where(leads, both, between), np.where(leads, between, both)
    a, b = drive.damping * first, drive.damping * second
    scale = 2.0 * drive.step * (1.0 + a * b)
    begin = -((1.0 - b) * one * first + (1.0 + a) * two * second) / scale
    corner = ((1.0 + b) * one * first - (1.0 - a) * two * second) / scale
    return Corners(lead, (first, second), (one, two), begin, corner)
