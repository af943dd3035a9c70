"""Reverse recovery of the diode that the opposite position's turn-on commutates."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Self

import numpy as np
from numpy.typing import NDArray
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import FloatArray, Line, LossTerm, PartKind, Position, Timing, Values, hookimpl, quantity
from tideleg_losses.edges import EnergyLaw, HeldInTurnOn, diode_current_at_end, refuse_vanishing_slope
from tideleg_losses.energy_curve import EnergyCurve, edge_outside, energy_curve, gate_resistance_factor
from tideleg_losses.point_keys import EnergyByGateResistance, EnergyPoints
from tideleg_losses.shared_keys import refuse_double_count, refuse_keys_without, refuse_missing

MECHANISM = "recovery"
DATA = ("recovery_energy", "recovery_charge", "recovery_energy_curve")


class RecoveryData(BaseModel):
    """Keys of [stage.switch] and [stage.switch.diode], of ONE chip.

    recovery_energy is what the diode itself loses at the test point; or recovery_charge, of which it keeps Q V/4; or
    recovery_energy_curve, a table of points. What recovery costs the opposite position belongs to turn_on_energy.
    recovery_in_turn_on says whether that holds the diode's part as well; both together would count twice. Exponents
    0.6 are typical (from memory). The energy at two gate resistances or more, those of the opposite switch's turn-on,
    carries it from that of the test to that in use.
    """

    model_config = ConfigDict(extra="forbid")

    recovery_energy: Annotated[quantity.Energy, Field(ge=0.0)] | None = None
    recovery_charge: Annotated[quantity.Charge, Field(ge=0.0)] | None = None
    recovery_energy_curve: EnergyPoints | None = None
    recovery_in_turn_on: bool | None = None
    recovery_current_exponent: float = Field(default=0.6, gt=0.0, le=3.0)
    recovery_voltage_exponent: float = Field(default=0.6, gt=0.0, le=3.0)
    recovery_energy_slope: quantity.RelativeSlope = 0.0
    recovery_energy_by_gate_resistance: EnergyByGateResistance | None = None
    turn_on_gate_resistance: Annotated[quantity.Resistance, Field(ge=0.0)] | None = None
    test_gate_resistance: Annotated[quantity.Resistance, Field(ge=0.0)] | None = None
    test_current: Annotated[quantity.Current, Field(gt=0.0)] | None = None
    test_voltage: Annotated[quantity.Voltage, Field(gt=0.0)] | None = None
    test_temperature: quantity.Temperature = 25.0

    @model_validator(mode="after")
    def _is_whole(self) -> Self:
        given = self.given()
        points = ("recovery_energy", "recovery_charge")
        refuse_keys_without(self, points, ("recovery_current_exponent",))
        refuse_keys_without(self, DATA, ("recovery_voltage_exponent", "recovery_energy_slope"))
        refuse_keys_without(self, DATA, ("recovery_energy_by_gate_resistance",))
        if len(given) > 1:
            raise ValueError(f"found {given[0]} and {given[1]}; give one of them")
        if given and given[0] in points:
            refuse_missing(self, ("test_current", "test_voltage"), f"{given[0]} holds at a test point")
        refuse_vanishing_slope("recovery_energy_slope", self.recovery_energy_slope, self.test_temperature)
        law = self.law()
        if isinstance(law, EnergyCurve) and law.at_zero_current() > 0.0:
            raise ValueError(
                f"recovery_energy_curve: found {law.at_zero_current():g} J at no current; nothing recovers there: give"
                " zero, or drop that point"
            )
        return self

    def given(self) -> list[str]:
        """Return which keys give the energy."""
        return [key for key in DATA if getattr(self, key) is not None]

    def law(self) -> EnergyLaw | EnergyCurve | None:
        """Return how the energy scales, or None where no data are given."""
        if not self.given():
            return None
        key = "recovery_energy_by_gate_resistance"
        table, curve, used = (
            self.recovery_energy_by_gate_resistance,
            self.recovery_energy_curve,
            self.turn_on_gate_resistance,
        )
        scale = gate_resistance_factor(table, used, self.test_gate_resistance, key, curve)
        degc, slope = self.test_temperature, self.recovery_energy_slope
        exponent = self.recovery_voltage_exponent
        if curve is not None:
            return energy_curve(curve, self.test_voltage, exponent, degc, slope, scale, used)
        if self.test_current is None or self.test_voltage is None:
            return None
        energy: Values = self.recovery_energy or 0.0
        if self.recovery_charge is not None:
            energy = energy_kept_by_diode(self.recovery_charge, self.test_voltage)
        point = self.test_current, self.test_voltage, degc
        return EnergyLaw(scale * energy, *point, self.recovery_current_exponent, exponent, slope)


class RecoverySettings(RecoveryData):
    """Keys of [stage.switch]; turn_on_energy and turn_on_energy_curve are read to know what may hold the recovery."""

    turn_on_energy: Annotated[quantity.Energy, Field(ge=0.0)] | None = None
    turn_on_energy_curve: EnergyPoints | None = None

    @model_validator(mode="after")
    def _counts_once(self) -> Self:
        refuse_double_count(self, "recovery_in_turn_on", bool(self.given()), "the opposite diode's recovery")
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

    law: EnergyLaw | EnergyCurve
    mechanism: str = MECHANISM
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Position, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one chip [W] and its slope [W/K]."""
        return self.law.line(diode_current_at_end(part), part.blocks, timing.frequency, temperature)

    def outside(self, part: Position, timing: Timing, temperature: FloatArray) -> NDArray[np.bool_]:
        """Return where the edge asks beyond the points of a curve."""
        return edge_outside(self.law, diode_current_at_end(part), part.blocks, temperature)


def recovery_terms(settings: RecoveryData) -> tuple[LossTerm[Position], ...]:
    """Return the term if recovery data are given; one that adds nothing where turn_on_energy holds it."""
    if settings.recovery_in_turn_on:
        return (HeldInTurnOn(MECHANISM),)
    law = settings.law()
    return () if law is None else (RecoveryTerm(law),)


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
    carries: str = "reverse"

    def terms(self, settings: RecoverySettings) -> tuple[LossTerm[Position], ...]:
        """Return the term if recovery data are given."""
        return recovery_terms(settings)


@hookimpl
def loss_model() -> Recovery:
    """Offer recovery."""
    return Recovery()
