"""The state of a sizing: the plan as sized so far, every decision with what set it, and what could not be decided."""

from __future__ import annotations

import dataclasses
import math
from collections.abc import Iterator, Mapping
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from tideleg.outcome import Outcome
from tideleg.plan import Plan

if TYPE_CHECKING:
    import pandas as pd

    from tideleg.waveform import FloatArray


@dataclasses.dataclass(frozen=True)
class Decision:
    """One value that the sizing chose.

    key : dotted key in the plan
    value : as the plan holds it, a quantity with unit or a number
    before : the plan's own value, or "" where it gave none
    set_by : the limit or rule that set it
    at : instant and mission, or "" where no instant sets it
    """

    key: str
    value: str | int
    before: str
    set_by: str
    at: str


class Trial(NamedTuple):
    """The plan as sized so far, what was decided, and what could not be."""

    plan: Plan
    decisions: Mapping[str, Decision]
    notes: tuple[str, ...]

    def decided(self, plan: Plan, decision: Decision) -> Trial:
        """Return the trial with one more value chosen; a later choice of the same key keeps the first `before`."""
        earlier = self.decisions.get(decision.key)
        kept = decision if earlier is None else dataclasses.replace(decision, before=earlier.before)
        return Trial(plan, {**self.decisions, decision.key: kept}, self.notes)

    def noted(self, note: str) -> Trial:
        """Return the trial with a note, once."""
        return self if note in self.notes else self._replace(notes=(*self.notes, note))


class Worst(NamedTuple):
    """The greatest value of something over all missions, and where: "" where there is nothing."""

    value: float
    at: str


def worst_over(outcome: Outcome, of: str | tuple[str, ...], measure: object = None) -> Worst:
    """Return the greatest magnitude of one or several columns over all missions, with its instant in words.

    measure : function of a mission's frame to an array (S,), used instead of the columns where given
    """
    best = Worst(-math.inf, "")
    columns = (of,) if isinstance(of, str) else of
    for mission in outcome.missions:
        for values in _series(mission.steps, columns, measure):
            row = int(np.argmax(values))
            if values[row] > best.value:
                best = Worst(float(values[row]), f"{mission.steps['time_s'].iloc[row]:.6g} s of {mission.name}")
    return best


def _series(steps: pd.DataFrame, columns: tuple[str, ...], measure: object) -> Iterator[FloatArray]:
    if callable(measure):
        yield measure(steps)
        return
    for column in columns:
        yield np.abs(steps[column].to_numpy())


def rounded_up(value: float, digits: int = 2) -> float:
    """Return the value rounded up to a few significant digits: a value that one can buy or wind, on the safe side.

    Examples
    --------
    >>> rounded_up(1.0312e-4)
    0.00011
    >>> rounded_up(4.0)
    4.0
    """
    if value <= 0.0:
        return 0.0
    size = 10.0 ** (math.floor(math.log10(value)) - digits + 1)
    return float(f"{math.ceil(value / size - 1e-9) * size:.12g}")


def rounded_down(value: float, digits: int = 2) -> float:
    """Return the value rounded down to a few significant digits.

    Examples
    --------
    >>> rounded_down(0.01279)
    0.012
    """
    size = 10.0 ** (math.floor(math.log10(value)) - digits + 1)
    return float(f"{math.floor(value / size + 1e-9) * size:.12g}")
