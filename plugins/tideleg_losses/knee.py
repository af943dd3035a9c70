"""Conduction with a knee: of an IGBT forward, and of a diode on a die of its own for all reverse current."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Literal, Self

import numpy as np
from numpy.typing import NDArray
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import FloatArray, Line, LossTerm, PartKind, Position, Timing, Values, Waveform, hookimpl, quantity
from tideleg_losses.channel_curve import reaches_beyond, shares_of_columns
from tideleg_losses.edges import COLDEST_DEGC, HOTTEST_DEGC
from tideleg_losses.family import Family, family
from tideleg_losses.point_keys import VoltagePoints
from tideleg_losses.shared_keys import refuse_keys_without

REFERENCE_DEGC = 25.0

SOURCE = (
    "V0 I_avg + r I_rms²: D. Graovac and M. Pürschel, IGBT Power Losses Calculation Using the Data-Sheet Parameters,"
    " Infineon, 2009, Eq. 1-3 (from memory)"
)


class KneeSettings(BaseModel):
    """Keys of [stage.switch] and [stage.switch.diode], of ONE chip: v = V0(T) + r(T) i, or a curve of v over i.

    V0 = knee_voltage + knee_voltage_slope (T - 25); r = knee_resistance (1 + knee_resistance_slope (T - 25)). In
    [stage.switch] they are an IGBT's, in [stage.switch.diode] its diode's.
    """

    model_config = ConfigDict(extra="forbid")

    knee_voltage: Annotated[quantity.Voltage, Field(ge=0.0)] | None = None
    knee_voltage_slope: float = Field(default=0.0, description="V/K", allow_inf_nan=False)
    knee_resistance: Annotated[quantity.Resistance, Field(ge=0.0)] = 0.0
    knee_resistance_slope: quantity.RelativeSlope = 0.0
    forward_voltage_curve: VoltagePoints | None = None

    @model_validator(mode="after")
    def _stays_positive(self) -> Self:
        straight = ("knee_voltage_slope", "knee_resistance", "knee_resistance_slope")
        refuse_keys_without(self, ("knee_voltage",), straight)
        if self.forward_voltage_curve is not None:
            if self.knee_voltage is not None:
                raise ValueError("found knee_voltage and forward_voltage_curve; give one of them")
            family(self.forward_voltage_curve, "hold")
        for degc in (COLDEST_DEGC, HOTTEST_DEGC):
            rise = degc - REFERENCE_DEGC
            volts = (self.knee_voltage or 0.0) + self.knee_voltage_slope * rise
            factor = 1.0 + self.knee_resistance_slope * rise
            if volts < 0.0 or factor <= 0.0:
                key, what = ("knee_voltage", f"{volts:.3g} V") if volts < 0.0 else ("knee_resistance", "no resistance")
                raise ValueError(
                    f"{key}_slope: with it there is {what} at {degc:g} degC; {key} must hold from {COLDEST_DEGC:g} to"
                    f" {HOTTEST_DEGC:g} degC: give a smaller slope"
                )
        return self


Way = Literal["forward", "reverse"]


def one_way(part: Position, way: Way) -> Waveform:
    """Return the current of a position in one direction, zero elsewhere."""
    return part.current.forward() if way == "forward" else part.current.reverse()


@dataclass(frozen=True)
class KneeTerm:
    """V0(T) |I|_avg + r(T) I_rms² of the current one way; see `SOURCE`.

    It counts as ohmic: over the squared current of the leg the loss of both dies is the mean drop in its way.
    """

    voltage: Values
    voltage_slope: Values
    resistance: Values
    resistance_slope: Values
    way: Way
    mechanism: str
    ohmic: bool = True
    heats: bool = True

    def at(self, part: Position, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one chip [W] and its slope [W/K]."""
        current = one_way(part, self.way)
        mean, square = np.abs(current.mean()), current.mean_square()
        rise = temperature - REFERENCE_DEGC
        # Both laws were accepted because they hold from -40 to 250 degC; a passing estimate beyond is held at zero.
        volts, factor = self.voltage + self.voltage_slope * rise, 1.0 + self.resistance_slope * rise
        watts = np.maximum(volts, 0.0) * mean + self.resistance * np.maximum(factor, 0.0) * square
        slope = np.where(volts > 0.0, self.voltage_slope, 0.0) * mean
        slope = slope + np.where(factor > 0.0, self.resistance * self.resistance_slope, 0.0) * square
        return Line(np.asarray(watts), np.asarray(slope))


@dataclass(frozen=True)
class ForwardCurveTerm:
    """The mean of v(|i|, T) |i| of the current one way, exact along straight pieces of current."""

    curve: Family
    way: Way
    mechanism: str
    scale: Values = 1.0
    ohmic: bool = True
    heats: bool = True

    def at(self, part: Position, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one chip [W] and its slope [W/K]."""
        shares = shares_of_columns(one_way(part, self.way), self.curve.current, 1)
        watts, slope = self.curve.weighted(shares, temperature)
        return Line(np.asarray(self.scale * watts), np.asarray(self.scale * slope))

    def outside(self, part: Position, timing: Timing, temperature: FloatArray) -> NDArray[np.bool_]:
        """Return where current or temperature lie beyond the points."""
        return reaches_beyond(self.curve, one_way(part, self.way), temperature)


def knee_terms(settings: KneeSettings, way: Way, mechanism: str) -> tuple[LossTerm[Position], ...]:
    """Return the term that the data support."""
    s = settings
    if s.forward_voltage_curve is not None:
        return (ForwardCurveTerm(family(s.forward_voltage_curve, "hold"), way, mechanism),)
    if s.knee_voltage is None:
        return ()
    knee = s.knee_voltage, s.knee_voltage_slope, s.knee_resistance, s.knee_resistance_slope
    return (KneeTerm(*knee, way, mechanism),)


@dataclass(frozen=True)
class Knee:
    """The model; an IGBT has a channel too, and its mechanism has the same name: a switch is one or the other."""

    name: str = "knee"
    source: str = SOURCE
    reads: PartKind = "switch"
    mechanisms: tuple[str, ...] = ("channel conduction",)
    settings: type[BaseModel] = KneeSettings
    carries: str = "forward"

    def terms(self, settings: KneeSettings) -> tuple[LossTerm[Position], ...]:
        """Return the term if a knee voltage or a curve is given."""
        return knee_terms(settings, "forward", "channel conduction")


@hookimpl
def loss_model() -> Knee:
    """Offer the conduction of an IGBT."""
    return Knee()
