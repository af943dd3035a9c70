"""What would change the answer: the same missions run again with one thing changed at a time, or more coarsely."""

from __future__ import annotations

import dataclasses
from collections.abc import Iterator

from tideleg.decide.changes import (
    inductance_of,
    stage_number,
    with_charge_limit,
    with_inductance,
    with_part,
    with_stage,
    with_warmer_coolant,
)
from tideleg.decide.coolant_loss import coolant_loss
from tideleg.decide.packs import both_packs
from tideleg.errors import InputError, NoEquilibriumError
from tideleg.outcome import Change, Coarser, Outcome
from tideleg.plan import Plan
from tideleg.registry import Registry
from tideleg.running import Progress, run

WARMER_K = 10.0
MERGED = (2, 5)
"""Numbers of neighbouring steps that are merged to test how far the profile's resolution limits the answer."""

LESS_CHARGE = 0.5
"""Share of the greatest charge current to which regeneration is limited, to see what its peaks cost."""


def explained(
    plan: Plan, outcome: Outcome, *, registry: Registry | None = None, progress: Progress | None = None
) -> Outcome:
    """Return the outcome with what further runs tell: changes, resolution, the aged pack, a loss of coolant."""
    changes = []
    for words, variant in (*_variants(plan), *_gentler(plan, outcome)):
        try:
            other = run(variant, registry=registry, progress=progress)
        except NoEquilibriumError:
            changes.append(Change(words, False, "no thermal equilibrium", None, None, None))
            continue
        except InputError as error:
            changes.append(Change(words, False, f"cannot operate: {error}", None, None, None))
            continue
        changes.append(_change(words, outcome, other))
    coarser = tuple(_coarser(plan, outcome, merged, registry, progress) for merged in MERGED)
    return dataclasses.replace(
        outcome,
        changes=tuple(changes),
        coarser=tuple(c for c in coarser if c is not None),
        coolant_loss=coolant_loss(plan, outcome, registry),
        packs=both_packs(plan, outcome, registry=registry, progress=progress),
    )


def _coarser(
    plan: Plan, outcome: Outcome, merged: int, registry: Registry | None, progress: Progress | None
) -> Coarser | None:
    """Run the profile with neighbouring steps merged; None where it is too short to merge or finds no answer."""
    if all(len(mission.steps) < merged for mission in outcome.missions):
        return None
    try:
        other = run(plan, registry=registry, progress=progress, merged_steps=merged)
    except (NoEquilibriumError, InputError):
        return None
    before, after = _mean_square(outcome), _mean_square(other)
    hot, less_hot = _hottest_junction(outcome), _hottest_junction(other)
    moved = None if hot is None or less_hot is None else less_hot - hot
    damage = _damage_ratio(outcome, other)
    change = None if damage is None else damage - 1.0
    return Coarser(merged, 0.0 if before == 0.0 else after / before - 1.0, moved, change)


def _damage_ratio(outcome: Outcome, other: Outcome) -> float | None:
    """Return the damage in another run of the part that temperature wears most here, over its damage here [-]."""
    worst = outcome.wear.worst_heated
    if worst is None or worst.damage_per_year <= 0.0:
        return None
    twins = [
        p for p in other.wear.parts if (p.part, p.model, p.mechanism) == (worst.part, worst.model, worst.mechanism)
    ]
    return twins[0].damage_per_year / worst.damage_per_year if twins else None


def _mean_square(outcome: Outcome) -> float:
    """Return the mean square of the battery current over all missions, weighted by passes a year [A²]."""
    total = seconds = 0.0
    for mission in outcome.missions:
        duration = mission.steps["duration_s"].to_numpy() * mission.passes_per_year
        total += float((mission.steps["battery_current_a"].to_numpy() ** 2 * duration).sum())
        seconds += float(duration.sum())
    return total / seconds


def _hottest_junction(outcome: Outcome) -> float | None:
    switches = {part.name for part in outcome.parts if part.kind == "switch"}
    return max((t.greatest_degc for t in outcome.thermal if t.part in switches), default=None)


def _variants(plan: Plan) -> Iterator[tuple[str, Plan]]:
    """Yield (words, changed plan) for every change worth asking about."""
    if any(mission.coolant is not None for mission in plan.mission):
        yield f"coolant {WARMER_K:g} K warmer", with_warmer_coolant(plan, WARMER_K)
    frequency = stage_number(plan, "switching_frequency", "frequency")
    if frequency is not None:
        yield "switching frequency 25 % higher", with_stage(plan, switching_frequency=1.25 * frequency)
        yield "switching frequency 25 % lower", with_stage(plan, switching_frequency=0.75 * frequency)
    inductance = inductance_of(plan)
    if inductance is not None:
        yield "inductance 30 % lower (saturation, tolerance)", with_inductance(plan, 0.7 * inductance)
    chips = plan.stage.parts.get("switch", {}).get("in_parallel", 1)
    if "switch" in plan.stage.parts and isinstance(chips, int):
        yield f"{chips + 1} chips in parallel instead of {chips}", with_part(plan, "switch", in_parallel=chips + 1)


def _gentler(plan: Plan, outcome: Outcome) -> Iterator[tuple[str, Plan]]:
    """Yield what may spare the parts, where their life is asked about: colder coolant, less regeneration."""
    if outcome.wear.worst_heated is None:
        return
    if any(mission.coolant is not None for mission in plan.mission):
        yield f"coolant {WARMER_K:g} K cooler", with_warmer_coolant(plan, -WARMER_K)
    charge = max(mission.battery.greatest_charge_a for mission in outcome.missions)
    if charge > 0.0:
        less = LESS_CHARGE * charge
        yield f"regeneration limited to {less:.0f} A, half of what it reached", with_charge_limit(plan, less)


def _change(words: str, outcome: Outcome, other: Outcome) -> Change:
    binding = "" if other.binding is None else f"{other.binding.name} of {other.binding.part.replace('_', ' ')}"
    used = None if other.binding is None else other.binding.used
    damage = _damage_ratio(outcome, other)
    return Change(words, other.holds, binding, used, _hottest_junction(other), other.efficiency, damage)
