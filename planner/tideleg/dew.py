"""Dew: whether the coldest surface lies below the dew point of the air around it.

Source: Magnus form over water with 17.62 and 243.12 degC, as in World Meteorological Organization, Guide to
Meteorological Instruments and Methods of Observation, WMO-No. 8 (from memory); -45 to 60 degC.
"""

from __future__ import annotations

import numpy as np

from tideleg.waveform import FloatArray, Values

FACTOR, OFFSET_DEGC = 17.62, 243.12
LOWEST_DEGC, HIGHEST_DEGC = -45.0, 60.0
"""Air temperatures for which the form holds [degC]."""


def dew_point(air_degc: Values, humidity: Values) -> FloatArray:
    """Return the dew point [degC] of air at a temperature [degC] and a relative humidity [-], above 0 to 1.

    Examples
    --------
    >>> round(float(dew_point(25.0, 0.60)), 1), round(float(dew_point(20.0, 1.0)), 6)
    (16.7, 20.0)
    """
    air = np.asarray(air_degc, dtype=np.float64)
    level = np.log(humidity) + FACTOR * air / (OFFSET_DEGC + air)
    return np.asarray(OFFSET_DEGC * level / (FACTOR - level))
