"""One two-level half-bridge leg between battery and link: boost in discharge, buck in charge."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

from tideleg import Operation, Point, Slot, Topology, Values, hookimpl
from tideleg_topologies import gates, leg, legs


class HalfBridgeSettings(leg.TwoLevelSettings):
    """Keys under [stage] of a single leg; `legs` may be written out, and is 1."""

    legs: Literal[1] = 1


@dataclass(frozen=True)
class HalfBridge:
    """A single leg. The reported duty ratio is that of the upper position."""

    name: str = "half-bridge"
    source: str = leg.SOURCE
    settings: type[HalfBridgeSettings] = HalfBridgeSettings
    reasons: tuple[str, ...] = leg.REASONS
    cautions: tuple[str, ...] = gates.CAUTIONS
    assumptions: tuple[str, ...] = leg.ASSUMPTIONS

    def slots(self, settings: HalfBridgeSettings) -> tuple[Slot, ...]:
        """Return the places for parts."""
        return legs.slots(settings.legs)

    def operate(self, point: Point, settings: HalfBridgeSettings, inductance: Mapping[str, Values]) -> Operation:
        """Return the steady state at each step."""
        return legs.operate(point, settings, inductance, legs.Sharing(1, 1))


@hookimpl
def topology() -> Topology:
    """Offer the half-bridge leg."""
    return HalfBridge()
