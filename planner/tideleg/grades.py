"""What the numbers of parts are worth, and how much of the loss rests on each: which guesses matter."""

from __future__ import annotations

import dataclasses
from collections.abc import Iterable, Mapping
from functools import partial
from typing import Any

import numpy as np
from pydantic import ValidationError

from tideleg.outcome import GradeEntry, MissionResult
from tideleg.plan import Plan
from tideleg.registry import call_plugin
from tideleg.stage import Stage, StagePart


def grade_entries(plan: Plan, stage: Stage, missions: Iterable[MissionResult]) -> tuple[GradeEntry, ...]:
    """Return every graded number of a part with the loss terms that it touches, the greatest share of loss first.

    A number touches a term if the term comes out otherwise, or not at all, without it.
    """
    joules = _energies(missions)
    whole = sum(joules.values())
    entries = []
    for key, grade in plan.stage.grades.items():
        table, _, name = key.removeprefix("stage.").rpartition(".")
        parts = [part for part in stage.parts if part.slot.table == table]
        touched = [(p.slot.name, mechanism) for p in parts for mechanism in _touched(plan, stage, p, name)]
        lost = sum(joules.get(one, 0.0) for one in touched)
        words = tuple(f"{mechanism} of {part.replace('_', ' ')}" for part, mechanism in touched)
        share = lost / whole if touched and whole > 0.0 else None
        entries.append(GradeEntry(key, grade, words or _besides(plan, stage, parts, name), share))
    return tuple(sorted(entries, key=lambda e: -1.0 if e.loss_share is None else -e.loss_share))


def placeholder_words(plan: Plan) -> tuple[str, ...]:
    """Return one sentence for each part that is invented."""
    sentences = []
    for table in plan.stage.placeholders:
        name = plan.stage.keys_of(table.removeprefix("stage.")).get("name", plan.stage.part_files.get(table, ""))
        named = f" ({name})" if name else ""
        sentences.append(
            f"[{table}] is a PLACEHOLDER{named}: invented numbers of no maker; put those of a real part there"
        )
    return tuple(sentences)


def _energies(missions: Iterable[MissionResult]) -> dict[tuple[str, str], float]:
    """Return the energy of a year by part and mechanism [J]."""
    found: dict[tuple[str, str], float] = {}
    for mission in missions:
        for entry in mission.losses:
            key = (entry.part, entry.mechanism)
            found[key] = found.get(key, 0.0) + mission.passes_per_year * entry.total_j
    return found


def _touched(plan: Plan, stage: Stage, part: StagePart, name: str) -> list[str]:
    """Return the mechanisms of a part that come out otherwise without one key."""
    given = plan.stage.keys_of(part.slot.table)
    found = []
    for model in {bound.model.name: bound.model for bound in part.terms}.values():
        if name not in model.settings.model_fields:
            continue
        own = [bound.term for bound in part.terms if bound.model is model]
        rest = {key: value for key, value in given.items() if key in model.settings.model_fields and key != name}
        try:
            settings = model.settings.model_validate(rest)
        except ValidationError:
            found += [term.mechanism for term in own]
            continue
        without = {term.mechanism: term for term in call_plugin(stage.registry, model, partial(model.terms, settings))}
        found += [term.mechanism for term in own if not _alike(term, without.get(term.mechanism))]
    return found


def _alike(one: Any, other: Any) -> bool:
    """Whether two terms hold the same data."""
    if dataclasses.is_dataclass(one) and type(one) is type(other):
        names = [field.name for field in dataclasses.fields(one)]
        return all(_alike(getattr(one, name), getattr(other, name)) for name in names)
    if isinstance(one, tuple) and isinstance(other, tuple):
        return len(one) == len(other) and all(_alike(a, b) for a, b in zip(one, other, strict=True))
    return one is other or bool(np.array_equal(one, other))


def _besides(plan: Plan, stage: Stage, parts: list[StagePart], name: str) -> tuple[str, ...]:
    """Return what a number touches that no loss term reads: temperatures, or the waveforms and limits."""
    if plan.cooling is None or not parts:
        return ()
    models: Mapping[Any, Any] = stage.registry.cooling(plan.cooling.model).part_settings
    kind = parts[0].slot.kind
    if kind in models and name in models[kind].model_fields:
        return tuple(f"temperature of {part.slot.name.replace('_', ' ')}" for part in parts)
    return ()
