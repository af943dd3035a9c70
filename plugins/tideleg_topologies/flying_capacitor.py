"""Three-level leg with a flying capacitor: devices at half the link voltage, ripple at twice their frequency.

Four positions in series join the link to the return; the inductor meets them in the middle, the flying capacitor spans
the inner two and is held at half the link voltage. The outer pair and the inner pair each switch with the duty ratio D,
half a period apart. The outer and the inner upper position carry the same current half a period apart, and so do the
two lower ones: each sort is stated once, with two copies a leg.

Modelling choices: the flying capacitor is balanced; both port capacitors take the whole ac part of the exchange; legs
are alike and evenly shifted; the inductor current may reverse and is never discontinuous.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from pydantic import Field

from tideleg import CONTINUOUS, IDLE, Exchange, Operation, Point, Position, Slot, Timing, Values, Winding, hookimpl
from tideleg_topologies import three_level
from tideleg_topologies.gates import CAUTIONS
from tideleg_topologies.leg import REASONS, SynchronousSettings


class FlyingCapacitorSettings(SynchronousSettings):
    """Keys under [stage]: those of a two-level leg, and the number of legs."""

    legs: int = Field(default=1, ge=1, strict=True)


@dataclass(frozen=True)
class FlyingCapacitor:
    """The topology. `Operation.duty_ratio` is that of the upper positions."""

    name: str = "flying-capacitor"
    source: str = three_level.SOURCE
    settings: type[FlyingCapacitorSettings] = FlyingCapacitorSettings
    reasons: tuple[str, ...] = REASONS
    cautions: tuple[str, ...] = CAUTIONS
    assumptions: tuple[str, ...] = three_level.ASSUMPTIONS

    def slots(self, settings: FlyingCapacitorSettings) -> tuple[Slot, ...]:
        """Return the places for parts; two equal positions of each sort in a leg."""
        legs = settings.legs
        return (
            Slot("upper_switch", "switch", "switch", 2 * legs),
            Slot("lower_switch", "switch", "switch", 2 * legs),
            Slot("inductor", "inductor", "inductor", legs),
            Slot("flying_capacitor", "capacitor", "flying_capacitor", legs),
            Slot("battery_capacitor", "capacitor", "battery_capacitor"),
            Slot("link_capacitor", "capacitor", "link_capacitor"),
        )

    def operate(self, point: Point, settings: FlyingCapacitorSettings, inductance: Mapping[str, Values]) -> Operation:
        """Return the steady state at each step."""
        legs, frequency, link = settings.legs, settings.switching_frequency, point.link_voltage
        currents = three_level.ThreeLevelCurrents.at(
            point, point.battery_current / legs, frequency, inductance["inductor"]
        )
        pulses = currents.gates(settings)
        inductor, into_link = currents.inductor(), currents.upper()
        driven = point.active.astype(np.float64)
        half = 0.5 * link
        return Operation(
            positions={
                "upper_switch": Position(into_link.scaled(-1.0), half, half, driven, 2 * legs),
                "lower_switch": Position(currents.lower(), half, half, driven, 2 * legs),
            },
            windings={"inductor": Winding(inductor, currents.voltages(link), legs)},
            exchanges={
                "flying_capacitor": Exchange(currents.middle(), frequency, half),
                "battery_capacitor": Exchange(inductor.fold(legs), legs * frequency, point.battery_voltage),
                "link_capacitor": Exchange(into_link.fold(legs), legs * frequency, link),
            },
            timing=Timing(frequency, settings.dead_time),
            duty_ratio=currents.duty * driven,
            conduction=np.where(point.active, np.int8(CONTINUOUS), np.int8(IDLE)),
            reason=pulses.reason(currents.reason, three_level.SHORT),
            caution=pulses.caution,
            columns=pulses.columns(),
        )


@hookimpl
def topology() -> FlyingCapacitor:
    """Offer the three-level leg with a flying capacitor."""
    return FlyingCapacitor()
