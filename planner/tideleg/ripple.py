"""How much of the stage's ripple reaches the battery: a divider between the port capacitor and the battery.

The capacitor takes the ac part of what the stage exchanges with the port; what voltage that leaves across it drives a
current through the battery's resistance and the inductance of the way there. Each harmonic divides by
Z_C/(Z_C + R + j w L), circuit law. The numbers are compared with a limit of the plan; what ripple does to the battery's
life is not told.
"""

from __future__ import annotations

import numpy as np

from tideleg.contract import Exchange
from tideleg.waveform import FloatArray, Values

HARMONICS = 12
"""Of the exchange's own frequency; a triangle's share beyond is below one part in a thousand of its mean square."""


def battery_ripple(exchange: Exchange, farad: float, ohms: Values, henry: float) -> tuple[FloatArray, FloatArray]:
    """Return (RMS [A], peak-to-peak [A]) of the ripple current that reaches the battery.

    Parameters
    ----------
    exchange : with the battery port
    farad : of the port capacitor, above zero
    ohms, henry : of the battery and the way to it [Ω], [H]

    Notes
    -----
    The peak-to-peak value is that of the sum of the harmonics over one period, sampled at 64 instants.
    """
    square: Values = 0.0
    angles = 2.0 * np.pi * np.arange(64) / 64.0
    sampled: FloatArray | float = 0.0
    for order in range(1, HARMONICS + 1):
        omega = 2.0 * np.pi * order * exchange.frequency
        capacitor = 1.0 / (1j * omega * farad)
        share = capacitor / (capacitor + ohms + 1j * omega * henry)
        amplitude = exchange.current.harmonic(order) * share
        square = square + 0.5 * np.abs(amplitude) ** 2
        turn = np.exp(1j * order * angles)
        sampled = sampled + np.real(np.multiply.outer(turn, amplitude))
    return np.sqrt(np.asarray(square)), np.asarray(np.ptp(np.asarray(sampled), axis=0))
