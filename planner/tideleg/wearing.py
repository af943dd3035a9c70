"""From the temperatures of a run to cycles, damage and life, part by part: it puts `wear` and the life plugins to work.

Temperatures are those at the end of each step, which hold the peaks; the first turning point is the start.
"""

from __future__ import annotations

from collections.abc import Mapping
from functools import partial
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from tideleg.life_binding import Worn
from tideleg.limits import LimitCheck
from tideleg.march import Demand, start
from tideleg.plan import LifeTable, Plan
from tideleg.registry import call_plugin
from tideleg.stage import Stage
from tideleg.stress import Cycles, Stress
from tideleg.waveform import FloatArray
from tideleg.wear import (
    RESIDUE_RULES,
    count_cycles,
    cumulative_damage,
    hours_above,
    hours_at_temperature,
    life_of,
    lifetime_quantile,
)
from tideleg.wear.lifetime import YEAR_S
from tideleg.worn import Consumer, CycleTrace, DamageTrace, HeatHistory, PartWear, SwingBand, Wear

if TYPE_CHECKING:
    import pandas as pd

    from tideleg.battery import Battery

STRETCHES = 200
"""Stretches into which a pass is cut to say which consume most."""

TOP = 20
"""How many of them are named."""

BANDS_K = (0.0, 5.0, 10.0, 20.0, 30.0, 40.0, 60.0, 80.0, np.inf)
"""Bands of swing for display; counting itself knows no classes [K]."""

HOUR_BANDS_K, MOST_HOUR_BANDS = (1.0, 2.0, 5.0, 10.0), 20
"""Widths of the bands in which hours by temperature are shown [K]: the finest that gives at most so many."""

OUTSIDE_SHARE = 0.10
"""Share of damage from outside a model's data from which a reader is warned [-]."""

PORTS = {"battery_capacitor": "battery_voltage_v", "link_capacitor": "link_voltage_v"}


class Pass(NamedTuple):
    """One mission as the wear of parts sees it.

    start_degc : temperature of each seated part before the first step
    """

    passes_per_year: float
    demand: Demand
    steps: pd.DataFrame
    start_degc: Mapping[str, float]

    @property
    def seconds(self) -> float:
        """Length of one pass [s]."""
        return float(self.demand.duration.sum())


def start_temperatures(
    stage: Stage, battery: Battery, demand: Demand, begin: float | str, steps: pd.DataFrame
) -> dict[str, float]:
    """Return the temperature of each seated part before the first step [degC]; of a periodic start that of the end."""
    if begin == "periodic":
        return {name: float(steps[f"{name}.temperature_degc"].iloc[-1]) for name in stage.seated}
    rest = start(stage, battery, demand, begin if isinstance(begin, float) else None).temperature[:, 0, 0]
    warm = rest if not isinstance(begin, float) else np.full(len(stage.seated), begin)
    return {name: float(degc) for name, degc in zip(stage.seated, warm, strict=True)}


def wear_of(plan: Plan, stage: Stage, worn: tuple[Worn, ...], passes: Mapping[str, Pass]) -> Wear:
    """Return the wear of every part over a year of all missions.

    Parameters
    ----------
    plan, stage : what was run
    worn : see `life_binding`
    passes : by mission
    """
    table = plan.life or LifeTable()
    cycles = {name: {mission: _cycles(table, name, one) for mission, one in passes.items()} for name in stage.seated}
    parts = [_part_wear(table, stage, one, cycles.get(one.part, {}), passes) for one in worn]
    heat = tuple(_heat(_hot_above(plan, stage, name), name, cycles[name], passes) for name in stage.seated)
    consumers = sorted((c for part in parts for c in _consumers(part, passes)), key=lambda c: -c.damage_per_year)
    return Wear(
        residue=f"{table.residue}: {RESIDUE_RULES[table.residue]}",
        heat=tuple(sorted(heat, key=lambda h: -h.greatest_degc)),
        parts=tuple(sorted(parts, key=lambda p: (p.life_at_target_years, -p.damage_per_year))),
        consumers=tuple(consumers[:TOP]),
    )


def _cycles(table: LifeTable, part: str, one: Pass) -> Cycles:
    time = np.concatenate([[0.0], np.cumsum(one.demand.duration)])
    value = np.concatenate([[one.start_degc[part]], one.steps[f"{part}.temperature_degc"].to_numpy()])
    return count_cycles(time, value, table.residue, period=one.seconds)


