"""What a run found about wear: records for the outcome and its JSON. No physics here."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import NamedTuple

from tideleg.waveform import FloatArray
from tideleg.wear import Life


class SwingBand(NamedTuple):
    """Cycles whose swing lies in one band.

    least_k, greatest_k : of the swing, the upper end not included [K]
    per_year : cycles [1/year]; damage_share : of the part's whole damage, 0 where none of it comes from cycles [-]
    """

    least_k: float
    greatest_k: float
    per_year: float
    damage_share: float


@dataclass(frozen=True)
class HeatHistory:
    """Temperature stress of one sort of part over a year of all missions, for one part.

    part : slot name
    greatest_degc, mean_degc, greatest_swing_k : swing is that of the greatest cycle counted
    cycles_per_year : of any size [1/year]
    hours_per_year : in all missions together
    band_edges_degc, band_hours : hours a year by temperature
    swing_edges_k, swing_counts : cycles a year by swing; the last band has no upper end
    hot_above_degc, hot_hours : hours a year above it, the part's limit if the plan names none; None where it has
        neither
    """

    part: str
    greatest_degc: float
    mean_degc: float
    greatest_swing_k: float
    cycles_per_year: float
    hours_per_year: float
    band_edges_degc: tuple[float, ...]
    band_hours: tuple[float, ...]
    swing_edges_k: tuple[float, ...]
    swing_counts: tuple[float, ...]
    hot_above_degc: float | None
    hot_hours: float | None


class CycleTrace(NamedTuple):
    """Cycles of one part over a year, for the cycle matrix: arrays (N,)."""

    swing_k: FloatArray
    mean_degc: FloatArray
    per_year: FloatArray
    damage_per_year: FloatArray
    outside: FloatArray


class DamageTrace(NamedTuple):
    """Damage of one part along one pass: arrays (A,)."""

    time_s: FloatArray
    damage: FloatArray


@dataclass(frozen=True)
class PartWear:
    """What one life model says of one sort of part.

    part : slot name, or the name the plan gives to what wears beside the stage
    model, mechanism : whose answer it is
    heated : whether temperature wears it; False of what merely runs along
    copies : equal parts in the stage; the first of them to fail ends the stage's life
    damage_per_year : Miner sum of one part with its median life [1/year]
    damage_per_pass : by mission [-]
    life : years of one part; `first_life` of the first of all copies
    spread, load_spread : standard deviations of ln(life), part to part and stage to stage [-]
    life_at_target_years : years until the allowed share of stages has lost its first part
    target_years, target_failures : what the plan asks; target is None where it asks nothing
    margin_years : life_at_target less target; None without target
    outside_share : of the damage, from cycles or hours outside the data of the model [-]
    box : where those data lie, in words
    bands : cycles by swing; empty where the model reads no cycles
    """

    part: str
    model: str
    mechanism: str
    heated: bool
    copies: int
    damage_per_year: float
    damage_per_pass: Mapping[str, float]
    life: Life
    first_life: Life
    spread: float
    load_spread: float
    life_at_target_years: float
    target_years: float | None
    target_failures: float
    margin_years: float | None
    outside_share: float
    box: str
    bands: tuple[SwingBand, ...]
    cycles: CycleTrace | None = field(repr=False)
    along: Mapping[str, DamageTrace] = field(repr=False)


@dataclass(frozen=True)
class Consumer:
    """A stretch of a mission and what it takes of the life of one part.

    share : of the part's damage a year, over all missions [-]
    """

    part: str
    mechanism: str
    mission: str
    begin_s: float
    end_s: float
    damage_per_year: float
    share: float


@dataclass(frozen=True)
class Wear:
    """Wear of all parts, the one with the shortest life first.

    residue : rule for cycles that never close, in words
    heat : temperature stress by part
    parts : an entry for each life model of each part
    consumers : the stretches of the missions that take most, greatest damage first
    """

    residue: str
    heat: tuple[HeatHistory, ...]
    parts: tuple[PartWear, ...]
    consumers: tuple[Consumer, ...]

    @property
    def worst(self) -> PartWear | None:
        """The part whose life is the shortest, or None where no life model is given."""
        return self.parts[0] if self.parts else None

    @property
    def worst_heated(self) -> PartWear | None:
        """The same of the parts that temperature wears: what design, cooling and mission can change."""
        return next((part for part in self.parts if part.heated), None)


NO_WEAR = Wear("", (), (), ())
"""Of an outcome that was made without looking at wear."""
