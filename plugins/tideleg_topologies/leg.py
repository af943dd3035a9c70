"""The two-level leg: its keys, and its currents in every mode.

The inductor joins the battery port to the switch node; the upper position joins the node to the link, the lower one
joins it to the return. All modes share one layout. The lower run begins at place 0. The upper run follows it, except
where a charging current is discontinuous: there it ends where the next lower run begins. The idle part of a
discontinuous period lies wherever neither runs.

With synchronous switching the current may reverse and is never discontinuous; with diode emulation it does not
reverse; with boundary modulation the frequency follows the current, so that the valley just reverses.
"""

from __future__ import annotations

from typing import Any, Literal, NamedTuple, Self

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, ValidationInfo, field_validator, model_validator

from tideleg import (
    BOUNDARY,
    CONTINUOUS,
    DISCONTINUOUS,
    IDLE,
    FloatArray,
    Point,
    Segment,
    Values,
    quantity,
)
from tideleg_topologies.gates import SHORT_PULSE

SOURCE = (
    "R. W. Erickson and D. Maksimović, Fundamentals of Power Electronics, 2nd ed., Kluwer, 2001: volt-second and"
    " charge balance (chapter 2), discontinuous conduction (chapter 5), sections from memory"
)

NOT_BELOW_LINK = "the battery voltage is not below the link voltage"
NO_DUTY_RATIO = "no duty ratio between 0 and 1 carries this current (resistive drop too large)"
REASONS = (NOT_BELOW_LINK, NO_DUTY_RATIO, SHORT_PULSE)

ASSUMPTIONS = (
    "switches and rectifiers are ideal in the waveforms; ohmic drops enter through their mean over the conducting part"
    " of the period, and capacitor voltages are constant within it",
    "each port capacitor takes the whole ac part of what the stage exchanges with that port",
    "while no switch of a leg conducts (discontinuous current) its node rests at the battery voltage, without ringing:"
    " the lower position turns on from the battery voltage in discharge, the upper one from link less battery voltage"
    " in charge",
)
"""Modelling choices that a reader of the report must know."""

BOUNDARY_TOLERANCE = 1e-9
"""A current this close to half its ripple, relative to it, is said to be at the boundary [-]."""

IDLE_SHARE_OF_SETTLING = 0.05
"""Idle share of the period over which the node is taken to go from the link or the return to the battery voltage [-].

A modelling choice, common practice has no figure: it keeps the voltage at turn-on, and so its energy, free of a jump
where conduction turns discontinuous.
"""

_LEAST = 1e-100
"""Keeps quotients finite where a link has no voltage or a leg no ripple; such steps carry a reason."""


class LegSettings(BaseModel):
    """Keys under [stage] that every stage of switched legs reads."""

    model_config = ConfigDict(extra="forbid")

    switching_frequency: quantity.Frequency = Field(gt=0.0)
    dead_time: quantity.Time = Field(default=0.0, ge=0.0)
    minimum_pulse: quantity.Time = Field(default=0.0, ge=0.0)
    idle: Literal["switching", "off"] = "switching"

    @field_validator("dead_time")
    @classmethod
    def _dead_times_leave_a_period(cls, dead_time: float, info: ValidationInfo) -> float:
        frequency = info.data.get("switching_frequency")  # absent where it was refused itself
        if frequency is not None and 2.0 * dead_time * frequency >= 1.0:
            raise ValueError(
                f"found {dead_time:g} s, which comes twice in a period of {1.0 / frequency:g} s; give less than"
                f" {0.5 / frequency:g} s or lower switching_frequency"
            )
        return dead_time


class SynchronousSettings(LegSettings):
    """Keys under [stage] of legs that only switch synchronously; the key may be written out."""

    modulation: Literal["synchronous"] = "synchronous"


