"""Equal two-level legs in parallel, their carriers evenly shifted, so that ripples partly cancel at both ports."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from pydantic import Field

from tideleg import Operation, Point, Slot, Topology, Values, hookimpl
from tideleg_topologies import leg

SOURCE = f"{leg.SOURCE}; sums of shifted legs: exact by the waveform algebra"


class InterleavedSettings(leg.LegSettings):
    """Keys under [stage] of interleaved legs."""

    legs: int = Field(ge=1, strict=True)


@dataclass(frozen=True)
class Interleaved:
    """Legs that share the current evenly. The reported duty ratio is that of the upper position of each leg."""

    @property
    def name(self) -> str:
        """Name that a plan gives in `stage.topology`."""
        return "interleaved"

    @property
    def source(self) -> str:
        """Where its equations come from."""
        return SOURCE

    @property
    def settings(self) -> type[InterleavedSettings]:
        """Model of the keys it reads under [stage]."""
        return InterleavedSettings

    @property
    def reasons(self) -> tuple[str, ...]:
        """Why it cannot operate at a point."""
        return leg.REASONS

    def slots(self, settings: InterleavedSettings) -> tuple[Slot, ...]:
        """Return the places for parts."""
        return leg.slots(settings.legs)

    def operate(self, point: Point, settings: InterleavedSettings, inductance: Mapping[str, Values]) -> Operation:
        """Return the steady state at each step."""
        return leg.operate(point, settings, inductance)


@hookimpl
def topology() -> Topology:
    """Offer the interleaved legs."""
    return Interleaved()
