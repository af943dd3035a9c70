"""Parts on one shared plate, and the coolant that warms along it.

Each switch stands on the plate through a Foster chain from junction to plate; inductors and capacitors through one
resistance with one time constant, on the plate or in the ambient air. The plate passes the heat of all parts to the
coolant, which warms by P/(rho cp q) from inlet to outlet.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Annotated, Any, Literal, Self

from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import CooledPart, InputError, Mass, Network, PartKind, Path, Seat, hookimpl, quantity

REFERENCE_SHARE = {"inlet": 0.0, "mean": 0.5, "outlet": 1.0}
"""Share of the coolant's whole rise at the place that plate_resistance refers to."""


class PlateSettings(BaseModel):
    """Keys of [cooling].

    plate_resistance runs from the plate to the coolant where `reference` says: at its inlet, its mean or its outlet
    temperature. Without flow data the coolant keeps its inlet temperature.
    """

    model_config = ConfigDict(extra="forbid")

    plate_resistance: Annotated[quantity.ThermalResistance, Field(gt=0.0)] | None = None
    plate_heat_capacity: Annotated[quantity.HeatCapacity, Field(ge=0.0)] = 0.0
    reference: Literal["inlet", "mean", "outlet"] = "mean"
    coolant_flow: Annotated[quantity.Flow, Field(gt=0.0)] | None = None
    coolant_density: Annotated[quantity.Density, Field(gt=0.0)] | None = None
    coolant_specific_heat: Annotated[quantity.SpecificHeat, Field(gt=0.0)] | None = None

    @model_validator(mode="after")
    def _flow_is_whole(self) -> Self:
        keys = ("coolant_flow", "coolant_density", "coolant_specific_heat")
        missing = [key for key in keys if getattr(self, key) is None]
        if 0 < len(missing) < len(keys):
            raise ValueError(f"{missing[0]} is missing: the coolant's rise needs {', '.join(keys)}")
        if missing and "reference" in self.model_fields_set and self.reference != "inlet":
            raise ValueError(
                f"reference: found {self.reference!r} without {', '.join(keys)}: the rise from the inlet is not known;"
                " give them, or leave reference out and the coolant keeps its inlet temperature"
            )
        return self

    def coolant_rise_per_watt(self) -> float:
        """Return the whole rise from inlet to outlet, 1/(rho cp q) [K/W]; zero without flow data."""
        if self.coolant_flow is None or self.coolant_density is None or self.coolant_specific_heat is None:
            return 0.0
        return 1.0 / (self.coolant_density * self.coolant_specific_heat * self.coolant_flow)


Cell = tuple[Annotated[quantity.ThermalResistance, Field(gt=0.0)], Annotated[quantity.Time, Field(ge=0.0)]]
"""One Foster cell: resistance [K/W] and time constant [s]; zero follows at once."""


class SwitchSeat(BaseModel):
    """Keys of [stage.switch] and its diode: Foster cells of ONE chip from junction to plate, an interface in series."""

    model_config = ConfigDict(extra="forbid")

    junction_to_plate: Annotated[tuple[Cell, ...], Field(min_length=1)] | None = None
    interface_resistance: Annotated[quantity.ThermalResistance, Field(ge=0.0)] | None = None

    @model_validator(mode="after")
    def _interface_has_a_chain(self) -> Self:
        if self.interface_resistance is not None and self.junction_to_plate is None:
            raise ValueError(
                "interface_resistance stands alone: it is in series with junction_to_plate; give that too,"
                " such as junction_to_plate = [['0.12 K/W', '20 ms']]"
            )
        return self


class InductorSeat(BaseModel):
    """Keys of [stage.inductor]: hot spot to its place, one cell."""

    model_config = ConfigDict(extra="forbid")

    thermal_resistance: Annotated[quantity.ThermalResistance, Field(gt=0.0)] | None = None
    thermal_time_constant: Annotated[quantity.Time, Field(ge=0.0)] = 0.0
    cooled_by: Literal["plate", "ambient"] = "plate"

    @model_validator(mode="after")
    def _has_a_resistance(self) -> Self:
        given = self.model_fields_set & {"thermal_time_constant", "cooled_by"}
        if self.thermal_resistance is None and given:
            raise ValueError(
                f"thermal_resistance is missing: {', '.join(sorted(given))} alone leave the temperature unknown;"
                " give it, such as thermal_resistance = '0.4 K/W'"
            )
        return self


class CapacitorSeat(InductorSeat):
    """Keys of a capacitor: hot spot to its place, one cell; in the ambient air unless said."""

    cooled_by: Literal["plate", "ambient"] = "ambient"


@dataclass(frozen=True)
class Plate:
    """The model."""

    name: str = "plate"
    source: str = "chains on a shared plate: series and sum of heat; coolant rise P/(rho cp q): energy balance"
    settings: type[BaseModel] = PlateSettings
    part_settings: Mapping[PartKind, type[BaseModel]] = field(
        default_factory=lambda: {
            "switch": SwitchSeat,
            "diode": SwitchSeat,
            "inductor": InductorSeat,
            "capacitor": CapacitorSeat,
        }
    )

    def without_coolant(self, settings: PlateSettings) -> PlateSettings | None:
        """Return the plate with its coolant standing still: only its own heat capacity takes heat."""
        if settings.plate_resistance is None:
            return None
        return settings.model_copy(update={"plate_resistance": LOST_RESISTANCE})

    def network(self, settings: PlateSettings, parts: Sequence[CooledPart]) -> Network:
        """Return the network of all parts that have thermal data."""
        seats = [seat for seat in (_seat(part) for part in parts) if seat is not None]
        on_plate = [seat.part for seat in seats if seat.base == "plate"]
        boundaries = ["coolant"] if on_plate else []
        if any(seat.base == "ambient" for seat in seats):
            boundaries.append("ambient")
        if not on_plate:
            return Network(tuple(boundaries), (), (), tuple(seats))
        if settings.plate_resistance is None:
            raise InputError(
                f"cooling.plate_resistance is missing: {', '.join(on_plate)} stand on the plate; give it,"
                " such as plate_resistance = '8 K/kW'"
            )
        rise = REFERENCE_SHARE[settings.reference] * settings.coolant_rise_per_watt()
        plate = Mass("plate", settings.plate_heat_capacity)
        if rise == 0.0:
            return Network(
                tuple(boundaries), (plate,), (Path("plate", "coolant", settings.plate_resistance),), tuple(seats)
            )
        # The coolant holds no heat of its own here: its local temperature is a joint behind the rise.
        local = Mass("coolant_at_plate", 0.0)
        paths = (Path("plate", local.name, settings.plate_resistance), Path(local.name, "coolant", rise))
        return Network(tuple(boundaries), (plate, local), paths, tuple(seats))


LOST_RESISTANCE = 1e6
"""Of a plate whose coolant stands still: far above every other way, and finite, so that the network stays one [K/W]."""


def _seat(part: CooledPart) -> Seat | None:
    keys: Any = part.settings
    if part.kind in ("switch", "diode"):
        if keys.junction_to_plate is None:
            return None
        cells = tuple((float(r), float(tau)) for r, tau in keys.junction_to_plate)
        if keys.interface_resistance:
            cells = (*cells, (float(keys.interface_resistance), 0.0))
        return Seat(part.name, "plate", cells, part.copies)
    if keys.thermal_resistance is None:
        return None
    cell = (float(keys.thermal_resistance), float(keys.thermal_time_constant))
    return Seat(part.name, keys.cooled_by, (cell,), part.copies)


@hookimpl
def cooling_model() -> Plate:
    """Offer the shared plate."""
    return Plate()
