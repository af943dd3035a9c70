"""Turn-on and turn-off energy at the edges: scaled from a test point, or from the length of the transition."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Self

import numpy as np
from numpy.typing import NDArray
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import FloatArray, Line, LossTerm, PartKind, PointTable, Position, Timing, hookimpl, quantity
from tideleg_losses.edges import EnergyLaw, hard_turn_off_current, hard_turn_on_current, refuse_vanishing_slope
from tideleg_losses.energy_curve import EnergyCurve, edge_outside, energy_curve, gate_resistance_factor
from tideleg_losses.point_keys import EnergyByGateResistance, EnergyPoints
from tideleg_losses.shared_keys import refuse_keys_without, refuse_missing
from tideleg_losses.swing import PowerLaw, charge_moved
from tideleg_losses.transition import clamped_inductive_energy

SOURCE = (
    "E = E_ref (I/I_ref)^Ki (V/V_ref)^Kv (1 + TC (Tj - T_ref)): Semikron, Application Manual Power Semiconductors,"
    " 2nd ed., 2015 (form and exponents from memory); V I t/2 from times: ROHM, AEK59-D1-0065-2"
)


class SwitchingSettings(BaseModel):
    """Keys of [stage.switch], of ONE chip: energies at a test point, curves of points, or times.

    An energy holds at test_current, test_voltage and test_temperature. A curve holds at its own points; where it gives
    no voltages or temperatures, at test_voltage and test_temperature. turn_on_time and turn_off_time stand for V I t/2,
    which holds neither recovery nor output charge. The voltage exponent 1.3 is common for silicon IGBTs (from memory);
    the current exponents are 1 unless fitted. An energy known at two gate resistances or more is carried from that of
    the test to that in use. output_charge is read for a turn-on curve that does not end at zero: what is left at zero
    current fades over the current that swings that charge.
    """

    model_config = ConfigDict(extra="forbid")

    turn_on_energy: Annotated[quantity.Energy, Field(ge=0.0)] | None = None
    turn_off_energy: Annotated[quantity.Energy, Field(ge=0.0)] | None = None
    turn_on_energy_curve: EnergyPoints | None = None
    turn_off_energy_curve: EnergyPoints | None = None
    turn_on_time: Annotated[quantity.Time, Field(ge=0.0)] | None = None
    turn_off_time: Annotated[quantity.Time, Field(ge=0.0)] | None = None
    test_current: Annotated[quantity.Current, Field(gt=0.0)] | None = None
    test_voltage: Annotated[quantity.Voltage, Field(gt=0.0)] | None = None
    test_temperature: quantity.Temperature = 25.0
    turn_on_current_exponent: float = Field(default=1.0, gt=0.0, le=3.0)
    turn_off_current_exponent: float = Field(default=1.0, gt=0.0, le=3.0)
    switching_voltage_exponent: float = Field(default=1.3, gt=0.0, le=3.0)
    switching_energy_slope: quantity.RelativeSlope = 0.0
    turn_on_energy_by_gate_resistance: EnergyByGateResistance | None = None
    turn_off_energy_by_gate_resistance: EnergyByGateResistance | None = None
    turn_on_gate_resistance: Annotated[quantity.Resistance, Field(ge=0.0)] | None = None
    turn_off_gate_resistance: Annotated[quantity.Resistance, Field(ge=0.0)] | None = None
    test_gate_resistance: Annotated[quantity.Resistance, Field(ge=0.0)] | None = None
    output_charge: Annotated[quantity.Charge, Field(ge=0.0)] | None = None
    output_charge_exponent: float = Field(default=0.5, gt=0.0, le=1.0)

    @model_validator(mode="after")
    def _is_whole(self) -> Self:
        for edge in ("turn_on", "turn_off"):
            ways = tuple(f"{edge}_{what}" for what in ("energy", "energy_curve", "time"))
            given = [key for key in ways if getattr(self, key) is not None]
            if len(given) > 1:
                raise ValueError(f"found {given[0]} and {given[1]}; give one of them")
            refuse_keys_without(self, (ways[0],), (f"{edge}_current_exponent",))
            refuse_keys_without(self, ways[:2], (f"{edge}_energy_by_gate_resistance",))
        energies = ("turn_on_energy", "turn_off_energy")
        curves = ("turn_on_energy_curve", "turn_off_energy_curve")
        refuse_keys_without(self, (*energies, *curves), ("switching_voltage_exponent",))
        refuse_keys_without(self, (*energies, *curves, "turn_on_time", "turn_off_time"), ("switching_energy_slope",))
        if any(getattr(self, key) is not None for key in energies):
            refuse_missing(self, ("test_current", "test_voltage"), "a switching energy holds at a test point")
        refuse_vanishing_slope("switching_energy_slope", self.switching_energy_slope, self.test_temperature)
        return self

    @model_validator(mode="after")
    def _curves_hold(self) -> Self:
        on, off = self.law("turn_on"), self.law("turn_off")
        if isinstance(off, EnergyCurve) and off.at_zero_current() > 0.0:
            raise ValueError(
                f"turn_off_energy_curve: found {off.at_zero_current():g} J at no current; nothing is turned off there:"
                " give zero, or drop that point"
            )
        if isinstance(on, EnergyCurve) and on.at_zero_current() > 0.0:
            why = "turn_on_energy_curve gives energy at no current, which fades over the current that swings it"
            refuse_missing(self, ("output_charge", "test_voltage"), why)
        return self

    def law(self, edge: str) -> EnergyLaw | EnergyCurve | None:
        """Return how the energy of one edge ("turn_on" or "turn_off") scales, or None where nothing is given."""
        energy, curve, time = (getattr(self, f"{edge}_{what}") for what in ("energy", "energy_curve", "time"))
        degc, slope = self.test_temperature, self.switching_energy_slope
        if time is not None:
            return EnergyLaw(clamped_inductive_energy(1.0, 1.0, time), 1.0, 1.0, degc, 1.0, 1.0, slope)
        if energy is None and curve is None:
            return None
        key = f"{edge}_energy_by_gate_resistance"
        used = getattr(self, f"{edge}_gate_resistance")
        scale = gate_resistance_factor(getattr(self, key), used, self.test_gate_resistance, key, curve)
        exponent = self.switching_voltage_exponent
        if curve is not None:
            slope = self._slope_for(edge, curve)
            return energy_curve(curve, self.test_voltage, exponent, degc, slope, scale, used)
        if energy is None or self.test_current is None or self.test_voltage is None:
            return None
        exponents = getattr(self, f"{edge}_current_exponent"), exponent
        return EnergyLaw(scale * energy, self.test_current, self.test_voltage, degc, *exponents, slope)

    def _slope_for(self, edge: str, curve: PointTable) -> float:
        """Return the slope for one curve: none for points over temperature where the other edge has use for it."""
        other = "turn_off" if edge == "turn_on" else "turn_on"
        used = any(getattr(self, f"{other}_{what}") is not None for what in ("energy", "time"))
        points: PointTable | None = getattr(self, f"{other}_energy_curve")
        used = used or (points is not None and "temperature" not in points.axes)
        return 0.0 if used and "temperature" in curve.axes else self.switching_energy_slope


@dataclass(frozen=True)
class Standing:
    """What of a turn-on energy is left at zero current fades as the current swings the output charge before it."""

    law: PowerLaw

    def share(self, part: Position, timing: Timing) -> FloatArray:
        """Return how hard each turn-on is [-]; see `swing`."""
        share = self.law.hard_share(charge_moved(part.turn_on_current(), timing.dead_time), part.turn_on_voltage)
        return np.asarray(share * part.has_edges() * part.driven)


@dataclass(frozen=True)
class TurnOnTerm:
    """The energy of a run that begins with positive current, times the frequency; at or below zero it is soft."""

    law: EnergyLaw | EnergyCurve
    standing: Standing | None = None
    mechanism: str = "turn-on"
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Position, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one chip [W] and its slope [W/K]."""
        line = self.law.line(hard_turn_on_current(part), part.turn_on_voltage, timing.frequency, temperature)
        if self.standing is None:
            return line
        share = self.standing.share(part, timing)
        return Line(line.watts * share, line.watts_per_kelvin * share)

    def outside(self, part: Position, timing: Timing, temperature: FloatArray) -> NDArray[np.bool_]:
        """Return where the edge asks beyond the points of a curve."""
        return edge_outside(self.law, hard_turn_on_current(part), part.turn_on_voltage, temperature)


