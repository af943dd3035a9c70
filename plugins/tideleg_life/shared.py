"""What the life models share: constants of nature, and the box within which data hold."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Annotated, NamedTuple

import numpy as np
from numpy.typing import NDArray
from pydantic import BaseModel, Field

from tideleg import FloatArray, Values, quantity

BOLTZMANN = 1.380649e-23
"""[J/K], exact since 2019."""

ELECTRONVOLT = 1.602176634e-19
"""[J], exact since 2019."""

ZERO_CELSIUS = 273.15
"""[K]"""

Spread = Annotated[float, Field(ge=0.0)]
"""Standard deviation of the natural logarithm of life between equal parts [-]; the person states it."""

SwingRange = tuple[quantity.TemperatureDifference, quantity.TemperatureDifference]
TemperatureRange = tuple[quantity.Temperature, quantity.Temperature]
TimeRange = tuple[quantity.Time, quantity.Time]


def kelvin(degc: Values) -> Values:
    """Return an absolute temperature [K]."""
    return degc + ZERO_CELSIUS


def arrhenius(energy: float, use_degc: Values, test_degc: Values) -> Values:
    """Return exp[(Ea/kB)(1/Tuse - 1/Ttest)]: how many times longer the same takes at the temperature of use [-].

    energy [J]; temperatures in degC, kelvin inside.
    """
    factor: Values = np.exp(energy / BOLTZMANN * (1.0 / kelvin(use_degc) - 1.0 / kelvin(test_degc)))
    return factor


class Side(NamedTuple):
    """One side of a validity box: what it bounds, least, greatest, unit."""

    what: str
    least: float
    greatest: float
    unit: str


class Box(NamedTuple):
    """The box within which the data of a life model hold."""

    sides: tuple[Side, ...]

    def outside(self, values: Mapping[str, FloatArray]) -> NDArray[np.bool_]:
        """Return where any value lies outside its side; keyed by what a side bounds."""
        beyond = [(values[s.what] < s.least) | (values[s.what] > s.greatest) for s in self.sides]
        return np.asarray(np.any(beyond, axis=0), dtype=bool)

    def words(self) -> str:
        """Return the box as words."""
        return ", ".join(f"{s.what} {s.least:g} to {s.greatest:g} {s.unit}".rstrip() for s in self.sides)


def refuse_mixed(settings: BaseModel, keys: tuple[str, ...]) -> None:
    """Raise ValueError unless either a published set of constants or every constant of one's own is given.

    Constants of one fit belong together: those of two sources differ by factors where either is right.
    """
    named = getattr(settings, "constants", None) is not None
    own = [key for key in keys if getattr(settings, key) is not None]
    if named and own:
        raise ValueError(f"constants and {own[0]} are both given; a fit belongs together: give one set or your own")
    if not named and len(own) < len(keys):
        missing = next(key for key in keys if getattr(settings, key) is None)
        raise ValueError(f"{missing} is missing: name a published set in constants, or give {', '.join(keys)} together")


def refuse_upside_down(settings: BaseModel, keys: tuple[str, ...]) -> None:
    """Raise ValueError for a range whose first value is not below its second."""
    for key in keys:
        given = getattr(settings, key)
        if given is not None and not given[0] < given[1]:
            raise ValueError(f"{key}: found [{given[0]:g}, {given[1]:g}]; give the lower value first")
