"""Conduction of a MOSFET channel, both ways, and of its body diode beside it in reverse."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Self

import numpy as np
from numpy.typing import NDArray
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import FloatArray, Line, LossTerm, PartKind, PointTable, Position, Timing, Values, hookimpl, quantity
from tideleg_losses.channel_curve import CurveChannelTerm
from tideleg_losses.edges import diode_current_at_begin, diode_current_at_end
from tideleg_losses.family import Family, Span, family
from tideleg_losses.moments import moments
from tideleg_losses.point_keys import FactorPoints, ResistancePoints
from tideleg_losses.shared_keys import refuse_keys_without
from tideleg_losses.third_quadrant import BodyDiode

REFERENCE_DEGC = 25.0
COLDEST_DEGC, HOTTEST_DEGC = -60.0, 250.0
ACCEPTED = Span(COLDEST_DEGC, HOTTEST_DEGC)
SHAPES = ("on_resistance_factor", "on_resistance_polynomial")
FACTOR_TOLERANCE = 0.03
"""How far a factor curve may be from 1 at 25 degC: the width of a line on a printed curve."""


class ChannelSettings(BaseModel):
    """Keys of [stage.switch], of ONE chip: R(T, i) as a polynomial, with a factor curve, or as a table of points.

    R(T, i) = on_resistance (1 + slope (T - 25) + curvature (T - 25)²) (1 + on_resistance_current_slope |i|); a fit of
    any order gives its coefficients of (T - 25), (T - 25)², ... as on_resistance_polynomial; or R is on_resistance
    times on_resistance_factor(T); or on_resistance_curve over temperature, current or both. Reverse
    current sees reverse_on_resistance (with the same temperature law) or reverse_on_resistance_curve where given.
    With the diode's keys the body diode takes its part of a large reverse current, and the dead times; a curve over
    current is taken as measured, its diode included.
    """

    model_config = ConfigDict(extra="forbid")

    on_resistance: Annotated[quantity.Resistance, Field(gt=0.0)] | None = None
    on_resistance_slope: quantity.RelativeSlope = 0.0
    on_resistance_curvature: float = Field(default=0.0, description="1/K²", allow_inf_nan=False)
    on_resistance_polynomial: Annotated[tuple[float, ...], Field(min_length=1, description="1/K, 1/K², ...")] | None = (
        None
    )
    on_resistance_current_slope: float = Field(default=0.0, ge=0.0, description="1/A", allow_inf_nan=False)
    on_resistance_factor: FactorPoints | None = None
    on_resistance_curve: ResistancePoints | None = None
    reverse_on_resistance: Annotated[quantity.Resistance, Field(gt=0.0)] | None = None
    reverse_on_resistance_curve: ResistancePoints | None = None
    diode_voltage: Annotated[quantity.Voltage, Field(ge=0.0)] | None = None
    diode_resistance: Annotated[quantity.Resistance, Field(ge=0.0)] = 0.0
    diode_voltage_slope: float = Field(default=0.0, description="V/K", allow_inf_nan=False)

    @model_validator(mode="after")
    def _one_way_of_giving_it(self) -> Self:
        polynomial = ("on_resistance_slope", "on_resistance_curvature")
        others = ("on_resistance_current_slope", "reverse_on_resistance", *SHAPES)
        refuse_keys_without(self, ("on_resistance",), (*polynomial, *others))
        refuse_keys_without(self, ("on_resistance_curve",), ("reverse_on_resistance_curve",))
        if self.on_resistance is not None and self.on_resistance_curve is not None:
            raise ValueError("found on_resistance and on_resistance_curve; give one of them")
        shapes = [key for key in SHAPES if getattr(self, key) is not None]
        twice = [*shapes, *(key for key in polynomial if key in self.model_fields_set)]
        if shapes and len(twice) > 1:
            raise ValueError(f"found {twice[0]} and {twice[1]}; both say how temperature acts, give one")
        for curve in (self.on_resistance_curve, self.reverse_on_resistance_curve):
            if curve is not None:
                family(curve, "hold")
        return self

    @model_validator(mode="after")
    def _factor_is_one_at_25(self) -> Self:
        if self.on_resistance_factor is None:
            return self
        found = family(self.on_resistance_factor, "hold").at(0.0, 0.0, np.array([REFERENCE_DEGC]))[0][0]
        if abs(found - 1.0) > FACTOR_TOLERANCE:
            raise ValueError(
                f"on_resistance_factor: found {found:.3g} at 25 degC; on_resistance holds there, so the factor is 1"
            )
        return self

    @model_validator(mode="after")
    def _stays_positive(self) -> Self:
        degc = np.linspace(COLDEST_DEGC, HOTTEST_DEGC, 311)
        factor = resistance_factor(degc, self.on_resistance_slope, self.on_resistance_curvature)
        what = (
            f"on_resistance_slope and on_resistance_curvature: found {self.on_resistance_slope:g} 1/K and"
            f" {self.on_resistance_curvature:g} 1/K²"
        )
        if self.on_resistance_polynomial is not None:
            factor = Polynomial(self.on_resistance_polynomial).at(0.0, 0.0, degc)[0]
            what = f"on_resistance_polynomial: found {', '.join(f'{c:g}' for c in self.on_resistance_polynomial)}"
        if not np.all(factor > 0.0):
            at = degc[int(np.argmin(factor > 0.0))]
            raise ValueError(
                f"{what}, with which the resistance vanishes at {at:.0f} degC;"
                f" it must stay positive from {COLDEST_DEGC:.0f} to {HOTTEST_DEGC:.0f} degC"
            )
        return self

    def factor(self) -> Family | Polynomial | None:
        """Return R(T)/R(25 degC) where it is a curve or a polynomial of any order."""
        if self.on_resistance_polynomial is not None:
            return Polynomial(self.on_resistance_polynomial)
        return None if self.on_resistance_factor is None else family(self.on_resistance_factor, "hold")

    def body_diode(self) -> BodyDiode | None:
        """Return the body diode where its voltage is given."""
        if self.diode_voltage is None:
            return None
        return BodyDiode(self.diode_voltage, self.diode_resistance, self.diode_voltage_slope)


@dataclass(frozen=True)
class Polynomial:
    """1 + c1 (T - 25) + c2 (T - 25)² + ...; a fit that was accepted because it is positive from -60 to 250 degC."""

    coefficients: tuple[float, ...]
    over_degc: Span = ACCEPTED

    def at(self, current: Values, voltage: Values, degc: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return the factor and its slope [1/K]; beyond the accepted range the end is held."""
        inside = np.clip(degc, *self.over_degc)
        fit = np.polynomial.Polynomial([1.0, *self.coefficients])
        rise = inside - REFERENCE_DEGC
        return np.asarray(fit(rise)), np.where(inside == degc, fit.deriv()(rise), 0.0)


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
    factor : R(T)/R(25 degC) as a curve or a polynomial, in place of slope and curvature
    current_slope : rise with the current [1/A]
    reverse_ratio : resistance in reverse over that forward [-]
    body_diode : takes its part of the reverse current; None where not known
    """

    resistance: Values
    slope: Values
    curvature: Values
    diode_counted: bool
    factor: Family | Polynomial | None = None
    current_slope: Values = 0.0
    reverse_ratio: Values = 1.0
    body_diode: BodyDiode | None = None
    mechanism: str = "channel conduction"
    ohmic: bool = True
    heats: bool = True

    def at(self, part: Position, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one chip [W] and its slope [W/K].

        A channel that is held on for the whole period conducts as well, so `driven` plays no part.
        """
        square = self._square(part, timing)
        ohms, rise = self._resistance(temperature)
        watts, slope = ohms * square, rise * square
        if self.body_diode is None:
            return Line(watts, slope)
        ratio = self.reverse_ratio
        less = self.body_diode.saving(part, timing, temperature, ratio * ohms, ratio * rise)
        return Line(np.maximum(watts - less.watts, 0.0), slope - less.watts_per_kelvin)

    def outside(self, part: Position, timing: Timing, temperature: FloatArray) -> NDArray[np.bool_]:
        """Return where the temperature lies beyond the factor."""
        if self.factor is None:
            return np.zeros(np.shape(temperature), dtype=bool)
        return self.factor.over_degc.beyond(temperature)

    def _resistance(self, degc: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return R(T) without current [Ω] and its slope [Ω/K]."""
        if self.factor is not None:
            value, tilt = self.factor.at(0.0, 0.0, degc)
            return np.asarray(self.resistance * value), np.asarray(self.resistance * tilt)
        value = resistance_factor(degc, self.slope, self.curvature)
        tilt = self.slope + 2.0 * self.curvature * (degc - REFERENCE_DEGC)
        return np.asarray(self.resistance * value), np.asarray(self.resistance * tilt)

    def _square(self, part: Position, timing: Timing) -> FloatArray:
        """Return the mean square that R(T) sees, with what current and direction add to the resistance [A²]."""
        if np.all(np.asarray(self.reverse_ratio) == 1.0) and not np.any(self.current_slope):
            return channel_mean_square(part, timing) if self.diode_counted else part.current.mean_square()
        forward = moments(part.current.forward(), 0.0, np.inf)
        reverse = moments(part.current.reverse(), 0.0, np.inf)
        back = reverse.second + self.current_slope * reverse.third
        if self.diode_counted:
            for current in (diode_current_at_begin(part), diode_current_at_end(part)):
                dead = timing.dead_time * timing.frequency
                back = back - dead * current * current * (1.0 + self.current_slope * current)
        there = forward.second + self.current_slope * forward.third
        return np.asarray(there + self.reverse_ratio * np.maximum(back, 0.0))


@dataclass(frozen=True)
class Channel:
    """The model."""

    name: str = "channel"
    source: str = (
        "P = R(T, i) I_rms², Joule's law; R quadratic in T or a table of points: common practice, no source; body"
        " diode in reverse: parallel branches"
    )
    reads: PartKind = "switch"
    mechanisms: tuple[str, ...] = ("channel conduction",)
    settings: type[BaseModel] = ChannelSettings
    carries: str = "both"

    def terms(self, settings: ChannelSettings) -> tuple[LossTerm[Position], ...]:
        """Return the term if an on-resistance is given."""
        s = settings
        if s.on_resistance_curve is not None:
            return (self._by_curve(s, s.on_resistance_curve),)
        if s.on_resistance is None:
            return ()
        return (
            ChannelTerm(
                s.on_resistance,
                s.on_resistance_slope,
                s.on_resistance_curvature,
                s.diode_voltage is not None,
                s.factor(),
                s.on_resistance_current_slope,
                1.0 if s.reverse_on_resistance is None else s.reverse_on_resistance / s.on_resistance,
                None if s.on_resistance_current_slope else s.body_diode(),
            ),
        )

    def _by_curve(self, s: ChannelSettings, curve: PointTable) -> LossTerm[Position]:
        reverse = s.reverse_on_resistance_curve
        forward = family(curve, "hold")
        back = forward if reverse is None else family(reverse, "hold")
        return CurveChannelTerm(forward, back, s.diode_voltage is not None)


@hookimpl
def loss_model() -> Channel:
    """Offer channel conduction."""
    return Channel()
