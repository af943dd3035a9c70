"""The two-level leg: its keys, its currents in every mode, and the stage of equal legs that share the work.

The inductor joins the battery port to the switch node; the upper position joins the node to the link, the lower one
joins it to the return. All modes share one layout. The lower run begins at place 0. The upper run follows it, except
where a charging current is discontinuous: there it ends where the next lower run begins. The idle part of a
discontinuous period lies wherever neither runs.

Modelling choices: switches and rectifiers are ideal; ohmic drops enter through their mean over the conducting part of
the period; capacitor voltages are constant within it; both port capacitors take the whole ac part of what the stage
exchanges; legs are alike and evenly shifted; the node rests at the battery voltage while no switch conducts, without
ringing.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, Literal, NamedTuple

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, ValidationInfo, field_validator

from tideleg import (
    BOUNDARY,
    CONTINUOUS,
    DISCONTINUOUS,
    IDLE,
    Exchange,
    FloatArray,
    Operation,
    Point,
    Position,
    Segment,
    Slot,
    Timing,
    Values,
    Waveform,
    Winding,
    quantity,
)

SOURCE = (
    "R. W. Erickson and D. Maksimović, Fundamentals of Power Electronics, 2nd ed., Kluwer, 2001: volt-second and"
    " charge balance (chapter 2), discontinuous conduction (chapter 5), sections from memory"
)

NOT_BELOW_LINK = "the battery voltage is not below the link voltage"
NO_DUTY_RATIO = "no duty ratio between 0 and 1 carries this current (resistive drop too large)"
REASONS = (NOT_BELOW_LINK, NO_DUTY_RATIO)

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
    """Keys under [stage] that every stage of two-level legs reads."""

    model_config = ConfigDict(extra="forbid")

    switching_frequency: quantity.Frequency = Field(gt=0.0)
    modulation: Literal["synchronous", "diode"] = "synchronous"
    dead_time: quantity.Time = Field(default=0.0, ge=0.0)
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


class LegState(NamedTuple):
    """Steady state of one leg at each step, arrays (..., S).

    lower, upper : inductor current while that position conducts, positive = discharge [A]
    node_mean : what the inductor sees as battery voltage, drops taken off [V]
    conducting : share of the period in which current flows: 1 where continuous, 0 where idle [-]
    conduction : code
    reason : code
    """

    lower: Segment
    upper: Segment
    node_mean: FloatArray
    conducting: Values
    conduction: Any
    reason: Any


def slots(legs: int) -> tuple[Slot, ...]:
    """Return the places for parts in a stage of so many legs."""
    return (
        Slot("upper_switch", "switch", "switch", legs),
        Slot("lower_switch", "switch", "switch", legs),
        Slot("inductor", "inductor", "inductor", legs),
        Slot("battery_capacitor", "capacitor", "battery_capacitor"),
        Slot("link_capacitor", "capacitor", "link_capacitor"),
    )


def operate(point: Point, settings: Any, inductance: Mapping[str, Values]) -> Operation:
    """Return the steady state of `settings.legs` equal, evenly shifted legs; see `Topology.operate`.

    `Operation.duty_ratio` is the share of the period in which the UPPER position conducts.
    """
    legs: int = settings.legs
    frequency: Values = settings.switching_frequency
    state = leg_state(point, point.battery_current / legs, frequency, inductance["inductor"], settings.modulation)
    inductor = Waveform((state.lower, state.upper))
    into_link = Waveform((state.upper,))
    return Operation(
        positions=_positions(point, state, legs),
        windings={"inductor": Winding(inductor, (state.node_mean, state.node_mean - point.link_voltage), legs)},
        exchanges={
            "battery_capacitor": Exchange(_folded(inductor, legs), legs * frequency, point.battery_voltage),
            "link_capacitor": Exchange(_folded(into_link, legs), legs * frequency, point.link_voltage),
        },
        timing=Timing(frequency, settings.dead_time),
        duty_ratio=np.asarray(state.upper.width),
        conduction=state.conduction,
        reason=state.reason,
    )


def leg_state(point: Point, current: FloatArray, frequency: Values, inductance: Values, modulation: str) -> LegState:
    """Return the steady state of one leg.

    Parameters
    ----------
    point : Point
        What the stage is asked to do.
    current : ndarray (..., S)
        Mean inductor current of this leg, positive = discharge [A].
    frequency, inductance : float or ndarray, broadcastable to (..., S)
        [Hz], [H]
    modulation : str
        "synchronous" or "diode".

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
    if modulation == "diode":
        wanted, share = _discontinuous(point, wanted, drop, size, step_of_current)
    duty = np.clip(wanted, 0.0, 1.0)
    off_duty = 1.0 - duty
    half_ripple = 0.5 * step_of_current * duty * off_duty
    on: Values = 1.0 if np.all(point.active) else point.active.astype(np.float64)
    conduction = _conduction(modulation, size, half_ripple, on)
    share = share * on
    half = share * half_ripple
    middle = on * current
    upper_place = lower_width = share * off_duty
    upper_width = share * duty
    if modulation == "diode":
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


def _conduction(modulation: str, size: FloatArray, half_ripple: FloatArray, on: Values) -> Any:
    """Return the conduction code of each step."""
    gap = size - half_ripple
    tolerance = BOUNDARY_TOLERANCE * half_ripple
    code = np.where(np.abs(gap) <= tolerance, np.int8(BOUNDARY), np.int8(CONTINUOUS))
    flows: Any = np.asarray(on) > 0.0
    if modulation == "diode":
        code = np.where(gap < -tolerance, np.int8(DISCONTINUOUS), code)
        flows = flows & (size > 0.0)
    return np.where(flows, code, np.int8(IDLE))


def _reason(point: Point, wanted: FloatArray) -> Any:
    """Return the reason code of each step; a stage at rest needs no duty ratio, yet its upper diode still conducts."""
    lost = (wanted <= 0.0) | (wanted >= 1.0)
    code = np.where(lost & point.active, np.int8(1 + REASONS.index(NO_DUTY_RATIO)), np.int8(0))
    not_below = point.battery_voltage >= point.link_voltage
    return np.where(not_below, np.int8(1 + REASONS.index(NOT_BELOW_LINK)), code)


def _positions(point: Point, state: LegState, legs: int) -> dict[str, Position]:
    """Return both switch positions of one leg."""
    place, width, start, end = state.upper
    link = point.link_voltage
    lower_rises, upper_rises = _turn_on_voltages(point, state)
    driven = (np.asarray(state.conducting) > 0.0).astype(np.float64)
    return {
        "upper_switch": Position(Waveform((Segment(place, width, -start, -end),)), link, upper_rises, driven, legs),
        "lower_switch": Position(Waveform((state.lower,)), link, lower_rises, driven, legs),
    }


def _turn_on_voltages(point: Point, state: LegState) -> tuple[Values, Values]:
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


def _folded(current: Waveform, legs: int) -> Waveform:
    return current if legs == 1 else current.fold(legs)
