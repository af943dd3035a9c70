"""Power of the control, always and while switching."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated

import numpy as np
from pydantic import BaseModel, ConfigDict, Field

from tideleg import FloatArray, Flow, Line, LossTerm, PartKind, Timing, Values, hookimpl, quantity


class StandbySettings(BaseModel):
    """Keys of [stage.control]; both are drawn from the battery."""

    model_config = ConfigDict(extra="forbid")

    standby_power: Annotated[quantity.Power, Field(ge=0.0)] | None = None
    switching_power: Annotated[quantity.Power, Field(ge=0.0)] | None = None


@dataclass(frozen=True)
class StandbyTerm:
    """Standby power always, and the rest only while the stage switches."""

    always: Values
    switching: Values
    mechanism: str = "standby"
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Flow, timing: Timing, temperature: FloatArray) -> Line:
        """Return the power of the control [W]."""
        watts = self.always + self.switching * part.active
        return Line(watts, np.zeros_like(watts))


@dataclass(frozen=True)
class Standby:
    """The model."""

    name: str = "standby"
    source: str = "as given by the plan"
    reads: PartKind = "control"
    mechanisms: tuple[str, ...] = ("standby",)
    settings: type[BaseModel] = StandbySettings

    def terms(self, settings: StandbySettings) -> tuple[LossTerm[Flow], ...]:
        """Return the term if a power is given."""
        given = (settings.standby_power, settings.switching_power)
        return () if given == (None, None) else (StandbyTerm(given[0] or 0.0, given[1] or 0.0),)


@hookimpl
def loss_model() -> Standby:
    """Offer the standby power."""
    return Standby()
