"""Choosing an inductor: what is chosen fulfils its own need when recomputed by other means, and nothing goes missing."""

from __future__ import annotations

import re
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import brentq

from tideleg import InputError
from tideleg_losses.gap import fringing_factor
from tideleg_losses.inductor_build_catalogue import cores, wires
from tideleg_losses.inductor_build_design import InductorNeed, choose_inductor, losses, shortfalls

MU0 = 4e-7 * np.pi
CORES, WIRES = cores(), wires()
# One of each sort keeps the property test quick.
SOME_CORES = [c for c in CORES if c.name in ("ferrite 70", "ferrite 130", "powder 57 mu 60", "powder 102 mu 26")]
SOME_WIRES = [
    w for w in WIRES if w.name in ("round 2.5 mm", "litz 400 x 0.1 mm", "litz 2500 x 0.1 mm", "foil 0.4 x 40 mm")
]
NEED = InductorNeed(100e-6, 20.0, 15.0, 6.0, 100e3, 15.0)


def needs() -> Any:
    return st.builds(
        lambda henry, peak, rms, ripple, hertz, watts: InductorNeed(
            henry, peak, max(rms, ripple / 3.4) * peak, ripple * peak, hertz, watts
        ),
        st.floats(5e-6, 400e-6),
        st.floats(5.0, 150.0),
        st.floats(0.5, 0.95),
        st.floats(0.05, 0.6),
        st.floats(20e3, 150e3),
        st.floats(2.0, 120.0),
    )


def flux_by_hand(build: Any, current: float) -> float:
    """Return the flux density, by scipy's root of Ampère's law on the core's own curve [T]."""
    core = build.core
    spread = (
        build.gap / float(fringing_factor(build.gap, core.area, core.window_height)) / MU0 if build.gap > 0.0 else 0.0
    )
    drive = build.turns * current

    def excess(field: float) -> float:
        return float(field * core.path_length + float(core.law.flux_density(field)) * spread - drive)

    field = brentq(excess, 0.0, drive / core.path_length * (1 + 1e-12) + 1e-12, xtol=1e-12, rtol=1e-14)
    return float(core.law.flux_density(field))


@settings(max_examples=25, deadline=None)
@given(needs())
def test_every_candidate_fulfils_the_need_when_recomputed(need: InductorNeed) -> None:
    found = choose_inductor(need, SOME_CORES, SOME_WIRES)
    assert len(found.candidates) + len(found.rejected) == len(SOME_CORES) * len(SOME_WIRES)
    for one in found.candidates:
        build = one.build
        assert shortfalls(need, build) == ()
        step = 1e-4 * need.peak_current
        low, peak, high = (flux_by_hand(build, need.peak_current + s) for s in (-step, 0.0, step))
        assert peak <= build.core.flux_limit * (1 + 1e-6)
        slope = build.turns * build.core.area * (high - low) / (2 * step)
        assert slope >= need.inductance * (1 - 1e-4)
        assert build.turns * build.wire.copper_area <= need.fill_limit * build.core.window_area
        bare = 1.7241e-8 * (1 + 0.00393 * 80) * build.turns * build.core.mean_turn_length / build.wire.copper_area
        assert bare * need.rms_current**2 <= one.winding_loss * (1 + 1e-9)
        assert one.winding_loss + one.core_loss <= need.loss_budget
    for left in found.rejected:
        assert left.reason


@settings(max_examples=15, deadline=None)
@given(needs())
def test_the_least_volume_stands_first_and_fewer_turns_would_not_do(need: InductorNeed) -> None:
    found = choose_inductor(need, SOME_CORES, SOME_WIRES).candidates
    volumes = [one.build.volume for one in found]
    assert volumes == sorted(volumes)
    for one in found:
        if one.build.gap == 0.0 and one.build.turns > 1:
            fewer = type(one.build)(one.build.core, one.build.wire, one.build.turns - 1)
            assert shortfalls(need, fewer)


def test_core_loss_is_that_of_the_triangle_by_its_closed_form() -> None:
    from scipy.special import gamma

    best = choose_inductor(NEED, CORES, WIRES).candidates[0]
    k, alpha, beta = best.build.core.steinmetz
    swing = best.build.inductance * NEED.ripple_current / (best.build.turns * best.build.core.area)
    turn = 2 * np.sqrt(np.pi) * gamma((alpha + 1) / 2) / gamma(alpha / 2 + 1)
    k_i = k / ((2 * np.pi) ** (alpha - 1) * 2 ** (beta - alpha) * turn)
    due = k_i * swing**beta * NEED.frequency**alpha * 2**alpha * best.build.core.volume
    assert best.core_loss == pytest.approx(due, rel=1e-9)
    assert losses(NEED, best.build) == (best.winding_loss, best.core_loss)


def test_a_greater_budget_never_costs_volume_and_a_nil_one_finds_nothing() -> None:
    least = []
    for watts in (6.0, 10.0, 40.0):
        need = InductorNeed(100e-6, 20.0, 15.0, 6.0, 100e3, watts)
        least.append(choose_inductor(need, SOME_CORES, SOME_WIRES).candidates[0].build.volume)
    assert least == sorted(least, reverse=True)
    assert choose_inductor(InductorNeed(100e-6, 20.0, 15.0, 6.0, 100e3, 1e-6), SOME_CORES, SOME_WIRES).candidates == ()


@pytest.mark.parametrize(
    ("need", "words"),
    [
        (NEED, "do not fit the window|is 40 mm wide"),
        (InductorNeed(100e-6, 20.0, 15.0, 6.0, 100e3, 1.0), r"least loss is .* W with .* 1 W is allowed"),
        (
            InductorNeed(1e-3, 150.0, 100.0, 6.0, 100e3, 15.0),
            "no turns up to 400 and gap for 1000 uH keep within 0.28 T",
        ),
        (InductorNeed(1e-3, 150.0, 100.0, 6.0, 100e3, 15.0), r"it keeps at most .* uH \(.* turns\), 1000 uH is wanted"),
        (InductorNeed(100e-6, 20.0, 15.0, 6.0, 1e6, 15.0), "strands of 0.1 mm are thicker than the skin depth, 0.0758"),
        (
            InductorNeed(100e-6, 20.0, 15.0, 6.0, 100e3, 15.0, fill_limit=0.01),
            "of the window with copper, 1% is allowed",
        ),
    ],
)
def test_every_reason_is_said_in_words_with_numbers(need: InductorNeed, words: str) -> None:
    rejected = choose_inductor(need, SOME_CORES, SOME_WIRES).rejected
    assert any(re.search(words, one.reason) for one in rejected)


@pytest.mark.parametrize(
    ("keys", "words"),
    [
        ({"inductance": 0.0}, "inductance: found 0"),
        ({"loss_budget": float("nan")}, "loss_budget: found nan"),
        ({"rms_current": 25.0}, "above the peak, 20 A"),
        ({"ripple_current": 41.0}, "twice the peak current, 40 A"),
        ({"ripple_current": 40.0, "rms_current": 5.0}, "below the 11.55 A of the ripple alone"),
        ({"degc": 400.0}, "-60 to 250 degC"),
    ],
)
def test_needs_that_no_current_has_are_refused(keys: dict[str, float], words: str) -> None:
    sound = {
        "inductance": 1e-4,
        "peak_current": 20.0,
        "rms_current": 15.0,
        "ripple_current": 6.0,
        "frequency": 1e5,
        "loss_budget": 15.0,
    }
    with pytest.raises(InputError, match=words):
        InductorNeed(**{**sound, **keys})
