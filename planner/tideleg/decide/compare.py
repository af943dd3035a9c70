"""Comparing stages fairly: the same missions, and what each stage was allowed to spend on them."""

from __future__ import annotations

import dataclasses
import math
from collections.abc import Callable, Mapping, Sequence
from pathlib import Path

from tideleg.decide.adapt import adapted
from tideleg.decide.changes import part_number
from tideleg.errors import InfeasibleError, InputError, NoEquilibriumError
from tideleg.outcome import Outcome
from tideleg.plan import Plan, load_plan
from tideleg.registry import Registry, installed
from tideleg.running import Progress, run
from tideleg.stage import Stage, StagePart, build_stage


@dataclasses.dataclass(frozen=True)
class Contender:
    """One stage of a comparison.

    label : plan title or topology
    outcome : None where it cannot operate or found no thermal equilibrium; `fault` then says so
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
        entries = [(name, *adapted(loaded[0], name, known)) for name in topologies]
    else:
        if len(loaded) < 2:
            raise InputError("give at least two plans to compare, or one plan and at least two topologies")
        entries = [(plan.title, plan, ()) for plan in loaded]
    _refuse_other_missions([plan for _, plan, _ in entries])
    contenders = tuple(_contender(label, plan, notes, known, progress) for label, plan, notes in entries)
    rows = contenders[0].fairness
    unequal = tuple(row for row in rows if len({c.fairness.get(row) for c in contenders}) > 1)
    return Comparison(contenders, unequal)


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
    from tideleg.demand import profile_of

    missions = [
        (profile_of(plan, m).sha256, m.passes_per_year, m.terminals, m.coolant, m.ambient, m.start, m.sign)
        for m in plan.mission
    ]
    return missions, plan.battery, plan.link.voltage, plan.vehicle


def _contender(
    label: str, plan: Plan, notes: tuple[str, ...], registry: Registry, progress: Progress | None
) -> Contender:
    try:
        outcome = run(plan, registry=registry, progress=progress)
    except (NoEquilibriumError, InfeasibleError) as error:
        return Contender(label, None, str(error), _fairness(plan, registry, None), notes)
    return Contender(label, outcome, "", _fairness(plan, registry, outcome), notes)


def _fairness(plan: Plan, registry: Registry, outcome: Outcome | None) -> dict[str, str]:
    """Return what a stage may spend: chips, on-resistance budget, magnetic and capacitive energy, ripple, limits."""
    stage = build_stage(plan, registry)
    chips = [p for p in stage.parts if p.slot.kind == "switch"]
    siemens = [_conductance(plan, part) for part in chips]
    given = [value for value in siemens if value is not None]
    ratings = sorted({p.base.rated_voltage for p in chips if p.base is not None and p.base.rated_voltage is not None})
    ripple = None if outcome is None else _greatest_ripple(outcome)
    junction = plan.limits.junction_temperature
    return {
        "chips": f"{sum(int(p.total) for p in chips)}",
        "chip conductance budget": "not given" if len(given) < len(siemens) else f"{sum(given):.4g} S",
        "chip voltage rating": ", ".join(f"{v:g} V" for v in ratings) or "not given",
        "inductor energy at peak": _energy(stage, outcome, "inductor", _inductor_energy),
        "capacitor energy": _energy(stage, outcome, "capacitor", _capacitor_energy),
        "greatest inductor ripple": "unknown" if ripple is None else f"{ripple:.4g} A",
        "junction limit": "none" if junction is None else f"{junction:g} degC",
        "coolant": ", ".join("column" if m.coolant is None else f"{m.coolant:g} degC" for m in plan.mission),
    }


def _conductance(plan: Plan, part: StagePart) -> float | None:
    """Return the conductance of all chips of one part together [S], or None where no resistance is given."""
    ohms = part_number(plan, part.slot.table, "on_resistance", "resistance")
    return None if ohms is None else float(part.total) / ohms


def _energy(
    stage: Stage, outcome: Outcome | None, kind: str, energy_of: Callable[[StagePart, Outcome], float | None]
) -> str:
    """Return the energy that all parts of one kind hold at most, and how many of them have no value."""
    if outcome is None:
        return "unknown"
    parts = [part for part in stage.parts if part.slot.kind == kind]
    found = [energy_of(part, outcome) for part in parts]
    known = [joule for joule in found if joule is not None]
    without = len(found) - len(known)
    return f"{sum(known):.3g} J" + (f", {without} without value" if without else "")


def _inductor_energy(part: StagePart, outcome: Outcome) -> float:
    peak = max(_greatest(outcome, f"{part.slot.name}.current_{side}_a") for side in ("peak", "valley"))
    return float(0.5 * part.base.inductance * peak * peak * part.slot.copies)


def _capacitor_energy(part: StagePart, outcome: Outcome) -> float | None:
    if part.base is None or part.base.capacitance is None:
        return None
    own = f"{part.slot.name}.voltage_v"
    port = f"{part.slot.name.removesuffix('_capacitor')}_voltage_v"
    volts = _greatest(outcome, own if own in outcome.missions[0].steps.columns else port)
    return float(0.5 * part.base.capacitance * volts * volts * part.slot.copies)


def _greatest(outcome: Outcome, column: str) -> float:
    return max(float(mission.steps[column].abs().max()) for mission in outcome.missions)


def _greatest_ripple(outcome: Outcome) -> float:
    columns = [c for c in outcome.missions[0].steps.columns if c.endswith(".current_ripple_a")]
    return max((float(m.steps[c].max()) for m in outcome.missions for c in columns), default=math.nan)
