"""Published RMS and mean values of piecewise-linear currents, through the waveform algebra and the half-bridge."""

from __future__ import annotations

from collections.abc import Callable
from typing import NamedTuple

import numpy as np
import pytest

from tideleg import Operation, Point, Segment, Waveform
from tideleg_topologies.half_bridge import topology

JACOB = "J. M. Jacob, Power Electronics: Principles and Applications, Cengage, Ex 7.3"
GUPTA = "B. R. Gupta and V. Singhal, Power Electronics, Ex 5.7"
ERICKSON = "R. W. Erickson and D. Maksimović, Fundamentals of Power Electronics, 2nd ed., 2001, Appendix A"
RESOLVED = "found in a stored companion re-solution of the textbook example"
CLOSED = "closed form, value computed by us"


def run(width: float, start: float, end: float) -> Waveform:
    return Waveform((Segment(0.0, width, start, end),))


def triangle(low: float, high: float) -> Waveform:
    """Return a current that rises and falls over the whole period; where it turns does not matter to its RMS."""
    return Waveform((Segment(0.0, 0.3, low, high), Segment(0.3, 0.7, high, low)))


def leg(ratio: float, current: float, ripple: float) -> Operation:
    """Return a half-bridge with that upper duty ratio, inductor current and peak-to-peak ripple."""
    high, frequency = 100.0, 20e3
    model = topology()
    point = Point(np.array(high * ratio), np.array(high), np.array(current), 0.0, np.array(True))
    inductance = high * ratio * (1.0 - ratio) / (frequency * ripple)
    return model.operate(
        point, model.settings.model_validate({"switching_frequency": frequency}), {"inductor": inductance}
    )


def link_rms(operation: Operation) -> float:
    return float(operation.exchanges["link_capacitor"].current.ac_rms())


def battery_rms(operation: Operation) -> float:
    return float(operation.exchanges["battery_capacitor"].current.ac_rms())


def switch(operation: Operation, name: str) -> Waveform:
    return operation.positions[f"{name}_switch"].current


def b05() -> Operation:
    return leg(1.0 / 3.0, 1.5, 0.888889)


class Row(NamedTuple):
    id: str
    what: str
    published: float
    tolerance: float
    found: Callable[[], object]
    source: str
    status: str


ROWS = [
    Row("E-B01", "rms_a", 0.32501, 5e-4, lambda: run(0.42, 0.433, 0.567).rms(), JACOB, RESOLVED),
    Row("E-B01", "rms_flat_top_a", 0.32404, 5e-4, lambda: run(0.42, 0.5, 0.5).rms(), JACOB, RESOLVED),
    Row("E-B02", "mean_a", 25.0, 1e-3, lambda: triangle(20.87, 29.13).mean(), GUPTA, RESOLVED),
    Row("E-B02", "rms_a", 25.11, 1e-3, lambda: triangle(20.87, 29.13).rms(), GUPTA, RESOLVED),
    Row("E-B03", "triangle_rms_a", 3.4641, 1e-4, lambda: run(0.36, 0.0, 10.0).rms(), ERICKSON, CLOSED),
    Row("E-B03", "dc_and_ripple_rms_a", 10.1489, 1e-4, lambda: triangle(7.0, 13.0).rms(), ERICKSON, CLOSED),
    Row("E-B03", "pulse_rms_a", 6.0, 1e-6, lambda: run(0.36, 10.0, 10.0).rms(), ERICKSON, CLOSED),
    Row("E-B04", "link_rms_boost_a", 4.95311, 1e-4, lambda: link_rms(leg(0.4, 10.0, 4.0)), ERICKSON, CLOSED),
    Row("E-B04", "link_rms_buck_a", 4.95311, 1e-4, lambda: link_rms(leg(0.4, -10.0, 4.0)), ERICKSON, CLOSED),
    Row("E-B04", "battery_rms_boost_a", 1.1547, 1e-4, lambda: battery_rms(leg(0.4, 10.0, 4.0)), ERICKSON, CLOSED),
    Row("E-B04", "battery_rms_buck_a", 1.1547, 1e-4, lambda: battery_rms(leg(0.4, -10.0, 4.0)), ERICKSON, CLOSED),
    Row("E-B05", "lower_mean_a", 1.0, 1e-4, lambda: switch(b05(), "lower").mean(), ERICKSON, CLOSED),
    Row("E-B05", "upper_mean_a", 0.5, 1e-4, lambda: -switch(b05(), "upper").mean(), ERICKSON, CLOSED),
    Row("E-B05", "lower_rms_a", 1.24254, 1e-4, lambda: switch(b05(), "lower").rms(), ERICKSON, CLOSED),
    Row("E-B05", "upper_rms_a", 0.87861, 1e-4, lambda: switch(b05(), "upper").rms(), ERICKSON, CLOSED),
    Row("E-B06", "mean_a", 3.75, 1e-6, lambda: triangle_within(0.75).mean(), ERICKSON, CLOSED),
    Row("E-B06", "rms_a", 5.0, 1e-6, lambda: triangle_within(0.75).rms(), ERICKSON, CLOSED),
]
"""Tolerances cover the rounding of the printed digits."""


def triangle_within(width: float) -> Waveform:
    """Return a triangle from zero to 10 A and back that leaves part of the period idle."""
    return Waveform((Segment(0.0, 0.3, 0.0, 10.0), Segment(0.3, width - 0.3, 10.0, 0.0)))


@pytest.mark.parametrize("row", ROWS, ids=lambda row: f"{row.id} {row.what}")
def test_waveform_equals_the_published_value(row: Row) -> None:
    assert row.found() == pytest.approx(row.published, rel=row.tolerance), f"{row.source}; {row.status}"


@pytest.mark.parametrize("current", [-80.0, -3.0, 3.0, 80.0])
@pytest.mark.parametrize("ratio", [0.1, 0.4, 0.5, 0.85])
def test_closed_forms_of_a_leg(ratio: float, current: float) -> None:
    # Erickson and Maksimović, Appendix A method: sqrt(D (I² + r²/12)) and so on; exact, hence 1e-12.
    ripple = 12.0
    op = leg(ratio, current, ripple)
    square = current**2 + ripple**2 / 12.0
    assert switch(op, "upper").mean_square() == pytest.approx(ratio * square, rel=1e-12)
    assert switch(op, "lower").mean_square() == pytest.approx((1.0 - ratio) * square, rel=1e-12)
    high_side = ratio * (1.0 - ratio) * current**2 + ratio * ripple**2 / 12.0
    assert link_rms(op) ** 2 == pytest.approx(high_side, rel=1e-11)
    assert battery_rms(op) ** 2 == pytest.approx(ripple**2 / 12.0, rel=1e-9)
