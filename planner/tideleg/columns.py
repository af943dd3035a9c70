"""The table of steps: from settled blocks to named columns with units.

Parts that repeat (legs, chips in parallel) are given for ONE; their number stands in the summary.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

import numpy as np

from tideleg.battery import CAUSE_WORDS, Battery
from tideleg.contract import CONDUCTION, DISCONTINUOUS, Chooser
from tideleg.march import Demand, Settled
from tideleg.ripple import battery_ripple
from tideleg.rolloff import LinkageCurve, effective_inductance_of, true_extremes
from tideleg.stage import Stage, StagePart

if TYPE_CHECKING:
    import pandas as pd

    from tideleg.waveform import FloatArray

Columns = dict[str, "FloatArray"]

PORT_CAPACITORS = ("battery_capacitor", "link_capacitor")
"""Their voltage is that of the port, which has a column of its own, unless several stand in series across it."""

DIRECTIONS = ("charge", "idle", "discharge")


def steps_frame(
    stage: Stage, battery: Battery, demand: Demand, blocks: list[Settled], candidate: int = 0
) -> pd.DataFrame:
    """Return one row a step for one candidate; no `soc` column where the state of charge is not modelled.

    Raises
    ------
    ValueError
        If a number is not finite: every column of the table must be.
    """
    import pandas as pd

    pieces = [_block_columns(stage, block, candidate, battery.ripple_inductance) for block in blocks]
    columns: dict[str, Any] = {
        "time_s": np.concatenate([[0.0], np.cumsum(demand.duration)[:-1]]),
        "duration_s": demand.duration,
        "power_requested_w": demand.power,
    }
    for name in pieces[0]:
        if name == "soc" and not battery.tracks_charge:
            continue
        columns[name] = np.concatenate([piece[name] for piece in pieces])
        if name == "battery_power_available_w" and not np.all(np.isfinite(columns[name])):
            del columns[name]  # no limit bounds it
            continue
        if not np.all(np.isfinite(columns[name])):
            raise ValueError(f"column {name} is not finite in step {int(np.argmin(np.isfinite(columns[name])))}")
    columns["curtailed_cause"] = _words(columns["curtailed_cause"], CAUSE_WORDS)
    columns["direction"] = _words(columns["direction"], DIRECTIONS)
    columns["conduction"] = _words(columns["conduction"], CONDUCTION)
    if stage.choices:
        columns[choice_name(stage)] = _words(columns.pop("choice"), stage.choices)
    return pd.DataFrame(columns, copy=False)


def choice_name(stage: Stage) -> str:
    """Return the name of the column that holds the topology's choice for each step."""
    assert isinstance(stage.topology, Chooser)
    return stage.topology.choice_name


def _words(codes: FloatArray, words: tuple[str, ...]) -> pd.Categorical[str]:
    import pandas as pd

    return pd.Categorical.from_codes(codes.astype(np.int64), pd.Index(list(words)))


def _block_columns(stage: Stage, block: Settled, candidate: int, battery_henry: float) -> Columns:
    """Return every column of one block after the demand's own, in order."""
    operation, battery = block.checked.operation, block.battery
    shape = block.losses.total.shape

    def one(values: Any) -> FloatArray:
        return np.asarray(np.broadcast_to(np.asarray(values, dtype=np.float64), shape)[candidate])

    link_current = block.power / block.point.link_voltage
    columns: Columns = {
        "power_w": one(block.power),
        "curtailed_w": one(block.curtailed),
        "curtailed_cause": one(battery.cause),
        "direction": one(1.0 + block.direction),
        "conduction": one(operation.conduction),
        "soc": one(battery.soc_end),
        "battery_voltage_v": one(battery.voltage),
        "battery_current_a": one(battery.current),
        "link_voltage_v": one(block.point.link_voltage),
        "link_current_a": one(link_current),
        "duty_ratio": one(operation.duty_ratio),
        "loss_w": one(block.losses.total),
        "battery_power_w": one(battery.power),
        "battery_power_available_w": np.where(one(block.direction) == 0.0, 0.0, one(battery.available)),
        "battery_heat_w": one((battery.source_voltage - battery.voltage) * battery.current),
        "switching_frequency_hz": one(operation.timing.frequency),
    }
    if stage.choices:
        columns["choice"] = one(block.point.choice)
    columns |= {name: one(values) for name, values in operation.columns.items()}
    for part in stage.parts:
        if part.slot.kind in _READERS:
            columns |= _READERS[part.slot.kind](part, block, one)
        columns |= _loss_and_temperature(stage, part, block, candidate, one)
        if part.slot.name == "battery_capacitor":
            columns |= _battery_ripple(part, battery_henry, block, one)
    return columns


def _battery_ripple(part: StagePart, henry: float, block: Settled, one: Callable[[Any], FloatArray]) -> Columns:
    """Return the ripple current that reaches the battery; nothing where the port capacitor has no capacitance given."""
    if part.base is None or part.base.capacitance is None:
        return {}
    exchange = block.checked.operation.exchanges["battery_capacitor"]
    rms, swing = battery_ripple(exchange, part.base.capacitance, block.battery.resistance, henry)
    return {"battery_ripple.current_rms_a": one(rms), "battery_ripple.current_a": one(swing)}


