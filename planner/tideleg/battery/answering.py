"""From wanted terminal power to voltage, current and state of charge, with limits that curtail.

The pack is a source E(SoC, T) behind a resistance R(SoC, T, direction) and, where given, pairs of R and C that relax
with their own time constants. At a terminal power P it carries I = (E - sqrt(E² - 4 R P))/(2 R), the root with the low
current; the greatest power is E²/(4 R). Circuit law; see also Mechanical Engineers' Handbook vol. 2, static systems,
for P = V_oc I_sc/4.

Shapes: arrays (C, S), candidates first and steps last. Positive power and current discharge the pack.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tideleg.battery.nodes import MIDDLE, Nodes, nodes_for
from tideleg.battery.pack import Battery, Cause
from tideleg.scan import clipped_sum, linear_scan
from tideleg.waveform import FloatArray, Values

ROUNDING = 1e-12
"""Of the squared voltage: what rounding may take the root of the greatest power below zero [-]."""


def current_at_power(power: Values, voltage: Values, resistance: Values) -> FloatArray:
    """Return the low-current root of the constant-power equation [A].

    Parameters
    ----------
    power : terminal power, positive = discharge [W]; must not exceed voltage²/(4 resistance)
    voltage : open-circuit voltage [V]
    resistance : [Ω], zero allowed

    Notes
    -----
    Written as 2P/(E + sqrt(E² - 4 R P)), which equals (E - sqrt(E² - 4 R P))/(2 R) but keeps its digits at light load
    and at R = 0.

    Examples
    --------
    >>> round(float(current_at_power(50e3, 400.0, 0.1)), 5)
    129.17131
    """
    square = np.asarray(voltage * voltage - 4.0 * resistance * power)
    square = np.where((square < 0.0) & (square > -ROUNDING * voltage * voltage), 0.0, square)
    return np.asarray(2.0 * power / (voltage + np.sqrt(square)))


class BatteryAnswer(NamedTuple):
    """What the pack does at each step, arrays (C, S).

    current : mean of the step [A]
    power : mean terminal power [W]
    voltage : at the terminals, power over current [V]
    source_voltage : open-circuit voltage, weighted by the current, so that heat = (source_voltage - voltage) current
    resistance : heat over squared current, RC pairs included [Ω]
    available : greatest terminal power in the asked direction within the limits of current, voltage and temperature
        [W]; infinite where none of them bounds it
    soc_start, soc_end : state of charge at both ends of the step [-]
    soc_nodes : (N, C, S) at the instants inside the step [-]
    pair_start, pair_end : (pair, C, S) voltage of each RC pair at both ends of the step [V]
    cause : why the wanted power was not met, a `Cause`
    """

    voltage: FloatArray
    current: FloatArray
    power: FloatArray
    source_voltage: FloatArray
    resistance: FloatArray
    available: FloatArray
    soc_start: FloatArray
    soc_end: FloatArray
    soc_nodes: FloatArray
    pair_start: FloatArray
    pair_end: FloatArray
    cause: NDArray[np.int8]


class BatteryState(NamedTuple):
    """The battery between two steps: state of charge (C, 1) [-] and voltage of each RC pair (pair, C, 1) [V]."""

    soc: FloatArray
    pairs: FloatArray


def at_rest(battery: Battery, candidates: int = 1) -> BatteryState:
    """Return the battery at its starting charge with its RC pairs relaxed."""
    soc = np.full((candidates, 1), battery.start_soc)
    return BatteryState(soc, np.zeros((len(battery.pairs), candidates, 1)))


class BatteryPath(NamedTuple):
    """An estimate of the battery along a block, relaxed by the caller.

    nodes : the instants inside each step
    soc_nodes : (N, C, S) state of charge at them [-]
    pair_start : (pair, C, S) voltage of each RC pair at the start of each step [V]
    """

    nodes: Nodes
    soc_nodes: FloatArray
    pair_start: FloatArray


def resting_path(before: BatteryState, steps: int, nodes: Nodes = MIDDLE) -> BatteryPath:
    """Return the first estimate of a block: everything stays as it was before."""
    shape = (before.soc.shape[0], steps)
    return BatteryPath(
        nodes,
        np.broadcast_to(before.soc, (nodes.number, *shape)),
        np.broadcast_to(before.pairs, (before.pairs.shape[0], *shape)),
    )


def nodes_of(battery: Battery, power: FloatArray, duration: FloatArray) -> Nodes:
    """Return the instants that steps of so much power [W] and duration [s] need, from the charge that they move."""
    if not battery.tracks_charge:
        return MIDDLE
    least = float(battery.open_circuit_voltage.min())
    moved = np.abs(power) * duration / (least * battery.capacity)
    window = battery.highest_soc - battery.lowest_soc
    return nodes_for(float(np.minimum(moved, window).max(initial=0.0)))


def path_of(given: BatteryAnswer, before: BatteryPath) -> BatteryPath:
    """Return the path that an answer implies, the estimate of the next pass."""
    return BatteryPath(before.nodes, given.soc_nodes, given.pair_start)


def state_after(given: BatteryAnswer) -> BatteryState:
    """Return the battery after the last step of an answer."""
    return BatteryState(given.soc_end[..., -1:], given.pair_end[..., -1:])


def answer(
    battery: Battery,
    wanted: FloatArray,
    duration: FloatArray,
    before: BatteryState,
    path: BatteryPath,
    degc: FloatArray | None = None,
) -> BatteryAnswer:
    """Return what the battery does when the stage wants a terminal power at each step.

    Parameters
    ----------
    battery : Battery
    wanted : (C, S) wanted terminal power, positive = discharge [W]
    duration : (S,) [s]
    before : state before the first step
    path : estimate along the block
    degc : (S,) temperature of the battery [degC]; needed where it depends on it

    Notes
    -----
    The wanted power holds at every instant of a step; the current follows E and R there, and its mean moves the
    charge. At held current the mean voltage of an RC pair over a step is v m + R (1 - m) I with
    m = (1 - exp(-h/tau)) tau/h, so a pair only shifts E and R of the constant-power root.
    Limits of current, voltage, temperature and greatest power bound the current first; the state of charge is then a
    sum that is clipped at its window, exactly, and a step that meets the window carries the share of its current that
    just reaches it.
    """
    discharging = wanted > 0.0
    source, resistance = battery.source(path.soc_nodes, discharging, degc)
    voltage = source
    for (ohms, constant), start in zip(battery.pairs, path.pair_start, strict=True):
        mean_decay = -np.expm1(-duration / constant) * constant / duration
        voltage = voltage - start * mean_decay
        resistance = resistance + ohms * (1.0 - mean_decay)
    bounds = _bounds(battery, voltage, resistance, degc)
    safe = np.where(resistance > 0.0, resistance, 1.0)
    greatest = np.where(resistance > 0.0, voltage * voltage / (4.0 * safe), np.inf)
    current = current_at_power(np.minimum(wanted, greatest), voltage, resistance)
    current, causes = _limited(current, bounds, wanted > greatest)
    mean = path.nodes.mean
    cause = causes.max(axis=0)
    flow = mean(current)
    soc_start = soc_end = np.broadcast_to(before.soc, wanted.shape)
    kept: FloatArray | float = 1.0
    soc_nodes = path.soc_nodes
    if battery.tracks_charge:
        change = -flow * duration / battery.capacity
        soc_end = clipped_sum(before.soc, change, battery.lowest_soc, battery.highest_soc)
        soc_start = np.concatenate([before.soc, soc_end[..., :-1]], axis=-1)
        short = np.abs(soc_start + change - soc_end) > 1e-12
        reached = (soc_start - soc_end) * battery.capacity / duration
        kept = np.where(short, reached / np.where(flow == 0.0, 1.0, flow), 1.0)
        flow = np.where(short, reached, flow)
        cause = np.where(short, np.where(discharging, Cause.SOC_LOW, Cause.SOC_HIGH), cause).astype(np.int8)
        moved = path.nodes.integral(current * kept) * duration / battery.capacity
        soc_nodes = np.clip(soc_start - moved, battery.lowest_soc, battery.highest_soc)
    current = current * kept
    power = mean((voltage - resistance * current) * current)
    pair_start, pair_end = _pairs(battery, flow, duration, before)
    terminal, open_circuit, ohmic = _by_current(flow, power, mean(source * current), source, voltage, resistance, mean)
    return BatteryAnswer(
        terminal,
        flow,
        power,
        open_circuit,
        ohmic,
        mean(_available(voltage, resistance, bounds, discharging)),
        soc_start,
        soc_end,
        soc_nodes,
        pair_start,
        pair_end,
        cause,
    )


def _by_current(
    flow: FloatArray,
    power: FloatArray,
    chemical: FloatArray,
    source: FloatArray,
    voltage: FloatArray,
    resistance: FloatArray,
    mean: object,
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return terminal voltage, open-circuit voltage and resistance of each step, so that power and heat are theirs.

    Where no current flows they are plain means over the step.
    """
    assert callable(mean)
    rests = flow == 0.0
    divisor = np.where(rests, 1.0, flow)
    terminal = np.where(rests, mean(voltage), power / divisor)
    open_circuit = np.where(rests, mean(source), chemical / divisor)
    ohmic = np.where(rests, mean(resistance), (open_circuit - terminal) / divisor)
    return terminal, open_circuit, ohmic


