"""Which life model reads which part of a stage: the tables [life.<part>] of a plan, bound and validated."""

from __future__ import annotations

from functools import partial
from typing import NamedTuple

import numpy as np

from tideleg.contract import Slot
from tideleg.plan import Plan, WornTable, read_table
from tideleg.registry import call_plugin
from tideleg.stage import Stage
from tideleg.stress import LifeModel, LifeTerm


class Worn(NamedTuple):
    """One life model bound to one sort of part: its name, how many the stage has, whose model, its term."""

    part: str
    kind: str
    copies: int
    model: LifeModel
    term: LifeTerm


def bind_life(plan: Plan, stage: Stage) -> tuple[Worn, ...]:
    """Return the life models of a plan, bound to the parts of its stage.

    Raises
    ------
    PlanError
        If a table names no part of the stage, a part of another kind, one without temperature, or its keys do not
        hold; file, line and key are named.
    PluginError
        If no life model of that name is installed.
    """
    tables = () if plan.life is None else plan.life.parts
    return tuple(worn for table in tables for worn in _bound(plan, stage, table))


def _bound(plan: Plan, stage: Stage, table: WornTable) -> list[Worn]:
    model = stage.registry.life(table.model)
    settings = read_table(plan, table.key, table.settings, {"life": model.settings})["life"]
    term = call_plugin(stage.registry, model, partial(model.term, settings))
    if model.reads == "stage":
        return [Worn(table.part, "stage", 1, model, term)]
    slots = [part for part in stage.parts if part.slot.table == table.part]
    if not slots:
        known = ", ".join(dict.fromkeys(p.slot.table for p in stage.parts if p.slot.kind not in ("busbar", "control")))
        raise plan.fault(table.key, f"found a life of {table.part!r}, which the stage does not have; it has {known}")
    _refuse_unfit(plan, stage, table, model, [part.slot for part in slots])
    return [Worn(part.slot.name, part.slot.kind, int(np.max(part.total)), model, term) for part in slots]


def _refuse_unfit(plan: Plan, stage: Stage, table: WornTable, model: LifeModel, slots: list[Slot]) -> None:
    for slot in slots:
        if slot.kind != model.reads:
            what = f"life model {table.model!r} is for a {model.reads}, and {table.part} is a {slot.kind}"
            raise plan.fault(f"{table.key}.model", f"{what}; choose another model")
        if slot.name not in stage.seated:
            what = f"the life of {table.part} needs its temperature, and it has no thermal path"
            raise plan.fault(table.key, f"{what}; give its thermal keys in [stage.{slot.table}], or drop this table")


def without_life(stage: Stage, worn: tuple[Worn, ...]) -> tuple[str, ...]:
    """Return one sentence for each sort of part that has no life model."""
    kinds = ("switch", "inductor", "capacitor")
    tables = {part.slot.table: part.slot.name for part in stage.parts if part.slot.kind in kinds}
    known = {one.part for one in worn}
    return tuple(
        f"life of {table.replace('_', ' ')}: no [life.{table}] given"
        for table, name in tables.items()
        if name not in known
    )
