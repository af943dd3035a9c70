"""Busbars and cables at both ports, which carry the mean currents."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated

import numpy as np
from pydantic import BaseModel, ConfigDict, Field

from tideleg import FloatArray, Flow, Line, LossTerm, PartKind, Timing, Values, hookimpl, quantity


class BusbarSettings(BaseModel):
    """Keys of [stage.busbar]: resistances there and back, each on its own."""

    model_config = ConfigDict(extra="forbid")

    battery_side_resistance: Annotated[quantity.Resistance, Field(ge=0.0)] | None = None
    link_side_resistance: Annotated[quantity.Resistance, Field(ge=0.0)] | None = None


@dataclass(frozen=True)
class BatterySideTerm:
    """R I² of the battery current. It lies outside of the leg, so it does not shift the duty ratio."""

    resistance: Values
    mechanism: str = "busbar battery side"
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Flow, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of the busbar [W]; the ripple stays in the capacitor."""
        watts = self.resistance * part.battery_current * part.battery_current
        return Line(watts, np.zeros_like(watts))


@dataclass(frozen=True)
class LinkSideTerm:
    """R I² of the link current. It lies outside of the leg, so it does not shift the duty ratio."""

    resistance: Values
    mechanism: str = "busbar link side"
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Flow, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of the busbar [W]; the ripple stays in the capacitor."""
        watts = self.resistance * part.link_current * part.link_current
        return Line(watts, np.zeros_like(watts))


@dataclass(frozen=True)
class Busbar:
    """The model."""

    name: str = "busbar"
    source: str = "R I², Joule's law"
    reads: PartKind = "busbar"
    mechanisms: tuple[str, ...] = ("busbar battery side", "busbar link side")
    settings: type[BaseModel] = BusbarSettings

    def terms(self, settings: BusbarSettings) -> tuple[LossTerm[Flow], ...]:
        """Return a term for each side whose resistance is given."""
        found: list[LossTerm[Flow]] = []
        if settings.battery_side_resistance is not None:
            found.append(BatterySideTerm(settings.battery_side_resistance))
        if settings.link_side_resistance is not None:
            found.append(LinkSideTerm(settings.link_side_resistance))
        return tuple(found)


@hookimpl
def loss_model() -> Busbar:
    """Offer the busbar loss."""
    return Busbar()
