"""Power cycling of modules with heating time, bond current, voltage class and bond diameter: the CIPS 2008 form.

N = K dT^b1 exp(b2/T) ton^b3 I^b4 V^b5 D^b6 with dT [K], T the MINIMUM of the cycle [K], heating time ton [s],
current of one bond foot I [A], blocking voltage over 100 V, bond diameter D [um].
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Literal, NamedTuple, Self

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import Consumption, LifeTerm, Stress, Values, WornKind, hookimpl, quantity
from tideleg_life.shared import (
    Box,
    Side,
    Spread,
    SwingRange,
    TemperatureRange,
    TimeRange,
    kelvin,
    refuse_mixed,
    refuse_upside_down,
)

EXPONENTS = (-4.416, 1285.0, -0.463, -0.716, -0.761, -0.5)


class Fit(NamedTuple):
    """K and the six exponents; the second is a temperature [K]."""

    factor: float
    exponents: tuple[float, float, float, float, float, float]


PUBLISHED: dict[str, Fit] = {
    # Bayerer, Herrmann, Licht, Lutz, Feller, Model for power cycling lifetime of IGBT modules, CIPS 2008. From memory.
    "cips-2008": Fit(2.03e14, EXPONENTS),
    "cips-2008-later-chips": Fit(9.3e14, EXPONENTS),
}

PUBLISHED_SWING = (45.0, 150.0)
PUBLISHED_LOW = (20.0, 120.0)
PUBLISHED_HEATING = (1.0, 15.0)
"""Ranges of the published data: swing [K], minimum [degC], heating time [s]; from memory."""

PUBLISHED_CURRENT, PUBLISHED_VOLTAGE, PUBLISHED_DIAMETER = (3.0, 23.0), (600.0, 3300.0), (75e-6, 500e-6)
"""... and current of a bond foot [A], blocking voltage [V], bond diameter [m]; from memory."""

MICRO, HUNDRED_VOLT = 1e-6, 100.0


class Cips2008Settings(BaseModel):
    """Keys of [life.<part>].

    constants, or factor and exponents of one's own (six, in the order of the formula) with their ranges.
    blocking_voltage is that of the class, in volts; bond_current that of ONE bond foot while it heats. `temperature`
    names which of a cycle's temperatures the exponential takes: the published form takes the minimum, some secondary
    sources print the maximum.
    """

    model_config = ConfigDict(extra="forbid")

    constants: Literal["cips-2008", "cips-2008-later-chips"] | None = None
    factor: Annotated[float, Field(gt=0.0)] | None = None
    exponents: tuple[float, float, float, float, float, float] | None = None
    blocking_voltage: Annotated[quantity.Voltage, Field(gt=0.0)]
    bond_current: Annotated[quantity.Current, Field(gt=0.0)]
    bond_diameter: Annotated[quantity.Length, Field(gt=0.0)]
    temperature: Literal["minimum", "maximum"] = "minimum"
    swing_range: SwingRange | None = None
    temperature_range: TemperatureRange | None = None
    heating_time_range: TimeRange | None = None
    spread: Spread

    @model_validator(mode="after")
    def _one_fit(self) -> Self:
        refuse_mixed(self, ("factor", "exponents", "swing_range", "temperature_range", "heating_time_range"))
        refuse_upside_down(self, ("swing_range", "temperature_range", "heating_time_range"))
        if self.blocking_voltage < HUNDRED_VOLT:
            raise ValueError(
                f"blocking_voltage: found {self.blocking_voltage:g} V; give volts, the formula's V/100 is formed inside"
            )
        if self.exponents is not None and not (self.exponents[0] < 0.0 <= self.exponents[1]):
            raise ValueError("exponents: the first (swing) is below zero and the second (temperature) is not")
        return self

    def fit(self) -> Fit:
        """Return the constants."""
        if self.constants is not None:
            return PUBLISHED[self.constants]
        assert self.factor is not None
        assert self.exponents is not None
        return Fit(self.factor, self.exponents)


def cycles_to_failure(
    fit: Fit, swing: Values, degc: Values, heating: Values, foot_current: Values, voltage: Values, diameter: Values
) -> Values:
    """Return the median number of cycles: [K], [degC], [s], [A] per bond foot, blocking voltage [V], diameter [m]."""
    b = fit.exponents
    thermal = swing ** b[0] * np.exp(b[1] / kelvin(degc)) * heating ** b[2]
    number: Values = (
        fit.factor * thermal * foot_current ** b[3] * (voltage / HUNDRED_VOLT) ** b[4] * (diameter / MICRO) ** b[5]
    )
    return number


@dataclass(frozen=True)
class Cips2008Term:
    """The model with its data."""

    given: Cips2008Settings
    mechanism: str = "bond wires and solder, by swing, minimum and heating time"
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
                Side("swing", *(g.swing_range or PUBLISHED_SWING), "K"),
                Side(g.temperature, *(g.temperature_range or PUBLISHED_LOW), "degC"),
                Side("heating time", *(g.heating_time_range or PUBLISHED_HEATING), "s"),
            )
        )

    @property
    def box(self) -> str:
        """Where the data lie, in words."""
        build = "" if self._build_is_inside() else "; the build itself (bond current, voltage, diameter) lies outside"
        return self._box.words() + build

    def _build_is_inside(self) -> bool:
        """Whether bond current, voltage class and bond diameter lie within the published data; unknown for own fits."""
        g = self.given
        pairs = (
            (g.bond_current, PUBLISHED_CURRENT),
            (g.blocking_voltage, PUBLISHED_VOLTAGE),
            (g.bond_diameter, PUBLISHED_DIAMETER),
        )
        return g.constants is None or all(low <= value <= high for value, (low, high) in pairs)

    def consumed(self, stress: Stress) -> Consumption:
        """Return count/N of each cycle."""
        g, cycles = self.given, stress.cycles
        degc = cycles.minimum if g.temperature == "minimum" else cycles.maximum
        number = cycles_to_failure(
            g.fit(), cycles.range, degc, cycles.heating_time, g.bond_current, g.blocking_voltage, g.bond_diameter
        )
        outside = self._box.outside({"swing": cycles.range, g.temperature: degc, "heating time": cycles.heating_time})
        return Consumption(cycles.weight / number, outside | (not self._build_is_inside()))


@dataclass(frozen=True)
class Cips2008:
    """The model."""

    name: str = "cips-2008"
    source: str = "Bayerer, Herrmann, Licht, Lutz, Feller, CIPS 2008"
    reads: WornKind = "switch"
    settings: type[BaseModel] = Cips2008Settings

    def term(self, settings: Cips2008Settings) -> LifeTerm:
        """Return the model with its data."""
        return Cips2008Term(settings)


@hookimpl
def life_model() -> Cips2008:
    """Offer the model."""
    return Cips2008()
