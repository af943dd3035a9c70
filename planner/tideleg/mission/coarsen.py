"""A coarser profile of the same energy: to see how far the resolution of a profile limits an answer."""

from __future__ import annotations

import dataclasses
from typing import Any

import numpy as np

from tideleg.mission.profile import Profile
from tideleg.waveform import FloatArray

_HELD = (
    "power_w",
    "link_voltage_v",
    "coolant_degc",
    "ambient_degc",
    "battery_degc",
    "power_max_w",
    "power_min_w",
    "speed_m_s",
)


def coarsened(profile: Profile, factor: int) -> Profile:
    """Return the profile with every `factor` neighbouring steps merged into one of their length and mean.

    Energy is kept to rounding; peaks are not, which is the point. The last step may hold fewer.

    Raises
    ------
    ValueError
        If `factor` is below 1.
    """
    if factor < 1:
        raise ValueError(f"steps are merged by 1 or more, not by {factor}")
    starts = np.arange(0, len(profile.power_w), factor)
    duration = np.add.reduceat(profile.duration_s, starts)

    def mean(values: FloatArray) -> FloatArray:
        return np.asarray(np.add.reduceat(values * profile.duration_s, starts) / duration)

    merged: dict[str, Any] = {
        name: mean(getattr(profile, name)) for name in _HELD if getattr(profile, name) is not None
    }
    if profile.power_peak_w is not None:
        merged["power_peak_w"] = np.maximum.reduceat(profile.power_peak_w, starts)
    if profile.power_valley_w is not None:
        merged["power_valley_w"] = np.minimum.reduceat(profile.power_valley_w, starts)
    rule = f"every {factor} neighbouring steps are merged into their mean, to test the profile's resolution"
    return dataclasses.replace(
        profile, time_s=profile.time_s[starts], duration_s=duration, rules=(*profile.rules, rule), **merged
    )
