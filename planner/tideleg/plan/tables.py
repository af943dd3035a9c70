"""The tables of a plan: what a person may write, with dimensions, signs and ranges; no physics."""

from __future__ import annotations

from itertools import pairwise
from pathlib import Path
from typing import Annotated, Any, Literal, Self

from pydantic import BaseModel, ConfigDict, Field, PrivateAttr, model_validator

from tideleg import quantity as q
from tideleg.errors import PlanError
from tideleg.plan.curve import Curve
from tideleg.plan.lines import line_of

Positive = Field(gt=0.0)
NotNegative = Field(ge=0.0)


class Table(BaseModel):
    """A table of the plan: frozen, and unknown keys are refused."""

    model_config = ConfigDict(extra="forbid", frozen=True, arbitrary_types_allowed=True)


class BatteryTable(Table):
    """[battery]; pack values after reading, also where cells were given.

    discharge_temperature, charge_temperature : between which it may give and take current
    aged_resistance, aged_capacity : of the aged pack that is run beside the new one, over the new values
    ripple_inductance : of the way to the battery, for the share of the ripple that reaches it
    """

    open_circuit_voltage: Curve
    resistance: Curve = Curve((0.0,), (0.0,))
    resistance_charge: Curve | None = None
    cells_in_series: int | None = Field(default=None, ge=1)
    cells_in_parallel: int | None = Field(default=None, ge=1)
    capacity: Annotated[q.Charge, Positive] | None = None
    start_soc: Annotated[q.Share, Field(ge=0.0, le=1.0)] | None = None
    soc_window: tuple[q.Share, q.Share] = (0.0, 1.0)
    current_limit_discharge: Annotated[q.Current, Positive] | None = None
    current_limit_charge: Annotated[q.Current, Positive] | None = None
    voltage_min: Annotated[q.Voltage, Positive] | None = None
    voltage_max: Annotated[q.Voltage, Positive] | None = None
    discharge_temperature: tuple[q.Temperature, q.Temperature] | None = None
    charge_temperature: tuple[q.Temperature, q.Temperature] | None = None
    aged_resistance: Annotated[q.Share, Field(ge=1.0)] = 1.7
    aged_capacity: Annotated[q.Share, Field(gt=0.0, le=1.0)] = 0.8
    ripple_inductance: Annotated[q.Inductance, NotNegative] = 0.0
    rc_pairs: tuple[tuple[Annotated[q.Resistance, Positive], Annotated[q.Time, Positive]], ...] = ()

    @model_validator(mode="after")
    def _is_a_battery(self) -> Self:
        low, high = self.soc_window
        curves = (self.open_circuit_voltage, self.resistance, self.resistance_charge)
        if not 0.0 <= low < high <= 1.0:
            raise ValueError(f"soc_window: found [{low:g}, {high:g}]; give two shares, 0 <= low < high <= 1")
        if self.capacity is None and any(curve is not None and len(curve.soc) > 1 for curve in curves):
            raise ValueError("capacity is missing: a curve over the state of charge needs it, such as '180 Ah'")
        if self.capacity is not None and self.start_soc is None:
            raise ValueError("start_soc is missing: with a capacity the start must be given, such as start_soc = 0.8")
        if self.start_soc is not None and not low <= self.start_soc <= high:
            raise ValueError(f"start_soc: found {self.start_soc:g}, outside soc_window [{low:g}, {high:g}]")
        if any(v <= 0.0 for v in self.open_circuit_voltage.value):
            raise ValueError("open_circuit_voltage must be above zero everywhere")
        if any(curve is not None and min(curve.value) < 0.0 for curve in curves[1:]):
            raise ValueError("resistance must not be negative")
        self._limits_leave_room()
        self._curves_cover_the_window()
        return self

    def _curves_cover_the_window(self) -> None:
        """Refuse what would have to be extrapolated, and ranges of temperature that hold nothing."""
        low, high = self.soc_window
        curves = (self.open_circuit_voltage, self.resistance, self.resistance_charge)
        for curve in (one for family in curves if family is not None for one in family.by_temperature().values()):
            if len(curve.soc) > 1 and (curve.soc[0] > low or curve.soc[-1] < high):
                raise ValueError(
                    f"a curve covers the state of charge from {curve.soc[0]:g} to {curve.soc[-1]:g}, not the whole"
                    f" soc_window [{low:g}, {high:g}]; nothing is extrapolated: add points or narrow the window"
                )
        for key in ("discharge_temperature", "charge_temperature"):
            allowed = getattr(self, key)
            if allowed is not None and allowed[0] >= allowed[1]:
                raise ValueError(f"{key}: found [{allowed[0]:g}, {allowed[1]:g}] degC; give the lower one first")

    def _limits_leave_room(self) -> None:
        """Refuse voltage limits that the resting battery passes at every state of charge: it could never work."""
        lowest, highest = min(self.open_circuit_voltage.value), max(self.open_circuit_voltage.value)
        if self.voltage_max is not None and self.voltage_max <= lowest:
            raise ValueError(
                f"voltage_max: found {self.voltage_max:g} V, below the battery at rest ({lowest:g} V and more)"
            )
        if self.voltage_min is not None and self.voltage_min >= highest:
            raise ValueError(
                f"voltage_min: found {self.voltage_min:g} V, above the battery at rest (at most {highest:g} V)"
            )