def _pairs(
    battery: Battery, current: FloatArray, duration: FloatArray, before: BatteryState
) -> tuple[FloatArray, FloatArray]:
    """Return the voltage of each RC pair at the start and end of each step: exact for a current held in the step."""
    if not battery.pairs:
        return np.zeros((0, *current.shape)), np.zeros((0, *current.shape))
    ends = []
    for (ohms, constant), start in zip(battery.pairs, before.pairs, strict=True):
        decay = np.exp(-duration / constant)
        drive = -np.expm1(-duration / constant) * ohms * current
        ends.append(linear_scan(decay, drive, start))
    end = np.stack(ends)
    return np.concatenate([before.pairs, end[..., :-1]], axis=-1), end


class _Bounds(NamedTuple):
    """Greatest current each way [A], magnitudes, and what sets it."""

    out: FloatArray
    into: FloatArray
    out_cause: NDArray[np.int8]
    into_cause: NDArray[np.int8]


def _bounds(battery: Battery, voltage: FloatArray, resistance: FloatArray, degc: FloatArray | None) -> _Bounds:
    """Return how much current the limits allow; the tightest one names the cause."""
    ohms = np.where(resistance > 0.0, resistance, 1.0)
    never = np.full_like(voltage, np.inf)
    by_low_voltage = np.where(resistance > 0.0, (voltage - battery.lowest_voltage) / ohms, never)
    by_high_voltage = np.where(resistance > 0.0, (battery.highest_voltage - voltage) / ohms, never)
    out = np.maximum(np.minimum(battery.discharge_current_limit, by_low_voltage), 0.0)
    into = np.maximum(np.minimum(battery.charge_current_limit, by_high_voltage), 0.0)
    low_first, high_first = (
        by_low_voltage < battery.discharge_current_limit,
        by_high_voltage < battery.charge_current_limit,
    )
    out_cause = np.where(low_first, np.int8(Cause.VOLTAGE_LOW), np.int8(Cause.DISCHARGE_CURRENT))
    into_cause = np.where(high_first, np.int8(Cause.VOLTAGE_HIGH), np.int8(Cause.CHARGE_CURRENT))
    if degc is None:
        return _Bounds(out, into, out_cause, into_cause)
    bars_out, bars_in = _outside(degc, battery.discharge_degc), _outside(degc, battery.charge_degc)
    return _Bounds(
        np.where(bars_out, 0.0, out),
        np.where(bars_in, 0.0, into),
        np.where(bars_out, np.int8(Cause.TEMPERATURE), out_cause),
        np.where(bars_in, np.int8(Cause.TEMPERATURE), into_cause),
    )


