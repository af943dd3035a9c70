"""Reverse recovery of the diode that the opposite position's turn-on commutates."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Self

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import FloatArray, Line, LossTerm, PartKind, Position, Timing, Values, hookimpl, quantity
from tideleg_losses.edges import diode_current_at_end, scaled_energy


class RecoverySettings(BaseModel):
    """Keys of [stage.switch].

    recovery_energy is what the diode itself loses at the test point; or recovery_charge, of which the diode keeps
    Q V/4. recovery_in_turn_on says whether turn_on_energy already holds the recovery; both together would count twice.
    """

    model_config = ConfigDict(extra="forbid")

    recovery_energy: Annotated[quantity.Energy, Field(ge=0.0)] | None = None
    recovery_charge: Annotated[quantity.Charge, Field(ge=0.0)] | None = None
    recovery_in_turn_on: bool | None = None
    recovery_current_exponent: float = Field(default=0.6, gt=0.0, le=3.0)
    recovery_voltage_exponent: float = Field(default=0.6, gt=0.0, le=3.0)
    recovery_energy_slope: quantity.RelativeSlope = 0.0
    test_current: Annotated[quantity.Current, Field(gt=0.0)] | None = None
    test_voltage: Annotated[quantity.Voltage, Field(gt=0.0)] | None = None
    test_temperature: quantity.Temperature = 25.0
    turn_on_energy: Annotated[quantity.Energy, Field(ge=0.0)] | None = None

    @model_validator(mode="after")
    def _counts_once(self) -> Self:
        if self.recovery_energy is None and self.recovery_charge is None:
            return self
        if self.recovery_energy is not None and self.recovery_charge is not None:
            raise ValueError("give recovery_energy or recovery_charge, not both")
        for key in ("test_current", "test_voltage"):
            if getattr(self, key) is None:
                raise ValueError(f"{key} is missing: recovery holds at a test point; give it")
        if self.turn_on_energy is not None and self.recovery_in_turn_on is None:
            raise ValueError(
                "recovery_in_turn_on is missing: turn_on_energy of a data sheet usually holds the opposite diode's"
                " recovery already; say true (recovery is then not added) or false"
            )
        return self


def energy_kept_by_diode(charge: Values, voltage: Values) -> Values:
    """Return Q V/4, the share of the recovery energy that the diode itself takes [J].

    D. Graovac and M. Pürschel, IGBT Power Losses Calculation Using the Data-Sheet Parameters, Infineon, 2009 (from
    memory). Others print up to V I_rr t_rr/2.
    """
    return charge * voltage / 4.0


@dataclass(frozen=True)
class RecoveryTerm:
    """Recovery energy at each run that ends with negative current, times the frequency."""

    energy: Values
    settings: RecoverySettings
    mechanism: str = "recovery"
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Position, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one chip [W] and its slope [W/K]."""
        s = self.settings
        assert s.test_current is not None
        assert s.test_voltage is not None
        exponents = (s.recovery_current_exponent, s.recovery_voltage_exponent)
        test_point = (s.test_current, s.test_voltage)
        energy = scaled_energy(self.energy, diode_current_at_end(part), part.blocks, *test_point, *exponents)
        watts = energy * timing.frequency
        factor = 1.0 + s.recovery_energy_slope * (temperature - s.test_temperature)
        return Line(watts * np.maximum(factor, 0.0), watts * np.where(factor > 0.0, s.recovery_energy_slope, 0.0))


@dataclass(frozen=True)
class Recovery:
    """The model."""

    name: str = "recovery"
    source: str = (
        "E_rr scaled as switching energies, exponents 0.6: Semikron, Application Manual, 2nd ed., 2015 (from memory)"
    )
    reads: PartKind = "switch"
    mechanisms: tuple[str, ...] = ("recovery",)
    settings: type[BaseModel] = RecoverySettings

    def terms(self, settings: RecoverySettings) -> tuple[LossTerm[Position], ...]:
        """Return the term if recovery data are given; zero energy where turn_on_energy already holds it."""
        energy: Values | None = settings.recovery_energy
        if settings.recovery_charge is not None and settings.test_voltage is not None:
            energy = energy_kept_by_diode(settings.recovery_charge, settings.test_voltage)
        if energy is None:
            return ()
        return (RecoveryTerm(0.0 if settings.recovery_in_turn_on else energy, settings),)


@hookimpl
def loss_model() -> Recovery:
    """Offer recovery."""
    return Recovery()
