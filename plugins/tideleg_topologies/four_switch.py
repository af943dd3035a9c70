"""The non-inverting four-switch leg: two half-bridges joined by one inductor, for voltage ranges that overlap.

The battery leg stands on the battery port, the link leg on the link port, the inductor between their nodes. Well below
the link voltage the link leg alone switches (boost), well above it the battery leg alone (buck); between lies the
blend band, where both switch in every period. Or both pairs always switch together, as in the inverting leg.

Every mode has the same layout: charge, direct, discharge (see `four_switch_shares`). A switch that stays on all the
period has no edges, and its leg's gates are not driven; to stay on, an upper switch needs a gate supply that does not
live on the switching.

Modelling choices: switches are ideal, ohmic drops enter through the mean inductor current; capacitor voltages are
constant within a period and both port capacitors take the whole ac part of the exchange; the inductor current may
reverse and is never discontinuous.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Literal, NamedTuple, Self

import numpy as np
from numpy.typing import NDArray
from pydantic import Field, model_validator

from tideleg import (
    CONTINUOUS,
    IDLE,
    Choice,
    Exchange,
    FloatArray,
    Operation,
    Point,
    Position,
    Rest,
    Segment,
    Slot,
    Timing,
    Values,
    Waveform,
    Winding,
    hookimpl,
    quantity,
)
from tideleg_topologies import four_switch_mode, four_switch_shares
from tideleg_topologies.four_switch_mode import BLEND, BOOST, BUCK, MODES
from tideleg_topologies.four_switch_shares import Corners, Shares, corners, ohmic_drop
from tideleg_topologies.leg import ASSUMPTIONS, NO_DUTY_RATIO, SynchronousSettings

CANNOT_HOLD = (
    "the mode chosen at rest cannot hold at the voltage under load (boost needs the battery below the link, buck above"
    " it, drops included); widen stage.blend_band"
)
SHORT_PULSE = "a switch is on or off for less than dead time and minimum_pulse allow: its pulse would be skipped"


class FourSwitchSettings(SynchronousSettings):
    """Keys under [stage]: those of a two-level leg, without diode emulation, and how the two legs share the work.

    blend_band is the half width of the blend band in the ratio of battery to link voltage; mode_hysteresis is how far
    past a border of the band that ratio must be, at rest, before the mode changes. Pulses shorter than minimum_pulse
    and the dead time before them are reported; dead times move no waveform here.
    """

    legs: Literal[1] = 1
    control: Literal["blend", "pairs"] = "blend"
    blend_band: quantity.Share = Field(default=0.1, gt=0.0, le=0.5)
    mode_hysteresis: quantity.Share = Field(default=0.01, ge=0.0)

    @model_validator(mode="after")
    def _fit_together(self) -> Self:
        if self.mode_hysteresis >= self.blend_band:
            raise ValueError(
                f"mode_hysteresis: found {self.mode_hysteresis:g}, not less than blend_band {self.blend_band:g}; boost"
                " or buck would be held past equal voltages: give less, or widen blend_band"
            )
        if 2.0 * self.minimum_pulse * self.switching_frequency >= 1.0:
            raise ValueError(
                f"minimum_pulse: found {self.minimum_pulse:g} s, half a period of {1.0 / self.switching_frequency:g} s"
                " or more, which no duty ratio could keep; give less or lower switching_frequency"
            )
        unused = {"blend_band", "mode_hysteresis"} & self.model_fields_set
        if self.control == "pairs" and unused:
            raise ValueError(f'control = "pairs" has no modes: drop {" and ".join(sorted(unused))}')
        return self


class _Period(NamedTuple):
    """One period of the inductor current in its three parts, zero while idle."""

    charge: Segment
    direct: Segment
    discharge: Segment


@dataclass(frozen=True)
class FourSwitch:
    """The topology. `Operation.duty_ratio` is that of the battery upper switch.

    Its columns battery_leg_duty_ratio and link_leg_duty_ratio are those of the two upper switches.
    """

    name: str = "four-switch"
    source: str = (
        "R. W. Erickson and D. Maksimović, Fundamentals of Power Electronics, 2nd ed., Kluwer, 2001: cascaded buck and"
        " boost, M = D_buck/(1 - D_boost), both pairs M = D/(1 - D), inductor current I_out/(1 - D) (chapter from"
        " memory); rule of the blend band: modelling choice"
    )
    settings: type[FourSwitchSettings] = FourSwitchSettings
    reasons: tuple[str, ...] = (NO_DUTY_RATIO, CANNOT_HOLD)
    cautions: tuple[str, ...] = (SHORT_PULSE,)
    assumptions: tuple[str, ...] = (
        *ASSUMPTIONS[:2],
        "the mode of a four-switch leg follows the battery at rest; dead times move none of its waveforms",
        "an upper switch that stays on for whole periods needs a gate supply that does not live on the switching",
    )
    feeds_link_through_diodes: bool = False
    choice_name: str = "mode"

    def slots(self, settings: FourSwitchSettings) -> tuple[Slot, ...]:
        """Return the places for parts."""
        return (
            Slot("battery_upper_switch", "switch", "switch"),
            Slot("battery_lower_switch", "switch", "switch"),
            Slot("link_upper_switch", "switch", "switch"),
            Slot("link_lower_switch", "switch", "switch"),
            Slot("inductor", "inductor", "inductor"),
            Slot("battery_capacitor", "capacitor", "battery_capacitor"),
            Slot("link_capacitor", "capacitor", "link_capacitor"),
        )

    def choices(self, settings: FourSwitchSettings) -> tuple[str, ...]:
        """Return the words of the modes; none where both pairs always switch."""
        return MODES if settings.control == "blend" else ()

    def plain_choice(self, settings: FourSwitchSettings) -> int | None:
        """Return None: no mode serves every voltage as well, so there is nothing to save against."""
        return None

    def choose(self, rest: Rest, settings: FourSwitchSettings, before: Any) -> Choice:
        """Return the mode of each step; see `four_switch_mode`."""
        return four_switch_mode.choose(rest, settings.blend_band, settings.mode_hysteresis, before)

    def operate(self, point: Point, settings: FourSwitchSettings, inductance: Mapping[str, Values]) -> Operation:
        """Return the steady state at each step."""
        frequency, battery, link = settings.switching_frequency, point.battery_voltage, point.link_voltage
        rise_per_volt = 1.0 / (inductance["inductor"] * frequency)
        shares = _shares(point, settings, rise_per_volt)
        on = point.active.astype(np.float64)
        period = _period(shares, corners(point, shares.charge, shares.discharge, rise_per_volt), on)
        drop = ohmic_drop(point, shares.charge, shares.discharge)
        # the leg whose gates rest has exactly no pulse; one that switches has at least the least pulse
        battery_driven, link_driven = on * (shares.discharge > 0.0), on * (shares.charge > 0.0)
        from_battery, into_link = Waveform(period[:2]), Waveform(period[1:])
        lower = Waveform((period.discharge,)), Waveform((period.charge,))
        battery_duty, link_duty = on * (1.0 - shares.discharge), on * (1.0 - shares.charge)
        return Operation(
            positions={
                "battery_upper_switch": Position(from_battery, battery, battery, battery_driven),
                "battery_lower_switch": Position(lower[0].scaled(-1.0), battery, battery, battery_driven),
                "link_upper_switch": Position(into_link.scaled(-1.0), link, link, link_driven),
                "link_lower_switch": Position(lower[1], link, link, link_driven),
            },
            windings={"inductor": Winding(Waveform(period), (battery - drop, battery - link - drop, -link - drop))},
            exchanges={
                "battery_capacitor": Exchange(from_battery, frequency, battery),
                "link_capacitor": Exchange(into_link, frequency, link),
            },
            timing=Timing(frequency, settings.dead_time),
            duty_ratio=battery_duty,
            conduction=np.where(point.active, np.int8(CONTINUOUS), np.int8(IDLE)),
            reason=_reason(point, shares),
            caution=_caution(point, shares, settings),
            columns={"battery_leg_duty_ratio": battery_duty, "link_leg_duty_ratio": link_duty},
        )


def _shares(point: Point, settings: FourSwitchSettings, rise_per_volt: Values) -> Shares:
    """Return the shares of every step by its mode; a mode that no step has is not worked out."""
    if settings.control == "pairs":
        return four_switch_shares.pairs(point)
    mode: NDArray[np.int64] = np.asarray(point.choice)
    found: Shares | None = None
    for code in (BOOST, BLEND, BUCK):
        here = mode == code
        if not np.any(here):
            continue
        if code == BLEND:
            these = four_switch_shares.blend(point, settings.blend_band, rise_per_volt)
        else:
            these = four_switch_shares.boost(point) if code == BOOST else four_switch_shares.buck(point)
        found = (
            these
            if found is None
            else Shares(*(np.where(here, new, old) for new, old in zip(these, found, strict=True)))
        )
    assert found is not None, f"mode codes are 0 to {len(MODES) - 1}"
    return found


def _period(shares: Shares, at: Corners, on: FloatArray) -> _Period:
    charge, discharge = on * shares.charge, on * shares.discharge
    direct = np.maximum(on - charge - discharge, 0.0)
    first, second, third = on * at.charge, on * at.direct, on * at.discharge
    return _Period(
        Segment(0.0, charge, first, second),
        Segment(charge, direct, second, third),
        Segment(charge + direct, discharge, third, first),
    )


def _reason(point: Point, shares: Shares) -> NDArray[np.int8]:
    """Return the reason code of each step; a stage at rest needs no duty ratio, and its diodes block both ports."""
    code = np.where(shares.unheld, np.int8(2), np.where(shares.lost, np.int8(1), np.int8(0)))
    return np.where(point.active, code, np.int8(0))


def _caution(point: Point, shares: Shares, settings: FourSwitchSettings) -> NDArray[np.int8]:
    """Return where a leg that switches has a pulse, or the rest of a period after one, that is too short."""
    least = (settings.minimum_pulse + settings.dead_time) * settings.switching_frequency
    short = np.zeros(np.shape(shares.charge), dtype=bool)
    for share in (shares.charge, shares.discharge):
        short |= (share > 0.0) & (np.minimum(share, 1.0 - share) < least)
    return np.where(short & point.active, np.int8(1), np.int8(0))


@hookimpl
def topology() -> FourSwitch:
    """Offer the four-switch leg."""
    return FourSwitch()
