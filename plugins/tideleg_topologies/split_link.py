"""Three-level leg on a split link: two link capacitors in series, and a switch pair to each half of the link.

The inductor leads from the battery to node A. Between A and node B, where the battery returns, two inner positions
stand in series with the midpoint of the link between them; an outer position joins A to the upper rail, another the
lower rail to B. Each inner position is the complement of the outer one beside it, and the two pairs switch half a
period apart, so every device blocks half the link voltage and the inductor sees twice the device frequency.

While only the upper outer position conducts, the current leaves through the upper half of the link and comes back by
the midpoint; while only the lower one does, the other way round. Over a period both halves receive the same charge: the
mean midpoint current is zero and the halves stay balanced. The midpoint current is what the halves differ by inside a
period.

Neither battery pole is joined to a rail of the link: both move against it with the switching frequency. The current of
that common mode through stray capacitance is not modelled.

Modelling choices: the halves are balanced; the stage takes power from or gives it to the link by its two rails only;
both port capacitors take the whole ac part of the exchange; the inductor current may reverse and is never
discontinuous.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

import numpy as np

from tideleg import CONTINUOUS, IDLE, Exchange, Operation, Point, Position, Slot, Timing, Values, Winding, hookimpl
from tideleg_topologies import three_level
from tideleg_topologies.gates import CAUTIONS
from tideleg_topologies.leg import REASONS, SynchronousSettings


class SplitLinkSettings(SynchronousSettings):
    """Keys under [stage]: those of a two-level leg. One leg: a midpoint serves one."""

    legs: Literal[1] = 1


@dataclass(frozen=True)
class SplitLink:
    """The topology. `Operation.duty_ratio` is that of the outer positions.

    The part `link_capacitor` is ONE of the two halves: its capacitance, its voltage (half the link) and its current.
    """

    name: str = "split-link"
    source: str = three_level.SOURCE + "; each half of a split link: dV = I_out D_boost/(f C), charge balance"
    settings: type[SplitLinkSettings] = SplitLinkSettings
    reasons: tuple[str, ...] = REASONS
    cautions: tuple[str, ...] = CAUTIONS
    assumptions: tuple[str, ...] = (
        *three_level.ASSUMPTIONS,
        "the battery floats against the rails of the link; the current of that common mode is not modelled",
        "a limit of the link voltage ripple is held against each half of the split link",
    )

    def slots(self, settings: SplitLinkSettings) -> tuple[Slot, ...]:
        """Return the places for parts; two outer and two inner positions, two halves of the link capacitor."""
        return (
            Slot("upper_switch", "switch", "switch", 2),
            Slot("lower_switch", "switch", "switch", 2),
            Slot("inductor", "inductor", "inductor"),
            Slot("battery_capacitor", "capacitor", "battery_capacitor"),
            Slot("link_capacitor", "capacitor", "link_capacitor", copies=2, in_series=2),
        )

    def operate(self, point: Point, settings: SplitLinkSettings, inductance: Mapping[str, Values]) -> Operation:
        """Return the steady state at each step.

        The upper half of the link receives what the upper outer position passes and gives the mean to the load; the
        lower half does the same half a period later.
        """
        frequency, link = settings.switching_frequency, point.link_voltage
        currents = three_level.ThreeLevelCurrents.at(point, point.battery_current, frequency, inductance["inductor"])
        pulses = currents.gates(settings)
        inductor, into_link, midpoint = currents.inductor(), currents.upper(), currents.middle()
        driven = point.active.astype(np.float64)
        half = 0.5 * link
        return Operation(
            positions={
                "upper_switch": Position(into_link.scaled(-1.0), half, half, driven, 2),
                "lower_switch": Position(currents.lower(), half, half, driven, 2),
            },
            windings={"inductor": Winding(inductor, currents.voltages(link))},
            exchanges={
                "battery_capacitor": Exchange(inductor, frequency, point.battery_voltage),
                "link_capacitor": Exchange(into_link, frequency, half),
            },
            timing=Timing(frequency, settings.dead_time),
            duty_ratio=currents.duty * driven,
            conduction=np.where(point.active, np.int8(CONTINUOUS), np.int8(IDLE)),
            reason=pulses.reason(currents.reason, three_level.SHORT),
            caution=pulses.caution,
            columns={
                **pulses.columns(),
                "midpoint.current_rms_a": midpoint.rms(),
                "midpoint.current_mean_a": midpoint.mean(),
                "midpoint.charge_swing_c": midpoint.charge_swing() / frequency,
            },
        )


@hookimpl
def topology() -> SplitLink:
    """Offer the three-level leg on a split link."""
    return SplitLink()
