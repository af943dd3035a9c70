"""One two-level half-bridge leg between battery and link: boost in discharge, buck in charge."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

from tideleg import Operation, Point, Slot, Topology, Values, hookimpl
from tideleg_topologies import leg


class HalfBridgeSettings(leg.LegSettings):
    """Keys under [stage] of a single leg; `legs` may be written out, and is 1."""

    legs: Literal[1] = 1


@dataclass(frozen=True)
class HalfBridge:
    """A single leg. The reported duty ratio is that of the upper position."""

    @property
    def name(self) -> str:
        """Name that a plan gives in `stage.topology`."""
        return "half-bridge"

    @property
    def source(self) -> str:
        """Where its equations come from."""
        return leg.SOURCE

    @property
    def settings(self) -> type[HalfBridgeSettings]:
        """Model of the keys it reads under [stage]."""
        return HalfBridgeSettings

    @property
    def reasons(self) -> tuple[str, ...]:
        """Why it cannot operate at a point."""
        return leg.REASONS

    def slots(self, settings: HalfBridgeSettings) -> tuple[Slot, ...]:
        """Return the places for parts."""
        return leg.slots(settings.legs)

    def operate(self, point: Point, settings: HalfBridgeSettings, inductance: Mapping[str, Values]) -> Operation:
        """Return the steady state at each step."""
        return leg.operate(point, settings, inductance)


@hookimpl
def topology() -> Topology:
    """Offer the half-bridge leg."""
    return HalfBridge()
