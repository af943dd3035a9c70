"""Published figures of interleaved legs, through the interleaved stage."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, NamedTuple

import numpy as np
import pytest

from tideleg import Operation, Point
from tideleg_topologies.interleaved import topology

SEMINAR = (
    "M. O'Loughlin, An Interleaving PFC Pre-Regulator for High-Power Converters, Texas Instruments SLUA746"
    " (seminar topic 5)"
)
TWO_PHASE = "Linear Technology, two-phase step-down controller data sheet, applications information, p. 24"
FOUR_PHASE = "Texas Instruments, SLUU195, Eq 6 (product formula)"
RASHID = "M. H. Rashid, Power Electronics: Devices, Circuits and Applications, 4th ed., Pearson, Ex 14.11"
STORED = "found in a stored copy"
RECOMPUTED = "inputs found in a stored copy, value computed by us"
RESOLVED = "found in a stored companion re-solution of the textbook example"

FLAT = 1e6
"""An inductance so large that the current has no ripple [H]."""


def stage(
    legs: int, upper_duty: Any, current: float = 0.0, high: float = 1.0, frequency: float = 1.0, inductance: float = 1.0
) -> Operation:
    """Return the steady state of the legs; `current` is that of all together, positive in boost."""
    model = topology()
    low = high * np.asarray(upper_duty, dtype=float)
    point = Point(low, np.full_like(low, high), np.full_like(low, current), 0.0, np.ones(low.shape, dtype=bool))
    keys = {"switching_frequency": frequency, "legs": legs}
    return model.operate(point, model.settings.model_validate(keys), {"inductor": inductance})


def total_ripple(operation: Operation) -> Any:
    return operation.exchanges["battery_capacitor"].current.peak_to_peak()


def ripple_ratio(legs: int, upper_duty: Any) -> Any:
    op = stage(legs, upper_duty)
    return total_ripple(op) / op.windings["inductor"].current.peak_to_peak()


def link_rms(legs: int, upper_duty: Any) -> Any:
    """Return the link capacitor's RMS per ampere of all inductors together, without ripple."""
    return stage(legs, upper_duty, 1.0, inductance=FLAT).exchanges["link_capacitor"].current.ac_rms()


def worst_link_rms(legs: int) -> float:
    return float(link_rms(legs, np.linspace(0.005, 0.995, 199)).max())


def worst_duty(legs: int) -> float:
    duties = np.linspace(0.005, 0.995, 199)
    return float(duties[np.argmax(link_rms(legs, duties))])


def ripple_per_low_voltage(legs: int, upper_duty: float) -> float:
    """Return the total ripple in units of V_low/(L f)."""
    return float(total_ripple(stage(legs, upper_duty))) / upper_duty


def energy_saved(legs: int) -> float:
    """Return by how much all inductors together store less than a single one of the same inductance."""
    shared = float(stage(legs, 0.4, 10.0).windings["inductor"].current.mean())
    single = float(stage(1, 0.4, 10.0).windings["inductor"].current.mean())
    return 1.0 - legs * shared**2 / single**2


class Row(NamedTuple):
    id: str
    what: str
    published: float
    tolerance: float
    found: Callable[[], Any]
    source: str
    status: str


ROWS = [
    Row("E-C01", "N2_ratio", 0.55, 3e-3, lambda: ripple_ratio(2, 0.31), f"{SEMINAR}, Fig 3 and 7", STORED),
    Row("E-C03", "N1_rms", 0.46249, 2e-4, lambda: link_rms(1, 0.31), f"{SEMINAR}, Fig 5", RECOMPUTED),
    Row("E-C03", "N2_rms", 0.24269, 2e-4, lambda: link_rms(2, 0.31), f"{SEMINAR}, Fig 5", RECOMPUTED),
    Row("E-C04", "N1_worst", 0.5, 1e-6, lambda: worst_link_rms(1), TWO_PHASE, RECOMPUTED),
    Row("E-C04", "N1_worst_duty", 0.5, 1e-6, lambda: worst_duty(1), TWO_PHASE, RECOMPUTED),
    Row("E-C04", "N2_at_0.25", 0.25, 1e-6, lambda: link_rms(2, 0.25), TWO_PHASE, RECOMPUTED),
    Row("E-C04", "N2_at_0.75", 0.25, 1e-6, lambda: link_rms(2, 0.75), TWO_PHASE, RECOMPUTED),
    Row("E-C04", "N2_worst", 0.25, 1e-6, lambda: worst_link_rms(2), TWO_PHASE, RECOMPUTED),
    Row("E-C05", "k", 0.5, 1e-6, lambda: ripple_per_low_voltage(4, 1.5 / 12.0), FOUR_PHASE, RECOMPUTED),
    Row("E-C06", "N2_saved", 0.50, 1e-3, lambda: energy_saved(2), f"{SEMINAR}, sec X, Fig 11", STORED),
    Row("E-C06", "N3_saved", 0.67, 1e-2, lambda: energy_saved(3), f"{SEMINAR}, sec X, Fig 11", STORED),
    Row("E-C06", "N4_saved", 0.75, 1e-3, lambda: energy_saved(4), f"{SEMINAR}, sec X, Fig 11", STORED),
    Row("E-C07", "ratio", 0.190476, 1e-4, lambda: ripple_ratio(4, 0.3), f"{SEMINAR}, sec IX, K4", RECOMPUTED),
    Row("E-C08", "k", 0.166667, 1e-4, lambda: ripple_per_low_voltage(2, 0.75), FOUR_PHASE, RECOMPUTED),
    Row(
        "E-C09",
        "ripple_a",
        5.24,
        1e-3,
        lambda: total_ripple(stage(2, np.linspace(0.005, 0.995, 199), 0.0, 220.0, 350.0, 15e-3)).max(),
        RASHID,
        RESOLVED,
    ),
]
"""Tolerances cover the rounding of the printed digits."""