def _stress(worn: Worn, cycles: Mapping[str, Cycles], mission: str, one: Pass) -> Stress:
    """Return what one part went through in one pass."""
    steps, nothing = one.steps, np.zeros(0)
    active = (steps["conduction"] != "idle").to_numpy().astype(np.float64)
    if worn.kind == "stage":
        none = Cycles(*(nothing for _ in Cycles._fields))
        battery = np.abs(steps["battery_current_a"].to_numpy())
        return Stress(none, nothing, one.demand.duration, battery, steps["link_voltage_v"].to_numpy(), active)
    name = worn.part
    if worn.kind == "switch":
        voltage = steps[f"{name}.blocked_voltage_v"].to_numpy()
    elif worn.kind == "capacitor":
        voltage = steps[PORTS.get(name, f"{name}.voltage_v")].to_numpy()
    else:
        voltage = np.maximum(steps["battery_voltage_v"].to_numpy(), steps["link_voltage_v"].to_numpy())
    return Stress(
        cycles[mission],
        steps[f"{name}.temperature_mean_degc"].to_numpy(),
        one.demand.duration,
        steps[f"{name}.current_rms_a"].to_numpy(),
        voltage,
        active,
    )


class _Answer(NamedTuple):
    damage: FloatArray
    outside: FloatArray
    cycles: Cycles


def _part_wear(
    table: LifeTable, stage: Stage, worn: Worn, cycles: Mapping[str, Cycles], passes: Mapping[str, Pass]
) -> PartWear:
    answers: dict[str, _Answer] = {}
    for mission, one in passes.items():
        stress = _stress(worn, cycles, mission, one)
        found = call_plugin(stage.registry, worn.model, partial(worn.term.consumed, stress))
        _refuse_bad(worn, found.damage)
        answers[mission] = _Answer(found.damage, found.outside.astype(np.float64), stress.cycles)
    by_pass = {mission: float(answer.damage.sum()) for mission, answer in answers.items()}
    weight = {mission: one.passes_per_year for mission, one in passes.items()}
    yearly = sum(weight[m] * d for m, d in by_pass.items())
    outside = sum(weight[m] * float(np.sum(a.damage * a.outside)) for m, a in answers.items())
    spreads = (worn.term.spread, worn.copies, table.load_spread)
    reached = lifetime_quantile(yearly, spreads[0], table.target_failures, *spreads[1:])
    target = None if table.target is None else table.target / YEAR_S
    by_cycles = worn.term.reads == "cycles"
    trace = _trace(answers, weight) if by_cycles else None
    return PartWear(
        part=worn.part,
        model=worn.model.name,
        mechanism=worn.term.mechanism,
        heated=worn.kind != "stage",
        copies=worn.copies,
        damage_per_year=yearly,
        damage_per_pass=by_pass,
        life=life_of(yearly, spreads[0], 1, table.load_spread),
        first_life=life_of(yearly, *spreads),
        spread=worn.term.spread,
        load_spread=table.load_spread,
        life_at_target_years=reached,
        target_years=target,
        target_failures=table.target_failures,
        margin_years=None if target is None else reached - target,
        outside_share=outside / yearly if yearly > 0.0 else 0.0,
        box=worn.term.box,
        bands=() if trace is None else _bands(trace),
        cycles=trace,
        along={mission: _along(answers[mission], one, by_cycles) for mission, one in passes.items()},
    )


def _refuse_bad(worn: Worn, damage: FloatArray) -> None:
    if not np.all(np.isfinite(damage)) or np.any(damage < 0.0):
        raise ValueError(f"life model {worn.model.name!r} of {worn.part} gave a damage that is not finite or negative")


def _trace(answers: Mapping[str, _Answer], weight: Mapping[str, float]) -> CycleTrace:
    columns = [
        (a.cycles.range, a.cycles.mean, weight[m] * a.cycles.weight, weight[m] * a.damage, a.outside)
        for m, a in answers.items()
    ]
    return CycleTrace(*(np.concatenate(column) for column in zip(*columns, strict=True)))


def _bands(trace: CycleTrace) -> tuple[SwingBand, ...]:
    edges = np.asarray(BANDS_K)
    count, _ = np.histogram(trace.swing_k, edges, weights=trace.per_year)
    damage, _ = np.histogram(trace.swing_k, edges, weights=trace.damage_per_year)
    whole = float(damage.sum()) or 1.0
    rows = zip(edges[:-1], edges[1:], count, damage / whole, strict=True)
    return tuple(SwingBand(*(float(value) for value in row)) for row in rows)


