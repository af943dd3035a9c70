"""A profile: one power-time trace, and how it was read."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Literal

from tideleg.waveform import FloatArray


@dataclass(frozen=True)
class Profile:
    """Power held step by step; arrays (S,).

    name, file, sha256 : of the file that was read
    terminals : where the power is meant
    time_s, duration_s : start and length of each step [s]
    power_w : positive = discharge [W]
    link_voltage_v, coolant_degc, ambient_degc, battery_degc, power_max_w, power_min_w : columns that override the plan,
        or None
    power_peak_w, power_valley_w : greatest and least power inside each step, whose mean is power_w, or None [W]
    speed_m_s : mean speed of each step where a speed profile was read [m/s]
    braked_by_friction_j : braking energy at the wheels that regeneration did not take [J]
    rules : sentences that say how the file was read, or what a profile source did; every output prints them
    """

    name: str
    file: Path | None
    sha256: str
    terminals: Literal["link", "battery"]
    time_s: FloatArray = field(repr=False)
    duration_s: FloatArray = field(repr=False)
    power_w: FloatArray = field(repr=False)
    link_voltage_v: FloatArray | None = field(default=None, repr=False)
    coolant_degc: FloatArray | None = field(default=None, repr=False)
    ambient_degc: FloatArray | None = field(default=None, repr=False)
    battery_degc: FloatArray | None = field(default=None, repr=False)
    power_max_w: FloatArray | None = field(default=None, repr=False)
    power_min_w: FloatArray | None = field(default=None, repr=False)
    power_peak_w: FloatArray | None = field(default=None, repr=False)
    power_valley_w: FloatArray | None = field(default=None, repr=False)
    speed_m_s: FloatArray | None = field(default=None, repr=False)
    braked_by_friction_j: float = 0.0
    rules: tuple[str, ...] = ()


@dataclass(frozen=True)
class SourcedProfile(Profile):
    """A profile that a source made: it has no file, and its sha256 is that of the table made.

    files_sha256 : file name -> SHA-256 of what the source read
    """

    files_sha256: Mapping[str, str] = field(default_factory=dict)
