"""Two-level legs in parallel, their carriers evenly shifted, so that ripples partly cancel at both ports.

Legs share the current evenly unless the plan tells how one lead leg differs; at light load legs may rest.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Self

from pydantic import Field, model_validator

from tideleg import Choice, Operation, Point, Rest, Slot, Topology, Values, hookimpl, quantity
from tideleg_topologies import gates, leg, legs, shedding

SOURCE = f"{leg.SOURCE}; sums of shifted legs: exact by the waveform algebra"


class InterleavedSettings(leg.TwoLevelSettings, shedding.SheddingKeys):
    """Keys under [stage] of interleaved legs.

    lead_leg_inductance : inductance of the lead leg over that of each other leg
    lead_leg_current : its current over that of an even share
    """

    legs: int = Field(ge=1, strict=True)
    lead_leg_inductance: quantity.Share = Field(default=1.0, gt=0.0)
    lead_leg_current: quantity.Share = Field(default=1.0, gt=0.0)

    @model_validator(mode="after")
    def _there_are_others(self) -> Self:
        if self.legs == 1 and self.has_lead_leg:
            raise ValueError(
                "lead_leg_inductance, lead_leg_current and shedding need other legs beside the lead leg; found legs = 1"
            )
        if self.lead_leg_current >= 2.0:
            raise ValueError(
                f"lead_leg_current: found {self.lead_leg_current:g}; with two legs at work the other one would be left"
                " with nothing: give less than 2"
            )
        return self

    @property
    def has_lead_leg(self) -> bool:
        """Whether one leg is stated apart from the others."""
        return self.shedding != "never" or self.lead_leg_inductance != 1.0 or self.lead_leg_current != 1.0


@dataclass(frozen=True)
class Interleaved:
    """The topology. The reported duty ratio is that of the upper position of each leg."""

    name: str = "interleaved"
    source: str = SOURCE
    settings: type[InterleavedSettings] = InterleavedSettings
    reasons: tuple[str, ...] = leg.REASONS
    cautions: tuple[str, ...] = gates.CAUTIONS
    assumptions: tuple[str, ...] = leg.ASSUMPTIONS
    choice_name: str = "active_legs"

    def slots(self, settings: InterleavedSettings) -> tuple[Slot, ...]:
        """Return the places for parts."""
        return legs.slots(settings.legs, settings.has_lead_leg)

    def choices(self, settings: InterleavedSettings) -> tuple[str, ...]:
        """Return the numbers of legs that may work; none to choose from where legs never rest."""
        return () if settings.shedding == "never" else tuple(str(n) for n in range(1, settings.legs + 1))

    def plain_choice(self, settings: InterleavedSettings) -> int | None:
        """Return the code of all legs at work."""
        return settings.legs - 1

    def choose(self, rest: Rest, settings: InterleavedSettings, before: Any) -> Choice:
        """Return how many legs work at each step."""
        return shedding.choose(rest, settings, before)

    def operate(self, point: Point, settings: InterleavedSettings, inductance: Mapping[str, Values]) -> Operation:
        """Return the steady state at each step."""
        working = settings.legs if settings.shedding == "never" else point.choice + 1
        sharing = legs.Sharing(
            settings.legs, working, settings.has_lead_leg, settings.lead_leg_current, settings.lead_leg_inductance
        )
        return legs.operate(point, settings, inductance, sharing)


@hookimpl
def topology() -> Topology:
    """Offer the interleaved legs."""
    return Interleaved()
