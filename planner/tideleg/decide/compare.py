"""Comparing stages fairly: the same missions, and what each stage was allowed to spend on them."""

from __future__ import annotations

import dataclasses
import math
from collections.abc import Mapping, Sequence
from pathlib import Path

from tideleg.decide.changes import part_number, with_stage, with_topology
from tideleg.errors import InputError, NoEquilibriumError
from tideleg.outcome import Outcome
from tideleg.plan import Plan, load_plan
from tideleg.registry import Registry, installed
from tideleg.running import Progress, run
from tideleg.stage import build_stage


@dataclasses.dataclass(frozen=True)
class Contender:
    """One stage of a comparison.

    label : plan title or topology
    outcome : None where it found no thermal equilibrium; `fault` then says so
    fairness : what it was given to spend: label -> value; equal rows make the comparison fair
    adaptations : what had to change in the plan so that this topology could use it
    """

    label: str
    outcome: Outcome | None
    fault: str
    fairness: Mapping[str, str]
    adaptations: tuple[str, ...]


@dataclasses.dataclass(frozen=True)
class Comparison:
    """Several stages on the same missions.

    contenders : in the order given
    unequal : labels of the fairness rows in which they differ
    """

    contenders: tuple[Contender, ...]
    unequal: tuple[str, ...]


def compare(
    plans: Sequence[Plan | str | Path],
    *,
    topologies: Sequence[str] = (),
    registry: Registry | None = None,
    progress: Progress | None = None,
) -> Comparison:
    """Run several plans, or one plan with several topologies, over the same missions.

    Parameters
    ----------
    plans : at least two plans; or one, with at least two `topologies`
    topologies : names of topologies to put in place of the one plan's own

    Raises
    ------
    InputError
        If the missions differ (profile, passes a year, coolant, terminals), or the call names too little to compare.
    """
    loaded = [plan if isinstance(plan, Plan) else load_plan(plan) for plan in plans]
    known = registry or installed()
    if topologies:
        if len(loaded) != 1 or len(topologies) < 2:
            raise InputError("with topologies to compare, give one plan and at least two topologies")
        entries = [(name, *_adapted(loaded[0], name, known)) for name in topologies]
    else:
        if len(loaded) < 2:
            raise InputError("give at least two plans to compare, or one plan and at least two topologies")
        entries = [(plan.title, plan, ()) for plan in loaded]
    _refuse_other_missions([plan for _, plan, _ in entries])
    contenders = tuple(_contender(label, plan, notes, known, progress) for label, plan, notes in entries)
    rows = contenders[0].fairness
    unequal = tuple(row for row in rows if len({c.fairness.get(row) for c in contenders}) > 1)
    return Comparison(contenders, unequal)


def _adapted(plan: Plan, topology: str, registry: Registry) -> tuple[Plan, tuple[str, ...]]:
    """Return the plan with another topology; keys that it does not take are changed, and said."""
    registry.topology(topology)
    other = with_topology(plan, topology)
    fields = registry.topology(topology).settings.model_fields
    dropped = [key for key in other.stage.settings if key not in fields]
    kept = {key: value for key, value in other.stage.settings.items() if key in fields}
    other = other.model_copy(update={"stage": other.stage.model_copy(update={"settings": kept})})
    notes = [f"{key} = {plan.stage.settings[key]} left out: {topology} does not take it" for key in dropped]
    try:
        build_stage(other, registry)
    except InputError:
        if kept.get("legs") is None:
            raise
        default = fields["legs"].default
        legs = default if isinstance(default, int) else 1
        other = with_stage(other, legs=legs)
        build_stage(other, registry)
        notes.append(f"legs = {legs} instead of {kept['legs']}: {topology} has no other number")
    return other, tuple(notes)


def _refuse_other_missions(plans: Sequence[Plan]) -> None:
    first = _mission_key(plans[0])
    for plan in plans[1:]:
        if _mission_key(plan) != first:
            raise InputError(
                f"{plan.file or plan.title}: its missions differ from those of {plans[0].file or plans[0].title}"
                " (profile content, passes a year, terminals, coolant, ambient, start or battery);"
                " a comparison needs the same missions and the same battery"
            )


def _mission_key(plan: Plan) -> object:
    from tideleg.facts import file_sha256

    missions = [
        (file_sha256(plan.folder / m.profile), m.passes_per_year, m.terminals, m.coolant, m.ambient, m.start, m.sign)
        for m in plan.mission
    ]
    return missions, plan.battery, plan.link.voltage, plan.vehicle


def _contender(
    label: str, plan: Plan, notes: tuple[str, ...], registry: Registry, progress: Progress | None
) -> Contender:
    try:
        outcome = run(plan, registry=registry, progress=progress)
    except NoEquilibriumError as error:
        return Contender(label, None, str(error), _fairness(plan, registry, None), notes)
    return Contender(label, outcome, "", _fairness(plan, registry, outcome), notes)


def _fairness(plan: Plan, registry: Registry, outcome: Outcome | None) -> dict[str, str]:
    """Return what a stage may spend: chips, on-resistance budget, magnetic and capacitive energy, ripple, limits."""
    stage = build_stage(plan, registry)
    chips = sum(int(p.total) for p in stage.parts if p.slot.kind == "switch")
    ohms = part_number(plan, "switch", "on_resistance", "resistance")
    peak = _greatest_peak(outcome)
    windings = [(p.base.inductance, p.slot.copies) for p in stage.parts if p.slot.kind == "inductor"]
    magnetic = sum(0.5 * henry * peak * peak * copies for henry, copies in windings) if peak is not None else None
    ripple = None if outcome is None else _greatest_ripple(outcome)
    junction = plan.limits.junction_temperature
    return {
        "chips": f"{chips}",
        "chip conductance budget": "not given" if ohms is None else f"{chips / ohms:.4g} S",
        "inductor energy at peak": "unknown" if magnetic is None else f"{magnetic:.3g} J",
        "capacitor energy": f"{_capacitor_energy(plan, stage_voltages(plan)):.3g} J",
        "greatest inductor ripple": "unknown" if ripple is None else f"{ripple:.4g} A",
        "junction limit": "none" if junction is None else f"{junction:g} degC",
        "coolant": ", ".join("column" if m.coolant is None else f"{m.coolant:g} degC" for m in plan.mission),
    }


def stage_voltages(plan: Plan) -> dict[str, float]:
    """Return the highest resting voltage at each port, for stored energy [V]."""
    return {"battery": max(plan.battery.open_circuit_voltage.value), "link": plan.link.voltage}


def _capacitor_energy(plan: Plan, voltages: Mapping[str, float]) -> float:
    total = 0.0
    for port, voltage in voltages.items():
        farad = part_number(plan, f"{port}_capacitor", "capacitance", "capacitance")
        total += 0.0 if farad is None else 0.5 * farad * voltage * voltage
    return total


def _greatest_peak(outcome: Outcome | None) -> float | None:
    if outcome is None:
        return None
    found = 0.0
    for mission in outcome.missions:
        for column in mission.steps.columns:
            if column.endswith((".current_peak_a", ".current_valley_a")) and "inductor" in column:
                found = max(found, float(mission.steps[column].abs().max()))
    return found


def _greatest_ripple(outcome: Outcome) -> float:
    columns = [c for c in outcome.missions[0].steps.columns if c.endswith(".current_ripple_a")]
    return max((float(m.steps[c].max()) for m in outcome.missions for c in columns), default=math.nan)
