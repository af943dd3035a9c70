"""Inverting buck-boost leg: the link stands opposite in sign to the battery and above or below it in size.

The inductor lies between the switch node and the return. The battery position joins the node to the battery for a share
D of the period, the link position to the (negative) link for the rest; both block the sum of both voltages. All link
voltages here are magnitudes. Both port capacitors carry pulsed currents.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

import numpy as np

from tideleg import (
    CONTINUOUS,
    IDLE,
    Exchange,
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
from tideleg_topologies.gates import CAUTIONS, SHORT_PULSE, Pulses, gates
from tideleg_topologies.leg import ASSUMPTIONS, NO_DUTY_RATIO, SynchronousSettings

LEAST_DUTY = 1e-6
"""Keeps the inductor current finite where no duty ratio exists; such steps carry a reason [-]."""


class InvertingSettings(SynchronousSettings):
    """Keys under [stage]: those of a two-level leg."""

    legs: Literal[1] = 1


@dataclass(frozen=True)
class Inverting:
    """The topology. `Operation.duty_ratio` is that of the battery position."""

    name: str = "inverting"
    source: str = (
        "R. W. Erickson and D. Maksimović, Fundamentals of Power Electronics, 2nd ed., Kluwer, 2001: buck-boost,"
        " M = D/(1 - D), inductor current I_out/(1 - D) (chapter from memory)"
    )
    settings: type[InvertingSettings] = InvertingSettings
    reasons: tuple[str, ...] = (NO_DUTY_RATIO, SHORT_PULSE)
    cautions: tuple[str, ...] = CAUTIONS
    assumptions: tuple[str, ...] = ASSUMPTIONS[:2]
    feeds_link_through_diodes: bool = False

    def slots(self, settings: InvertingSettings) -> tuple[Slot, ...]:
        """Return the places for parts."""
        return (
            Slot("battery_switch", "switch", "switch"),
            Slot("link_switch", "switch", "switch"),
            Slot("inductor", "inductor", "inductor"),
            Slot("battery_capacitor", "capacitor", "battery_capacitor"),
            Slot("link_capacitor", "capacitor", "link_capacitor"),
        )

    def operate(self, point: Point, settings: InvertingSettings, inductance: Mapping[str, Values]) -> Operation:
        """Return the steady state at each step.

        Volt-seconds with the drop of the inductor current I/D in its path: D V_sum = V_link + R I/D, a square in D.
        """
        frequency, link, battery = settings.switching_frequency, point.link_voltage, point.battery_voltage
        both = np.maximum(battery + link, 1e-100)
        drop = point.battery_current * point.path_resistance
        root = link * link + 4.0 * both * drop
        wanted = (link + np.sqrt(np.maximum(root, 0.0))) / (2.0 * both)
        duty = np.clip(wanted, LEAST_DUTY, 1.0 - LEAST_DUTY)
        on = point.active.astype(np.float64)
        ripple = on * both * duty * (1.0 - duty) / (inductance["inductor"] * frequency)
        current = on * point.battery_current / duty
        peak, valley = current + 0.5 * ripple, current - 0.5 * ripple
        charge = Segment(0.0, duty * on, valley, peak)
        discharge = Segment(duty * on, (1.0 - duty) * on, peak, valley)
        from_battery, into_link = Waveform((charge,)), Waveform((discharge,))
        lost = (root < 0.0) | (wanted <= LEAST_DUTY) | (wanted >= 1.0 - LEAST_DUTY)
        pulses = gates(
            Pulses((1.0 - duty) * on, duty * on, valley, peak), frequency, settings.dead_time, settings.minimum_pulse
        )
        return Operation(
            positions={
                "battery_switch": Position(from_battery, both, both, on),
                "link_switch": Position(into_link.scaled(-1.0), both, both, on),
            },
            windings={"inductor": Winding(Waveform((charge, discharge)), ((1.0 - duty) * both, -duty * both))},
            exchanges={
                "battery_capacitor": Exchange(from_battery, frequency, battery),
                "link_capacitor": Exchange(into_link, frequency, link),
            },
            timing=Timing(frequency, settings.dead_time),
            duty_ratio=duty * on,
            conduction=np.where(point.active, np.int8(CONTINUOUS), np.int8(IDLE)),
            reason=pulses.reason(np.where(lost, np.int8(1), np.int8(0)), 2),
            caution=pulses.caution,
            columns=pulses.columns(),
        )


@hookimpl
def topology() -> Inverting:
    """Offer the inverting buck-boost leg."""
    return Inverting()
