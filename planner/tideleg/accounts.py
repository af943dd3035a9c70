"""Accounts of one mission: energy, losses, battery and temperatures, from its settled blocks and its table of steps."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from tideleg.battery import Battery
from tideleg.choices import loss_with, plain_choice
from tideleg.columns import choice_name
from tideleg.march import Demand, Settled
from tideleg.outcome import BatteryEntry, ChoiceAccount, EnergyAccount, LossEntry, ThermalEntry
from tideleg.stage import Stage
from tideleg.wear import count_cycles

if TYPE_CHECKING:
    from collections.abc import Mapping

    import pandas as pd

    from tideleg.waveform import FloatArray


def energy_account(demand: Demand, blocks: list[Settled], steps: pd.DataFrame) -> EnergyAccount:
    """Return where the energy of one pass went, with both residuals of the books."""
    seconds = demand.duration

    def energy(watts: FloatArray) -> float:
        return float(np.sum(watts * seconds))

    link = steps["power_w"].to_numpy()
    battery = steps["battery_power_w"].to_numpy()
    loss = steps["loss_w"].to_numpy()
    checked = np.concatenate([block.checked.total[0] for block in blocks])
    # What runs against the request (the link keeping an idle stage alive) is loss, not more curtailment.
    wanted = np.abs(demand.power)
    along = np.maximum(np.sign(demand.power) * (demand.power - steps["curtailed_w"].to_numpy()), 0.0)
    throughput = energy(np.abs(battery))
    scale = throughput if throughput > 0.0 else 1.0
    return EnergyAccount(
        link_out_j=energy(np.maximum(link, 0.0)),
        link_in_j=energy(np.maximum(-link, 0.0)),
        battery_out_j=energy(np.maximum(battery, 0.0)),
        battery_in_j=energy(np.maximum(-battery, 0.0)),
        loss_j=energy(loss),
        battery_heat_j=energy(steps["battery_heat_w"].to_numpy()),
        curtailed_j=energy(wanted - along),
        requested_j=energy(wanted),
        throughput_j=throughput,
        residual=energy(np.abs(battery - link - loss)) / scale,
        recomputed_residual=energy(np.abs(battery - link - checked)) / scale,
    )


def loss_entries(stage: Stage, demand: Demand, blocks: list[Settled]) -> tuple[LossEntry, ...]:
    """Return the energy of every loss term by direction, greatest first."""
    direction = np.concatenate([block.direction[0] for block in blocks])
    entries = []
    for part in stage.parts:
        for bound in part.terms:
            key = (part.slot.name, bound.term.mechanism)
            joules = np.concatenate([block.losses.by_term[key][0] for block in blocks]) * demand.duration
            by_direction = [float(joules[direction == sign].sum()) for sign in (1.0, -1.0, 0.0)]
            entries.append(LossEntry(*key, *by_direction))
    return tuple(sorted(entries, key=lambda entry: -entry.total_j))


def choice_account(stage: Stage, demand: Demand, blocks: list[Settled]) -> ChoiceAccount | None:
    """Return what the topology chose along one pass and what that saved; None where it leaves nothing to choose."""
    if not stage.choices:
        return None
    codes = np.concatenate([np.broadcast_to(block.point.choice, block.losses.total.shape)[0] for block in blocks])
    hours = float(demand.duration.sum()) / 3600.0
    shares = {
        word: float(demand.duration[codes == code].sum()) / (3600.0 * hours) for code, word in enumerate(stage.choices)
    }
    plain, saved = plain_choice(stage), None
    if plain is not None:
        begin, saved = 0, 0.0
        for block in blocks:
            part = demand.block(begin)
            loss = loss_with(stage, block.point, stage.by_name(block.mean, part.held, block.losses.total.shape))
            saved += float(np.sum((loss(plain) - block.losses.total)[0] * part.duration))
            begin += len(part.power)
    return ChoiceAccount(
        name=choice_name(stage),
        share_of_time=shares,
        changes_per_hour=float(np.count_nonzero(np.diff(codes))) / hours,
        plain=None if plain is None else stage.choices[plain],
        saved_j=saved,
    )


def battery_entry(battery: Battery, demand: Demand, steps: pd.DataFrame) -> BatteryEntry:
    """Return what one pass does to the battery; half of the ampere-hours both ways over the capacity is its cycles."""
    current = steps["battery_current_a"].to_numpy()
    voltage = steps["battery_voltage_v"].to_numpy()
    coulombs = float(np.sum(np.abs(current) * demand.duration))
    soc = steps["soc"].to_numpy() if battery.tracks_charge else None
    return BatteryEntry(
        start_soc=None if soc is None else battery.start_soc,
        end_soc=None if soc is None else float(soc[-1]),
        least_soc=None if soc is None else float(min(soc.min(), battery.start_soc)),
        greatest_soc=None if soc is None else float(max(soc.max(), battery.start_soc)),
        throughput_ah=coulombs / 3600.0,
        equivalent_full_cycles=None if soc is None else coulombs / (2.0 * battery.capacity),
        throughput_wh=float(np.sum(np.abs(steps["battery_power_w"].to_numpy()) * demand.duration)) / 3600.0,
        stored_change_j=-float(
            np.sum((steps["battery_power_w"].to_numpy() + steps["battery_heat_w"].to_numpy()) * demand.duration)
        ),
        depth_cycles=() if soc is None else _by_depth(battery, demand, soc),
        least_voltage_v=float(voltage.min()),
        greatest_voltage_v=float(voltage.max()),
        greatest_discharge_a=float(max(current.max(), 0.0)),
        greatest_charge_a=float(max(-current.min(), 0.0)),
    )


DEPTHS = (0.0, 0.01, 0.02, 0.05, 0.1, 0.2, 0.4, 0.6, 0.8, 1.0)
"""Bands of depth of discharge for display; counting itself knows no classes [-]."""


def _by_depth(battery: Battery, demand: Demand, soc: FloatArray) -> tuple[tuple[float, float, float], ...]:
    """Return the cycles of the state of charge in one pass by their depth."""
    time = np.concatenate([[0.0], np.cumsum(demand.duration)])
    cycles = count_cycles(time, np.concatenate([[battery.start_soc], soc]), "half_cycles")
    edges = np.array([*DEPTHS[:-1], DEPTHS[-1] + 1e-9])
    counted, _ = np.histogram(cycles.range, edges, weights=cycles.weight)
    return tuple((low, high, float(n)) for low, high, n in zip(DEPTHS, DEPTHS[1:], counted, strict=False) if n > 0.0)


def thermal_entries(
    stage: Stage, demands: Mapping[str, Demand], gains: Mapping[str, FloatArray], steps: Mapping[str, pd.DataFrame]
) -> tuple[ThermalEntry, ...]:
    """Return the temperatures of every part over all missions, hottest first; of uneven chips those of the hottest.

    gains : (seated part,) greatest loop gain at rest, by mission
    """
    entries = []
    for part in stage.parts:
        name = part.slot.name
        if name in stage.seated and part.decides:
            entries.append(_seated_entry(name, stage.seated.index(name), demands, gains, steps))
    return tuple(sorted(entries, key=lambda entry: -entry.greatest_degc))


def _seated_entry(
    name: str,
    index: int,
    demands: Mapping[str, Demand],
    gains: Mapping[str, FloatArray],
    steps: Mapping[str, pd.DataFrame],
) -> ThermalEntry:
    greatest, least, time, where, weighted, seconds = -np.inf, np.inf, 0.0, "", 0.0, 0.0
    for mission, frame in steps.items():
        end = frame[f"{name}.temperature_degc"].to_numpy()
        row = int(np.argmax(end))
        if end[row] > greatest:
            greatest, time, where = float(end[row]), float(frame["time_s"].iloc[row]), mission
        least = min(least, float(end.min()))
        duration = demands[mission].duration
        weighted += float(np.sum(frame[f"{name}.temperature_mean_degc"].to_numpy() * duration))
        seconds += float(duration.sum())
    gain = max(float(g[index]) for g in gains.values())
    return ThermalEntry(name, greatest, weighted / seconds, greatest - least, time, where, gain)
