"""Frequency response: power by the deviation of the grid frequency, positive (discharge) where it is low.

Either a dead band with a straight line, by full_deviation or by droop (the relative deviation that asks for rated
power), or a published curve of straight lines from deviation to share of rated power.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path
from typing import Annotated, Literal, Self

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import FloatArray, MadeProfile, hookimpl, quantity
from tideleg_profiles.series import HOLDING, read_series

Deviation = Annotated[quantity.Frequency, Field(ge=0.0)]


class FrequencyResponseSettings(BaseModel):
    """Keys of [mission.source_settings].

    frequency : CSV with time_s and frequency_hz
    full_deviation, droop, curve : exactly one; droop is (deviation/nominal) for rated power
    dead_band : half width; within it nothing is asked
    outside_dead_band : "through nominal": the line runs through the nominal frequency, so the request jumps at the
        edge; "from edge": it starts at zero at the edge and reaches rated power at the full deviation
    curve : pairs of deviation and share of rated power, both rising from zero; beyond the last its share holds
    """

    model_config = ConfigDict(extra="forbid", frozen=True)

    frequency: str
    rated_power: Annotated[quantity.Power, Field(gt=0.0)]
    nominal: Annotated[quantity.Frequency, Field(gt=0.0)] = 50.0
    dead_band: Deviation = 0.0
    outside_dead_band: Literal["through nominal", "from edge"] = "through nominal"
    full_deviation: Annotated[quantity.Frequency, Field(gt=0.0)] | None = None
    droop: Annotated[quantity.Share, Field(gt=0.0, le=1.0)] | None = None
    curve: tuple[tuple[Deviation, Annotated[quantity.Share, Field(ge=0.0, le=1.0)]], ...] | None = None

    @model_validator(mode="after")
    def _one_form(self) -> Self:
        given = [key for key in ("full_deviation", "droop", "curve") if getattr(self, key) is not None]
        if len(given) != 1:
            raise ValueError(f"found {', '.join(given) or 'none'}; give exactly one of full_deviation, droop and curve")
        if self.curve is not None:
            self._curve_is_one(self.curve)
        elif self.dead_band >= self.at_full():
            raise ValueError(
                f"dead_band: found {self.dead_band:g} Hz, not below the {self.at_full():g} Hz of full power"
            )
        return self

    def _curve_is_one(self, curve: tuple[tuple[float, float], ...]) -> None:
        if self.model_fields_set & {"dead_band", "outside_dead_band"}:
            raise ValueError("curve states its own dead band; remove dead_band and outside_dead_band")
        rises = all(a[0] < b[0] and a[1] <= b[1] for a, b in pairwise(curve))
        if len(curve) < 2 or curve[0][1] != 0.0 or not rises:
            raise ValueError("curve: give two pairs or more, deviation rising, share from 0 and not falling")

    def at_full(self) -> float:
        """Return the deviation that asks for rated power [Hz]; of a curve, its last."""
        if self.curve is not None:
            return self.curve[-1][0]
        return self.nominal * self.droop if self.droop is not None else float(self.full_deviation or 0.0)


def request(deviation: FloatArray, keys: FrequencyResponseSettings) -> FloatArray:
    """Return the share of rated power for a deviation from nominal [Hz]; positive (discharge) for a low frequency."""
    size = np.abs(deviation)
    if keys.curve is not None:
        # Rounded to nanohertz: 50.015 - 50 is not 0.015 in binary, and an edge must not depend on that.
        share = np.interp(np.round(size, 9), [d for d, _ in keys.curve], [s for _, s in keys.curve])
    else:
        skipped = keys.dead_band if keys.outside_dead_band == "from edge" else 0.0
        line = (size - skipped) / (keys.at_full() - skipped)
        share = np.where(np.round(size, 9) <= keys.dead_band, 0.0, np.minimum(line, 1.0))
    return -np.sign(deviation) * share


@dataclass(frozen=True)
class FrequencyResponse:
    """The source."""

    name: str = "frequency-response"
    source: str = "P/P_rated = -(f - f_n)/(droop f_n) outside the dead band, at most 1; or a published curve"
    settings: type[BaseModel] = FrequencyResponseSettings
    file_keys: tuple[str, ...] = ("frequency",)

    def example(self, folder: Path) -> Mapping[str, object]:
        """Write the files of a small example and return its keys."""
        text = "time_s,frequency_hz\n0,49.95\n10,50.02\n20,50\n"
        (folder / "frequency.csv").write_text(text, encoding="utf-8")
        return {"frequency": "frequency.csv", "rated_power": "1 MW", "dead_band": "10 mHz", "droop": "0.4 %"}

    def make(self, settings: FrequencyResponseSettings, folder: Path) -> MadeProfile:
        """Return the requested power over the frequency series."""
        path = folder / settings.frequency
        grid = read_series(path, {"frequency_hz": 1.0})
        power = settings.rated_power * request(grid.value - settings.nominal, settings)
        return MadeProfile(grid.time, grid.duration, power + 0.0, _rules(power, grid.duration, settings), (path,))


def _rules(power: FloatArray, duration: FloatArray, keys: FrequencyResponseSettings) -> tuple[str, ...]:
    form = f"rated power at {keys.at_full():.6g} Hz from {keys.nominal:g} Hz, dead band +-{keys.dead_band:g} Hz"
    if keys.curve is not None:
        form = f"the plan's curve about {keys.nominal:g} Hz, held beyond {keys.at_full():.6g} Hz"
    out, into = (float(np.sum(np.maximum(sign * power, 0.0) * duration)) / 3.6e6 for sign in (1.0, -1.0))
    full = 100.0 * float(np.sum(duration[np.abs(power) >= keys.rated_power])) / float(duration.sum())
    return (
        HOLDING,
        f"power follows the deviation at once, positive for a low frequency: {form}; delivery time is not modelled",
        f"it asks for {out:.6g} kWh out and {into:.6g} kWh in, and for rated power in {full:.3g} % of the time; a"
        " request is not energy neutral and nothing here restores the charge",
    )


@hookimpl
def profile_source() -> FrequencyResponse:
    """Offer frequency response."""
    return FrequencyResponse()
