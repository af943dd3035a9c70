"""Power cycling by swing and mean temperature: Coffin-Manson with an Arrhenius term.

N = A dT^alpha exp(Ea/(kB Tm)); Tm is the MEAN temperature of the cycle in kelvin.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Literal, NamedTuple, Self

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import Consumption, LifeTerm, Stress, Values, WornKind, hookimpl, quantity
from tideleg_life.shared import (
    BOLTZMANN,
    Box,
    Side,
    Spread,
    SwingRange,
    TemperatureRange,
    kelvin,
    refuse_mixed,
    refuse_upside_down,
)

AVOGADRO = 6.02214076e23
"""[1/mol]"""


class Constants(NamedTuple):
    """One fit: factor A [K^-alpha], exponent alpha [-], activation energy [J], and where its data lie."""

    factor: float
    exponent: float
    energy: float
    swing: tuple[float, float]
    mean: tuple[float, float]


PUBLISHED: dict[str, Constants] = {
    # Held et al., PEDS 1997, the LESIT tests; as tabulated in Lutz et al., Semiconductor Power Devices, ch. 11. From
    # memory, as is the range of the tests.
    "lesit-1997": Constants(302500.0, -5.039, 9.891e-20, (30.0, 80.0), (60.0, 100.0)),
    # An older fit to the same family of tests: A = 640, alpha = -5, Q = 78 kJ/mol. From memory. Never mix the two.
    "lesit-older": Constants(640.0, -5.0, 78e3 / AVOGADRO, (30.0, 80.0), (60.0, 100.0)),
}


class CoffinMansonSettings(BaseModel):
    """Keys of [life.<part>]: a published set by name, or factor, exponent, activation energy and ranges of one's own.

    factor A [K^-alpha] and exponent alpha (below zero) belong to swings in kelvin; activation_energy may be given in
    eV. `spread` is the standard deviation of the natural logarithm of life between equal parts.
    """

    model_config = ConfigDict(extra="forbid")

    constants: Literal["lesit-1997", "lesit-older"] | None = None
    factor: Annotated[float, Field(gt=0.0)] | None = None
    exponent: Annotated[float, Field(lt=0.0)] | None = None
    activation_energy: Annotated[quantity.Energy, Field(ge=0.0)] | None = None
    swing_range: SwingRange | None = None
    mean_range: TemperatureRange | None = None
    spread: Spread

    @model_validator(mode="after")
    def _one_fit(self) -> Self:
        refuse_mixed(self, ("factor", "exponent", "activation_energy", "swing_range", "mean_range"))
        refuse_upside_down(self, ("swing_range", "mean_range"))
        return self

    def fit(self) -> Constants:
        """Return the constants."""
        own = (self.factor, self.exponent, self.activation_energy, self.swing_range, self.mean_range)
        if self.constants is not None:
            return PUBLISHED[self.constants]
        return Constants(*(value for value in own if value is not None))  # type: ignore[arg-type]


def cycles_to_failure(fit: Constants, swing: Values, mean_degc: Values) -> Values:
    """Return the median number of cycles: swing [K], mean temperature of the cycle [degC]."""
    number: Values = fit.factor * swing**fit.exponent * np.exp(fit.energy / (BOLTZMANN * kelvin(mean_degc)))
    return number


@dataclass(frozen=True)
class CoffinMansonTerm:
    """The model with its constants."""

    fit: Constants
    spread: float
    mechanism: str = "bond wires and solder, by swing and mean"
    reads: Literal["cycles", "steps"] = "cycles"

    @property
    def _box(self) -> Box:
        return Box((Side("swing", *self.fit.swing, "K"), Side("mean", *self.fit.mean, "degC")))

    @property
    def box(self) -> str:
        """Where the data lie, in words."""
        return self._box.words()

    def consumed(self, stress: Stress) -> Consumption:
        """Return count/N of each cycle."""
        cycles = stress.cycles
        damage = cycles.weight / cycles_to_failure(self.fit, cycles.range, cycles.mean)
        return Consumption(damage, self._box.outside({"swing": cycles.range, "mean": cycles.mean}))


@dataclass(frozen=True)
class CoffinMansonArrhenius:
    """The model."""

    name: str = "coffin-manson-arrhenius"
    source: str = "N = A dT^alpha exp(Ea/(kB Tm)): Held et al., PEDS 1997; Lutz et al., Semiconductor Power Devices"
    reads: WornKind = "switch"
    settings: type[BaseModel] = CoffinMansonSettings

    def term(self, settings: CoffinMansonSettings) -> LifeTerm:
        """Return the model with its constants."""
        return CoffinMansonTerm(settings.fit(), settings.spread)


@hookimpl
def life_model() -> CoffinMansonArrhenius:
    """Offer the model."""
    return CoffinMansonArrhenius()
