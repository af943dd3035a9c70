"""Isolated dual active bridge, single phase shift, both power directions.

A full bridge at each port makes a square wave of half duty; between them lie a series inductor, stated at the battery
side with the transformer's leakage in it, and an ideal transformer. The battery bridge leads in discharge, the link
bridge in charge, by at most 90°. Each of the four equal switches of a bridge conducts for half a period.

Modelling choices: port voltages are constant within the period and both port capacitors take the whole ac part of what
their bridge exchanges, at twice the switching frequency. The magnetising current is left out, and no dc current flows
in the windings. All resistance lies in series with the inductor, at the battery side: the transformer's data hold for
both its windings together, seen from there. Its flux follows from the link bridge. Each piece of the current is
straight also with resistance R; the true curve has another mean there, by up to R/(24 L f) of its rise in the piece.

Dead times move neither phase nor current here. A phase that lasts less than the dead time is not controlled, which is
a caution. Soft switching is judged by the sign of the current in the bounds and at the edges: necessary, not
sufficient, for the current must also swing the output capacitances within the dead time.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from tideleg import (
    CONTINUOUS,
    IDLE,
    Exchange,
    FloatArray,
    Need,
    Operation,
    Point,
    Position,
    Segment,
    Slot,
    Timing,
    Values,
    Waveform,
    Winding,
    hookimpl,
)
from tideleg_topologies.leg import SynchronousSettings
from tideleg_topologies.phase_shift import Corners, Drive, Shift, corners, shift_for

BEYOND_RIGHT_ANGLE = "more current is asked than a phase of 90° carries (lower the inductance or the frequency)"
NEAR_RIGHT_ANGLE = (
    "works above 90 % of the greatest power; the power is flat in the phase there, so phase and currents are"
    " ill-conditioned"
)
WITHIN_DEAD_TIME = "the phase lasts less than the dead time or minimum_pulse and is not controlled"

NEAR = 0.9
"""Share of the greatest power above which phase and current are ill-conditioned [-]; common practice, no source."""

SWITCHES = 4
"""Equal switches of a full bridge."""

_LEAST = 1e-100
"""Keeps quotients finite where a port has no voltage."""


class DualBridgeSettings(SynchronousSettings):
    """Keys under [stage]: those of a two-level leg without diode emulation; turns_ratio, link over battery turns."""

    legs: Literal[1] = 1
    turns_ratio: float = Field(gt=0.0, allow_inf_nan=False)


START_SHARE = 0.8
"""Share of the greatest power that a proposed inductance leaves the mission to use: below the caution's 90 % [-]."""


@dataclass(frozen=True)
class DualBridge:
    """The topology. `Operation.duty_ratio` is that of every switch: a half while the stage switches.

    Its columns: phase_shift_rad, positive where the battery bridge leads; and for each bridge the least magnitude of
    the phase with which it switches softly by the sign of its current, drops left out, 0 where any phase will do.
    """

    name: str = "dual-bridge"
    source: str = (
        "R. De Doncker, D. Divan, M. Kheraluwala, IEEE Trans. Ind. Appl. 27(1), 1991: power over phase; D. Das,"
        " K. Basu, IEEE Trans. Ind. Electron. 68(12), 2021: currents and soft-switching bounds (d1 = d2 = 1)"
    )
    settings: type[DualBridgeSettings] = DualBridgeSettings
    reasons: tuple[str, ...] = (BEYOND_RIGHT_ANGLE,)
    cautions: tuple[str, ...] = (NEAR_RIGHT_ANGLE, WITHIN_DEAD_TIME)
    feeds_link_through_diodes: bool = False
    assumptions: tuple[str, ...] = (
        "the dual bridge is controlled by a single phase shift; dead time does not move the phase, and the magnetising"
        " current of the transformer is left out",
        "soft switching of a bridge is told by the sign of its current alone; whether that current also swings the"
        " output charge within the dead time is a matter of the loss models",
        "data of the transformer hold for both windings together, seen from the battery side",
    )

    def slots(self, settings: DualBridgeSettings) -> tuple[Slot, ...]:
        """Return the places for parts; the inductor holds the leakage of the transformer, at the battery side."""
        return (
            Slot("battery_switch", "switch", "battery_switch", SWITCHES),
            Slot("link_switch", "switch", "link_switch", SWITCHES),
            Slot("inductor", "inductor", "inductor"),
            Slot("transformer", "transformer", "transformer"),
            Slot("battery_capacitor", "capacitor", "battery_capacitor"),
            Slot("link_capacitor", "capacitor", "link_capacitor"),
        )

    def starting_values(self, need: Need) -> Mapping[str, float | str]:
        """Return a turns ratio that matches the ports, and an inductance with room: L = V1 V2'/(8 f P_max)."""
        greatest = need.power / START_SHARE
        return {
            "turns_ratio": need.link_voltage / need.battery_voltage,
            "inductor.inductance": need.battery_voltage**2 / (8.0 * need.switching_frequency * greatest),
        }

    def operate(self, point: Point, settings: DualBridgeSettings, inductance: Mapping[str, Values]) -> Operation:
        """Return the steady state at each step; the smaller phase is taken, and held at 90° beyond reach."""
        frequency, ratio = settings.switching_frequency, settings.turns_ratio
        step = inductance["inductor"] * frequency
        drive = Drive(point.battery_voltage, point.link_voltage / ratio, step, point.path_resistance / (2.0 * step))
        shift = shift_for(point.battery_current, drive)
        lead = np.where(point.battery_current < 0.0, -1.0, 1.0)
        on = point.active.astype(np.float64)
        pieces = _Pieces.of(corners(shift.share, lead, drive), on)
        both = 2.0 * frequency
        return Operation(
            positions=_positions(pieces, point, ratio, on),
            windings=_windings(pieces, drive, point.path_resistance),
            exchanges={
                "battery_capacitor": Exchange(pieces.from_battery(), both, point.battery_voltage),
                "link_capacitor": Exchange(pieces.into_link().scaled(1.0 / ratio), both, point.link_voltage),
            },
            timing=Timing(frequency, settings.dead_time),
            duty_ratio=0.5 * on,
            conduction=np.where(point.active, np.int8(CONTINUOUS), np.int8(IDLE)),
            reason=np.where(shift.lost & point.active, np.int8(1), np.int8(0)),
            caution=_caution(point, shift, max(settings.dead_time, settings.minimum_pulse) * frequency),
            columns={"phase_shift_rad": 2.0 * np.pi * on * lead * shift.share, **_soft_switching_bounds(drive)},
        )