def _along(answer: _Answer, one: Pass, by_cycles: bool) -> DamageTrace:
    """Return the damage along one pass, at the ends of its stretches."""
    at = np.linspace(0.0, one.seconds, STRETCHES + 1)
    if by_cycles:
        return DamageTrace(at, cumulative_damage(answer.cycles, answer.damage, at, one.seconds))
    edges = np.concatenate([[0.0], np.cumsum(one.demand.duration)])
    done = np.concatenate([[0.0], np.cumsum(answer.damage)])
    return DamageTrace(at, np.interp(at, edges, done))


def _consumers(part: PartWear, passes: Mapping[str, Pass]) -> list[Consumer]:
    """Return the stretches of every mission with what they take of one part."""
    found = []
    for mission, (time, damage) in part.along.items():
        taken = np.diff(damage) * passes[mission].passes_per_year
        for k in np.argsort(-taken, kind="stable")[:TOP]:
            if taken[k] > 0.0:
                share = float(taken[k]) / part.damage_per_year
                when = (float(time[k]), float(time[k + 1]))
                found.append(Consumer(part.part, part.mechanism, mission, *when, float(taken[k]), share))
    return found


def _hot_above(plan: Plan, stage: Stage, part: str) -> float | None:
    """Return the temperature above which hours are told apart: the plan's, or the limit of that kind of part [degC]."""
    if plan.life is not None and plan.life.hot_above is not None:
        return plan.life.hot_above
    limits = {
        "switch": plan.limits.junction_temperature,
        "inductor": plan.limits.inductor_temperature,
        "capacitor": plan.limits.capacitor_temperature,
    }
    return limits.get(stage.part(part).slot.kind)


def _heat(hot: float | None, part: str, cycles: Mapping[str, Cycles], passes: Mapping[str, Pass]) -> HeatHistory:
    mean = [one.steps[f"{part}.temperature_mean_degc"].to_numpy() for one in passes.values()]
    end = [one.steps[f"{part}.temperature_degc"].to_numpy() for one in passes.values()]
    yearly = np.concatenate([one.passes_per_year * one.demand.duration for one in passes.values()])
    temperature = np.concatenate(mean)
    band = next((b for b in HOUR_BANDS_K if np.ptp(temperature) <= MOST_HOUR_BANDS * b), HOUR_BANDS_K[-1])
    edges, hours = hours_at_temperature(temperature, yearly, band)
    number = np.concatenate([one.passes_per_year * cycles[m].weight for m, one in passes.items()])
    swings = np.concatenate([cycles[m].range for m in passes])
    counts, _ = np.histogram(swings, np.asarray(BANDS_K), weights=number)
    return HeatHistory(
        part=part,
        greatest_degc=float(max(e.max() for e in end)),
        mean_degc=float(np.sum(temperature * yearly) / yearly.sum()),
        greatest_swing_k=float(swings.max(initial=0.0)),
        cycles_per_year=float(number.sum()),
        hours_per_year=float(yearly.sum()) / 3600.0,
        band_edges_degc=tuple(edges.tolist()),
        band_hours=tuple(hours.tolist()),
        swing_edges_k=BANDS_K,
        swing_counts=tuple(counts.tolist()),
        hot_above_degc=hot,
        hot_hours=None if hot is None else hours_above(hot, temperature, yearly),
    )


def life_checks_of(wear: Wear) -> tuple[LimitCheck, ...]:
    """Return the life of every part against the target of the plan."""
    return tuple(
        LimitCheck(
            name=f"life by {part.model}",
            part=part.part,
            value=part.life_at_target_years,
            limit=part.target_years,
            unit="years",
            margin=part.life_at_target_years - part.target_years,
            used=part.target_years / part.life_at_target_years,
            time_s=None,
            mission=None,
            holds=bool(part.life_at_target_years >= part.target_years),
        )
        for part in wear.parts
        if part.target_years is not None
    )


def wear_warnings(wear: Wear, table: LifeTable | None) -> tuple[str, ...]:
    """Return what a reader must know before trusting a life."""
    found = [
        f"{part.part.replace('_', ' ')}: {100.0 * part.outside_share:.0f} % of the damage by {part.model} comes from"
        f" outside the data it stands on ({part.box}); its life is an extrapolation there"
        for part in wear.parts
        if part.outside_share > OUTSIDE_SHARE
    ]
    if table is not None and table.residue == "closed_only" and wear.parts:
        found.append("residue = 'closed_only' leaves out the greatest swings: lives by cycles are too long")
    return tuple(found)
