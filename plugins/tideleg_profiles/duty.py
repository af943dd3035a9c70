"""A synthetic duty for design work before data exist: a stated spectrum with random phases.

Power about its mean is a sum of cosines at f_k = k/T, k = 1 .. below half the sampling rate, each with the amplitude
that the first-order spectrum S(f) = 1/(1 + (f/f_c)^2) gives it and a phase drawn from the seed; all scaled to the
stated rms. So mean, rms and spectrum are exact for any seed, and only the order of events is random. Random-phase
method: Shinozuka, Deodatis, Applied Mechanics Reviews 44(4), 1991, 191-204 (from memory).
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Annotated, Self

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import FloatArray, MadeProfile, hookimpl, quantity


class DutySettings(BaseModel):
    """Keys of [mission.source_settings].

    duration, step : whole length, and the length of a step, which divides it
    mean_power, rms_power : mean, positive in discharge, and rms about the mean
    corner_frequency : below it the spectrum is flat, above it falls with the square of the frequency
    seed : of the phases
    """

    model_config = ConfigDict(extra="forbid", frozen=True)

    duration: Annotated[quantity.Time, Field(gt=0.0)]
    step: Annotated[quantity.Time, Field(gt=0.0)]
    mean_power: quantity.Power = 0.0
    rms_power: Annotated[quantity.Power, Field(gt=0.0)]
    corner_frequency: Annotated[quantity.Frequency, Field(gt=0.0)]
    seed: int = Field(ge=0)

    @model_validator(mode="after")
    def _divides(self) -> Self:
        steps = self.duration / self.step
        if abs(steps - round(steps)) > 1e-9 * steps or round(steps) < 4:
            raise ValueError(
                f"step: {self.step:g} s goes {steps:.6g} times into duration; give four whole times or more"
            )
        return self

    def steps(self) -> int:
        """Return how many steps there are."""
        return round(self.duration / self.step)


def synthesize(keys: DutySettings) -> FloatArray:
    """Return the power of each step [W], (S,)."""
    steps = keys.steps()
    order = np.arange(1, (steps - 1) // 2 + 1)
    amplitude = 1.0 / np.sqrt(1.0 + (order / keys.duration / keys.corner_frequency) ** 2)
    amplitude *= keys.rms_power / np.sqrt(0.5 * np.sum(amplitude**2))
    phase = 2.0 * np.pi * np.random.Generator(np.random.PCG64(keys.seed)).random(len(order))
    lines = np.zeros(steps // 2 + 1, dtype=complex)
    lines[order] = 0.5 * steps * amplitude * np.exp(1j * phase)
    return np.asarray(keys.mean_power + np.fft.irfft(lines, steps), dtype=np.float64)


@dataclass(frozen=True)
class Duty:
    """The source."""

    name: str = "duty"
    source: str = "random phases on S(f) = 1/(1 + (f/f_c)^2); Shinozuka, Deodatis 1991 (from memory)"
    settings: type[BaseModel] = DutySettings
    file_keys: tuple[str, ...] = ()

    def example(self, folder: Path) -> Mapping[str, object]:
        """Write the files of a small example and return its keys."""
        spectrum = {"rms_power": "20 kW", "corner_frequency": "10 mHz", "seed": 7}
        return {"duration": "1 h", "step": "2 s", **spectrum}

    def make(self, settings: DutySettings, folder: Path) -> MadeProfile:
        """Return the synthetic power."""
        power = synthesize(settings)
        time = np.arange(len(power), dtype=np.float64) * settings.step
        rules = (
            f"synthetic duty, not measured: {len(power)} steps of {settings.step:g} s, seed {settings.seed}",
            f"spectrum 1/(1 + (f/f_c)^2) with f_c = {settings.corner_frequency:g} Hz and random phases; mean"
            f" {settings.mean_power:g} W, rms about it {settings.rms_power:g} W; its end joins its beginning",
            f"power lies between {power.min():.6g} and {power.max():.6g} W; no peak is cut",
        )
        return MadeProfile(np.asarray(time, dtype=np.float64), np.full(len(power), settings.step), power, rules)


@hookimpl
def profile_source() -> Duty:
    """Offer the synthetic duty."""
    return Duty()
