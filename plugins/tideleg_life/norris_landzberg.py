"""Solder fatigue by swing, cycling frequency and greatest temperature: Norris-Landzberg.

AF = (dTtest/dTuse)^n (fuse/ftest)^m exp[(Ea/kB)(1/Tuse - 1/Ttest)], T the MAXIMUM of the cycle in kelvin; the life in
use is AF times that of the test. The exponents of one source belong together.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Literal, NamedTuple, Self

from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import Consumption, FloatArray, LifeTerm, Stress, Values, WornKind, hookimpl, quantity
from tideleg_life.shared import (
    BOLTZMANN,
    Box,
    Side,
    Spread,
    SwingRange,
    TemperatureRange,
    arrhenius,
    refuse_mixed,
    refuse_upside_down,
)

DAY_S = 86400.0


class Exponents(NamedTuple):
    """n of the swing, m of the frequency [-], activation energy [J]."""

    swing: float
    frequency: float
    energy: float


PUBLISHED: dict[str, Exponents] = {
    # Norris, Landzberg, IBM J. Res. Dev. 13(3), 1969: tin-lead. Constants as given in the ESA reliability handbook.
    "norris-landzberg-1969": Exponents(1.9, 1.0 / 3.0, 1414.0 * BOLTZMANN),
    # Pan et al. 2005: lead-free (SAC). From memory; other authors pair the same n and m with another energy.
    "sac-2005": Exponents(2.65, 0.136, 2185.0 * BOLTZMANN),
}


class NorrisLandzbergSettings(BaseModel):
    """Keys of [life.<part>]: the test (life, swing, maximum, cycles a day), exponents, ranges, spread.

    The frequency of a cycle in use is taken from its own two turning points. Ranges bound the data: outside, the
    damage counts and is marked.
    """

    model_config = ConfigDict(extra="forbid")

    test_cycles: Annotated[float, Field(gt=0.0)]
    test_swing: Annotated[quantity.TemperatureDifference, Field(gt=0.0)]
    test_maximum: quantity.Temperature
    test_cycles_per_day: Annotated[float, Field(gt=0.0)]
    constants: Literal["norris-landzberg-1969", "sac-2005"] | None = None
    swing_exponent: Annotated[float, Field(gt=0.0)] | None = None
    frequency_exponent: Annotated[float, Field(ge=0.0)] | None = None
    activation_energy: Annotated[quantity.Energy, Field(ge=0.0)] | None = None
    swing_range: SwingRange
    maximum_range: TemperatureRange
    cycles_per_day_range: tuple[float, float]
    spread: Spread

    @model_validator(mode="after")
    def _one_fit(self) -> Self:
        refuse_mixed(self, ("swing_exponent", "frequency_exponent", "activation_energy"))
        refuse_upside_down(self, ("swing_range", "maximum_range", "cycles_per_day_range"))
        return self

    def exponents(self) -> Exponents:
        """Return the exponents."""
        own = (self.swing_exponent, self.frequency_exponent, self.activation_energy)
        if self.constants is not None:
            return PUBLISHED[self.constants]
        return Exponents(*(value for value in own if value is not None))


def acceleration(
    exponents: Exponents, swing: tuple[Values, Values], per_day: tuple[Values, Values], maximum: tuple[Values, Values]
) -> Values:
    """Return life in use over life in the test [-]; each pair is (test, use): [K], [1/day], [degC]."""
    by_swing = (swing[0] / swing[1]) ** exponents.swing
    by_frequency = (per_day[1] / per_day[0]) ** exponents.frequency
    return by_swing * by_frequency * arrhenius(exponents.energy, maximum[1], maximum[0])


@dataclass(frozen=True)
class NorrisLandzbergTerm:
    """The model with its data."""

    given: NorrisLandzbergSettings
    mechanism: str = "solder, by swing, frequency and maximum"
    reads: Literal["cycles", "steps"] = "cycles"

    @property
    def spread(self) -> float:
        """Standard deviation of the natural logarithm of life [-]."""
        return self.given.spread

    @property
    def _box(self) -> Box:
        g = self.given
        return Box(
            (
                Side("swing", *g.swing_range, "K"),
                Side("maximum", *g.maximum_range, "degC"),
                Side("cycles a day", *g.cycles_per_day_range, ""),
            )
        )

    @property
    def box(self) -> str:
        """Where the data lie, in words."""
        return self._box.words()

    def consumed(self, stress: Stress) -> Consumption:
        """Return count/N of each cycle."""
        g, cycles = self.given, stress.cycles
        per_day: FloatArray = DAY_S / (2.0 * cycles.heating_time)
        factor = acceleration(
            g.exponents(),
            (g.test_swing, cycles.range),
            (g.test_cycles_per_day, per_day),
            (g.test_maximum, cycles.maximum),
        )
        values = {"swing": cycles.range, "maximum": cycles.maximum, "cycles a day": per_day}
        return Consumption(cycles.weight / (g.test_cycles * factor), self._box.outside(values))


@dataclass(frozen=True)
class NorrisLandzberg:
    """The model."""

    name: str = "norris-landzberg"
    source: str = "Norris, Landzberg, IBM J. Res. Dev. 13(3), 1969; lead-free constants: Pan et al. 2005"
    reads: WornKind = "switch"
    settings: type[BaseModel] = NorrisLandzbergSettings

    def term(self, settings: NorrisLandzbergSettings) -> LifeTerm:
        """Return the model with its data."""
        return NorrisLandzbergTerm(settings)


@hookimpl
def life_model() -> NorrisLandzberg:
    """Offer the model."""
    return NorrisLandzberg()
