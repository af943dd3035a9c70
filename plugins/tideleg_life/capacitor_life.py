"""Life of a capacitor by core temperature and voltage: 10-kelvin rule or Arrhenius, times a voltage law.

The stage's own thermal network has ripple heating in the temperature already: it is not added again here.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Literal, Self

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import Consumption, LifeTerm, Stress, Values, WornKind, hookimpl, quantity
from tideleg_life.shared import Box, Side, Spread, TemperatureRange, arrhenius, refuse_upside_down

TEN_KELVIN_CATEGORY = 105.0
"""The 10-kelvin rule is meant for parts with an upper category temperature up to this [degC]; found in Rubycon's
technical note, 5-1."""

HOUR_S = 3600.0


class CapacitorLifeSettings(BaseModel):
    """Keys of [life.<capacitor>].

    rated_life holds at rated_temperature (and rated_voltage). rated_at says whether the maker means the core, or the
    ambient with rated ripple: then core_rise is the rise of the core that rated ripple causes there. law: "ten-kelvin",
    or "arrhenius" with activation_energy. voltage_law: "none"; "power", (V0/V)^voltage_exponent; "linear",
    4.3 - 3.3 V/V0. temperature_range bounds the core temperature for which the data speak.
    """

    model_config = ConfigDict(extra="forbid")

    rated_life: Annotated[quantity.Time, Field(gt=0.0)]
    rated_temperature: quantity.Temperature
    rated_at: Literal["core", "ambient"]
    core_rise: Annotated[quantity.TemperatureDifference, Field(ge=0.0)] | None = None
    law: Literal["ten-kelvin", "arrhenius"]
    activation_energy: Annotated[quantity.Energy, Field(gt=0.0)] | None = None
    voltage_law: Literal["none", "power", "linear"]
    rated_voltage: Annotated[quantity.Voltage, Field(gt=0.0)] | None = None
    voltage_exponent: Annotated[float, Field(gt=0.0)] | None = None
    temperature_range: TemperatureRange
    spread: Spread

    @model_validator(mode="after")
    def _is_whole(self) -> Self:
        pairs = (
            ("core_rise", self.rated_at == "ambient", "rated_at = 'ambient'"),
            ("activation_energy", self.law == "arrhenius", "law = 'arrhenius'"),
            ("rated_voltage", self.voltage_law != "none", "a voltage_law"),
            ("voltage_exponent", self.voltage_law == "power", "voltage_law = 'power'"),
        )
        for key, needed, why in pairs:
            given = getattr(self, key) is not None
            if needed and not given:
                raise ValueError(f"{key} is missing: {why} needs it; give it")
            if given and not needed:
                raise ValueError(f"{key} does nothing without {why}; drop it or give that")
        if self.law == "ten-kelvin" and self.rated_temperature > TEN_KELVIN_CATEGORY:
            raise ValueError(
                f"law: the 10-kelvin rule is meant for parts rated up to {TEN_KELVIN_CATEGORY:g} degC; found"
                f" rated_temperature {self.rated_temperature:g} degC; give law = 'arrhenius' with activation_energy"
            )
        refuse_upside_down(self, ("temperature_range",))
        return self

    @property
    def rated_core(self) -> float:
        """Core temperature at which rated_life holds [degC]."""
        return self.rated_temperature + (self.core_rise or 0.0)


def ten_kelvin(rated_degc: Values, degc: Values) -> Values:
    """Return 2^((T0 - T)/10), how many times longer it lives at T than at T0 [-]."""
    factor: Values = 2.0 ** ((rated_degc - degc) / 10.0)
    return factor


def power_law(rated_voltage: Values, voltage: Values, exponent: Values) -> Values:
    """Return (V0/V)^n [-]."""
    factor: Values = (rated_voltage / voltage) ** exponent
    return factor


def linear_voltage(rated_voltage: Values, voltage: Values) -> Values:
    """Return 4.3 - 3.3 V/V0 [-]: Parler, life of electrolytic capacitors; constants from memory."""
    return 4.3 - 3.3 * voltage / rated_voltage


@dataclass(frozen=True)
class CapacitorTerm:
    """The model with its data."""

    given: CapacitorLifeSettings
    mechanism: str = "capacitor, by core temperature and voltage"
    reads: Literal["cycles", "steps"] = "steps"

    @property
    def spread(self) -> float:
        """Standard deviation of the natural logarithm of life [-]."""
        return self.given.spread

    @property
    def _box(self) -> Box:
        g = self.given
        sides = [Side("core", *g.temperature_range, "degC")]
        if g.rated_voltage is not None:
            sides.append(Side("voltage", 0.0, g.rated_voltage, "V"))
        return Box(tuple(sides))

    @property
    def box(self) -> str:
        """Where the data hold, in words."""
        return self._box.words()

    def life(self, degc: Values, voltage: Values) -> Values:
        """Return the median life at a constant core temperature [degC] and voltage [V], in seconds."""
        g = self.given
        life = g.rated_life * np.ones_like(np.asarray(degc, dtype=np.float64))
        if g.law == "ten-kelvin":
            life = life * ten_kelvin(g.rated_core, degc)
        elif g.activation_energy is not None:
            life = life * arrhenius(g.activation_energy, degc, g.rated_core)
        if g.rated_voltage is not None and g.voltage_exponent is not None:
            life = life * power_law(g.rated_voltage, np.maximum(voltage, np.finfo(float).tiny), g.voltage_exponent)
        elif g.rated_voltage is not None:
            # Above 4.3/3.3 of the rated voltage the straight line gives no life at all; that step breaks the part.
            life = life * np.maximum(linear_voltage(g.rated_voltage, voltage), np.finfo(float).eps)
        return life

    def consumed(self, stress: Stress) -> Consumption:
        """Return time over life of each step: phases combine by the sum of their shares, not by mean temperature."""
        damage = stress.duration / self.life(stress.temperature, stress.voltage)
        return Consumption(damage, self._box.outside({"core": stress.temperature, "voltage": stress.voltage}))


@dataclass(frozen=True)
class CapacitorLife:
    """The model."""

    name: str = "capacitor-life"
    source: str = "10-kelvin rule (common practice) or Arrhenius; (V0/V)^n, or 4.3 - 3.3 V/V0 after Parler"
    reads: WornKind = "capacitor"
    settings: type[BaseModel] = CapacitorLifeSettings

    def term(self, settings: CapacitorLifeSettings) -> LifeTerm:
        """Return the model with its data."""
        return CapacitorTerm(settings)


@hookimpl
def life_model() -> CapacitorLife:
    """Offer the model."""
    return CapacitorLife()
