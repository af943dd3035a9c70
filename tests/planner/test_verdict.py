"""The cautions that a topology states, in words: how much of a mission they hold for, and since when."""

from types import SimpleNamespace

import numpy as np
import pytest

from tideleg.verdict import cautions_of


def block(caution, steps):
    operation = SimpleNamespace(caution=caution)
    return SimpleNamespace(
        checked=SimpleNamespace(operation=operation), losses=SimpleNamespace(total=np.zeros((1, steps)))
    )


def mission(*blocks, durations):
    return "loop", SimpleNamespace(duration=np.array(durations)), list(blocks)


STAGE = SimpleNamespace(topology=SimpleNamespace(cautions=("runs near the edge", "runs blind")))


def test_each_caution_says_its_share_of_time_and_its_first_instant_across_blocks():
    first, second = block(np.array([[0, 2, 0]], dtype=np.int8), 3), block(np.array([[1, 2]], dtype=np.int8), 2)
    found = cautions_of(STAGE, [mission(first, second, durations=[10.0, 5.0, 5.0, 20.0, 60.0])])
    assert found == (
        "loop: runs near the edge (20 % of the time, first at 20 s)",
        "loop: runs blind (65 % of the time, first at 10 s)",
    )


@pytest.mark.parametrize(("caution", "count"), [(0, 0), (1, 1)])
def test_a_caution_may_be_one_number_for_all_steps(caution, count):
    found = cautions_of(STAGE, [mission(block(caution, 2), durations=[1.0, 3.0])])
    assert len(found) == count
    assert all("100 % of the time, first at 0 s" in sentence for sentence in found)


def test_a_topology_without_cautions_has_none():
    stage = SimpleNamespace(topology=SimpleNamespace())
    assert cautions_of(stage, [mission(block(0, 2), durations=[1.0, 3.0])]) == ()
