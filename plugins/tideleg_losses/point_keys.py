"""The kinds of tables of points that switches take, as annotated types for settings."""

from __future__ import annotations

from typing import Annotated

from pydantic import PlainValidator, WithJsonSchema

from tideleg import PointReader, PointTable

_AXES = {
    "current": "current",
    "voltage": "voltage",
    "temperature": "temperature",
    "gate_resistance": "resistance",
}
_ENERGY = PointReader("energy", "energy", _AXES, required=("current",))
_BY_GATE = PointReader("energy", "energy", {"resistance": "resistance"}, required=("resistance",), above_zero=True)
_RESISTANCE = PointReader(
    "resistance", "resistance", {"temperature": "temperature", "current": "current"}, above_zero=True
)
_FACTOR = PointReader("factor", "share", {"temperature": "temperature"}, required=("temperature",), above_zero=True)
_FORWARD = PointReader(
    "voltage", "voltage", {"current": "current", "temperature": "temperature"}, required=("current",)
)
_CHARGE = PointReader("charge", "charge", {"voltage": "voltage"}, required=("voltage",))

EnergyPoints = Annotated[PointTable, PlainValidator(_ENERGY), WithJsonSchema(_ENERGY.schema())]
"""Energy over current, and over voltage, temperature and gate resistance where given."""

EnergyByGateResistance = Annotated[PointTable, PlainValidator(_BY_GATE), WithJsonSchema(_BY_GATE.schema())]
"""Energy over gate resistance, all else alike."""

ResistancePoints = Annotated[PointTable, PlainValidator(_RESISTANCE), WithJsonSchema(_RESISTANCE.schema())]
"""Resistance over temperature, current or both."""

FactorPoints = Annotated[PointTable, PlainValidator(_FACTOR), WithJsonSchema(_FACTOR.schema())]
"""A factor over temperature, 1 at 25 degC."""

VoltagePoints = Annotated[PointTable, PlainValidator(_FORWARD), WithJsonSchema(_FORWARD.schema())]
"""Forward voltage over current, and over temperature where given."""

ChargePoints = Annotated[PointTable, PlainValidator(_CHARGE), WithJsonSchema(_CHARGE.schema())]
"""Charge over voltage."""