class TwoLevelSettings(LegSettings):
    """Keys under [stage] of two-level legs: three ways to switch.

    lowest_frequency : with boundary modulation, the lower end of its window; switching_frequency is the upper one
    reversal_current : by how much the valley then passes zero, so that the node swings softly
    """

    modulation: Literal["synchronous", "diode", "boundary"] = "synchronous"
    lowest_frequency: quantity.Frequency | None = Field(default=None, gt=0.0)
    reversal_current: quantity.Current | None = Field(default=None, ge=0.0)

    @model_validator(mode="after")
    def _boundary_has_a_window(self) -> Self:
        lowest = self.lowest_frequency
        if self.modulation != "boundary":
            if lowest is not None or self.reversal_current is not None:
                raise ValueError(
                    "lowest_frequency and reversal_current belong to modulation = 'boundary'; found modulation ="
                    f" {self.modulation!r}"
                )
        elif lowest is None:
            raise ValueError(
                "lowest_frequency is missing: with modulation = 'boundary' the frequency moves between it and"
                " switching_frequency, the highest"
            )
        elif lowest > self.switching_frequency:
            raise ValueError(
                f"lowest_frequency: found {lowest:g} Hz, above switching_frequency {self.switching_frequency:g} Hz,"
                " which is the highest"
            )
        return self


class LegState(NamedTuple):
    """Steady state of one leg at each step, arrays (..., S).

    lower, upper : inductor current while that position conducts, positive = discharge [A]
    node_mean : what the inductor sees as battery voltage, drops taken off [V]
    conducting : share of the period in which current flows: 1 where continuous, 0 where idle [-]
    conduction : code
    reason : 0, or 1 + index into (NOT_BELOW_LINK, NO_DUTY_RATIO)
    """

    lower: Segment
    upper: Segment
    node_mean: FloatArray
    conducting: Values
    conduction: Any
    reason: Any


def frequency_of(point: Point, current: FloatArray, settings: TwoLevelSettings, inductance: Values) -> Values:
    """Return the switching frequency at each step [Hz].

    Notes
    -----
    Boundary modulation: half the ripple, V_link D (1 - D)/(2 L f), is to equal |I| + I_reversal, so that the valley
    just passes zero by I_reversal and both edges are soft; hence f = V_link D (1 - D)/(2 L (|I| + I_reversal)). Outside
    its window the frequency stays at the window's edge: above it the valley reverses further, below it not at all.
    """
    if settings.lowest_frequency is None:
        return settings.switching_frequency
    link = np.maximum(point.link_voltage, _LEAST)
    duty = np.clip((point.battery_voltage - current * point.path_resistance) / link, 0.0, 1.0)
    half_ripple = np.abs(current) + (settings.reversal_current or 0.0)
    wanted = point.link_voltage * duty * (1.0 - duty) / (2.0 * inductance * np.maximum(half_ripple, _LEAST))
    return np.clip(wanted, settings.lowest_frequency, settings.switching_frequency)


def leg_state(
    point: Point, current: FloatArray, frequency: Values, inductance: Values, settings: TwoLevelSettings
) -> LegState:
    """Return the steady state of one leg.

    Parameters
    ----------
    point : Point
        What the stage is asked to do.
    current : ndarray (..., S)
        Mean inductor current of this leg, positive = discharge [A].
    frequency, inductance : float or ndarray, broadcastable to (..., S)
        [Hz], [H]
    settings : TwoLevelSettings
        Its modulation, and the window of frequency of boundary modulation.

    Notes
    -----
    Volt-seconds: V_battery - I R = D V_link; ripple: V_link D (1 - D)/(L f). A leg whose current must not reverse is
    discontinuous where |I| is below half its ripple. Its triangle then rises and falls as steeply as in continuous
    conduction, so both runs are narrower by one factor s and the peak is s times the ripple; its mean is s² ripple/2
    = |I|, hence s = sqrt(2 |I|/ripple). That is the closed form of Erickson and Maksimović, chapter 5.
    """
    step_of_current = point.link_voltage / (inductance * frequency)
    drop = current * point.path_resistance
    wanted = (point.battery_voltage - drop) / np.maximum(point.link_voltage, _LEAST)
    size = np.abs(current)
    share: Values = 1.0
    diode = settings.modulation == "diode"
    if diode:
        wanted, share = _discontinuous(point, wanted, drop, size, step_of_current)
    duty = np.clip(wanted, 0.0, 1.0)
    off_duty = 1.0 - duty
    half_ripple = 0.5 * step_of_current * duty * off_duty
    on: Values = 1.0 if np.all(point.active) else point.active.astype(np.float64)
    conduction = _conduction(settings, size, half_ripple, frequency, on)
    share = share * on
    half = share * half_ripple
    middle = on * current
    upper_place = lower_width = share * off_duty
    upper_width = share * duty
    if diode:
        middle = np.copysign(np.maximum(np.abs(middle), half), current)  # where discontinuous, the least size is zero
        upper_place = np.where(current < 0.0, 1.0 - upper_width, lower_width)
    valley, peak = middle - half, middle + half
    return LegState(
        lower=Segment(0.0, lower_width, valley, peak),
        upper=Segment(upper_place, upper_width, peak, valley),
        node_mean=duty * point.link_voltage,
        conducting=share,
        conduction=conduction,
        reason=_reason(point, wanted),
    )


