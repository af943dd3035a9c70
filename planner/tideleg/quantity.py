"""Quantities with units: the one place that knows prefixes and dimensions.

A quantity in a plan is a string such as "120 uH", "8 mohm", "65 degC", or a bare number, which is taken in the base
unit of its dimension (SI; degC for temperatures, 1 for shares). `parse` reads one; the annotated types below read one
as a field of a pydantic model and describe themselves in the JSON Schema.
"""

from __future__ import annotations

import math
import re
from collections.abc import Callable
from typing import Annotated, Any, NamedTuple

from pydantic import BeforeValidator, WithJsonSchema

_PREFIXES = {"p": 1e-12, "n": 1e-9, "u": 1e-6, "µ": 1e-6, "μ": 1e-6, "m": 1e-3, "k": 1e3, "M": 1e6, "G": 1e9}

_NUMBER_AND_UNIT = re.compile(r"^\s*([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*(.*?)\s*$")


class Dimension(NamedTuple):
    """A physical dimension and how people write it.

    base : unit of a bare number
    prefixed : units that take SI prefixes, with their size in the base unit
    plain : units that take none, with their size in the base unit
    example : a quantity as a person would write it
    """

    base: str
    prefixed: dict[str, float]
    plain: dict[str, float]
    example: str


_OHM = {"ohm": 1.0, "\u03a9": 1.0, "\u2126": 1.0}  # Greek omega and the ohm sign look alike
DIMENSIONS: dict[str, Dimension] = {
    "voltage": Dimension("V", {"V": 1.0}, {}, "750 V"),
    "current": Dimension("A", {"A": 1.0}, {}, "320 A"),
    "resistance": Dimension("ohm", _OHM, {}, "8 mohm"),
    "inductance": Dimension("H", {"H": 1.0}, {}, "120 uH"),
    "capacitance": Dimension("F", {"F": 1.0}, {}, "500 uF"),
    "frequency": Dimension("Hz", {"Hz": 1.0}, {}, "40 kHz"),
    "time": Dimension("s", {"s": 1.0}, {"min": 60.0, "h": 3600.0, "d": 86400.0, "years": 31557600.0}, "200 ns"),
    "power": Dimension("W", {"W": 1.0}, {}, "150 kW"),
    "energy": Dimension("J", {"J": 1.0, "Wh": 3600.0}, {"eV": 1.602176634e-19}, "2.4 mJ"),
    "charge": Dimension("C", {"C": 1.0, "Ah": 3600.0}, {}, "180 Ah"),
    "temperature": Dimension("degC", {}, {"degC": 1.0, "°C": 1.0}, "65 degC"),
    "temperature difference": Dimension("K", {"K": 1.0}, {}, "25 K"),
    "thermal resistance": Dimension("K/W", {"K/W": 1.0}, {"K/kW": 1e-3}, "0.12 K/W"),
    "heat capacity": Dimension("J/K", {"J/K": 1.0}, {}, "900 J/K"),
    "specific heat": Dimension("J/(kg K)", {"J/(kg K)": 1.0}, {"J/kg/K": 1.0}, "3600 J/(kg K)"),
    "density": Dimension("kg/m3", {}, {"kg/m3": 1.0, "g/cm3": 1e3, "kg/l": 1e3}, "1050 kg/m3"),
    "flow": Dimension("m3/s", {}, {"m3/s": 1.0, "l/min": 1e-3 / 60, "L/min": 1e-3 / 60, "m3/h": 1 / 3600}, "12 l/min"),
    "mass": Dimension("kg", {"g": 1e-3}, {"t": 1e3}, "18 t"),
    "length": Dimension("m", {"m": 1.0}, {"cm": 1e-2}, "1.2 mm"),
    "area": Dimension("m2", {}, {"m2": 1.0, "cm2": 1e-4, "mm2": 1e-6}, "6.4 cm2"),
    "volume": Dimension("m3", {}, {"m3": 1.0, "l": 1e-3, "cm3": 1e-6, "mm3": 1e-9}, "180 cm3"),
    "flux density": Dimension("T", {"T": 1.0}, {}, "0.3 T"),
    "speed": Dimension("m/s", {}, {"m/s": 1.0, "km/h": 1 / 3.6, "mph": 0.44704}, "50 km/h"),
    "force": Dimension("N", {"N": 1.0}, {}, "140 N"),
    "force per speed": Dimension("N/(m/s)", {}, {"N/(m/s)": 1.0, "N/(km/h)": 3.6}, "2 N/(m/s)"),
    "force per squared speed": Dimension("N/(m/s)2", {}, {"N/(m/s)2": 1.0, "N/(km/h)2": 12.96}, "0.05 N/(km/h)2"),
    "relative slope": Dimension("1/K", {}, {"1/K": 1.0, "%/K": 1e-2}, "0.4 %/K"),
    "share": Dimension("1", {}, {"%": 1e-2, "1": 1.0}, "30 %"),
}
"""Every dimension that a plan may hold, by name."""