class LinkTable(Table):
    """[link]; capacitance is that of the whole bus, for energy and discharge."""

    voltage: Annotated[q.Voltage, Positive]
    trip_voltage: Annotated[q.Voltage, Positive] | None = None
    capacitance: Annotated[q.Capacitance, Positive] | None = None

    @model_validator(mode="after")
    def _trips_above(self) -> Self:
        if self.trip_voltage is not None and self.trip_voltage <= self.voltage:
            raise ValueError(f"trip_voltage: found {self.trip_voltage:g} V, not above voltage {self.voltage:g} V")
        return self


class StageTable(Table):
    """[stage]: the topology, its keys as written, and the part tables as written; plugins validate both.

    origins : file of each part key that came from a part file, by dotted key
    grades : worth of each part key that has one: measured, datasheet, typical or guess, by dotted key
    overridden : what a part file gives for a key that the plan gives itself, by dotted key
    placeholders : dotted tables whose part is invented
    part_files : part file of each dotted table that names one, as written
    """

    topology: str
    settings: dict[str, Any] = {}
    parts: dict[str, dict[str, Any]] = {}
    origins: dict[str, Path] = {}
    grades: dict[str, str] = {}
    overridden: dict[str, Any] = {}
    placeholders: tuple[str, ...] = ()
    part_files: dict[str, str] = {}

    def keys_of(self, table: str) -> dict[str, Any]:
        """Return the keys of a part table by its dotted name, without the tables inside it; empty where none is."""
        found: Any = self.parts
        for name in table.split("."):
            found = found.get(name, {})
        return {name: value for name, value in found.items() if not isinstance(value, dict)}


class CoolingTable(Table):
    """[cooling]: the model, and its keys as written."""

    model: str = "plate"
    settings: dict[str, Any] = {}


class LossesTable(Table):
    """[losses]: names of loss plugins to leave out."""

    leave_out: tuple[str, ...] = ()


class LimitsTable(Table):
    """[limits]; every key optional, shares between 0 and 1 or in percent."""

    junction_temperature: q.Temperature | None = None
    inductor_temperature: q.Temperature | None = None
    capacitor_temperature: q.Temperature | None = None
    inductor_peak_current: Annotated[q.Current, Positive] | None = None
    switch_current: Annotated[q.Current, Positive] | None = None
    ripple_ratio: Annotated[q.Share, Positive] | None = None
    voltage_utilisation: Annotated[q.Share, Field(gt=0.0, le=1.0)] | None = None
    capacitor_voltage_utilisation: Annotated[q.Share, Field(gt=0.0, le=1.0)] | None = None
    battery_voltage_ripple: Annotated[q.Voltage, Positive] | None = None
    battery_ripple_current: Annotated[q.Current, Positive] | None = None
    link_voltage_ripple: Annotated[q.Voltage, Positive] | None = None
    battery_capacitor_current: Annotated[q.Current, Positive] | None = None
    link_capacitor_current: Annotated[q.Current, Positive] | None = None
    curtailed_energy: Annotated[q.Share, Field(ge=0.0, le=1.0)] | None = None
    efficiency: Annotated[q.Share, Field(gt=0.0, lt=1.0)] | None = None


