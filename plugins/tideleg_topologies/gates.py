"""Gate pulses of a leg: what dead time leaves of them, and where they become too short.

Each gate turns on a dead time after its command and off with it. In a dead time the current takes the diode it finds:
a current into the link (discharge) keeps the link-side diode conducting in both dead times of a period, a current out
of it the other one; one that reverses within the period swings the node at once at both edges. So the conducting share
of the link-side position, which the volt-seconds fix, is the commanded one plus t_d f in discharge, less t_d f in
charge, and the commanded one itself where the current reverses. Source: the path of the current at each edge; common
practice under the name of dead-time compensation, no source.
"""

from __future__ import annotations

from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from tideleg import FloatArray, Values

SHORT_PULSE = (
    "the pulse of the controlling switch is shorter than dead time and minimum_pulse allow (battery and link voltage"
    " too near each other, or too far apart)"
)
SKIPPED = "pulses at light load are shorter than minimum_pulse: a controller would skip some of them"
DIODE_CARRIES = (
    "the gate pulse of the rectifying switch is shorter than dead time and minimum_pulse allow: its diode would carry"
    " what is counted as channel conduction"
)
CAUTIONS = (SKIPPED, DIODE_CARRIES)


class Pulses(NamedTuple):
    """The conducting runs of one leg, which volt-seconds fix; arrays (..., S).

    link_side, battery_side : share of the period in which the position conducts that joins the node to the link, and
        its complement [-]
    valley, peak : of the inductor current, positive = discharge [A]
    rests : where the current is discontinuous
    """

    link_side: Values
    battery_side: Values
    valley: Values
    peak: Values
    rests: Any = False


class Gates(NamedTuple):
    """Gate pulses at each step, arrays (..., S).

    link_side, battery_side : share of the period in which that gate is on, 0 where its dead time swallows it [-]
    duty_shift : conducting less commanded share of the link-side position [-]
    too_short : where the stage cannot be controlled so
    caution : code into `CAUTIONS`, counted from 1
    """

    link_side: FloatArray
    battery_side: FloatArray
    duty_shift: FloatArray
    too_short: NDArray[np.bool_]
    caution: Any

    def columns(self) -> dict[str, Values]:
        """Return what a reader of the table of steps wants to know of the gates."""
        return {
            "link_side_gate_duty_ratio": self.link_side,
            "battery_side_gate_duty_ratio": self.battery_side,
            "dead_time_duty_shift": self.duty_shift,
        }

    def reason(self, others: Any, code: int) -> Any:
        """Return the reason codes of a leg, `code` added where a pulse is too short and nothing else is in the way."""
        return np.where(self.too_short & (np.asarray(others) == 0), np.int8(code), others)


def gates(pulses: Pulses, frequency: Values, dead_time: float, minimum_pulse: float) -> Gates:
    """Return the gate pulses behind the conducting runs of a leg.

    Parameters
    ----------
    pulses : Pulses
    frequency : float or ndarray
        Switching frequency of the leg [Hz].
    dead_time, minimum_pulse : float
        [s]
    """
    dead, least = np.asarray(dead_time * frequency), minimum_pulse * frequency
    link_side, battery_side, valley, peak, rests = (np.asarray(values) for values in pulses)
    flows = link_side + battery_side > 0.0
    into_link, out_of_link = (valley >= 0.0) & (peak > 0.0), (peak <= 0.0) & (valley < 0.0)
    # After a rest the first gate of the period closes on no current: only one dead time is left to a diode.
    by_diode = np.where(rests, 1.0, 2.0) * dead
    link_gate = link_side - np.where(into_link, by_diode, np.where(out_of_link, 0.0, dead))
    battery_gate = battery_side - np.where(out_of_link, by_diode, np.where(into_link, 0.0, dead))
    shift = np.where(rests | ~flows, 0.0, dead * (into_link * 1.0 - out_of_link * 1.0))
    controls = np.where(into_link, battery_gate, np.where(out_of_link, link_gate, np.minimum(link_gate, battery_gate)))
    follows = np.where(into_link, link_gate, np.where(out_of_link, battery_gate, np.inf))
    short = flows & ((controls < least) | (controls <= 0.0))
    by_its_diode = flows & ((follows < least) | (follows <= 0.0))
    caution = np.where(short & rests, np.int8(1), np.where(by_its_diode, np.int8(2), np.int8(0)))
    return Gates(
        np.where(flows, np.maximum(link_gate, 0.0), 0.0),
        np.where(flows, np.maximum(battery_gate, 0.0), 0.0),
        shift,
        short & ~rests,
        caution,
    )
