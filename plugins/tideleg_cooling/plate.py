"""Parts on one shared plate, and the coolant that warms along it.

Each switch stands on the plate through a Foster chain from junction to plate; inductors and capacitors through one
resistance with one time constant, on the plate or in the ambient air. The plate passes the heat of all parts to the
coolant, which warms by P/(rho cp q) from inlet to outlet.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Annotated, Any, Literal, NamedTuple, Self

from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import CooledPart, InputError, Mass, Network, PartKind, Path, Seat, hookimpl, quantity

REFERENCE_SHARE = {"inlet": 0.0, "mean": 0.5, "outlet": 1.0}
"""Share of the coolant's whole rise at the place that plate_resistance refers to."""


class PlateSettings(BaseModel):
    """Keys of [cooling].

    plate_resistance runs from the plate to the coolant where `reference` says: at its inlet, its mean or its outlet
    temperature. Without flow data the coolant keeps its inlet temperature. resistance_factor multiplies it: fouling of
    the coolant side, or thin air at altitude, as the user's own figure.
    """

    model_config = ConfigDict(extra="forbid")

    plate_resistance: Annotated[quantity.ThermalResistance, Field(gt=0.0)] | None = None
    resistance_factor: float = Field(default=1.0, ge=1.0, le=100.0)
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


Rung = tuple[Annotated[quantity.ThermalResistance, Field(gt=0.0)], Annotated[quantity.HeatCapacity, Field(gt=0.0)]]
"""One place of a Cauer ladder: resistance to the next place [K/W] and heat capacity [J/K]."""


class SwitchSeat(BaseModel):
    """Keys of [stage.switch] and its diode, of ONE chip from junction to plate, and an interface in series.

    junction_to_plate : Foster cells (resistance, time constant), as a curve of Zth is fitted; their inner nodes are no
        places, so all heat of the chip reaches the plate at once
    junction_to_plate_ladder : Cauer places (resistance to the next, heat capacity) from the junction on; heat passes
        from place to place and reaches the plate later
    """

    model_config = ConfigDict(extra="forbid")

    junction_to_plate: Annotated[tuple[Cell, ...], Field(min_length=1)] | None = None
    junction_to_plate_ladder: Annotated[tuple[Rung, ...], Field(min_length=1)] | None = None
    interface_resistance: Annotated[quantity.ThermalResistance, Field(ge=0.0)] | None = None

    @model_validator(mode="after")
    def _interface_has_a_chain(self) -> Self:
        if self.junction_to_plate is not None and self.junction_to_plate_ladder is not None:
            raise ValueError(
                "junction_to_plate and junction_to_plate_ladder say the same in two ways; give one of them"
            )
        if self.interface_resistance is not None and self._chain() is None:
            raise ValueError(
                "interface_resistance stands alone: it is in series with junction_to_plate; give that too,"
                " such as junction_to_plate = [['0.12 K/W', '20 ms']]"
            )
        return self

    def _chain(self) -> object:
        return self.junction_to_plate if self.junction_to_plate is not None else self.junction_to_plate_ladder


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


_PART_SETTINGS: dict[PartKind, type[BaseModel]] = {
    "switch": SwitchSeat,
    "diode": SwitchSeat,
    "inductor": InductorSeat,
    "capacitor": CapacitorSeat,
}


@dataclass(frozen=True)
class Plate:
    """The model."""

    name: str = "plate"
    source: str = "chains on a shared plate: series and sum of heat; coolant rise P/(rho cp q): energy balance"
    settings: type[BaseModel] = PlateSettings
    part_settings: Mapping[PartKind, type[BaseModel]] = field(default_factory=lambda: dict(_PART_SETTINGS))

    def without_coolant(self, settings: PlateSettings) -> PlateSettings | None:
        """Return the plate with its coolant standing still: only its own heat capacity takes heat."""
        if settings.plate_resistance is None:
            return None
        return settings.model_copy(update={"plate_resistance": LOST_RESISTANCE})

    def network(self, settings: PlateSettings, parts: Sequence[CooledPart]) -> Network:
        """Return the network of all parts that have thermal data."""
        stands = [stand for stand in (_stand(part) for part in parts) if stand is not None]
        seats = [stand.seat for stand in stands]
        ladders = tuple(mass for stand in stands for mass in stand.masses)
        rungs = tuple(path for stand in stands for path in stand.paths)
        on_plate = [seat.part for seat in seats if seat.base != "ambient"]
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
        to_coolant = settings.plate_resistance * settings.resistance_factor
        if rise == 0.0:
            paths = (Path("plate", "coolant", to_coolant), *rungs)
            return Network(tuple(boundaries), (plate, *ladders), paths, tuple(seats))
        # The coolant holds no heat of its own here: its local temperature is a joint behind the rise.
        local = Mass("coolant_at_plate", 0.0)
        paths = (Path("plate", local.name, to_coolant), Path(local.name, "coolant", rise), *rungs)
        return Network(tuple(boundaries), (plate, local, *ladders), paths, tuple(seats))


LOST_RESISTANCE = 1e6
"""Of a plate whose coolant stands still: far above every other way, and finite, so that the network stays one [K/W]."""


class _Stand(NamedTuple):
    """Where a part's heat goes in, and the places of its own between there and the plate."""

    seat: Seat
    masses: tuple[Mass, ...] = ()
    paths: tuple[Path, ...] = ()


def _stand(part: CooledPart) -> _Stand | None:
    keys: Any = part.settings
    ladder = getattr(keys, "junction_to_plate_ladder", None)
    if ladder is not None:
        return _on_ladder(part, ladder, float(keys.interface_resistance or 0.0))
    seat = _seat(part)
    return None if seat is None else _Stand(seat)


def _on_ladder(part: CooledPart, ladder: Sequence[tuple[float, float]], interface: float) -> _Stand:
    """Return the ladder of all equal chips as one: they are alike, so places of one height share a temperature.

    Heat capacities add and resistances divide by the number of chips; the interface lies in series with the last one.
    """
    names = [f"{part.name} place {i}" for i in range(1, len(ladder) + 1)]
    masses, paths = [], []
    for i, (resistance, capacity) in enumerate(ladder):
        last = i + 1 == len(ladder)
        masses.append(Mass(names[i], capacity * part.copies))
        ohms = (resistance + interface if last else resistance) / part.copies
        paths.append(Path(names[i], "plate" if last else names[i + 1], ohms))
    return _Stand(Seat(part.name, names[0], (), part.copies), tuple(masses), tuple(paths))


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