class WornTable(Table):
    """One [life.<part>]: the life model, and its keys as written; the plugin validates them.

    key : dotted key of the table, for messages
    """

    part: str
    key: str
    model: str
    settings: dict[str, Any] = {}


class LifeTable(Table):
    """[life]: what is asked of the life of parts, and the life models by part.

    residue : what cycles that never close count for
    target : life that must be reached, by all but a share `target_failures` of the stages
    load_spread : standard deviation of ln(life) by how stages are used, alike for all parts of one stage [-]
    hot_above : temperature above which hours are told apart
    """

    residue: Literal["half_cycles", "repeating", "closed_only"] = "repeating"
    target: Annotated[q.Time, Positive] | None = None
    target_failures: Annotated[q.Share, Field(gt=0.0, lt=1.0)] = 0.1
    load_spread: float = Field(default=0.0, ge=0.0)
    hot_above: q.Temperature | None = None
    parts: tuple[WornTable, ...] = ()


class VehicleTable(Table):
    """[vehicle]: turns a speed profile into power; either drag_area and rolling_resistance, or f0, f1, f2.

    regeneration_fade : speeds at or below which nothing is taken back, and at or above which the whole share is
    """

    mass: Annotated[q.Mass, Positive]
    rotating_mass_factor: float = Field(default=1.03, ge=1.0)
    drag_area: Annotated[q.Area, NotNegative] | None = None
    rolling_resistance: float | None = Field(default=None, ge=0.0)
    air_density: Annotated[q.Density, Positive] = 1.2
    f0: q.Force | None = None
    f1: q.ForcePerSpeed | None = None
    f2: q.ForcePerSquaredSpeed | None = None
    drivetrain_efficiency: Annotated[q.Share, Field(gt=0.0, le=1.0)] = 1.0
    regeneration_limit: Annotated[q.Power, NotNegative] | None = None
    regeneration_share: Annotated[q.Share, Field(ge=0.0, le=1.0)] = 1.0
    regeneration_fade: tuple[Annotated[q.Speed, NotNegative], Annotated[q.Speed, NotNegative]] | None = None
    auxiliary_power: Annotated[q.Power, NotNegative] = 0.0

    @model_validator(mode="after")
    def _fades_upward(self) -> Self:
        fade = self.regeneration_fade
        if fade is not None and fade[0] >= fade[1]:
            raise ValueError(
                f"regeneration_fade: found [{fade[0]:g}, {fade[1]:g}] m/s; give the speed without regeneration first,"
                " then the higher one from which on it is whole, such as ['5 km/h', '15 km/h']"
            )
        return self

    @model_validator(mode="after")
    def _one_form(self) -> Self:
        physical = self.drag_area is not None and self.rolling_resistance is not None
        fitted = self.f0 is not None and self.f1 is not None and self.f2 is not None
        mixed = (self.drag_area is not None or self.rolling_resistance is not None) and any(
            f is not None for f in (self.f0, self.f1, self.f2)
        )
        if mixed or physical == fitted:
            raise ValueError("give drag_area and rolling_resistance, or f0, f1 and f2: exactly one of the two forms")
        return self


class SizeTable(Table):
    """[size]: bounds for `tideleg size`."""

    leg_current: Annotated[q.Current, Positive] | None = None
    legs_max: int = Field(default=8, ge=1)
    in_parallel_max: int = Field(default=8, ge=1)
    voltage_classes: tuple[q.Voltage, ...] = (100.0, 650.0, 750.0, 1200.0, 1700.0)
    plate_resistance_range: tuple[q.ThermalResistance, q.ThermalResistance] = (2e-3, 0.2)


class SwitchBase(Table):
    """Core-known keys of a switch."""

    name: str | None = None
    in_parallel: int = Field(default=1, ge=1)
    sharing_spread: Annotated[q.Share, Field(ge=0.0, lt=1.0)] = 0.0
    rated_voltage: Annotated[q.Voltage, Positive] | None = None


