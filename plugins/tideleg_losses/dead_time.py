"""Conduction of the diode in the dead times."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Self

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import FloatArray, Line, LossTerm, PartKind, Position, Timing, Values, hookimpl, quantity
from tideleg_losses.edges import COLDEST_DEGC, HOTTEST_DEGC, diode_current_at_begin, diode_current_at_end
from tideleg_losses.shared_keys import refuse_keys_without

REFERENCE_DEGC = 25.0


class DeadTimeSettings(BaseModel):
    """Keys of [stage.switch]: diode voltage V0 + slope (T - 25) + r i, of ONE chip."""

    model_config = ConfigDict(extra="forbid")

    diode_voltage: Annotated[quantity.Voltage, Field(ge=0.0)] | None = None
    diode_resistance: Annotated[quantity.Resistance, Field(ge=0.0)] = 0.0
    diode_voltage_slope: float = Field(default=0.0, description="V/K", allow_inf_nan=False)

    @model_validator(mode="after")
    def _stays_positive(self) -> Self:
        refuse_keys_without(self, ("diode_voltage",), ("diode_resistance", "diode_voltage_slope"))
        if self.diode_voltage is None:
            return self
        for degc in (COLDEST_DEGC, HOTTEST_DEGC):
            volts = self.diode_voltage + self.diode_voltage_slope * (degc - REFERENCE_DEGC)
            if volts < 0.0:
                raise ValueError(
                    f"diode_voltage_slope: found {self.diode_voltage_slope:g} V/K, with which the diode voltage is"
                    f" {volts:.3g} V at {degc:g} degC; it must not be negative from {COLDEST_DEGC:g} to"
                    f" {HOTTEST_DEGC:g} degC: give a smaller slope"
                )
        return self


@dataclass(frozen=True)
class DeadTimeTerm:
    """(V0 + r i) i t_d f at each edge with the diode's current: ROHM, AEK59-D1-0065-2, dead-time loss."""

    voltage: Values
    resistance: Values
    slope: Values
    mechanism: str = "dead time"
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Position, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one chip [W] and its slope [W/K].

        The voltage was accepted because it is not negative from -40 to 250 degC; beyond that a passing estimate of
        the relaxation could make it so, and it is then zero.
        """
        share = timing.dead_time * timing.frequency
        begin, end = diode_current_at_begin(part), diode_current_at_end(part)
        warm = self.voltage + self.slope * (temperature - REFERENCE_DEGC)
        both = (begin + end) * share
        watts = np.maximum(warm, 0.0) * both + self.resistance * (begin * begin + end * end) * share
        return Line(watts, both * np.where(warm > 0.0, self.slope, 0.0))


@dataclass(frozen=True)
class DeadTime:
    """The model."""

    name: str = "dead-time"
    source: str = "V_F I (t1 + t2) f: ROHM, Calculation of Power Loss (Synchronous), AEK59-D1-0065-2"
    reads: PartKind = "switch"
    mechanisms: tuple[str, ...] = ("dead time",)
    settings: type[BaseModel] = DeadTimeSettings
    carries: str = "reverse"

    def terms(self, settings: DeadTimeSettings) -> tuple[LossTerm[Position], ...]:
        """Return the term if a diode voltage is given."""
        if settings.diode_voltage is None:
            return ()
        return (DeadTimeTerm(settings.diode_voltage, settings.diode_resistance, settings.diode_voltage_slope),)


@hookimpl
def loss_model() -> DeadTime:
    """Offer dead-time conduction."""
    return DeadTime()
