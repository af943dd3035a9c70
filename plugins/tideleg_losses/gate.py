"""Gate charge; its heat stays in the driver and the gate resistors."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Self

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import FloatArray, Line, LossTerm, PartKind, Position, Timing, Values, hookimpl, quantity


class GateSettings(BaseModel):
    """Keys of [stage.switch]; gate_voltage is the whole swing of the drive."""

    model_config = ConfigDict(extra="forbid")

    gate_charge: Annotated[quantity.Charge, Field(ge=0.0)] | None = None
    gate_voltage: Annotated[quantity.Voltage, Field(gt=0.0)] | None = None

    @model_validator(mode="after")
    def _both_or_none(self) -> Self:
        if (self.gate_charge is None) != (self.gate_voltage is None):
            missing = "gate_voltage" if self.gate_voltage is None else "gate_charge"
            raise ValueError(f"{missing} is missing: the gate loss needs gate_charge and gate_voltage")
        return self


@dataclass(frozen=True)
class GateTerm:
    """Q V f while the gate is switched. Infineon, PFC boost converter design guide, DN 2013-01, Eq. 24."""

    charge: Values
    voltage: Values
    mechanism: str = "gate"
    ohmic: bool = False
    heats: bool = False

    def at(self, part: Position, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one chip's drive [W]; it does not depend on temperature."""
        watts = self.charge * self.voltage * timing.frequency * np.asarray(part.driven) + np.zeros_like(temperature)
        return Line(watts, np.zeros_like(watts))


@dataclass(frozen=True)
class Gate:
    """The model."""

    name: str = "gate"
    source: str = "Q_g V_g f: Infineon, PFC boost converter design guide, DN 2013-01, Eq. 24"
    reads: PartKind = "switch"
    mechanisms: tuple[str, ...] = ("gate",)
    settings: type[BaseModel] = GateSettings

    def terms(self, settings: GateSettings) -> tuple[LossTerm[Position], ...]:
        """Return the term if gate data are given."""
        if settings.gate_charge is None or settings.gate_voltage is None:
            return ()
        return (GateTerm(settings.gate_charge, settings.gate_voltage),)


@hookimpl
def loss_model() -> Gate:
    """Offer the gate loss."""
    return Gate()
