"""Reverse recovery of the diode that the opposite position's turn-on commutates."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Self

from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import FloatArray, Line, LossTerm, PartKind, Position, Timing, Values, hookimpl, quantity
from tideleg_losses.edges import EnergyLaw, HeldInTurnOn, diode_current_at_end, refuse_vanishing_slope
from tideleg_losses.shared_keys import refuse_double_count, refuse_keys_without, refuse_missing

MECHANISM = "recovery"


class RecoverySettings(BaseModel):
    """Keys of [stage.switch], of ONE chip.

    recovery_energy is what the diode itself loses at the test point; or recovery_charge, of which it keeps Q V/4.
    What recovery costs the opposite position belongs to turn_on_energy. recovery_in_turn_on says whether that holds
    the diode's part as well; both together would count twice. Exponents 0.6 are typical (from memory).
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
        data = ("recovery_energy", "recovery_charge")
        given = [key for key in data if getattr(self, key) is not None]
        refuse_double_count(self, "recovery_in_turn_on", bool(given), "the opposite diode's recovery")
        shape = ("recovery_current_exponent", "recovery_voltage_exponent", "recovery_energy_slope")
        refuse_keys_without(self, data, shape)
        if len(given) > 1:
            raise ValueError("found recovery_energy and recovery_charge; give one of them")
        if given:
            refuse_missing(self, ("test_current", "test_voltage"), f"{given[0]} holds at a test point")
        refuse_vanishing_slope("recovery_energy_slope", self.recovery_energy_slope, self.test_temperature)
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

    law: EnergyLaw
    mechanism: str = MECHANISM
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Position, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one chip [W] and its slope [W/K]."""
        return self.law.line(diode_current_at_end(part), part.blocks, timing.frequency, temperature)


@dataclass(frozen=True)
class Recovery:
    """The model."""

    name: str = "recovery"
    source: str = (
        "E_rr scaled as switching energies, exponents 0.6: Semikron, Application Manual, 2nd ed., 2015 (from memory)"
    )
    reads: PartKind = "switch"
    mechanisms: tuple[str, ...] = (MECHANISM,)
    settings: type[BaseModel] = RecoverySettings

    def terms(self, settings: RecoverySettings) -> tuple[LossTerm[Position], ...]:
        """Return the term if recovery data are given; one that adds nothing where turn_on_energy holds it."""
        s = settings
        if s.recovery_in_turn_on:
            return (HeldInTurnOn(MECHANISM),)
        if s.test_current is None or s.test_voltage is None:
            return ()
        energy: Values | None = s.recovery_energy
        if s.recovery_charge is not None:
            energy = energy_kept_by_diode(s.recovery_charge, s.test_voltage)
        if energy is None:
            return ()
        exponents = s.recovery_current_exponent, s.recovery_voltage_exponent
        point = s.test_current, s.test_voltage, s.test_temperature
        return (RecoveryTerm(EnergyLaw(energy, *point, *exponents, s.recovery_energy_slope)),)


@hookimpl
def loss_model() -> Recovery:
    """Offer recovery."""
    return Recovery()
