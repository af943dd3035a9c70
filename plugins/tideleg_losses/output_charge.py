"""Output charge of both positions, lost at a hard turn-on."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Self

import numpy as np
from numpy.typing import NDArray
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import FloatArray, Line, LossTerm, PartKind, Position, Timing, hookimpl, quantity
from tideleg_losses.edges import HeldInTurnOn
from tideleg_losses.point_keys import ChargePoints, EnergyPoints
from tideleg_losses.shared_keys import refuse_double_count, refuse_keys_without, refuse_missing
from tideleg_losses.swing import ChargeCurve, PowerLaw, charge_moved

MECHANISM = "output charge"


class OutputChargeSettings(BaseModel):
    """Keys of [stage.switch], of ONE chip: output_charge or output_energy at test_voltage, or output_charge_curve.

    Q(V) = Q (V/V_test)^exponent; the exponent 0.5 is that of an abrupt junction. With output_energy E_oss alone the
    charge follows from the exponent; with charge and energy together the exponent follows from both. Or Q(V) is a
    curve of points, straight between them and to zero. output_charge_in_turn_on says whether turn_on_energy already
    holds the output charge; both together would count twice.
    """

    model_config = ConfigDict(extra="forbid")

    output_charge: Annotated[quantity.Charge, Field(ge=0.0)] | None = None
    output_energy: Annotated[quantity.Energy, Field(ge=0.0)] | None = None
    output_charge_curve: ChargePoints | None = None
    output_charge_exponent: float = Field(default=0.5, gt=0.0, le=1.0)
    output_charge_in_turn_on: bool | None = None
    test_voltage: Annotated[quantity.Voltage, Field(gt=0.0)] | None = None
    turn_on_energy: Annotated[quantity.Energy, Field(ge=0.0)] | None = None
    turn_on_energy_curve: EnergyPoints | None = None

    @model_validator(mode="after")
    def _counts_once(self) -> Self:
        points = ("output_charge", "output_energy")
        given = [key for key in (*points, "output_charge_curve") if getattr(self, key) is not None]
        refuse_double_count(self, "output_charge_in_turn_on", bool(given), "the output charge")
        refuse_keys_without(self, points, ("output_charge_exponent",))
        if self.output_charge_curve is not None and len(given) > 1:
            raise ValueError(f"found {given[0]} and output_charge_curve; give one of them")
        if given and given[0] in points:
            refuse_missing(self, ("test_voltage",), f"{given[0]} holds at a voltage")
        if len(given) == 2:
            if "output_charge_exponent" in self.model_fields_set:
                raise ValueError(
                    "output_charge and output_energy together give the exponent; drop output_charge_exponent"
                )
            self.law()
        if self.output_charge_curve is not None:
            charges = [q for _, q in sorted(self.output_charge_curve.points)]
            if any(after < before for after, before in zip(charges[1:], charges, strict=False)):
                raise ValueError("output_charge_curve: the charge falls with voltage; no capacitance does that")
        return self

    def law(self) -> PowerLaw | ChargeCurve | None:
        """Return Q(V), or None where no data are given."""
        if self.output_charge_curve is not None:
            volts, charges = zip(*sorted(self.output_charge_curve.points), strict=True)
            return ChargeCurve(tuple(volts), tuple(charges))
        if self.test_voltage is None:
            return None
        charge, energy, p = self.output_charge, self.output_energy, self.output_charge_exponent
        if charge is not None and energy is not None:
            share = energy / (charge * self.test_voltage) if charge > 0.0 else 0.0
            if not 0.0 < share <= 0.5:
                raise ValueError(
                    f"output_energy: found {share:.3g} of output_charge times test_voltage; a capacitance that does not"
                    " grow with voltage stores between 0 and 1/2 of it"
                )
            return PowerLaw(charge, self.test_voltage, share / (1.0 - share))
        if energy is not None:
            return PowerLaw(energy * (1.0 + p) / (p * self.test_voltage), self.test_voltage, p)
        return None if charge is None else PowerLaw(charge, self.test_voltage, p)


@dataclass(frozen=True)
class OutputChargeTerm:
    """Q(V) V at each hard turn-on, times the frequency: its own energy and what charging the opposite position costs.

    The link gives Q V to charge the opposite position, which keeps E_oss of it; the rest, and the E_oss of this one,
    heat this channel: Q V in all for two alike positions (charge balance). Negative current alone makes no soft
    turn-on: it must move the charge of both within the dead time; where it moves a part, see `swing`.
    """

    law: PowerLaw | ChargeCurve
    mechanism: str = MECHANISM
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Position, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one chip [W]; it does not depend on temperature."""
        voltage = part.turn_on_voltage
        charge = self.law.at(voltage)
        share = self.law.hard_share(charge_moved(part.turn_on_current(), timing.dead_time), voltage)
        watts = charge * voltage * share * timing.frequency * part.has_edges() * part.driven
        watts = watts + np.zeros_like(temperature)
        return Line(watts, np.zeros_like(watts))

    def outside(self, part: Position, timing: Timing, temperature: FloatArray) -> NDArray[np.bool_]:
        """Return where the voltage at turn-on lies beyond the points of a curve."""
        return self.law.outside(part.turn_on_voltage) & part.has_edges()


@dataclass(frozen=True)
class OutputCharge:
    """The model."""

    name: str = "output-charge"
    source: str = (
        "Q_oss V a hard turn-on, less what the current swings in the dead time: charge balance of two positions"
    )
    reads: PartKind = "switch"
    mechanisms: tuple[str, ...] = (MECHANISM,)
    settings: type[BaseModel] = OutputChargeSettings

    def terms(self, settings: OutputChargeSettings) -> tuple[LossTerm[Position], ...]:
        """Return the term if an output charge is given; one that adds nothing where turn_on_energy holds it."""
        if settings.output_charge_in_turn_on:
            return (HeldInTurnOn(MECHANISM),)
        law = settings.law()
        return () if law is None else (OutputChargeTerm(law),)


@hookimpl
def loss_model() -> OutputCharge:
    """Offer the output charge."""
    return OutputCharge()
