"""What wears by running or by starting: a fan or pump by its hours, a contactor by its operations."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Literal, Self

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import Consumption, LifeTerm, Stress, WornKind, hookimpl, quantity
from tideleg_life.shared import Spread


class RunningSettings(BaseModel):
    """Keys of [life.<name>]: rated_hours that are used up while it runs, or rated_starts, an operation at each start.

    runs: "always", through every step of the mission, or "switching", while the stage switches. A pass begins with a
    start.
    """

    model_config = ConfigDict(extra="forbid")

    rated_hours: Annotated[quantity.Time, Field(gt=0.0)] | None = None
    rated_starts: Annotated[float, Field(gt=0.0)] | None = None
    runs: Literal["always", "switching"]
    spread: Spread

    @model_validator(mode="after")
    def _one(self) -> Self:
        if (self.rated_hours is None) == (self.rated_starts is None):
            raise ValueError("give rated_hours (such as '40000 h') or rated_starts (such as 200000): one of the two")
        return self


@dataclass(frozen=True)
class RunningTerm:
    """The model with its data."""

    given: RunningSettings
    reads: Literal["cycles", "steps"] = "steps"

    @property
    def mechanism(self) -> str:
        """What wears."""
        return "running hours" if self.given.rated_hours is not None else "starts"

    @property
    def spread(self) -> float:
        """Standard deviation of the natural logarithm of life [-]."""
        return self.given.spread

    @property
    def box(self) -> str:
        """No bounds are known."""
        return "no bounds stated"

    def consumed(self, stress: Stress) -> Consumption:
        """Return the share of the life of each step."""
        g = self.given
        runs = np.ones_like(stress.duration) if g.runs == "always" else stress.active
        if g.rated_hours is not None:
            damage = runs * stress.duration / g.rated_hours
        else:
            before = np.concatenate([np.zeros(min(len(runs), 1)), runs[:-1]])
            damage = np.where((runs > 0.0) & (before == 0.0), 1.0, 0.0) / (g.rated_starts or 1.0)
        return Consumption(damage, np.zeros(len(damage), dtype=bool))


@dataclass(frozen=True)
class RunningHours:
    """The model."""

    name: str = "running-hours"
    source: str = "time or operations over the rated number; no formula behind it"
    reads: WornKind = "stage"
    settings: type[BaseModel] = RunningSettings

    def term(self, settings: RunningSettings) -> LifeTerm:
        """Return the model with its data."""
        return RunningTerm(settings)


@hookimpl
def life_model() -> RunningHours:
    """Offer the model."""
    return RunningHours()
