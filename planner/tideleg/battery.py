"""The battery: power to voltage, current and state of charge, with limits that curtail.

The pack is a source E(SoC) behind a resistance R(SoC, direction) and, where given, pairs of R and C that relax with
their own time constants. At a terminal power P it carries
I = (E - sqrt(E² - 4 R P))/(2 R), the root with the low current; the greatest power is E²/(4 R). Circuit law; see also
Mechanical Engineers' Handbook vol. 2, static systems, for P = V_oc I_sc/4.

Shapes: arrays (C, S), candidates first and steps last. Positive power and current discharge the pack.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import IntEnum
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tideleg.scan import clipped_sum, linear_scan
from tideleg.waveform import FloatArray, Values


class Cause(IntEnum):
    """Why a step was curtailed; the words are in `CAUSE_WORDS`."""

    NONE = 0
    PROFILE = 1
    DISCHARGE_CURRENT = 2
    CHARGE_CURRENT = 3
    VOLTAGE_LOW = 4
    VOLTAGE_HIGH = 5
    GREATEST_POWER = 6
    SOC_LOW = 7
    SOC_HIGH = 8


CAUSE_WORDS = (
    "",
    "power limit in the profile",
    "discharge current limit",
    "charge current limit",
    "lowest battery voltage",
    "highest battery voltage",
    "greatest power of the battery",
    "lowest state of charge",
    "highest state of charge",
)


@dataclass(frozen=True)
class Battery:
    """A pack as the planner sees it.

    soc : grid of the state of charge, increasing, 0 to 1 [-]; one point means constant
    open_circuit_voltage, discharge_resistance, charge_resistance : on that grid [V], [Ω], [Ω]
    capacity : [C]; infinite for an ideal source whose state of charge is not modelled
    start_soc, lowest_soc, highest_soc : [-]
    pairs : (resistance [Ω], time constant [s]) of each RC pair
    discharge_current_limit, charge_current_limit : magnitudes [A], infinite where not limited
    lowest_voltage, highest_voltage : at the terminals [V]; 0 and infinite where not limited
    """

    soc: FloatArray
    open_circuit_voltage: FloatArray
    discharge_resistance: FloatArray
    charge_resistance: FloatArray
    capacity: float
    start_soc: float
    lowest_soc: float = 0.0
    highest_soc: float = 1.0
    pairs: tuple[tuple[float, float], ...] = ()
    discharge_current_limit: float = np.inf
    charge_current_limit: float = np.inf
    lowest_voltage: float = 0.0
    highest_voltage: float = np.inf

    @property
    def tracks_charge(self) -> bool:
        """Whether the state of charge is modelled."""
        return bool(np.isfinite(self.capacity))

    def source(self, soc: FloatArray, discharging: NDArray[np.bool_]) -> tuple[FloatArray, FloatArray]:
        """Return (open-circuit voltage [V], resistance [Ω]) at a state of charge and a direction."""
        voltage = np.interp(soc, self.soc, self.open_circuit_voltage)
        out = np.interp(soc, self.soc, self.discharge_resistance)
        into = np.interp(soc, self.soc, self.charge_resistance)
        return voltage, np.where(discharging, out, into)


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
    root = np.sqrt(np.asarray(voltage * voltage - 4.0 * resistance * power))
    return np.asarray(2.0 * power / (voltage + root))


class BatteryAnswer(NamedTuple):
    """What the pack does at each step, arrays (C, S).

    voltage, current : at the terminals [V], [A]; mean of the step
    power : terminal power [W]
    source_voltage : open-circuit voltage that held in the step [V]
    resistance : of the root, RC pairs included [Ω]
    soc_start, soc_end : state of charge at both ends of the step [-]
    pair_start, pair_end : (pair, C, S) voltage of each RC pair at both ends of the step [V]
    cause : why the wanted power was not met, a `Cause`
    """

    voltage: FloatArray
    current: FloatArray
    power: FloatArray
    source_voltage: FloatArray
    resistance: FloatArray
    soc_start: FloatArray
    soc_end: FloatArray
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

    soc_middle : (C, S) state of charge in the middle of each step [-]
    pair_start : (pair, C, S) voltage of each RC pair at the start of each step [V]
    """

    soc_middle: FloatArray
    pair_start: FloatArray


def resting_path(before: BatteryState, steps: int) -> BatteryPath:
    """Return the first estimate of a block: everything stays as it was before."""
    shape = (before.soc.shape[0], steps)
    return BatteryPath(
        np.broadcast_to(before.soc, shape), np.broadcast_to(before.pairs, (before.pairs.shape[0], *shape))
    )