def _discontinuous(
    point: Point, wanted: FloatArray, drop: FloatArray, size: FloatArray, step_of_current: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Return the duty ratio within the conducting share of the period, and that share.

    Notes
    -----
    While current flows, its mean is I/s: the drop then is I R/s, and V_battery - I R/s = D V_link holds in place of
    the continuous relation. D moves s in turn; one correction from the continuous D leaves an error of second order
    in the drop, and none where s is 1.
    """

    def conducting(duty: FloatArray) -> FloatArray:
        inside = np.clip(duty, 0.0, 1.0)
        half_ripple = 0.5 * step_of_current * inside * (1.0 - inside)
        return np.sqrt(np.minimum(size / np.maximum(half_ripple, _LEAST), 1.0))

    share = conducting(wanted)
    if not np.any(point.path_resistance):
        return wanted, share
    drop_in_flow = drop / np.where(share > 0.0, share, 1.0)
    squeezed = (point.battery_voltage - drop_in_flow) / np.maximum(point.link_voltage, _LEAST)
    return squeezed, conducting(squeezed)


def _conduction(
    settings: TwoLevelSettings, size: FloatArray, half_ripple: FloatArray, frequency: Values, on: Values
) -> Any:
    """Return the conduction code of each step."""
    gap = size - half_ripple
    tolerance = BOUNDARY_TOLERANCE * half_ripple
    code = np.where(np.abs(gap) <= tolerance, np.int8(BOUNDARY), np.int8(CONTINUOUS))
    flows: Any = np.asarray(on) > 0.0
    if settings.modulation == "diode":
        code = np.where(gap < -tolerance, np.int8(DISCONTINUOUS), code)
        flows = flows & (size > 0.0)
    if settings.lowest_frequency is not None:
        inside = (frequency > settings.lowest_frequency) & (frequency < settings.switching_frequency)
        code = np.where(inside, np.int8(BOUNDARY), code)
    return np.where(flows, code, np.int8(IDLE))


def _reason(point: Point, wanted: FloatArray) -> Any:
    """Return the reason code of each step; a stage at rest needs no duty ratio, yet its upper diode still conducts."""
    lost = (wanted <= 0.0) | (wanted >= 1.0)
    code = np.where(lost & point.active, np.int8(2), np.int8(0))
    return np.where(point.battery_voltage >= point.link_voltage, np.int8(1), code)


def turn_on_voltages(point: Point, state: LegState) -> tuple[Values, Values]:
    """Return the voltage that the lower and the upper position turn on from.

    After an idle part of the period the node rests at the battery voltage: the lower position turns on from that in
    discharge, the upper one from the rest of the link voltage in charge. See `IDLE_SHARE_OF_SETTLING`.
    """
    link, battery = point.link_voltage, point.battery_voltage
    if np.all(np.asarray(state.conducting) == 1.0):
        return link, link
    settled = np.minimum((1.0 - state.conducting) / IDLE_SHARE_OF_SETTLING, 1.0)
    charges = point.battery_current < 0.0
    lower = link - np.where(charges, 0.0, (link - battery) * settled)
    return lower, link - np.where(charges, battery * settled, 0.0)