class DiodeBase(Table):
    """Core-known keys of a diode on a die of its own; what is left out is as its switch has it."""

    name: str | None = None
    in_parallel: int | None = Field(default=None, ge=1)
    sharing_spread: Annotated[q.Share, Field(ge=0.0, lt=1.0)] | None = None


class InductorBase(Table):
    """Core-known keys of an inductor.

    inductance : at zero current; may be left out where a curve gives it
    inductance_curve : small-signal inductance over current, [[current, inductance], ...] from zero current on
    """

    name: str | None = None
    inductance: Annotated[q.Inductance, Positive]
    inductance_curve: tuple[tuple[q.Current, Annotated[q.Inductance, Positive]], ...] | None = None
    saturation_current: Annotated[q.Current, Positive] | None = None

    @model_validator(mode="before")
    @classmethod
    def _starts_on_its_curve(cls, given: Any) -> Any:
        curve = given.get("inductance_curve") if isinstance(given, dict) else None
        if curve and "inductance" not in given and isinstance(curve[0], list | tuple) and len(curve[0]) == 2:
            return {**given, "inductance": curve[0][1]}
        return given

    @model_validator(mode="after")
    def _curve_is_one(self) -> Self:
        curve = self.inductance_curve
        if curve is None:
            return self
        if len(curve) < 2 or curve[0][0] != 0.0:
            raise ValueError(
                "inductance_curve: give at least two points [current, inductance], the first at zero current"
            )
        for i, ((before, _), (after, _)) in enumerate(pairwise(curve), start=2):
            if after <= before:
                raise ValueError(f"inductance_curve: point {i}: current {after:g} A does not rise above {before:g} A")
        if abs(curve[0][1] - self.inductance) > 1e-6 * self.inductance:
            raise ValueError(
                f"inductance {self.inductance:g} H and inductance_curve {curve[0][1]:g} H at zero current differ; leave"
                " inductance out, or give one value"
            )
        return self


class TransformerBase(Table):
    """Core-known keys of a transformer; its data hold for both windings together, seen from the battery side."""

    name: str | None = None


class CapacitorBase(Table):
    """Core-known keys of a capacitor."""

    name: str | None = None
    capacitance: Annotated[q.Capacitance, Positive] | None = None
    rated_voltage: Annotated[q.Voltage, Positive] | None = None
    rated_current: Annotated[q.Current, Positive] | None = None
    external_ripple_current: Annotated[q.Current, NotNegative] | None = None
    external_ripple_spectrum: tuple[
        tuple[Annotated[q.Frequency, Positive], Annotated[q.Current, NotNegative]], ...
    ] = ()

    def external_mean_square(self) -> float:
        """Return the mean square of the ripple of others on the port [A²]: one number, or the sum of a spectrum's."""
        return (self.external_ripple_current or 0.0) ** 2 + sum(rms**2 for _, rms in self.external_ripple_spectrum)


class LayoutTable(Table):
    """layout of a [[mission]]: what is declared of its file; the rest is told from the file, or asked for.

    time, duration, power, speed, link_voltage, coolant, ambient, battery_temperature, power_peak, power_valley,
        power_max, power_min : names of columns in the file, peak and valley inside a step in the unit of power; once
        one is named, columns that are not known are left unread
    """

    time: str | None = None
    duration: str | None = None
    power: str | None = None
    speed: str | None = None
    link_voltage: str | None = None
    coolant: str | None = None
    ambient: str | None = None
    battery_temperature: str | None = None
    power_peak: str | None = None
    power_valley: str | None = None
    power_max: str | None = None
    power_min: str | None = None
    unit: Literal["W", "kW", "MW", "m/s", "km/h", "mph"] | None = None
    encoding: str | None = None
    separator: Literal[",", ";", "\t"] | None = None
    decimal: Literal[".", ","] | None = None
    header_line: int | None = Field(default=None, ge=1)
    stamps: Literal["seconds", "minutes", "hours", "clock", "iso", "day first", "month first"] | None = None
    longest_gap: Annotated[q.Time, Positive] | None = None
    gap: Literal["refuse", "hold", "zero"] = "refuse"
    missing: Literal["refuse", "drop"] = "refuse"

    @model_validator(mode="after")
    def _a_rule_has_a_length(self) -> Self:
        if self.gap != "refuse" and self.longest_gap is None:
            raise ValueError("longest_gap is missing: it says how long a step must be to be a hole, such as '60 s'")
        return self


