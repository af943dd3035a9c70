"""The worst instant: where the binding limit is met, with every value and one period of the waveforms there."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING

import numpy as np

from tideleg.contract import Operation, read_as
from tideleg.limits import LimitCheck
from tideleg.march import Settled
from tideleg.outcome import Trace, WorstInstant
from tideleg.stage import Stage
from tideleg.waveform import Segment, Waveform

if TYPE_CHECKING:
    import pandas as pd


def worst_instant(
    stage: Stage,
    checks: tuple[LimitCheck, ...],
    steps: Mapping[str, pd.DataFrame],
    blocks: Mapping[str, list[Settled]],
) -> WorstInstant:
    """Return the step at which the tightest limit that has an instant is met; without one, that of greatest loss."""
    timed = [check for check in checks if check.time_s is not None and check.mission is not None and check.used > 0.0]
    if timed:
        first = timed[0]
        mission, time = str(first.mission), float(first.time_s or 0.0)
        why = f"{first.name} of {first.part.replace('_', ' ')}, tightest of the limits that vary"
        row = int(np.searchsorted(steps[mission]["time_s"].to_numpy(), time))
    else:
        mission = max(steps, key=lambda name: float(steps[name]["loss_w"].max()))
        row, why = int(steps[mission]["loss_w"].to_numpy().argmax()), "greatest loss"
        if float(steps[mission]["loss_w"].max()) <= 0.0:
            row, why = int(np.abs(steps[mission]["power_w"].to_numpy()).argmax()), "greatest power"
    frame = steps[mission]
    numbers = frame.select_dtypes("number").iloc[row]
    values = {str(name): float(value) for name, value in numbers.items()}
    return WorstInstant(why, mission, values["time_s"], values, _traces_at(stage, blocks[mission], row))


def _traces_at(stage: Stage, blocks: list[Settled], row: int) -> tuple[Trace, ...]:
    """Return one switching period of every part's current at one step."""
    for block in blocks:
        length = block.losses.total.shape[-1]
        if row < length:
            return _traces(stage, block.checked.operation, row, block.losses.total.shape)
        row -= length
    raise IndexError(row)


def _traces(stage: Stage, operation: Operation, row: int, shape: tuple[int, ...]) -> tuple[Trace, ...]:
    frequency = _at(operation.timing.frequency, row, shape)
    traces = []
    for part in stage.parts:
        name, kind = part.slot.name, part.slot.kind
        label = name.replace("_", " ")
        if name != part.place:
            continue
        if read_as(kind) == "inductor":
            traces.append(_trace(f"{label} current", name, operation.windings[name].current, row, shape, frequency))
        elif kind == "switch":
            traces.append(_trace(f"{label} current", name, operation.positions[name].current, row, shape, frequency))
        elif kind == "capacitor":
            exchange = operation.exchanges[name]
            own = _at(exchange.frequency, row, shape)
            whole = _trace(f"{label} current", name, exchange.current, row, shape, own)
            mean = _at(exchange.current.mean(), row, shape)
            traces.append(Trace(whole.label, name, whole.time_s, whole.current_a - mean))
    return tuple(traces)


def _trace(label: str, part: str, current: Waveform, row: int, shape: tuple[int, ...], frequency: float) -> Trace:
    single = Waveform(tuple(Segment(*(_at(field, row, shape) for field in segment)) for segment in current.segments))
    fraction, ampere = single.trace()
    return Trace(label, part, fraction / frequency, ampere)


def _at(values: object, row: int, shape: tuple[int, ...]) -> float:
    return float(np.broadcast_to(np.asarray(values), shape)[0, row])
