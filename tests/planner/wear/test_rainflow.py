"""Cycle counts against two independent packages, and the streaming count against the count in one go."""

from itertools import pairwise

import fatpack
import numpy as np
import pytest
import rainflow
from hypothesis import given
from hypothesis import strategies as st

from tideleg.stress import Cycles
from tideleg.wear import RESIDUE_RULES, CycleCount, count_cycles, turning_points
from tideleg.wear import rainflow as rainflow_module
from tideleg.wear.rainflow import joined_cycles

TIED = st.lists(st.integers(-4, 4), min_size=2, max_size=60)
FINE = st.lists(st.floats(-100, 100, width=32), min_size=2, max_size=80)
RULES = sorted(RESIDUE_RULES)


def counted(values, rule):
    return count_cycles(np.arange(len(values), dtype=float), np.asarray(values, dtype=float), rule)


def table(cycles):
    """Range -> count, as `rainflow.count_cycles` gives it."""
    found = {}
    for size, count in zip(cycles.range.tolist(), cycles.weight.tolist(), strict=True):
        found[size] = found.get(size, 0.0) + count
    return found


def same(found, wanted):
    assert sorted(found) == pytest.approx(sorted(wanted), abs=1e-9)
    assert [found[k] for k in sorted(found)] == [wanted[k] for k in sorted(wanted)]


@given(st.one_of(TIED, FINE.map(lambda v: [round(x, 2) for x in v])))
def test_half_cycles_agree_with_the_rainflow_package(values):
    values = [v for i, v in enumerate(values) if i == 0 or v != values[i - 1]]
    if len(values) < 3:  # the package gives nothing for a single slope
        return
    theirs = {}
    for size, _, count, _, _ in rainflow.extract_cycles(values):
        theirs[round(size, 9)] = theirs.get(round(size, 9), 0.0) + count
    ours = {}
    for size, count in table(counted(values, "half_cycles")).items():
        ours[round(size, 9)] = ours.get(round(size, 9), 0.0) + count
    same(ours, {size: count for size, count in theirs.items() if size > 0.0})


@pytest.mark.parametrize("seed", range(8))
def test_means_and_ranges_of_half_cycles_agree_with_the_rainflow_package_on_long_histories(seed):
    history = np.cumsum(np.random.default_rng(seed).normal(size=4000))
    theirs = sorted((size, mean, count) for size, mean, count, _, _ in rainflow.extract_cycles(history))
    ours = counted(history, "half_cycles")
    mine = sorted(zip(ours.range.tolist(), ours.mean.tolist(), ours.weight.tolist(), strict=True))
    np.testing.assert_allclose(mine, theirs, rtol=1e-12, atol=1e-12)


@pytest.mark.parametrize("seed", range(8))
def test_repeating_agrees_with_fatpack(seed):
    history = np.random.default_rng(seed).normal(size=3000)
    # ASTM E1049-85, 5.4.5: begin the repeating history at its greatest peak; then all but the greatest swing closes.
    # (The package's own joining of the residue drops an extreme where the history ends and begins on the same slope.)
    around = np.append(np.roll(history, -int(np.argmax(history))), history.max())
    closed, residue = fatpack.find_rainflow_cycles(around[turning_points(around)])
    assert len(residue) == 3
    theirs = np.append(np.abs(np.diff(closed, axis=1)), np.ptp(history))
    ours = counted(history, "repeating").range
    assert len(ours) > 900
    np.testing.assert_array_equal(np.sort(ours), np.sort(theirs))


def ordered(cycles):
    return np.array(sorted(zip(*(column.tolist() for column in cycles), strict=True)))


@pytest.mark.parametrize("rule", RULES)
@given(values=st.one_of(TIED, FINE), cuts=st.lists(st.integers(1, 59), max_size=6))
def test_a_history_cut_anywhere_gives_the_same_cycles_to_the_last_bit(rule, values, cuts):
    time, value = np.arange(len(values), dtype=float), np.asarray(values, dtype=float)
    counting = CycleCount(rule)
    edges = [0, *sorted({c for c in cuts if c < len(values)}), len(values)]
    pieces = [counting.take(time[a:b], value[a:b]) for a, b in pairwise(edges)]
    streamed = joined_cycles([*pieces, counting.finish()])
    whole = counted(values, rule)
    assert streamed.begin.tolist() == sorted(streamed.begin.tolist())
    np.testing.assert_array_equal(ordered(streamed), ordered(whole))


@pytest.mark.parametrize("rule", RULES)
def test_one_sample_at_a_time_is_the_same_as_all_at_once(rule):
    history = np.random.default_rng(3).integers(-6, 7, size=700).astype(float)
    counting = CycleCount(rule)
    pieces = [counting.take(np.array([float(i)]), history[i : i + 1]) for i in range(len(history))]
    np.testing.assert_array_equal(ordered(joined_cycles([*pieces, counting.finish()])), ordered(counted(history, rule)))


