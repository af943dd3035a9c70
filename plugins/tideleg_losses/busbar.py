"""Busbars and cables at both ports, which carry the mean currents."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated

import numpy as np
from pydantic import BaseModel, ConfigDict, Field

from tideleg import FloatArray, Flow, Line, LossTerm, PartKind, Timing, Values, hookimpl, quantity


class BusbarSettings(BaseModel):
    """Keys of [stage.busbar]: resistances there and back."""

    model_config = ConfigDict(extra="forbid")

    battery_side_resistance: Annotated[quantity.Resistance, Field(ge=0.0)] | None = None
    link_side_resistance: Annotated[quantity.Resistance, Field(ge=0.0)] | None = None


@dataclass(frozen=True)
class BusbarTerm:
    """R I² of both ports; the ripple stays in the capacitors."""

    battery_side: Values
    link_side: Values
    mechanism: str = "busbar"
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Flow, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of both busbars [W]."""
        watts = self.battery_side * part.battery_current**2 + self.link_side * part.link_current**2
        return Line(watts, np.zeros_like(watts))


@dataclass(frozen=True)
class Busbar:
    """The model."""

    name: str = "busbar"
    source: str = "R I², Joule's law"
    reads: PartKind = "busbar"
    mechanisms: tuple[str, ...] = ("busbar",)
    settings: type[BaseModel] = BusbarSettings

    def terms(self, settings: BusbarSettings) -> tuple[LossTerm[Flow], ...]:
        """Return the term if a resistance is given."""
        given = (settings.battery_side_resistance, settings.link_side_resistance)
        return () if given == (None, None) else (BusbarTerm(given[0] or 0.0, given[1] or 0.0),)


@hookimpl
def loss_model() -> Busbar:
    """Offer the busbar loss."""
    return Busbar()