def _switch(part: StagePart, block: Settled, one: Callable[[Any], FloatArray]) -> Columns:
    name = part.slot.name
    position = block.checked.operation.positions[part.place]
    share = part.share
    current = position.current.forward() if part.forward_only else position.current
    return {
        f"{name}.current_rms_a": one(current.rms() * share),
        f"{name}.current_mean_a": one(current.mean() * share),
        f"{name}.current_peak_a": one(np.maximum(np.abs(current.peak()), np.abs(current.valley())) * share),
        f"{name}.turn_on_current_a": one(position.turn_on_current() * share),
        f"{name}.turn_off_current_a": one(position.turn_off_current() * share),
        f"{name}.blocked_voltage_v": one(position.blocks),
    }


def _diode(part: StagePart, block: Settled, one: Callable[[Any], FloatArray]) -> Columns:
    """Return what a diode of its own carries: the reverse current of its place, as a magnitude."""
    name = part.slot.name
    position = block.checked.operation.positions[part.place]
    current = position.current.reverse()
    return {
        f"{name}.current_rms_a": one(current.rms() * part.share),
        f"{name}.current_mean_a": one(-current.mean() * part.share),
        f"{name}.current_peak_a": one(np.maximum(-current.valley(), 0.0) * part.share),
        f"{name}.blocked_voltage_v": one(position.blocks),
    }


def _inductor(part: StagePart, block: Settled, one: Callable[[Any], FloatArray]) -> Columns:
    name = part.slot.name
    current = block.checked.operation.windings[name].current
    valley, peak = _extremes(part, block)
    return {
        f"{name}.current_mean_a": one(current.mean()),
        f"{name}.current_rms_a": one(current.rms()),
        f"{name}.current_ripple_a": one(current.peak_to_peak()),
        f"{name}.current_peak_a": one(peak),
        f"{name}.current_valley_a": one(valley),
    }


def _extremes(part: StagePart, block: Settled) -> tuple[FloatArray, FloatArray]:
    """Return valley and peak of a winding; where its inductance falls with current, those of the bent current."""
    operation = block.checked.operation
    current = operation.windings[part.slot.name].current
    valley, peak = current.valley(), current.peak()
    points = getattr(part.base, "inductance_curve", None)
    if points is None:
        return valley, peak
    curve = LinkageCurve.of(points)
    henry = effective_inductance_of(curve, valley, peak)
    lower, upper = true_extremes(curve, valley, peak, henry)
    rests = operation.conduction == DISCONTINUOUS  # it begins and ends at zero, and its peak is set by the charge
    return np.where(rests, valley, lower), np.where(rests, peak, upper)


def _capacitor(part: StagePart, block: Settled, one: Callable[[Any], FloatArray]) -> Columns:
    name = part.slot.name
    exchange = block.checked.operation.exchanges[name]
    others = 0.0 if part.base is None else part.base.external_mean_square()
    # Ripple of others on the port has no fixed phase to the stage's own: it adds in squares.
    columns = {f"{name}.current_rms_a": one(np.sqrt(exchange.current.ac_mean_square() + others))}
    if name not in PORT_CAPACITORS or part.slot.in_series > 1:
        columns[f"{name}.voltage_v"] = one(exchange.voltage)
    if part.base is not None and part.base.capacitance is not None:
        swing = exchange.current.charge_swing() / exchange.frequency
        columns[f"{name}.voltage_ripple_v"] = one(swing / part.base.capacitance)
    if part.base is not None and part.base.rated_voltage is not None:
        # The stage's own ripple counts by half its swing; where no capacitance is given it is not known, hence nil.
        highest = exchange.voltage + 0.5 * columns.get(f"{name}.voltage_ripple_v", 0.0)
        columns[f"{name}.voltage_share"] = one(highest / part.base.rated_voltage)
    return columns


_READERS: dict[str, Callable[[StagePart, Settled, Callable[[Any], FloatArray]], Columns]] = {
    "switch": _switch,
    "diode": _diode,
    "inductor": _inductor,
    "transformer": _inductor,
    "capacitor": _capacitor,
}


def _loss_and_temperature(
    stage: Stage, part: StagePart, block: Settled, candidate: int, one: Callable[[Any], FloatArray]
) -> Columns:
    """Return the loss of ONE part and, where modelled, its temperatures."""
    name = part.slot.name
    columns: Columns = {}
    if part.terms:
        loss = sum(block.losses.by_term[name, bound.term.mechanism] for bound in part.terms)
        columns[f"{name}.loss_w"] = one(loss / part.total)
    if name in stage.seated:
        index = stage.seated.index(name)
        columns[f"{name}.temperature_degc"] = block.end[index, candidate]
        columns[f"{name}.temperature_mean_degc"] = block.mean[index, candidate]
    return columns
