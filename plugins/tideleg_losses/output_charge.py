"""Output charge of both positions, lost at a hard turn-on."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Self

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import FloatArray, Line, LossTerm, PartKind, Position, Timing, Values, hookimpl, quantity

LEAST_SWING_CURRENT = 1e-3
"""Keeps the ramp from hard to soft finite where no dead time is given [A]: any negative current is then soft."""


class OutputChargeSettings(BaseModel):
    """Keys of [stage.switch]: output_charge of one chip at test_voltage, Q(V) = Q (V/V_test)^exponent.

    output_charge_in_turn_on says whether turn_on_energy already holds it; both together would count twice.
    """

    model_config = ConfigDict(extra="forbid")

    output_charge: Annotated[quantity.Charge, Field(ge=0.0)] | None = None
    output_charge_exponent: float = Field(default=0.5, gt=0.0, le=1.0)
    output_charge_in_turn_on: bool | None = None
    test_voltage: Annotated[quantity.Voltage, Field(gt=0.0)] | None = None
    turn_on_energy: Annotated[quantity.Energy, Field(ge=0.0)] | None = None

    @model_validator(mode="after")
    def _counts_once(self) -> Self:
        if self.output_charge is None:
            return self
        if self.test_voltage is None:
            raise ValueError("test_voltage is missing: output_charge holds at a voltage; give it")
        if self.turn_on_energy is not None and self.output_charge_in_turn_on is None:
            raise ValueError(
                "output_charge_in_turn_on is missing: turn_on_energy of a data sheet usually holds the output charge"
                " already; say true (it is then not added) or false"
            )
        return self


def hard_share(current: FloatArray, swing_current: Values) -> FloatArray:
    """Return how hard a turn-on is [-]: 1 at or above zero current, 0 where the current swings the charge in time.

    In between the node is swung part of the way: a straight line keeps the loss continuous (modelling choice).
    """
    return np.clip(1.0 + current / np.maximum(swing_current, LEAST_SWING_CURRENT), 0.0, 1.0)


@dataclass(frozen=True)
class OutputChargeTerm:
    """Q(V) V at each hard turn-on, times the frequency: its own energy and what charging the opposite position costs.

    Total Q_oss V a cycle for a hard-switched leg. The swing needs the charge of both positions within the dead time.
    """

    charge: Values
    exponent: Values
    test_voltage: Values
    counted: bool
    mechanism: str = "output charge"
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Position, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one chip [W]; it does not depend on temperature."""
        voltage = np.maximum(np.asarray(part.turn_on_voltage), 0.0)
        charge = self.charge * (voltage / self.test_voltage) ** self.exponent
        swing = 2.0 * charge / np.maximum(np.asarray(timing.dead_time, dtype=np.float64), 1e-12)
        share = hard_share(part.turn_on_current(), np.where(np.asarray(timing.dead_time) > 0.0, swing, 0.0))
        watts = charge * voltage * share * timing.frequency * part.has_edges() * part.driven * float(self.counted)
        watts = watts + np.zeros_like(temperature)
        return Line(watts, np.zeros_like(watts))


@dataclass(frozen=True)
class OutputCharge:
    """The model."""

    name: str = "output-charge"
    source: str = "Q_oss V a hard turn-on: charge balance of two positions; ramp to soft: modelling choice, no source"
    reads: PartKind = "switch"
    mechanisms: tuple[str, ...] = ("output charge",)
    settings: type[BaseModel] = OutputChargeSettings

    def terms(self, settings: OutputChargeSettings) -> tuple[LossTerm[Position], ...]:
        """Return the term if an output charge is given."""
        if settings.output_charge is None or settings.test_voltage is None:
            return ()
        counted = not settings.output_charge_in_turn_on
        return (
            OutputChargeTerm(settings.output_charge, settings.output_charge_exponent, settings.test_voltage, counted),
        )


@hookimpl
def loss_model() -> OutputCharge:
    """Offer the output charge."""
    return OutputCharge()
