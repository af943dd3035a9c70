"""Solar smoothing: the storage gives the difference between a smooth feed-in and what the sun gives.

With a ramp limit r the smooth feed-in g is the middle between the greatest curve below the solar power s and the least
curve above it that keep the limit, so it begins a ramp before the sun does: the whole series is known beforehand. With
a window g is the mean over the window that ends with the step, which needs no foresight. P = g - s; with a return time
tau the stored energy is drawn back to where it began: P = g - s + (E - E_start)/tau, solved exactly over each step.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Annotated, NamedTuple, Self

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import FloatArray, MadeProfile, hookimpl, quantity
from tideleg_profiles.series import HOLDING, Series, columns_of, read_series
from tideleg_profiles.walls import Step, run_between_walls


class SolarSmoothingSettings(BaseModel):
    """Keys of [mission.source_settings].

    solar : CSV with time_s and solar_w, solar_kw or solar_mw
    ramp_limit_per_minute, window : exactly one of the two
    storage_energy, start_share : usable energy, and the share of it at the start, to which it returns
    return_time : time constant of that return; none without it
    """

    model_config = ConfigDict(extra="forbid", frozen=True)

    solar: str
    ramp_limit_per_minute: Annotated[quantity.Power, Field(gt=0.0)] | None = None
    window: Annotated[quantity.Time, Field(gt=0.0)] | None = None
    storage_energy: Annotated[quantity.Energy, Field(gt=0.0)]
    start_share: Annotated[quantity.Share, Field(ge=0.0, le=1.0)] = 0.5
    return_time: Annotated[quantity.Time, Field(gt=0.0)] | None = None

    @model_validator(mode="after")
    def _one_form(self) -> Self:
        if (self.ramp_limit_per_minute is None) == (self.window is None):
            raise ValueError("give exactly one of ramp_limit_per_minute and window")
        return self


class Smoothed(NamedTuple):
    """Power of the storage [W], feed-in [W] and stored energy after each step [J]; arrays (S,)."""

    power: FloatArray
    feed_in: FloatArray
    energy: FloatArray


def smooth(solar: Series, keys: SolarSmoothingSettings) -> Smoothed:
    """Return what the storage gives, and what the grid sees."""
    target = _ramped(solar, keys.ramp_limit_per_minute / 60.0) if keys.ramp_limit_per_minute else _mean(solar, keys)
    wanted = target - solar.value
    start = keys.start_share * keys.storage_energy
    if keys.return_time is None:
        keep, add = np.ones_like(wanted), -wanted * solar.duration
    else:
        fades = -np.expm1(-solar.duration / keys.return_time)
        keep, add = 1.0 - fades, fades * (start - wanted * keys.return_time)
    walls = np.zeros_like(keep), np.full_like(keep, keys.storage_energy)
    energy = run_between_walls(start, Step(keep, add, *walls))
    power = -np.diff(energy, prepend=start) / solar.duration
    return Smoothed(power, solar.value + power, energy)


def _ramped(solar: Series, rate: float) -> FloatArray:
    """Return the middle between the greatest curve below and the least curve above that keep the rate [W/s].

    min_j (s_j + r |t - t_j|) and max_j (s_j - r |t - t_j|) over the starts of the steps: the bounds of McShane and
    Whitney for the extension of a function with a bounded slope.
    """
    rise = rate * solar.time
    below = _envelope(solar.value, rise)
    above = -_envelope(-solar.value, rise)
    return 0.5 * (below + above)


def _envelope(value: FloatArray, rise: FloatArray) -> FloatArray:
    """Return min over j of value_j + |rise - rise_j|: from what came before, and from what comes after."""
    before = np.minimum.accumulate(value - rise) + rise
    after = np.minimum.accumulate((value + rise)[::-1])[::-1] - rise
    return np.minimum(before, after)


def _mean(solar: Series, keys: SolarSmoothingSettings) -> FloatArray:
    """Return the mean over the window that ends with each step; before the series its first value held."""
    window = float(keys.window or 0.0)
    edges = np.concatenate([[0.0], np.cumsum(solar.duration)])
    energy = np.concatenate([[0.0], np.cumsum(solar.value * solar.duration)])
    begins = edges[1:] - window
    before = np.where(begins < 0.0, solar.value[0] * begins, np.interp(begins, edges, energy))
    return np.asarray((energy[1:] - before) / window)


@dataclass(frozen=True)
class SolarSmoothing:
    """The source."""

    name: str = "solar-smoothing"
    source: str = "ramp limit or mean over a window on the feed-in; first-order return of the stored energy"
    settings: type[BaseModel] = SolarSmoothingSettings
    file_keys: tuple[str, ...] = ("solar",)

    def example(self, folder: Path) -> Mapping[str, object]:
        """Write the files of a small example and return its keys."""
        (folder / "solar.csv").write_text("time_s,solar_kw\n0,0\n60,30\n120,8\n300,20\n400,0\n", encoding="utf-8")
        return {"solar": "solar.csv", "window": "10 min", "storage_energy": "20 kWh", "return_time": "2 h"}

    def make(self, settings: SolarSmoothingSettings, folder: Path) -> MadeProfile:
        """Return the storage's power over the solar series."""
        path = folder / settings.solar
        solar = read_series(path, columns_of("solar"))
        smoothed = smooth(solar, settings)
        return MadeProfile(solar.time, solar.duration, smoothed.power, _rules(solar, smoothed, settings), (path,))


def _rules(solar: Series, smoothed: Smoothed, keys: SolarSmoothingSettings) -> tuple[str, ...]:
    energy = np.concatenate([[keys.start_share * keys.storage_energy], smoothed.energy])
    full = (energy <= 0.0) | (energy >= keys.storage_energy)
    rises = np.abs(np.diff(smoothed.feed_in)) / solar.duration[:-1] * 60.0
    steepest = float(rises.max()) if len(rises) else 0.0
    form = (
        f"a ramp of at most {keys.ramp_limit_per_minute:g} W a minute, midway between the bounds that keep it, with the"
        " whole series known beforehand"
        if keys.ramp_limit_per_minute
        else f"the mean over the {keys.window:g} s that end with each step; before the series its first value holds"
    )
    back = "" if keys.return_time is None else f", and returns its charge with {keys.return_time:g} s"
    return (
        HOLDING,
        f"the storage makes the feed-in follow {form}{back}",
        "the storage has no loss here and no power limit but that of the stage",
        f"steepest feed-in {steepest:.6g} W a minute; the storage is at a wall after {int(full[1:].sum())} of"
        f" {len(solar.time)} steps",
        f"stored energy starts at {energy[0] / 3.6e6:.6g} kWh, ends at {energy[-1] / 3.6e6:.6g} kWh, between"
        f" {energy.min() / 3.6e6:.6g} and {energy.max() / 3.6e6:.6g} kWh",
    )


@hookimpl
def profile_source() -> SolarSmoothing:
    """Offer solar smoothing."""
    return SolarSmoothing()
