"""Turn-on and turn-off energy at the edges, scaled from a test point."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Self

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import FloatArray, Line, LossTerm, PartKind, Position, Timing, Values, hookimpl, quantity
from tideleg_losses.edges import hard_turn_off_current, hard_turn_on_current, scaled_energy

SOURCE = (
    "E = E_ref (I/I_ref)^Ki (V/V_ref)^Kv (1 + TC (Tj - T_ref)): Semikron, Application Manual Power Semiconductors,"
    " 2nd ed., 2015 (form and exponents from memory)"
)


class SwitchingSettings(BaseModel):
    """Keys of [stage.switch]; energies of ONE chip at test_current, test_voltage and test_temperature."""

    model_config = ConfigDict(extra="forbid")

    turn_on_energy: Annotated[quantity.Energy, Field(ge=0.0)] | None = None
    turn_off_energy: Annotated[quantity.Energy, Field(ge=0.0)] | None = None
    test_current: Annotated[quantity.Current, Field(gt=0.0)] | None = None
    test_voltage: Annotated[quantity.Voltage, Field(gt=0.0)] | None = None
    test_temperature: quantity.Temperature = 25.0
    turn_on_current_exponent: float = Field(default=1.0, gt=0.0, le=3.0)
    turn_off_current_exponent: float = Field(default=1.0, gt=0.0, le=3.0)
    switching_voltage_exponent: float = Field(default=1.3, gt=0.0, le=3.0)
    switching_energy_slope: quantity.RelativeSlope = 0.0

    @model_validator(mode="after")
    def _has_its_test_point(self) -> Self:
        if self.turn_on_energy is None and self.turn_off_energy is None:
            return self
        for key in ("test_current", "test_voltage"):
            if getattr(self, key) is None:
                raise ValueError(f"{key} is missing: a switching energy holds at a test point; give it")
        return self


@dataclass(frozen=True)
class EdgeTerm:
    """One energy an edge, times the frequency; at or below zero current the edge costs nothing."""

    mechanism: str
    energy: Values
    current_exponent: Values
    settings: SwitchingSettings
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Position, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one chip [W] and its slope [W/K]."""
        turns_on = self.mechanism == "turn-on"
        current = hard_turn_on_current(part) if turns_on else hard_turn_off_current(part)
        voltage = part.turn_on_voltage if turns_on else part.blocks
        s = self.settings
        assert s.test_current is not None
        assert s.test_voltage is not None
        energy = scaled_energy(
            self.energy,
            current,
            voltage,
            s.test_current,
            s.test_voltage,
            self.current_exponent,
            s.switching_voltage_exponent,
        )
        watts = energy * timing.frequency
        factor = 1.0 + s.switching_energy_slope * (temperature - s.test_temperature)
        return Line(watts * np.maximum(factor, 0.0), watts * np.where(factor > 0.0, s.switching_energy_slope, 0.0))


@dataclass(frozen=True)
class Switching:
    """The model."""

    name: str = "switching"
    source: str = SOURCE
    reads: PartKind = "switch"
    mechanisms: tuple[str, ...] = ("turn-on", "turn-off")
    settings: type[BaseModel] = SwitchingSettings

    def terms(self, settings: SwitchingSettings) -> tuple[LossTerm[Position], ...]:
        """Return a term for each energy given."""
        terms: list[LossTerm[Position]] = []
        if settings.turn_on_energy is not None:
            terms.append(EdgeTerm("turn-on", settings.turn_on_energy, settings.turn_on_current_exponent, settings))
        if settings.turn_off_energy is not None:
            terms.append(EdgeTerm("turn-off", settings.turn_off_energy, settings.turn_off_current_exponent, settings))
        return tuple(terms)


@hookimpl
def loss_model() -> Switching:
    """Offer turn-on and turn-off."""
    return Switching()