@dataclass(frozen=True)
class TurnOffTerm:
    """The energy of a run that ends with positive current, times the frequency; at or below zero it is soft."""

    law: EnergyLaw | EnergyCurve
    mechanism: str = "turn-off"
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Position, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one chip [W] and its slope [W/K]."""
        return self.law.line(hard_turn_off_current(part), part.blocks, timing.frequency, temperature)

    def outside(self, part: Position, timing: Timing, temperature: FloatArray) -> NDArray[np.bool_]:
        """Return where the edge asks beyond the points of a curve."""
        return edge_outside(self.law, hard_turn_off_current(part), part.blocks, temperature)


@dataclass(frozen=True)
class Switching:
    """The model."""

    name: str = "switching"
    source: str = SOURCE
    reads: PartKind = "switch"
    mechanisms: tuple[str, ...] = ("turn-on", "turn-off")
    settings: type[BaseModel] = SwitchingSettings

    def terms(self, settings: SwitchingSettings) -> tuple[LossTerm[Position], ...]:
        """Return a term for each edge whose energy, curve or time is given."""
        s = settings
        on, off = s.law("turn_on"), s.law("turn_off")
        found: list[LossTerm[Position]] = []
        if on is not None:
            found.append(TurnOnTerm(on, self._standing(s, on)))
        if off is not None:
            found.append(TurnOffTerm(off))
        return tuple(found)

    def _standing(self, s: SwitchingSettings, on: EnergyLaw | EnergyCurve) -> Standing | None:
        if not isinstance(on, EnergyCurve) or on.at_zero_current() == 0.0:
            return None
        if s.output_charge is None or s.test_voltage is None:
            return None
        return Standing(PowerLaw(s.output_charge, s.test_voltage, s.output_charge_exponent))


@hookimpl
def loss_model() -> Switching:
    """Offer turn-on and turn-off."""
    return Switching()
