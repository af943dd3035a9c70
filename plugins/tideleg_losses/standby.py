"""Power of the control: always, and on top while switching."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated

import numpy as np
from pydantic import BaseModel, ConfigDict, Field

from tideleg import FloatArray, Flow, Line, LossTerm, PartKind, Timing, Values, hookimpl, quantity


class StandbySettings(BaseModel):
    """Keys of [stage.control], each on its own: standby_power always, switching_power only while the stage switches."""

    model_config = ConfigDict(extra="forbid")

    standby_power: Annotated[quantity.Power, Field(ge=0.0)] | None = None
    switching_power: Annotated[quantity.Power, Field(ge=0.0)] | None = None


@dataclass(frozen=True)
class StandbyTerm:
    """Power that the control always draws."""

    power: Values
    mechanism: str = "standby"
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Flow, timing: Timing, temperature: FloatArray) -> Line:
        """Return the power of the control [W]."""
        watts = self.power + np.zeros_like(temperature)
        return Line(watts, np.zeros_like(watts))


@dataclass(frozen=True)
class SwitchingPowerTerm:
    """Power that the control draws on top while the stage switches."""

    power: Values
    mechanism: str = "control while switching"
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Flow, timing: Timing, temperature: FloatArray) -> Line:
        """Return the power of the control [W]."""
        watts = self.power * part.active + np.zeros_like(temperature)
        return Line(watts, np.zeros_like(watts))


@dataclass(frozen=True)
class Standby:
    """The model."""

    name: str = "standby"
    source: str = "as given by the plan"
    reads: PartKind = "control"
    mechanisms: tuple[str, ...] = ("standby", "control while switching")
    settings: type[BaseModel] = StandbySettings

    def terms(self, settings: StandbySettings) -> tuple[LossTerm[Flow], ...]:
        """Return a term for each power given."""
        found: list[LossTerm[Flow]] = []
        if settings.standby_power is not None:
            found.append(StandbyTerm(settings.standby_power))
        if settings.switching_power is not None:
            found.append(SwitchingPowerTerm(settings.switching_power))
        return tuple(found)


@hookimpl
def loss_model() -> Standby:
    """Offer the power of the control."""
    return Standby()