def parse(given: object, dimension: str) -> float:
    """Return a quantity in the base unit of its dimension.

    Parameters
    ----------
    given : str, int or float
        "120 uH" and the like, or a bare number in the base unit.
    dimension : str
        A key of `DIMENSIONS`.

    Raises
    ------
    ValueError
        If the text is no quantity, its unit is of another dimension, or the number is not finite. The message says
        what came and what is allowed.

    Examples
    --------
    >>> parse("120 uH", "inductance")
    0.00012
    >>> parse(40e3, "frequency")
    40000.0
    """
    known = DIMENSIONS[dimension]
    if isinstance(given, bool) or not isinstance(given, (int, float, str)):
        raise ValueError(f"found {given!r}; give a {dimension} such as {known.example!r}")
    if not isinstance(given, str):
        return _finite(float(given), given, dimension)
    match = _NUMBER_AND_UNIT.match(given)
    if match is None:
        raise ValueError(f"found {given!r}, which starts with no number; give a {dimension} such as {known.example!r}")
    number, unit = float(match.group(1)), match.group(2)
    size = 1.0 if unit == "" else _unit_size(unit, known)
    if size is None:
        nature = _nature(unit)
        raise ValueError(f"found {given!r}, where the unit is {nature}; give a {dimension} such as {known.example!r}")
    return _finite(_scale(number, size), given, dimension)


def column_unit(unit: str, dimension: str, where: str) -> Callable[[float], float]:
    """Return what brings the numbers of a column with this unit to the base unit of its dimension.

    Column names are often written in lower case throughout: "energy_mj" is read as millijoule, "energy_MJ" as
    megajoule, "temperature_degc" as degree Celsius.

    Raises
    ------
    ValueError
        If the unit is of another dimension; `where` stands in front of the message.
    """
    known = DIMENSIONS[dimension]
    size = _unit_size(unit, known)
    if size is None:
        units = {**known.plain, **known.prefixed}
        units |= {f"{p}{u}": _PREFIXES[p] * s for u, s in known.prefixed.items() for p in "pnumk"}
        lower = {name.lower(): found for name, found in units.items()}
        size = lower.get(unit.lower()) if unit == unit.lower() else None
    if size is None:
        raise ValueError(
            f"{where}: the unit {unit!r} is {_nature(unit)}; wanted is a {dimension}, such as {known.base}"
        )
    return lambda number: _scale(number, size)


def _unit_size(unit: str, dimension: Dimension) -> float | None:
    if unit in dimension.plain:
        return dimension.plain[unit]
    if unit in dimension.prefixed:
        return dimension.prefixed[unit]
    head, tail = unit[:1], unit[1:]
    if head in _PREFIXES and tail in dimension.prefixed:
        return _PREFIXES[head] * dimension.prefixed[tail]
    return None


def _scale(number: float, size: float) -> float:
    # "120 uH" must be the same number as 120e-6 written by hand: divide by whole powers of ten, which are exact.
    inverse = round(1.0 / size)
    return number / inverse if size < 1.0 and math.isclose(inverse * size, 1.0, rel_tol=1e-12) else number * size