def _caution(point: Point, shift: Shift, least_share: float) -> NDArray[np.int8]:
    """Return the caution of each step; a stage whose gates are off has none."""
    near = np.abs(point.battery_current) > NEAR * shift.greatest
    within = shift.share < least_share
    return np.where(point.active, np.where(near, np.int8(1), np.where(within, np.int8(2), np.int8(0))), np.int8(0))


def _soft_switching_bounds(drive: Drive) -> dict[str, Values]:
    """Return the least |phase| for which the current of each bridge has the right sign at its edges [rad].

    The bridge of the lower voltage needs (π/2)(1 - V_lower/V_higher), link seen from the battery side; the other needs
    none. Das and Basu, Table I, zone V.
    """
    over = drive.link - drive.battery
    return {
        "battery_bridge_zvs_phase_rad": 0.5 * np.pi * np.maximum(over / np.maximum(drive.link, _LEAST), 0.0),
        "link_bridge_zvs_phase_rad": 0.5 * np.pi * np.maximum(-over / np.maximum(drive.battery, _LEAST), 0.0),
    }


@dataclass(frozen=True)
class _Pieces:
    """The pieces of a half period, no width while idle, and what each branch takes of them."""

    lead: FloatArray
    first: FloatArray
    second: FloatArray
    begin: FloatArray
    corner: FloatArray
    voltages: tuple[FloatArray, FloatArray]

    @classmethod
    def of(cls, found: Corners, on: FloatArray) -> _Pieces:
        """Return the pieces as they are where the stage switches, and nothing elsewhere."""
        first, second = (on * width for width in found.widths)
        return cls(found.lead, first, second, on * found.begin, on * found.corner, found.voltages)

    def _rise(self, place: Values, stretch: float = 1.0, sign: Values = 1.0) -> Segment:
        return Segment(place, stretch * self.first, sign * self.begin, sign * self.corner)

    def _fall(self, place: Values, stretch: float = 1.0, sign: Values = 1.0) -> Segment:
        return Segment(place, stretch * self.second, sign * self.corner, -sign * self.begin)

    def inductor(self) -> Waveform:
        """Return the current of the inductor and the battery-side winding over the whole period."""
        second_half = (self._rise(0.5, sign=-1.0), self._fall(0.5 + self.first, sign=-1.0))
        return Waveform((self._rise(0.0), self._fall(self.first), *second_half))

    def battery_switch(self) -> Waveform:
        """Return the run of a switch of the battery bridge, from the edge at which the bridge turns positive."""
        return Waveform((self._rise(0.0), self._fall(self.first)))

    def link_switch(self) -> Waveform:
        """Return the run of a switch of the link bridge, as battery-side current, from that bridge's first edge.

        At that edge the bridge turns positive where it follows, negative where it leads. The switch that begins there
        carries the current into the link, source to drain, in the one case and its negative in the other.
        """
        return Waveform((self._fall(self.first, sign=-self.lead), self._rise(0.5, sign=self.lead)))

    def from_battery(self) -> Waveform:
        """Return what the battery bridge draws over half a switching period."""
        return Waveform((self._rise(0.0, 2.0), self._fall(2.0 * self.first, 2.0)))

    def into_link(self) -> Waveform:
        """Return what the link bridge gives over half a switching period, as battery-side current."""
        return Waveform((self._rise(0.0, 2.0, -self.lead), self._fall(2.0 * self.first, 2.0, self.lead)))


def _positions(pieces: _Pieces, point: Point, ratio: float, on: FloatArray) -> dict[str, Position]:
    """Return one switch of each bridge."""
    link, battery = point.link_voltage, point.battery_voltage
    into_link = pieces.link_switch().scaled(1.0 / ratio)
    return {
        "battery_switch": Position(pieces.battery_switch(), battery, battery, on, SWITCHES),
        "link_switch": Position(into_link, link, link, on, SWITCHES),
    }


def _windings(pieces: _Pieces, drive: Drive, resistance: Values) -> dict[str, Winding]:
    """Return inductor and transformer: one current; flux from what the drops leave, and from the link voltage."""
    current = pieces.inductor()
    one, two = pieces.voltages
    one = one - 0.5 * resistance * (pieces.begin + pieces.corner)
    two = two - 0.5 * resistance * (pieces.corner - pieces.begin)
    link = pieces.lead * drive.link
    return {
        "inductor": Winding(current, (one, two, -one, -two)),
        "transformer": Winding(current, (-link, link, link, -link), lone=False),
    }


@hookimpl
def topology() -> DualBridge:
    """Offer the isolated dual active bridge."""
    return DualBridge()
