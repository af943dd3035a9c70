"""The main job: a plan in, an outcome out. It puts the rooms in order and adds no physics of its own."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from pathlib import Path
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from tideleg.accounts import battery_entry, choice_account, energy_account, loss_entries, thermal_entries
from tideleg.battery import Battery
from tideleg.caution import Safety, SafetyFacts, safety
from tideleg.columns import steps_frame
from tideleg.coverage import outside_entries, outside_warnings
from tideleg.demand import battery_of, demand_of, profile_of
from tideleg.errors import InputError
from tideleg.facts import inputs_of, part_entries, stage_facts
from tideleg.feasible import refuse_impossible_power, refuse_infeasible_rest, refuse_infeasible_steps
from tideleg.grades import Marched, grade_entries, placeholder_words
from tideleg.life_binding import Worn, bind_life, without_life
from tideleg.limits import Seen, check_limits, unchecked_limits
from tideleg.march import Demand, Settled, march, start
from tideleg.mission import Profile, coarsened
from tideleg.outcome import MissionResult, Outcome
from tideleg.plan import Plan, load_plan
from tideleg.reaching import reach_of
from tideleg.registry import Registry
from tideleg.stage import Stage, build_stage
from tideleg.verdict import cautions_of, dew_warnings, verdict_sentence, warnings_of
from tideleg.wearing import Pass, life_checks_of, start_temperatures, wear_of, wear_warnings
from tideleg.worst import worst_instant
from tideleg.year import year_of

if TYPE_CHECKING:
    import pandas as pd

Progress = Callable[[str, int, int], None]
"""Called with (mission, steps done, steps in all)."""

PERIODIC_TOLERANCE = 1e-4
"""A periodic start is found when no modal temperature moves by more than this over one pass [K]."""

MOST_PERIODIC_RUNS = 20

RULES = (
    "power and battery current are positive in discharge (battery to link, boost), negative in charge (buck)",
    "temperatures are in degC; those in the table of steps hold at the end of each step",
    "parts that repeat are given for one; their number stands in the list of parts",
    "limits are design targets of the plan, not a statement of compliance with any standard",
)


class MissionRun(NamedTuple):
    """One mission as it was marched."""

    profile: Profile
    demand: Demand
    blocks: list[Settled]
    steps: pd.DataFrame
    result: MissionResult


def run(
    plan: Plan | str | Path,
    *,
    registry: Registry | None = None,
    progress: Progress | None = None,
    merged_steps: int = 1,
) -> Outcome:
    """Run every mission of a plan through its stage and hold it against its limits.

    Parameters
    ----------
    plan : Plan, or the path of a plan file
    registry : plugins to use; those installed if None
    progress : called as steps are finished
    merged_steps : neighbouring steps of every profile to merge into one, for the test of its resolution; 1 for none

    Returns
    -------
    Outcome
        `outcome.steps` is a pandas frame, one row a step; `outcome.summary()` is what summary.json holds.

    Raises
    ------
    InputError
        If the plan or a profile cannot be used, or the stage cannot operate at a step.
    NoEquilibriumError
        If a part finds no steady temperature.
    """
    if not isinstance(plan, Plan):
        plan = load_plan(plan)
    stage = build_stage(plan, registry)
    _refuse_twin_missions(plan)
    worn = bind_life(plan, stage)
    runs = [_run_mission(plan, index, stage, merged_steps, progress, registry) for index in range(len(plan.mission))]
    return _outcome(plan, stage, battery_of(plan), worn, {r.result.name: r for r in runs})


def _refuse_twin_missions(plan: Plan) -> None:
    names = [mission.label for mission in plan.mission]
    for index, name in enumerate(names):
        if name in names[:index]:
            what = f"two missions are named {name!r}; give one of them a name of its own, such as name = 'winter'"
            raise plan.fault(f"mission.{index}.name", what)


def _run_mission(
    plan: Plan,
    index: int,
    stage: Stage,
    merged_steps: int,
    progress: Progress | None,
    registry: Registry | None,
) -> MissionRun:
    table = plan.mission[index]
    battery = battery_of(plan, table)
    profile = profile_of(plan, table, registry)
    profile = profile if merged_steps == 1 else coarsened(profile, merged_steps)
    demand = demand_of(plan, index, profile, stage)
    refuse_impossible_power(battery, demand, profile.name)
    refuse_infeasible_rest(stage, battery, demand, profile.name)
    done = None if progress is None else lambda steps: progress(profile.name, steps, len(demand.power))
    blocks = _march_from(stage, battery, demand, table.start, done)
    refuse_infeasible_steps(stage, demand, blocks, profile.name)
    steps = steps_frame(stage, battery, demand, blocks)
    result = MissionResult(
        name=profile.name,
        passes_per_year=table.passes_per_year,
        rules=profile.rules,
        steps=steps,
        energy=energy_account(demand, blocks, steps),
        losses=loss_entries(stage, demand, blocks),
        battery=battery_entry(battery, demand, steps),
        passes=max(block.passes for block in blocks),
        choice=choice_account(stage, demand, blocks),
        reach=reach_of(stage, battery, demand, profile.name),
        outside=outside_entries(stage, demand, blocks),
    )
    return MissionRun(profile, demand, blocks, steps, result)


def _march_from(
    stage: Stage, battery: Battery, demand: Demand, begin: float | str, done: Callable[[int], None] | None
) -> list[Settled]:
    """March from the wanted start; "periodic" repeats until the thermal state comes back to itself.

    At given losses each modal state after a pass is a times the state before it plus c, with a known decay a; so the
    state that repeats is c/(1 - a), and only the feedback of temperature on loss needs the few runs.
    """
    carry = start(stage, battery, demand, begin if isinstance(begin, float) else None)
    blocks = list(march(stage, battery, demand, carry, done))
    if begin != "periodic" or stage.modes is None:
        return blocks
    whole = float(demand.duration.sum())
    for _ in range(MOST_PERIODIC_RUNS):
        after = blocks[-1].carry.heat
        if np.max(np.abs(after - carry.heat), initial=0.0) < PERIODIC_TOLERANCE:
            return blocks
        carry = carry._replace(heat=stage.modes.periodic_start(carry.heat, after, whole))
        blocks = list(march(stage, battery, demand, carry, done))
    raise InputError(
        f"the periodic start did not settle in {MOST_PERIODIC_RUNS} runs: the profile does not repeat."
        " Start soaked, or give a temperature"
    )


def _outcome(
    plan: Plan, stage: Stage, battery: Battery, worn: tuple[Worn, ...], runs: Mapping[str, MissionRun]
) -> Outcome:
    """Hold the runs against the limits and put everything on one table."""
    steps = {name: r.steps for name, r in runs.items()}
    wear = wear_of(plan, stage, worn, _passes(plan, stage, battery, runs))
    checks = check_limits(plan.limits, stage, plan.link.trip_voltage, _seen(stage, runs))
    unchecked = unchecked_limits(plan.limits, checks)
    checks = tuple(sorted((*checks, *life_checks_of(wear)), key=lambda check: -check.used))
    binding = checks[0] if checks else None
    gains = {name: np.max([b.gain[:, 0].max(axis=-1) for b in r.blocks], axis=0) for name, r in runs.items()}
    thermal = thermal_entries(stage, {name: r.demand for name, r in runs.items()}, gains, steps)
    holds = all(check.holds for check in checks) and not unchecked
    results = tuple(r.result for r in runs.values())
    warnings = warnings_of(stage, battery, [(name, r.demand) for name, r in runs.items()], thermal, results)
    warnings += dew_warnings(plan, {name: r.demand for name, r in runs.items()}, stage)
    cautions = cautions_of(stage, [(name, r.demand, r.blocks) for name, r in runs.items()])
    return Outcome(
        title=plan.title,
        holds=holds,
        verdict=verdict_sentence(checks, unchecked),
        binding=binding,
        limits=checks,
        missions=results,
        year=year_of(plan, stage, results),
        thermal=thermal,
        parts=part_entries(plan, stage),
        stage_facts=stage_facts(plan, stage),
        worst=worst_instant(stage, checks, steps, {name: r.blocks for name, r in runs.items()}),
        changes=(),
        safety=_safety(plan, stage, battery, steps),
        not_modelled=stage.not_modelled + unchecked + without_life(stage, worn),
        warnings=(
            *warnings,
            *cautions,
            *wear_warnings(wear, plan.life),
            *(line for name, r in runs.items() for line in outside_warnings(name, r.result.outside)),
        ),
        rules=(*RULES, *getattr(stage.topology, "assumptions", ())),
        inputs=inputs_of(plan, [r.profile for r in runs.values()]),
        plan_file=plan.file,
        grades=grade_entries(
            plan, stage, [Marched(r.result.passes_per_year, r.demand, r.blocks) for r in runs.values()]
        ),
        placeholders=placeholder_words(plan),
        wear=wear,
    )


def _passes(plan: Plan, stage: Stage, battery: Battery, runs: Mapping[str, MissionRun]) -> dict[str, Pass]:
    """Return the runs as the wear of parts sees them."""
    found = {}
    for table, (name, r) in zip(plan.mission, runs.items(), strict=True):
        warm = start_temperatures(stage, battery, r.demand, table.start, r.steps)
        found[name] = Pass(table.passes_per_year, r.demand, r.steps, warm)
    return found


def _seen(stage: Stage, runs: Mapping[str, MissionRun]) -> Seen:
    inductors = [part.slot.name for part in stage.parts if part.slot.kind == "inductor"]
    means = [np.abs(r.steps[f"{name}.current_mean_a"].to_numpy()).max() for r in runs.values() for name in inductors]
    weight = {name: r.result.passes_per_year for name, r in runs.items()}
    energy_in = sum(weight[n] * (r.result.energy.battery_out_j + r.result.energy.link_in_j) for n, r in runs.items())
    loss = sum(weight[n] * r.result.energy.loss_j for n, r in runs.items())
    return Seen(
        steps={name: r.steps for name, r in runs.items()},
        coolest=min(float(r.demand.held.min()) for r in runs.values()),
        requested_j={name: r.result.energy.requested_j for name, r in runs.items()},
        curtailed_j={name: r.result.energy.curtailed_j for name, r in runs.items()},
        efficiency=1.0 - loss / energy_in if energy_in > 0.0 else 1.0,
        rated_leg_current=float(max(means, default=0.0)),
    )


def _safety(plan: Plan, stage: Stage, battery: Battery, steps: Mapping[str, pd.DataFrame]) -> Safety:
    """Return the caution's own numbers for this design."""
    frames = list(steps.values())
    link = max(float(f["link_voltage_v"].max()) for f in frames)
    link = link if plan.link.trip_voltage is None else max(link, plan.link.trip_voltage)
    inductors = [part for part in stage.parts if part.slot.kind == "inductor"]
    at_link = [p for p in stage.parts if p.slot.name == "link_capacitor" and p.base is not None and p.base.capacitance]
    own = [p.base.capacitance * p.slot.copies / p.slot.in_series**2 for p in at_link]
    return safety(
        SafetyFacts(
            highest_link_voltage_v=link,
            highest_battery_voltage_v=max(
                float(battery.open_circuit_voltage.max()), *(float(f["battery_voltage_v"].max()) for f in frames)
            ),
            link_voltage_v=plan.link.voltage,
            trip_voltage_v=plan.link.trip_voltage,
            bus_capacitance_f=plan.link.capacitance,
            stage_link_capacitance_f=own[0] if own else None,
            battery_source_voltage_v=float(battery.open_circuit_voltage.max()),
            battery_resistance_ohm=float(battery.discharge_resistance.min()),
            path_resistance_ohm=0.0,
            inductance_per_leg_h=float(inductors[0].base.inductance),
            legs=inductors[0].slot.copies,
            greatest_discharge_w=max(0.0, *(float(f["power_w"].max()) for f in frames)),
            link_fed_through_diodes=getattr(stage.topology, "feeds_link_through_diodes", True),
        )
    )
