"""Two interleaved legs whose inductors are inversely coupled on one core.

Both windings see the battery on one side and their node on the other; flux that one leg drives into the common path
opposes that of the other. With the self-inductance L of one winding (the other open) and the coupling k,

    v1 = L di1/dt - k L di2/dt,    v2 = -k L di1/dt + L di2/dt,

so that di1/dt = (v1 + k v2)/(L (1 - k²)). The carriers are half a period apart: below half duty the two upper positions
never conduct together, above it the two lower ones never do, and each half period again falls into two pieces. What
both legs exchange with a port is seen by the leakage inductance L (1 - k) alone, so a strong coupling lowers the ripple
of a leg but raises that of the battery port.

Source: P.-L. Wong, P. Xu, B. Yang and F. C. Lee, Performance improvements of interleaving VRMs with coupling inductors,
IEEE Trans. Power Electronics 16(4), 2001 (from memory): equivalent inductances of inversely coupled legs.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Literal, NamedTuple

import numpy as np
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
    quantity,
)
from tideleg_topologies import legs
from tideleg_topologies.gates import CAUTIONS, SHORT_PULSE, Pulses, gates
from tideleg_topologies.leg import ASSUMPTIONS, NO_DUTY_RATIO, NOT_BELOW_LINK, REASONS, SynchronousSettings

LEGS = 2


class CoupledPairSettings(SynchronousSettings):
    """Keys under [stage]: those of a synchronous leg and the coupling.

    coupling : share of one winding's flux that passes the other winding; 0 is two separate inductors
    """

    legs: Literal[2] = 2
    coupling: quantity.Share = Field(ge=0.0, lt=1.0)


class _Leg(NamedTuple):
    """One leg: four pieces of the period, from the instant at which its upper position begins to conduct.

    widths : of the pieces [-]
    corners : current where each piece begins, and at last where the period ends [A]
    below : whether the duty ratio is below one half
    """

    widths: tuple[FloatArray, ...]
    corners: tuple[FloatArray, ...]
    below: Any

    def piece(self, index: int, weight: Values = 1.0) -> Segment:
        """Return one piece, or where `weight` is 0 nothing."""
        place = sum(self.widths[:index]) if index else 0.0
        return Segment(place, self.widths[index] * weight, self.corners[index], self.corners[index + 1])

    def inductor(self) -> Waveform:
        """Return the whole current."""
        return Waveform(tuple(self.piece(i) for i in range(4)))

    def upper(self) -> Waveform:
        """Return the upper position's run: the first piece below half duty, the first three above."""
        return Waveform((self.piece(0), *(self._kept(i, ~self.below, 1) for i in (1, 2))))

    def lower(self) -> Waveform:
        """Return the lower position's run: what the upper one leaves."""
        return Waveform((*(self._kept(i, self.below, 3) for i in (1, 2)), self.piece(3)))

    def _kept(self, index: int, keep: Any, corner: int) -> Segment:
        """Return one piece where kept; elsewhere no width, and the current at the run's neighbouring corner."""
        whole = self.piece(index, np.asarray(keep, dtype=np.float64))
        return whole._replace(
            start=np.where(keep, whole.start, self.corners[corner]), end=np.where(keep, whole.end, self.corners[corner])
        )