def _outside(degc: FloatArray, allowed: tuple[float, float]) -> NDArray[np.bool_]:
    return np.asarray((degc < allowed[0]) | (degc > allowed[1]))


def _limited(current: FloatArray, bounds: _Bounds, over: NDArray[np.bool_]) -> tuple[FloatArray, NDArray[np.int8]]:
    """Return the current within its bounds, and the cause where they bind."""
    cause = np.where(over, np.int8(Cause.GREATEST_POWER), np.int8(Cause.NONE))
    cause = np.where(current > bounds.out, bounds.out_cause, cause)
    cause = np.where(-current > bounds.into, bounds.into_cause, cause)
    return np.clip(current, -bounds.into, bounds.out), cause.astype(np.int8)


def _available(
    voltage: FloatArray, resistance: FloatArray, bounds: _Bounds, discharging: NDArray[np.bool_]
) -> FloatArray:
    """Return the greatest terminal power in the asked direction [W], a magnitude.

    In discharge the power grows with the current up to E/(2 R), beyond which more current gives less.
    """
    safe = np.where(resistance > 0.0, resistance, 1.0)
    best = np.where(resistance > 0.0, np.minimum(bounds.out, voltage / (2.0 * safe)), bounds.out)
    finite_out, finite_in = np.isfinite(best), np.isfinite(bounds.into)
    out = np.where(finite_out, best, 0.0)
    into = np.where(finite_in, bounds.into, 0.0)
    given = np.where(finite_out, (voltage - resistance * out) * out, np.inf)
    taken = np.where(finite_in, (voltage + resistance * into) * into, np.inf)
    return np.where(discharging, given, taken)