def path_of(given: BatteryAnswer) -> BatteryPath:
    """Return the path that an answer implies, the estimate of the next pass."""
    return BatteryPath(0.5 * (given.soc_start + given.soc_end), given.pair_start)


def state_after(given: BatteryAnswer) -> BatteryState:
    """Return the battery after the last step of an answer."""
    return BatteryState(given.soc_end[..., -1:], given.pair_end[..., -1:])


def answer(
    battery: Battery, wanted: FloatArray, duration: FloatArray, before: BatteryState, path: BatteryPath
) -> BatteryAnswer:
    """Return what the battery does when the stage wants a terminal power at each step.

    Parameters
    ----------
    battery : Battery
    wanted : (C, S) wanted terminal power, positive = discharge [W]
    duration : (S,) [s]
    before : state before the first step
    path : estimate along the block

    Notes
    -----
    E and R are taken in the middle of each step. At held current the mean voltage of an RC pair over a step is
    v m + R (1 - m) I with m = (1 - exp(-h/tau)) tau/h, so a pair only shifts E and R of the constant-power root.
    Limits of current, voltage and greatest power bound the current first; the state of charge is then a sum that is
    clipped at its window, exactly, and a step that meets the window carries the mean current that just reaches it.
    """
    discharging = wanted > 0.0
    open_circuit, resistance = battery.source(path.soc_middle, discharging)
    voltage = open_circuit
    for (ohms, constant), start in zip(battery.pairs, path.pair_start, strict=True):
        mean_decay = -np.expm1(-duration / constant) * constant / duration
        voltage = voltage - start * mean_decay
        resistance = resistance + ohms * (1.0 - mean_decay)
    safe = np.where(resistance > 0.0, resistance, 1.0)
    greatest = np.where(resistance > 0.0, voltage * voltage / (4.0 * safe), np.inf)
    current = current_at_power(np.minimum(wanted, greatest), voltage, resistance)
    current, cause = _limited(battery, current, voltage, resistance, wanted > greatest)
    soc_start = soc_end = np.broadcast_to(before.soc, wanted.shape)
    if battery.tracks_charge:
        change = -current * duration / battery.capacity
        soc_end = clipped_sum(before.soc, change, battery.lowest_soc, battery.highest_soc)
        soc_start = np.concatenate([before.soc, soc_end[..., :-1]], axis=-1)
        short = np.abs(soc_start + change - soc_end) > 1e-12
        current = np.where(short, (soc_start - soc_end) * battery.capacity / duration, current)
        cause = np.where(short, np.where(discharging, Cause.SOC_LOW, Cause.SOC_HIGH), cause).astype(np.int8)
    terminal = voltage - resistance * current
    pair_start, pair_end = _pairs(battery, current, duration, before)
    return BatteryAnswer(
        terminal,
        current,
        terminal * current,
        open_circuit,
        resistance,
        soc_start,
        soc_end,
        pair_start,
        pair_end,
        cause,
    )


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


def _limited(
    battery: Battery, current: FloatArray, voltage: FloatArray, resistance: FloatArray, over: NDArray[np.bool_]
) -> tuple[FloatArray, NDArray[np.int8]]:
    """Bound the current by the limits of current and voltage; the tightest bound names the cause."""
    ohms = np.where(resistance > 0.0, resistance, 1.0)
    never = np.full_like(voltage, np.inf)
    by_low_voltage = np.where(resistance > 0.0, (voltage - battery.lowest_voltage) / ohms, never)
    by_high_voltage = np.where(resistance > 0.0, (battery.highest_voltage - voltage) / ohms, never)
    most_out = np.maximum(np.minimum(battery.discharge_current_limit, by_low_voltage), 0.0)
    most_in = np.maximum(np.minimum(battery.charge_current_limit, by_high_voltage), 0.0)
    cause = np.where(over, Cause.GREATEST_POWER, Cause.NONE)
    low_first = by_low_voltage < battery.discharge_current_limit
    high_first = by_high_voltage < battery.charge_current_limit
    cause = np.where(current > most_out, np.where(low_first, Cause.VOLTAGE_LOW, Cause.DISCHARGE_CURRENT), cause)
    cause = np.where(-current > most_in, np.where(high_first, Cause.VOLTAGE_HIGH, Cause.CHARGE_CURRENT), cause)
    return np.clip(current, -most_in, most_out), cause.astype(np.int8)
