"""When in a mission the damage arises."""

from __future__ import annotations

import numpy as np

from tideleg.stress import Cycles
from tideleg.waveform import FloatArray


def cumulative_damage(cycles: Cycles, damage: FloatArray, at: FloatArray, period: float) -> FloatArray:
    """Return the damage done by cycles up to each instant, each cycle's spread evenly from its beginning to its end.

    Parameters
    ----------
    cycles : (N,) of one pass that lasts `period` [s]; what a cycle does after the seam is done at the beginning
    damage : (N,) of each cycle, its count included [-]
    at : (A,) instants within the pass, rising [s]

    Notes
    -----
    The sum of straight ramps is straight between their corners; it is read there from the sums of slopes.
    """
    begin, end = cycles.begin, cycles.end
    over = end > period
    rate = damage / np.maximum(end - begin, np.finfo(float).tiny)
    starts = np.concatenate([begin, np.zeros(int(over.sum()))])
    stops = np.concatenate([np.minimum(end, period), end[over] - period])
    rates = np.concatenate([rate, rate[over]])
    corners = np.unique(np.concatenate([at, starts, stops]))
    slope = np.zeros(len(corners))
    np.add.at(slope, np.searchsorted(corners, starts), rates)
    np.add.at(slope, np.searchsorted(corners, stops), -rates)
    running = np.maximum(np.cumsum(slope), 0.0)
    done = np.concatenate([[0.0], np.cumsum(running[:-1] * np.diff(corners))])
    return np.asarray(done[np.searchsorted(corners, at)])
