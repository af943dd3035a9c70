"""Leg shedding: how many legs of an interleaved stage work in each step.

A leg joins at once where the request needs it. A leg rests only when the present number has held for the dwell time,
so that no leg is started and stopped with every ripple of the request. Two rules say how many are needed: a threshold
of the leg current with hysteresis, or the least loss of the stage with a stated saving that a change must bring.
Common practice, no source.
"""

from __future__ import annotations

from typing import Any, Literal, NamedTuple

import numpy as np
from numpy.typing import NDArray
from pydantic import BaseModel, Field, model_validator

from tideleg import Choice, FloatArray, Rest, quantity


class SheddingKeys(BaseModel):
    """Keys under [stage] that say when legs rest."""

    shedding: Literal["never", "threshold", "least loss"] = "never"
    shedding_current: quantity.Current | None = Field(default=None, gt=0.0)
    shedding_hysteresis: quantity.Share = Field(default=0.1, ge=0.0, lt=1.0)
    shedding_dwell: quantity.Time = Field(default=1.0, ge=0.0)

    @model_validator(mode="after")
    def _threshold_is_given(self) -> SheddingKeys:
        if self.shedding == "threshold" and self.shedding_current is None:
            raise ValueError(
                "shedding_current is missing: with shedding = 'threshold' it is the mean leg current up to which a leg"
                " is loaded before the next one joins, such as '60 A'"
            )
        return self


class _Wanted(NamedTuple):
    """Codes (legs - 1) at each step: the state may stay within [least, most]; else it moves to `up` or `down`."""

    least: NDArray[np.int64]
    most: NDArray[np.int64]
    up: NDArray[np.int64]
    down: NDArray[np.int64]


class Held(NamedTuple):
    """One row's state between two blocks: its code, and for how long it has held [s]."""

    code: int
    seconds: float


def choose(rest: Rest, settings: Any, before: Any) -> Choice:
    """Return how many legs work at each step, less one (C, S)."""
    wanted = _by_threshold(rest, settings) if settings.shedding == "threshold" else _by_loss(rest, settings)
    codes = np.empty(rest.battery_current.shape, dtype=np.int64)
    carry = []
    for row in range(len(codes)):
        mine = _Wanted(*(values[row] for values in wanted))
        start = None if before is None else before[row]
        codes[row], held = _hold(mine, rest.duration, settings.shedding_dwell, start)
        carry.append(held)
    return Choice(codes, tuple(carry))


def _by_threshold(rest: Rest, settings: Any) -> _Wanted:
    """Return the legs that the current needs; they may stay until fewer would do with room to spare."""
    size = np.abs(rest.battery_current)
    least = _legs_for(size, settings.shedding_current, settings.legs)
    spared = settings.shedding_current * (1.0 - settings.shedding_hysteresis)
    most = _legs_for(size, spared, settings.legs)
    return _Wanted(least, most, least, most)


def _legs_for(size: FloatArray, current: float, legs: int) -> NDArray[np.int64]:
    return np.clip(np.ceil(size / current) - 1.0, 0.0, legs - 1.0).astype(np.int64)


def _by_loss(rest: Rest, settings: Any) -> _Wanted:
    """Return the number with the least loss; it may stay while the loss is within the hysteresis of that."""
    losses = np.stack([rest.loss(code) for code in range(settings.legs)])
    allowed = np.ones_like(losses, dtype=bool)
    if settings.shedding_current is not None:
        needed = _legs_for(np.abs(rest.battery_current), settings.shedding_current, settings.legs)
        allowed = np.arange(settings.legs)[:, None, None] >= needed
    losses = np.where(allowed, losses, np.inf)
    best = np.argmin(losses, axis=0)
    near = losses <= np.min(losses, axis=0) / (1.0 - settings.shedding_hysteresis)
    least = np.argmax(near, axis=0)
    most = settings.legs - 1 - np.argmax(near[::-1], axis=0)
    return _Wanted(least, most, best, best)


def _hold(wanted: _Wanted, duration: FloatArray, dwell: float, before: Held | None) -> tuple[NDArray[np.int64], Held]:
    """Return the code of each step and the state at the end; a loop over CHANGES, not over steps."""
    begins = np.concatenate([[0.0], np.cumsum(duration)])
    held = Held(int(wanted.up[0]), 0.0) if before is None else before
    code, since = held.code, -held.seconds
    codes = np.empty(len(duration), dtype=np.int64)
    step = 0
    while step < len(duration):
        change = _next_change(wanted, begins, step, code, since + dwell)
        codes[step:change] = code
        if change == len(duration):
            break
        code = int(wanted.up[change] if wanted.least[change] > code else wanted.down[change])
        since, step = float(begins[change]), change
        codes[step] = code
        step += 1
    return codes, Held(code, float(begins[-1]) - since)


_FIRST_LOOK = 64
"""Steps looked at first for the next change; doubled until one is found, so that frequent changes stay cheap."""


def _next_change(wanted: _Wanted, begins: FloatArray, step: int, code: int, free_from: float) -> int:
    """Return the first step from `step` on in which the code must or may change, or the number of steps."""
    steps, look = len(wanted.least), _FIRST_LOOK
    while step < steps:
        cut = slice(step, min(step + look, steps))
        must = wanted.least[cut] > code
        may = (wanted.most[cut] < code) & (begins[cut] >= free_from)
        found = must | may
        if np.any(found):
            return step + int(np.argmax(found))
        step, look = cut.stop, 2 * look
    return steps
