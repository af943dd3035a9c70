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
    amplitudes = []
    for order in range(1, HARMONICS + 1):
        omega = 2.0 * np.pi * order * exchange.frequency
        capacitor = 1.0 / (1j * omega * farad)
        share = capacitor / (capacitor + ohms + 1j * omega * henry)
        amplitudes.append(exchange.current.harmonic(order) * share)
    found = np.stack(np.broadcast_arrays(*amplitudes))
    turns = np.exp(2j * np.pi * np.outer(np.arange(64) / 64.0, np.arange(1, HARMONICS + 1)))
    # One product for all instants: real and imaginary part apart, since only the real part of it is wanted.
    flat = found.reshape(HARMONICS, -1)
    sampled = turns.real @ flat.real - turns.imag @ flat.imag
    rms = np.sqrt(0.5 * np.sum(np.abs(found) ** 2, axis=0))
    return rms, np.ptp(sampled, axis=0).reshape(rms.shape)