class MissionTable(Table):
    """One [[mission]]: its profile is a file, or comes from a profile source with the keys of source_settings."""

    profile: str | None = None
    source: str | None = None
    source_settings: dict[str, Any] = {}
    layout: LayoutTable = LayoutTable()
    name: str | None = None
    passes_per_year: float = Field(default=1.0, gt=0.0)
    terminals: Literal["link", "battery"] = "link"
    interpolation: Literal["hold", "linear"] = "hold"
    sign: Literal["discharge", "charge"] = "discharge"
    coolant: q.Temperature | None = None
    ambient: q.Temperature | None = None
    battery_temperature: q.Temperature | None = None
    humidity: Annotated[q.Share, Field(gt=0.0, le=1.0)] | None = None
    start: Literal["soaked", "periodic"] | q.Temperature = "soaked"
    start_soc: Annotated[q.Share, Field(ge=0.0, le=1.0)] | None = None

    @model_validator(mode="after")
    def _one_origin(self) -> Self:
        if (self.profile is None) == (self.source is None):
            found = "neither" if self.profile is None else "both"
            raise ValueError(f"found {found} of profile and source; give exactly one: a file, or a profile source")
        if self.source is None and self.source_settings:
            raise ValueError("source_settings stands without source; name the source, or remove its settings")
        idle = sorted({"interpolation", "sign"} & self.model_fields_set)
        if self.source is not None and idle:
            raise ValueError(f"{idle[0]} tells how a profile file is read; a source states its own: remove it")
        return self

    @property
    def label(self) -> str:
        """The name in every output: as given, or the stem of the file, or the name of the source."""
        return self.name or (Path(self.profile).stem if self.profile is not None else str(self.source))


class YearTable(Table):
    """[year]: hours beside the missions in which the stage stands by, gates off and control alive."""

    standby_hours: float = Field(default=0.0, ge=0.0)


class Plan(Table):
    """A whole plan."""

    title: str
    battery: BatteryTable
    link: LinkTable
    stage: StageTable
    mission: tuple[MissionTable, ...] = Field(min_length=1)
    cooling: CoolingTable | None = None
    losses: LossesTable = LossesTable()
    limits: LimitsTable = LimitsTable()
    life: LifeTable | None = None
    vehicle: VehicleTable | None = None
    size: SizeTable | None = None
    year: YearTable = YearTable()
    _file: Path | None = PrivateAttr(default=None)
    _folder: Path = PrivateAttr(default=Path())
    _text: str = PrivateAttr(default="")
    _extra_files: tuple[Path, ...] = PrivateAttr(default=())

    @model_validator(mode="after")
    def _missions_start_in_the_window(self) -> Self:
        low, high = self.battery.soc_window
        for i, mission in enumerate(self.mission):
            soc = mission.start_soc
            if soc is None:
                continue
            if self.battery.capacity is None:
                raise ValueError(f"mission.{i}.start_soc: the battery has no capacity given, so no state of charge")
            if not low <= soc <= high:
                raise ValueError(f"mission.{i}.start_soc: found {soc:g}, outside soc_window [{low:g}, {high:g}]")
        return self

    @property
    def file(self) -> Path | None:
        """The plan file, or None for a plan made in Python."""
        return self._file

    @property
    def folder(self) -> Path:
        """Where relative file names start."""
        return self._folder

    @property
    def text(self) -> str:
        """The text of the plan file, for error lines; empty for a plan made in Python."""
        return self._text

    def fault(self, key: str, what: str) -> PlanError:
        """Return the error that says `what` about one dotted key, with the file and the line where it stands."""
        return PlanError(what, file=self._file, key=key, line=line_of(self._text, key) if self._text else None)

    @property
    def extra_files(self) -> tuple[Path, ...]:
        """Part files and curve files that the plan read."""
        return self._extra_files
