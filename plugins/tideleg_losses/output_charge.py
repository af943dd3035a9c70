"""Output charge of both positions, lost at a hard turn-on."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Self

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import FloatArray, Line, LossTerm, PartKind, Position, Timing, Values, hookimpl, quantity
from tideleg_losses.edges import HeldInTurnOn
from tideleg_losses.shared_keys import refuse_double_count, refuse_keys_without, refuse_missing

MECHANISM = "output charge"


class OutputChargeSettings(BaseModel):
    """Keys of [stage.switch]: output_charge of ONE chip at test_voltage, Q(V) = Q (V/V_test)^exponent.

    The exponent 0.5 is that of an abrupt junction. output_charge_in_turn_on says whether turn_on_energy already holds
    the output charge; both together would count twice.
    """

    model_config = ConfigDict(extra="forbid")

    output_charge: Annotated[quantity.Charge, Field(ge=0.0)] | None = None
    output_charge_exponent: float = Field(default=0.5, gt=0.0, le=1.0)
    output_charge_in_turn_on: bool | None = None
    test_voltage: Annotated[quantity.Voltage, Field(gt=0.0)] | None = None
    turn_on_energy: Annotated[quantity.Energy, Field(ge=0.0)] | None = None

    @model_validator(mode="after")
    def _counts_once(self) -> Self:
        given = self.output_charge is not None
        refuse_double_count(self, "output_charge_in_turn_on", given, "the output charge")
        refuse_keys_without(self, ("output_charge",), ("output_charge_exponent",))
        if given:
            refuse_missing(self, ("test_voltage",), "output_charge holds at a voltage")
        return self


def charge_at(voltage: Values, charge: Values, test_voltage: Values, exponent: Values) -> FloatArray:
    """Return Q (V/V_test)^exponent [C]; none at zero voltage or below."""
    return np.asarray(charge * np.maximum(voltage / test_voltage, 0.0) ** exponent)


def stored_energy(charge: Values, voltage: Values, exponent: Values) -> Values:
    """Return E_oss, the integral of v dQ: Q V p/(1 + p) with Q growing as V^p [J].

    C V²/2 with the capacitance at one voltage is wrong by far, because the capacitance falls with voltage.
    """
    return charge * voltage * exponent / (1.0 + exponent)


def hard_share(current: FloatArray, dead_time: Values, charge: Values) -> FloatArray:
    """Return how hard a turn-on is [-]: 1 at or above zero current, 0 where the current swings the node in time.

    The node needs the charge of both positions, 2 Q, within the dead time: zero or negative current alone is not
    enough. Between the two a straight line in the charge moved, |i| t_d/(2 Q), keeps the loss continuous (modelling
    choice). Without a dead time nothing can swing, and every turn-on is hard.
    """
    both = 2.0 * np.asarray(charge)
    moved = current * dead_time / np.where(both > 0.0, both, 1.0)
    return np.clip(1.0 + moved, 0.0, 1.0)


@dataclass(frozen=True)
class OutputChargeTerm:
    """Q(V) V at each hard turn-on, times the frequency: its own energy and what charging the opposite position costs.

    The link gives Q V to charge the opposite position, which keeps E_oss of it; the rest, and the E_oss of this one,
    heat this channel: Q V in all for two alike positions (charge balance).
    """

    charge: Values
    exponent: Values
    test_voltage: Values
    mechanism: str = MECHANISM
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Position, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one chip [W]; it does not depend on temperature."""
        voltage = part.turn_on_voltage
        charge = charge_at(voltage, self.charge, self.test_voltage, self.exponent)
        share = hard_share(part.turn_on_current(), timing.dead_time, charge)
        watts = charge * voltage * share * timing.frequency * part.has_edges() * part.driven
        watts = watts + np.zeros_like(temperature)
        return Line(watts, np.zeros_like(watts))


@dataclass(frozen=True)
class OutputCharge:
    """The model."""

    name: str = "output-charge"
    source: str = "Q_oss V a hard turn-on: charge balance of two positions; ramp to soft: modelling choice, no source"
    reads: PartKind = "switch"
    mechanisms: tuple[str, ...] = (MECHANISM,)
    settings: type[BaseModel] = OutputChargeSettings

    def terms(self, settings: OutputChargeSettings) -> tuple[LossTerm[Position], ...]:
        """Return the term if an output charge is given; one that adds nothing where turn_on_energy holds it."""
        s = settings
        if s.output_charge_in_turn_on:
            return (HeldInTurnOn(MECHANISM),)
        if s.output_charge is None or s.test_voltage is None:
            return ()
        return (OutputChargeTerm(s.output_charge, s.output_charge_exponent, s.test_voltage),)


@hookimpl
def loss_model() -> OutputCharge:
    """Offer the output charge."""
    return OutputCharge()