@dataclass(frozen=True)
class CoupledPair:
    """The topology. `Operation.duty_ratio` is that of the upper positions."""

    name: str = "coupled-pair"
    source: str = (
        "P.-L. Wong et al., IEEE Trans. Power Electronics 16(4), 2001 (from memory): di1/dt = (v1 + k v2)/(L (1 - k²))"
    )
    settings: type[CoupledPairSettings] = CoupledPairSettings
    reasons: tuple[str, ...] = REASONS
    cautions: tuple[str, ...] = CAUTIONS
    assumptions: tuple[str, ...] = (
        *ASSUMPTIONS[:2],
        "core loss and flux of coupled inductors are counted as if each winding had a core of its own that carries its"
        " whole flux; legs share the current evenly",
    )

    def slots(self, settings: CoupledPairSettings) -> tuple[Slot, ...]:
        """Return the places for parts; an inductor is one winding with its share of the core."""
        return legs.slots(settings.legs)

    def starting_values(self, need: Need) -> Mapping[str, float | str]:
        """Return a coupling to start from: a common value between no gain and no leakage left; common practice."""
        return {"coupling": 0.4}

    def operate(self, point: Point, settings: CoupledPairSettings, inductance: Mapping[str, Values]) -> Operation:
        """Return the steady state at each step."""
        frequency, link = settings.switching_frequency, point.link_voltage
        current = point.battery_current / LEGS
        wanted = (point.battery_voltage - current * point.path_resistance) / np.maximum(link, 1e-100)
        duty = np.clip(wanted, 0.0, 1.0)
        on = point.active.astype(np.float64)
        self_henry = inductance["inductor"] * frequency
        mine, others = _node_voltages(duty, link)
        leg = _leg(duty, on, current, mine, others, settings.coupling, self_henry)
        upper, lower, inductor = leg.upper(), leg.lower(), leg.inductor()
        begins, ends = leg.corners[0], np.where(leg.below, leg.corners[1], leg.corners[3])
        pulses = gates(
            Pulses(duty * on, (1.0 - duty) * on, np.minimum(begins, ends), np.maximum(begins, ends)),
            frequency,
            settings.dead_time,
            settings.minimum_pulse,
        )
        lost = np.where((wanted <= 0.0) | (wanted >= 1.0), np.int8(1 + REASONS.index(NO_DUTY_RATIO)), np.int8(0))
        reason = np.where(point.battery_voltage >= link, np.int8(1 + REASONS.index(NOT_BELOW_LINK)), lost)
        return Operation(
            positions={
                "upper_switch": Position(upper.scaled(-1.0), link, link, on, LEGS),
                "lower_switch": Position(lower, link, link, on, LEGS),
            },
            windings={"inductor": Winding(inductor, mine, LEGS, lone=False)},
            exchanges={
                "battery_capacitor": Exchange(inductor.fold(LEGS), LEGS * frequency, point.battery_voltage),
                "link_capacitor": Exchange(upper.fold(LEGS), LEGS * frequency, link),
            },
            timing=Timing(frequency, settings.dead_time),
            duty_ratio=duty * on,
            conduction=np.where(point.active, np.int8(CONTINUOUS), np.int8(IDLE)),
            reason=pulses.reason(reason, 1 + REASONS.index(SHORT_PULSE)),
            caution=pulses.caution,
            columns=pulses.columns(),
        )


def _node_voltages(duty: FloatArray, link: FloatArray) -> tuple[tuple[FloatArray, ...], tuple[FloatArray, ...]]:
    """Return the voltage of this winding and of the other one in each of the four pieces [V]."""
    below = duty < 0.5
    low, high = duty * link, duty * link - link  # while the lower, while the upper position conducts
    mine = (high, np.where(below, low, high), np.where(below, low, high), low)
    return mine, (mine[2], mine[3], mine[0], mine[1])


def _leg(
    duty: FloatArray,
    on: FloatArray,
    current: FloatArray,
    mine: tuple[FloatArray, ...],
    others: tuple[FloatArray, ...],
    coupling: float,
    self_henry: Values,
) -> _Leg:
    """Return the corner currents: slopes from both windings' voltages, raised to the wanted mean."""
    below = duty < 0.5
    short = np.where(below, duty, duty - 0.5) * on
    long = 0.5 * on - short
    widths = (short, long, short, long)
    effective = self_henry * (1.0 - coupling * coupling)
    corners = [np.zeros_like(duty)]
    for width, v, w in zip(widths, mine, others, strict=True):
        corners.append(corners[-1] + (v + coupling * w) * width / effective)
    flat = sum(0.5 * width * (a + b) for width, a, b in zip(widths, corners[:-1], corners[1:], strict=True))
    lift = on * current - np.asarray(flat)
    return _Leg(widths, tuple(corner + lift for corner in corners), below)


@hookimpl
def topology() -> CoupledPair:
    """Offer the coupled pair of legs."""
    return CoupledPair()