def test_memory_does_not_grow_with_a_history_that_repeats():
    counting = CycleCount("half_cycles")
    wave = np.tile([0.0, 5.0, 1.0, 3.0], 5000)
    for k in range(10):
        counting.take(np.arange(len(wave)) + float(k * len(wave)), wave)
        assert len(counting.residue) < 10


@given(TIED, TIED)
def test_neither_order_of_sign_nor_offset_changes_ranges(values, other):
    flipped = [-v for v in values]
    assert table(counted(values, "half_cycles")) == table(counted(flipped, "half_cycles"))
    same(table(counted([v + 7 for v in values], "repeating")), table(counted(values, "repeating")))


@given(TIED)
def test_half_cycles_hold_every_step_of_the_turning_points(values):
    # Whatever closes, half cycles and whole ones together hold each rise and each fall once.
    points = turning_points(np.asarray(values, dtype=float))
    assert 2 * counted(values, "half_cycles").weight.sum() == pytest.approx(max(len(points) - 1, 0))


@given(TIED)
def test_repeating_always_keeps_the_greatest_swing_whole(values):
    spread = max(values) - min(values)
    if spread > 0:
        whole = counted(values, "repeating")
        assert whole.range.max() == spread
        assert np.all(whole.weight == 1.0)


@given(TIED)
def test_extra_samples_between_turning_points_change_nothing(values):
    fine = np.interp(np.arange(0, len(values) - 1 + 1e-9, 0.25), np.arange(len(values)), values)
    coarse_table, fine_table = table(counted(values, "half_cycles")), table(counted(fine, "half_cycles"))
    assert coarse_table == fine_table


def test_times_of_a_cycle_are_those_of_its_two_turning_points():
    found = counted([0.0, 5.0, 3.0, 4.0, 2.0, 6.0], "closed_only")
    assert (found.minimum.tolist(), found.maximum.tolist()) == ([2.0, 3.0], [5.0, 4.0])
    assert (found.begin.tolist(), found.end.tolist()) == ([1.0, 2.0], [4.0, 3.0])
    assert found.heating_time.tolist() == [3.0, 1.0]


def test_a_cycle_across_the_seam_ends_after_the_period():
    found = count_cycles(np.array([0.0, 1, 2, 3]), np.array([2.0, 5.0, 1.0, 2.0]), "repeating", period=4.0)
    assert found.range.tolist() == [4.0]
    assert (found.begin.tolist(), found.end.tolist()) == ([2.0], [5.0])
    seam = count_cycles(np.array([0.0, 1, 2, 3]), np.array([5.0, 4.0, 6.0, 1.0]), "repeating", period=4.0)
    assert sorted(seam.range.tolist()) == [1.0, 5.0]
    assert seam.end.max() > 3.0


@pytest.mark.parametrize("rule", RULES)
@pytest.mark.parametrize("values", [[], [3.0], [3.0, 3.0, 3.0]])
def test_nothing_that_moves_gives_no_cycle(rule, values):
    found = counted(values, rule)
    assert isinstance(found, Cycles)
    assert len(found.range) == 0


def test_what_cannot_be_counted_is_refused():
    with pytest.raises(ValueError, match="sample 1 is not finite"):
        counted([0.0, np.nan, 1.0], "repeating")
    with pytest.raises(ValueError, match="half_cycles, repeating, closed_only"):
        CycleCount("halves")
    counting = CycleCount()
    counting.take(np.array([0.0, 5.0]), np.array([1.0, 2.0]))
    with pytest.raises(ValueError, match="times must not fall"):
        counting.take(np.array([4.0]), np.array([1.0]))
    with pytest.raises(ValueError, match="one time a value"):
        counting.take(np.array([6.0, 7.0]), np.array([1.0]))


def test_a_spiral_that_closes_one_cycle_a_pass_still_ends_soon():
    down = np.arange(20000.0, 0.0, -1.0)
    history = np.append(down * np.where(np.arange(20000) % 2, -1.0, 1.0), 3e4)
    found = counted(history, "half_cycles")
    assert found.weight.sum() == pytest.approx(10000.0)


@pytest.mark.parametrize("seed", range(20))
def test_passes_and_the_plain_stack_find_the_same_pairs_also_among_equal_ranges(seed):
    history = np.random.default_rng(seed).integers(-4, 5, size=600).astype(float)
    points = turning_points(history)
    begins, ends, _ = rainflow_module._by_stack(history[points].tolist())
    found = counted(history, "closed_only")
    by_stack = sorted(zip(points[begins].tolist(), points[ends].tolist(), strict=True))
    assert sorted(zip(found.begin.tolist(), found.end.tolist(), strict=True)) == by_stack