def _nature(unit: str) -> str:
    names = [name for name, dimension in DIMENSIONS.items() if _unit_size(unit, dimension) is not None]
    return f"a unit of {names[0]}" if names else "not known"


def _finite(value: float, given: object, dimension: str) -> float:
    if not math.isfinite(value):
        raise ValueError(f"found {given!r}, which is not a finite {dimension}")
    return value


class _Reader:
    """Reads a field of one dimension; a class so that the schema shows which."""

    def __init__(self, dimension: str) -> None:
        self.dimension = dimension

    def __call__(self, given: Any) -> float:
        return parse(given, self.dimension)


def _schema(dimension: str) -> WithJsonSchema:
    known = DIMENSIONS[dimension]
    units = ", ".join([*known.prefixed, *known.plain])
    return WithJsonSchema(
        {
            "anyOf": [{"type": "number"}, {"type": "string"}],
            "description": f"{dimension}: a string with unit ({units}; SI prefixes), or a number in {known.base}",
            "examples": [known.example],
        }
    )


Voltage = Annotated[float, BeforeValidator(_Reader("voltage")), _schema("voltage")]
Current = Annotated[float, BeforeValidator(_Reader("current")), _schema("current")]
Resistance = Annotated[float, BeforeValidator(_Reader("resistance")), _schema("resistance")]
Inductance = Annotated[float, BeforeValidator(_Reader("inductance")), _schema("inductance")]
Capacitance = Annotated[float, BeforeValidator(_Reader("capacitance")), _schema("capacitance")]
Frequency = Annotated[float, BeforeValidator(_Reader("frequency")), _schema("frequency")]
Time = Annotated[float, BeforeValidator(_Reader("time")), _schema("time")]
Power = Annotated[float, BeforeValidator(_Reader("power")), _schema("power")]
Energy = Annotated[float, BeforeValidator(_Reader("energy")), _schema("energy")]
Charge = Annotated[float, BeforeValidator(_Reader("charge")), _schema("charge")]
Temperature = Annotated[float, BeforeValidator(_Reader("temperature")), _schema("temperature")]
TemperatureDifference = Annotated[
    float, BeforeValidator(_Reader("temperature difference")), _schema("temperature difference")
]
ThermalResistance = Annotated[float, BeforeValidator(_Reader("thermal resistance")), _schema("thermal resistance")]
HeatCapacity = Annotated[float, BeforeValidator(_Reader("heat capacity")), _schema("heat capacity")]
SpecificHeat = Annotated[float, BeforeValidator(_Reader("specific heat")), _schema("specific heat")]
Density = Annotated[float, BeforeValidator(_Reader("density")), _schema("density")]
Flow = Annotated[float, BeforeValidator(_Reader("flow")), _schema("flow")]
Mass = Annotated[float, BeforeValidator(_Reader("mass")), _schema("mass")]
Length = Annotated[float, BeforeValidator(_Reader("length")), _schema("length")]
Area = Annotated[float, BeforeValidator(_Reader("area")), _schema("area")]
Volume = Annotated[float, BeforeValidator(_Reader("volume")), _schema("volume")]
FluxDensity = Annotated[float, BeforeValidator(_Reader("flux density")), _schema("flux density")]
Speed = Annotated[float, BeforeValidator(_Reader("speed")), _schema("speed")]
Force = Annotated[float, BeforeValidator(_Reader("force")), _schema("force")]
ForcePerSpeed = Annotated[float, BeforeValidator(_Reader("force per speed")), _schema("force per speed")]
ForcePerSquaredSpeed = Annotated[
    float, BeforeValidator(_Reader("force per squared speed")), _schema("force per squared speed")
]
RelativeSlope = Annotated[float, BeforeValidator(_Reader("relative slope")), _schema("relative slope")]
Share = Annotated[float, BeforeValidator(_Reader("share")), _schema("share")]