NULLS = [(2, 1.0 / 2.0), (3, 1.0 / 3.0), (3, 2.0 / 3.0), (4, 0.25), (4, 0.5), (4, 0.75)]


@pytest.mark.parametrize("row", ROWS, ids=lambda row: f"{row.id} {row.what}")
def test_stage_equals_the_published_value(row: Row) -> None:
    assert row.found() == pytest.approx(row.published, rel=row.tolerance), f"{row.source}; {row.status}"


@pytest.mark.parametrize(("legs", "duty"), NULLS)
def test_e_c02_total_ripple_vanishes(legs: int, duty: float) -> None:
    # SLUA746, sections IX and XII; found in a stored copy; absolute 1e-9 of the ripple of one leg.
    assert ripple_ratio(legs, duty) == pytest.approx(0.0, abs=1e-9)
    assert ripple_ratio(legs, duty + 0.02) > 1e-2


@pytest.mark.parametrize("legs", range(1, 7))
def test_ripple_ratio_and_link_rms_follow_their_closed_forms(legs: int) -> None:
    # SLUA746, K and section XIII: N (D - m/N)((m + 1)/N - D)/(D (1 - D)), m = floor(N D); sqrt(a (1 - a))/N.
    duty = np.linspace(0.013, 0.987, 101)
    m = np.floor(legs * duty)
    ratio = legs * (duty - m / legs) * ((m + 1.0) / legs - duty) / (duty * (1.0 - duty))
    assert ripple_ratio(legs, duty) == pytest.approx(ratio, rel=1e-9, abs=1e-9)
    a = legs * duty - m
    assert link_rms(legs, duty) == pytest.approx(np.sqrt(a * (1.0 - a)) / legs, rel=1e-9, abs=1e-7)


def test_e_c05_holds_in_the_published_units() -> None:
    # SLUU195: four phases from 12 V to 1.5 V, ripple 0.5 · V_low/(L f); any L and f, here 1 uH and 500 kHz.
    op = stage(4, 1.5 / 12.0, -100.0, 12.0, 500e3, 1e-6)
    assert total_ripple(op) == pytest.approx(0.5 * 1.5 / (1e-6 * 500e3), rel=1e-9)


def test_trap_output_ripple_of_a_boost_goes_with_the_lower_duty_ratio() -> None:
    # Texas Instruments SNVA335A prints 1 - D where charge balance gives D: with D_lower = 0.7 the link capacitor alone
    # feeds the load for 0.7 of the period, ΔQ = I_out D/f.
    op = stage(1, 0.3, 10.0, 400.0, 20e3, FLAT)
    into_link = float(op.exchanges["link_capacitor"].current.mean())
    charge = float(op.exchanges["link_capacitor"].current.charge_swing()) / 20e3
    assert into_link == pytest.approx(3.0, rel=1e-9)
    assert charge == pytest.approx(into_link * 0.7 / 20e3, rel=1e-6)


def test_trap_two_legs_cancel_where_the_link_is_twice_the_battery() -> None:
    # SNVA335A says V_in = 2 V_out, which no boost reaches: it is V_out = 2 V_in.
    assert ripple_ratio(2, 0.5) == pytest.approx(0.0, abs=1e-9)
    swapped = stage(2, 2.0, 10.0)
    assert swapped.reason == 1
    assert topology().reasons[int(swapped.reason) - 1] == "the battery voltage is not below the link voltage"


def test_trap_positions_block_the_link_voltage_not_the_battery_voltage() -> None:
    # SNVA335A's switching loss takes the input voltage where the switch blocks the output.
    op = stage(2, 0.25, 10.0, 800.0, 20e3, 100e-6)
    for position in op.positions.values():
        assert position.blocks == 800.0
        assert position.turn_on_voltage == 800.0
