"""Conduction of a MOSFET channel, both ways."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Self

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import FloatArray, Line, LossTerm, PartKind, Position, Timing, Values, hookimpl, quantity
from tideleg_losses.edges import diode_current_at_begin, diode_current_at_end
from tideleg_losses.shared_keys import refuse_keys_without

REFERENCE_DEGC = 25.0
COLDEST_DEGC, HOTTEST_DEGC = -60.0, 250.0


class ChannelSettings(BaseModel):
    """Keys of [stage.switch]: R(T) = on_resistance (1 + slope (T - 25) + curvature (T - 25)²), of ONE chip.

    diode_voltage is read only to know whether the diode's share of the dead times is counted elsewhere.
    """

    model_config = ConfigDict(extra="forbid")

    on_resistance: Annotated[quantity.Resistance, Field(gt=0.0)] | None = None
    on_resistance_slope: quantity.RelativeSlope = 0.0
    on_resistance_curvature: float = Field(default=0.0, description="1/K²", allow_inf_nan=False)
    diode_voltage: Annotated[quantity.Voltage, Field(ge=0.0)] | None = None

    @model_validator(mode="after")
    def _stays_positive(self) -> Self:
        refuse_keys_without(self, ("on_resistance",), ("on_resistance_slope", "on_resistance_curvature"))
        degc = np.linspace(COLDEST_DEGC, HOTTEST_DEGC, 311)
        factor = resistance_factor(degc, self.on_resistance_slope, self.on_resistance_curvature)
        if np.any(factor <= 0.0):
            at = degc[int(np.argmax(factor <= 0.0))]
            raise ValueError(
                f"on_resistance_slope and on_resistance_curvature: found {self.on_resistance_slope:g} 1/K and"
                f" {self.on_resistance_curvature:g} 1/K², with which the resistance vanishes at {at:.0f} degC;"
                f" it must stay positive from {COLDEST_DEGC:.0f} to {HOTTEST_DEGC:.0f} degC"
            )
        return self


def resistance_factor(degc: FloatArray, slope: Values, curvature: Values) -> FloatArray:
    """Return R(T)/R(25 degC) [-]: a quadratic in temperature, common practice, no source."""
    rise = degc - REFERENCE_DEGC
    return np.asarray(1.0 + slope * rise + curvature * rise * rise)


def channel_mean_square(part: Position, timing: Timing) -> FloatArray:
    """Return the mean square of the run less the dead times, in which the diode carries the current [A²].

    The dead-time loss counts the diode in full, so the channel must not count the same time again. The current is
    taken as constant within a dead time.
    """
    by_diode = diode_current_at_begin(part) ** 2 + diode_current_at_end(part) ** 2
    return np.maximum(part.current.mean_square() - by_diode * timing.dead_time * timing.frequency, 0.0)


@dataclass(frozen=True)
class ChannelTerm:
    """R(T) times the mean square: Joule's law. Infineon, PFC boost converter design guide, DN 2013-01, Eq. 17.

    diode_counted : whether a dead-time loss takes the diode's share of the run; else the channel keeps it
    """

    resistance: Values
    slope: Values
    curvature: Values
    diode_counted: bool
    mechanism: str = "channel conduction"
    ohmic: bool = True
    heats: bool = True

    def at(self, part: Position, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one chip [W] and its slope [W/K].

        A channel that is held on for the whole period conducts as well, so `driven` plays no part.
        """
        square = channel_mean_square(part, timing) if self.diode_counted else part.current.mean_square()
        cold = self.resistance * square
        rise = temperature - REFERENCE_DEGC
        watts = cold * resistance_factor(temperature, self.slope, self.curvature)
        return Line(watts, cold * (self.slope + 2.0 * self.curvature * rise))


@dataclass(frozen=True)
class Channel:
    """The model."""

    name: str = "channel"
    source: str = "P = R(T) I_rms², Joule's law; R(T) quadratic: common practice, no source"
    reads: PartKind = "switch"
    mechanisms: tuple[str, ...] = ("channel conduction",)
    settings: type[BaseModel] = ChannelSettings

    def terms(self, settings: ChannelSettings) -> tuple[LossTerm[Position], ...]:
        """Return the term if an on-resistance is given."""
        s = settings
        if s.on_resistance is None:
            return ()
        diode_counted = s.diode_voltage is not None
        return (ChannelTerm(s.on_resistance, s.on_resistance_slope, s.on_resistance_curvature, diode_counted),)


@hookimpl
def loss_model() -> Channel:
    """Offer channel conduction."""
    return Channel()
