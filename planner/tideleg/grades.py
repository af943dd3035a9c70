"""What the numbers of parts are worth, and how much of the loss rests on each: which guesses matter."""

from __future__ import annotations

import dataclasses
from collections.abc import Iterable, Iterator, Mapping
from functools import partial
from typing import Any, NamedTuple

import numpy as np
from pydantic import ValidationError

from tideleg.contract import LossTerm
from tideleg.march import Demand, Settled
from tideleg.outcome import GradeEntry
from tideleg.plan import Plan
from tideleg.registry import call_plugin
from tideleg.stage import BoundTerm, Stage, StagePart


class Marched(NamedTuple):
    """One mission as it was marched: passes a year, what was asked, and the settled blocks."""

    passes_per_year: float
    demand: Demand
    blocks: list[Settled]


class Touched(NamedTuple):
    """A term that comes out otherwise without one number: the term then, or None where there is none."""

    part: StagePart
    bound: BoundTerm
    without: LossTerm[Any] | None


def grade_entries(plan: Plan, stage: Stage, missions: Iterable[Marched]) -> tuple[GradeEntry, ...]:
    """Return every graded number of a part with what rests on it, the greatest share of loss first.

    A number touches a term if the term comes out otherwise, or not at all, without it. The share of the loss is what
    the energy of these terms moves by then, at the currents and temperatures of the run.
    """
    marched = list(missions)
    whole = sum(m.passes_per_year * _energy(m, [block.losses.total for block in m.blocks]) for m in marched)
    entries = []
    for key, grade in plan.stage.grades.items():
        table, _, name = key.removeprefix("stage.").rpartition(".")
        parts = [part for part in stage.parts if part.slot.table == table]
        touched = [one for part in parts for one in _touched(plan, stage, part, name)]
        moved = sum(m.passes_per_year * _moved(stage, m, one) for m in marched for one in touched)
        words = tuple(f"{one.bound.term.mechanism} of {_words(one.part)}" for one in touched)
        share = moved / whole if touched and whole > 0.0 else None
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


def _words(part: StagePart) -> str:
    return part.slot.name.replace("_", " ")


def _energy(mission: Marched, watts: Iterable[Any]) -> float:
    """Return the energy of one pass from the power of each block [J]."""
    begin, total = 0, 0.0
    for block in watts:
        seconds = mission.demand.duration[begin : begin + block.shape[-1]]
        begin += block.shape[-1]
        total += float(np.sum(block[0] * seconds))
    return total


def _moved(stage: Stage, mission: Marched, one: Touched) -> float:
    """Return how much energy of one pass moves in a term when a number is left out [J]."""
    return _energy(mission, (np.abs(watts) for watts in _differences(stage, mission, one)))


def _differences(stage: Stage, mission: Marched, one: Touched) -> Iterator[Any]:
    """Yield the power of a term less that of the term without a number, for each block, all equal parts together."""
    name, begin = one.part.slot.name, 0
    for block in mission.blocks:
        shape = block.losses.total.shape
        now = block.losses.by_term[name, one.bound.term.mechanism]
        held = mission.demand.held[begin : begin + shape[-1]]
        begin += shape[-1]
        if one.without is None:
            yield now
            continue
        reading = stage.reading(one.part, block.checked.operation, block.point)
        degc = stage.by_name(block.mean, held, shape)[name]
        ask = partial(one.without.at, reading, block.checked.operation.timing, degc)
        yield now - call_plugin(stage.registry, one.bound.model, ask).watts * one.part.total


def _touched(plan: Plan, stage: Stage, part: StagePart, name: str) -> Iterator[Touched]:
    """Yield the terms of a part that come out otherwise without one key."""
    given = plan.stage.keys_of(part.slot.table)
    for model in {bound.model.name: bound.model for bound in part.terms}.values():
        if name not in model.settings.model_fields:
            continue
        rest = {key: value for key, value in given.items() if key in model.settings.model_fields and key != name}
        without: dict[str, LossTerm[Any]] = {}
        try:
            settings = model.settings.model_validate(rest)
        except ValidationError:
            pass  # the model cannot do without this key: all its terms rest on it
        else:
            offered = call_plugin(stage.registry, model, partial(model.terms, settings))
            without = {term.mechanism: term for term in offered}
        for bound in part.terms:
            twin = without.get(bound.term.mechanism)
            if bound.model is model and not _alike(bound.term, twin):
                yield Touched(part, bound, twin)


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
