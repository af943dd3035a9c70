"""Turn-on and turn-off energy at the edges: scaled from a test point, or from the length of the transition."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Self

from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import FloatArray, Line, LossTerm, PartKind, Position, Timing, hookimpl, quantity
from tideleg_losses.edges import EnergyLaw, hard_turn_off_current, hard_turn_on_current, refuse_vanishing_slope
from tideleg_losses.shared_keys import refuse_keys_without, refuse_missing
from tideleg_losses.transition import clamped_inductive_energy

SOURCE = (
    "E = E_ref (I/I_ref)^Ki (V/V_ref)^Kv (1 + TC (Tj - T_ref)): Semikron, Application Manual Power Semiconductors,"
    " 2nd ed., 2015 (form and exponents from memory); V I t/2 from times: ROHM, AEK59-D1-0065-2"
)


class SwitchingSettings(BaseModel):
    """Keys of [stage.switch], of ONE chip: energies at test_current, test_voltage and test_temperature, or times.

    turn_on_time and turn_off_time stand for V I t/2, which holds neither recovery nor output charge. The voltage
    exponent 1.3 is common for silicon IGBTs (from memory); the current exponents are 1 unless fitted.
    """

    model_config = ConfigDict(extra="forbid")

    turn_on_energy: Annotated[quantity.Energy, Field(ge=0.0)] | None = None
    turn_off_energy: Annotated[quantity.Energy, Field(ge=0.0)] | None = None
    turn_on_time: Annotated[quantity.Time, Field(ge=0.0)] | None = None
    turn_off_time: Annotated[quantity.Time, Field(ge=0.0)] | None = None
    test_current: Annotated[quantity.Current, Field(gt=0.0)] | None = None
    test_voltage: Annotated[quantity.Voltage, Field(gt=0.0)] | None = None
    test_temperature: quantity.Temperature = 25.0
    turn_on_current_exponent: float = Field(default=1.0, gt=0.0, le=3.0)
    turn_off_current_exponent: float = Field(default=1.0, gt=0.0, le=3.0)
    switching_voltage_exponent: float = Field(default=1.3, gt=0.0, le=3.0)
    switching_energy_slope: quantity.RelativeSlope = 0.0

    @model_validator(mode="after")
    def _is_whole(self) -> Self:
        for edge in ("turn_on", "turn_off"):
            energy, time = f"{edge}_energy", f"{edge}_time"
            if getattr(self, energy) is not None and getattr(self, time) is not None:
                raise ValueError(f"found {energy} and {time}; give one of them")
            refuse_keys_without(self, (energy,), (f"{edge}_current_exponent",))
        energies = ("turn_on_energy", "turn_off_energy")
        refuse_keys_without(self, energies, ("switching_voltage_exponent",))
        refuse_keys_without(self, (*energies, "turn_on_time", "turn_off_time"), ("switching_energy_slope",))
        if any(getattr(self, key) is not None for key in energies):
            refuse_missing(self, ("test_current", "test_voltage"), "a switching energy holds at a test point")
        refuse_vanishing_slope("switching_energy_slope", self.switching_energy_slope, self.test_temperature)
        return self

    def law(self, energy: float | None, time: float | None, current_exponent: float) -> EnergyLaw | None:
        """Return how the energy of one edge scales, or None where neither energy nor time is given."""
        warm = self.test_temperature, self.switching_energy_slope
        if time is not None:
            return EnergyLaw(clamped_inductive_energy(1.0, 1.0, time), 1.0, 1.0, warm[0], 1.0, 1.0, warm[1])
        if energy is None or self.test_current is None or self.test_voltage is None:
            return None
        exponents = current_exponent, self.switching_voltage_exponent
        return EnergyLaw(energy, self.test_current, self.test_voltage, warm[0], *exponents, warm[1])


@dataclass(frozen=True)
class TurnOnTerm:
    """The energy of a run that begins with positive current, times the frequency; at or below zero it is soft."""

    law: EnergyLaw
    mechanism: str = "turn-on"
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Position, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one chip [W] and its slope [W/K]."""
        return self.law.line(hard_turn_on_current(part), part.turn_on_voltage, timing.frequency, temperature)


@dataclass(frozen=True)
class TurnOffTerm:
    """The energy of a run that ends with positive current, times the frequency; at or below zero it is soft."""

    law: EnergyLaw
    mechanism: str = "turn-off"
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Position, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one chip [W] and its slope [W/K]."""
        return self.law.line(hard_turn_off_current(part), part.blocks, timing.frequency, temperature)


@dataclass(frozen=True)
class Switching:
    """The model."""

    name: str = "switching"
    source: str = SOURCE
    reads: PartKind = "switch"
    mechanisms: tuple[str, ...] = ("turn-on", "turn-off")
    settings: type[BaseModel] = SwitchingSettings

    def terms(self, settings: SwitchingSettings) -> tuple[LossTerm[Position], ...]:
        """Return a term for each edge whose energy or time is given."""
        s = settings
        on = s.law(s.turn_on_energy, s.turn_on_time, s.turn_on_current_exponent)
        off = s.law(s.turn_off_energy, s.turn_off_time, s.turn_off_current_exponent)
        found: list[LossTerm[Position]] = []
        if on is not None:
            found.append(TurnOnTerm(on))
        if off is not None:
            found.append(TurnOffTerm(off))
        return tuple(found)


@hookimpl
def loss_model() -> Switching:
    """Offer turn-on and turn-off."""
    return Switching()
