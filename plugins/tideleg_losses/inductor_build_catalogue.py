"""A small catalogue of invented, generic cores, conductors and capacitors (grade "placeholder"), and its reader.

The same reader takes a person's own file of the same form. Every record is validated; the first fault names file,
record and key.
"""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Annotated, Any, Literal, Self, TypeVar

from pydantic import BaseModel, ConfigDict, Field, ValidationError, model_validator

from tideleg import InputError
from tideleg import quantity as q
from tideleg_losses.capacitor import CapacitorSettings
from tideleg_losses.inductor_build_core import CoreShape
from tideleg_losses.inductor_build_law import CoreLaw, FerriteLaw, PowderLaw
from tideleg_losses.inductor_build_winding import Wire

FOLDER = Path(__file__).with_name("catalogue")
Positive = Field(gt=0.0)


class _Record(BaseModel):
    model_config = ConfigDict(extra="forbid", frozen=True)

    name: str = Field(min_length=1)


class CoreRecord(_Record):
    """One core as a file states it; roll-off for H in oersted, as makers of powder cores publish it."""

    kind: Literal["ferrite", "powder"]
    area: Annotated[q.Area, Positive]
    path_length: Annotated[q.Length, Positive]
    volume: Annotated[q.Volume, Positive]
    window_area: Annotated[q.Area, Positive]
    window_height: Annotated[q.Length, Positive]
    mean_turn_length: Annotated[q.Length, Positive]
    density: Annotated[q.Density, Positive]
    flux_limit: Annotated[q.FluxDensity, Positive]
    permeability: float = Field(gt=1.0)
    saturation: Annotated[q.FluxDensity, Positive] | None = None
    roll_off_level: float = Field(default=1.0, gt=0.0, le=1.0)
    roll_off_factor_per_oersted: float | None = Field(default=None, gt=0.0)
    roll_off_exponent: float | None = Field(default=None, gt=1.0, le=4.0)
    steinmetz_k: float = Field(gt=0.0)
    steinmetz_alpha: float = Field(ge=1.0, le=2.5)
    steinmetz_beta: float = Field(ge=1.0, le=4.0)

    @model_validator(mode="after")
    def _has_its_law(self) -> Self:
        powder = (self.roll_off_factor_per_oersted, self.roll_off_exponent)
        if self.kind == "ferrite" and (self.saturation is None or any(x is not None for x in powder)):
            raise ValueError("a ferrite has saturation and no roll_off keys")
        if self.kind == "powder" and (self.saturation is not None or any(x is None for x in powder)):
            raise ValueError("a powder core has roll_off_factor_per_oersted and roll_off_exponent, and no saturation")
        if self.saturation is not None and self.flux_limit > self.saturation:
            raise ValueError(f"flux_limit: found {self.flux_limit:g} T, above the saturation {self.saturation:g} T")
        return self

    def shape(self) -> CoreShape:
        """Return the core."""
        return CoreShape(
            name=self.name,
            area=self.area,
            path_length=self.path_length,
            volume=self.volume,
            window_area=self.window_area,
            window_height=self.window_height,
            mean_turn_length=self.mean_turn_length,
            density=self.density,
            flux_limit=self.flux_limit,
            law=self._law(),
            steinmetz=(self.steinmetz_k, self.steinmetz_alpha, self.steinmetz_beta),
            may_be_gapped=self.kind == "ferrite",
        )

    def _law(self) -> CoreLaw:
        if self.saturation is not None:
            return FerriteLaw(self.permeability, self.saturation)
        assert self.roll_off_factor_per_oersted is not None
        assert self.roll_off_exponent is not None
        return PowderLaw.per_oersted(
            self.permeability, self.roll_off_level, self.roll_off_factor_per_oersted, self.roll_off_exponent
        )


class WireRecord(_Record):
    """One conductor as a file states it."""

    kind: Literal["round", "foil", "litz"]
    thickness: Annotated[q.Length, Positive]
    strands: int = Field(default=1, ge=1)
    width: Annotated[q.Length, Field(ge=0.0)] = 0.0
    outer: Annotated[q.Length, Positive]

    def wire(self) -> Wire:
        """Return the conductor."""
        return Wire(self.name, self.kind, self.thickness, self.strands, self.width, self.outer)


class CapacitorRecord(_Record):
    """One capacitor as a file states it; hot_spot_limit goes to [limits] capacitor_temperature."""

    kind: Literal["film", "electrolytic"]
    capacitance: Annotated[q.Capacitance, Positive]
    rated_voltage: Annotated[q.Voltage, Positive]
    rated_current: Annotated[q.Current, Positive]
    hot_spot_limit: q.Temperature
    esr_table: tuple[tuple[float | str, ...], ...]

    @model_validator(mode="after")
    def _table_is_sound(self) -> Self:
        CapacitorSettings(esr_table=self.esr_table)
        return self

    def plan_keys(self) -> dict[str, Any]:
        """Return the keys of a capacitor's table in a plan."""
        return self.model_dump(include={"name", "capacitance", "rated_voltage", "rated_current", "esr_table"})


_R = TypeVar("_R", bound=_Record)


def cores(file: Path | None = None) -> tuple[CoreShape, ...]:
    """Return the cores of a file, of the catalogue where none is given; faults raise InputError."""
    return tuple(record.shape() for record in _read(file or FOLDER / "cores.toml", "core", CoreRecord))


def wires(file: Path | None = None) -> tuple[Wire, ...]:
    """Return the conductors of a file, of the catalogue where none is given; faults raise InputError."""
    return tuple(record.wire() for record in _read(file or FOLDER / "wires.toml", "wire", WireRecord))


def capacitors(file: Path | None = None) -> tuple[CapacitorRecord, ...]:
    """Return the capacitors of a file, of the catalogue where none is given; faults raise InputError."""
    return _read(file or FOLDER / "capacitors.toml", "capacitor", CapacitorRecord)


def _read(file: Path, table: str, model: type[_R]) -> tuple[_R, ...]:
    try:
        data = tomllib.loads(file.read_text(encoding="utf-8-sig"))
    except (OSError, UnicodeDecodeError):
        raise InputError(f"{file}: no readable UTF-8 file; check the name") from None
    except tomllib.TOMLDecodeError as error:
        raise InputError(f"{file}: not valid TOML: {error}") from None
    if not isinstance(data.get("grade"), str):
        raise InputError(f'{file}, grade: is missing; say how far the data are to be trusted, such as "placeholder"')
    if unknown := sorted(set(data) - {"grade", table}):
        raise InputError(f"{file}, {unknown[0]}: this key is not known; the file holds grade and [[{table}]]")
    rows = data.get(table)
    if not isinstance(rows, list) or not rows:
        raise InputError(f"{file}: found no [[{table}]]; give one or more")
    found = tuple(_record(file, table, number, row, model) for number, row in enumerate(rows, start=1))
    names = [record.name for record in found]
    for name in names:
        if names.count(name) > 1:
            raise InputError(f"{file}: the name {name!r} stands twice; each {table} has its own")
    return found


def _record(file: Path, table: str, number: int, row: object, model: type[_R]) -> _R:
    try:
        return model.model_validate(row)
    except ValidationError as error:
        first = error.errors()[0]
        key = ".".join(str(step) for step in first["loc"])
        raise InputError(f"{file}, {table} {number}, {key or 'keys together'}: {first['msg']}") from None
