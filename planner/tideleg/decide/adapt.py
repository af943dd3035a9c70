"""Putting another topology into a plan: what it does not take goes, what it needs comes, and all of it is said.

So that the comparison is fair, the chips of the plan are kept as a budget: they are spread over the positions of the
other topology, as evenly as whole chips allow.
"""

from __future__ import annotations

from collections.abc import Mapping
from functools import partial

import numpy as np
from pydantic import ValidationError

from tideleg.contract import Need, Slot, Starter, Topology
from tideleg.decide.changes import (
    stage_number,
    with_inductance,
    with_part,
    with_stage,
    with_topology,
    without_stage_key,
)
from tideleg.demand import profile_of
from tideleg.errors import InputError
from tideleg.plan import Plan, format_quantity
from tideleg.registry import Registry, call_plugin
from tideleg.stage import build_stage

USUAL_FREQUENCY = 40e3
"""Where a plan gives no switching frequency, values to start from are proposed for this one [Hz]."""


def adapted(plan: Plan, name: str, registry: Registry) -> tuple[Plan, tuple[str, ...]]:
    """Return the plan with another topology, and one sentence for each thing that had to change.

    Raises
    ------
    InputError
        If no such topology is installed, or the plan lacks what it needs.
    """
    before, topology = registry.topology(plan.stage.topology), registry.topology(name)
    if topology is before:
        return plan, ()
    stage = build_stage(plan, registry)  # a fault of the plan itself is told as such, with its line
    chips = sum(int(part.total) for part in stage.parts if part.slot.kind == "switch")
    tables = _tables(plan, before, registry)
    other, notes = with_topology(plan, name), []
    for key in [key for key in other.stage.settings if key not in topology.settings.model_fields]:
        notes.append(f"{key} = {other.stage.settings[key]} left out: {name} does not take it")
        other = without_stage_key(other, key)
    proposed = topology.starting_values(need_of(plan)) if isinstance(topology, Starter) else {}
    other, told = _with_proposed(other, proposed, name)
    notes += told
    other, told = _without_refused(other, topology, name)
    notes += told
    other, told = _with_tables(other, tables, _tables(other, topology, registry), name)
    notes += told
    other, told = _with_lives(other, tables, _tables(other, topology, registry))
    notes += told
    other, told = _with_chips(other, topology, chips, registry)
    return other, (*notes, *told)


def need_of(plan: Plan) -> Need:
    """Return what the plan's missions need of a stage."""
    powers = [np.abs(profile_of(plan, mission).power_w).max() for mission in plan.mission]
    return Need(
        battery_voltage=min(plan.battery.open_circuit_voltage.value),
        link_voltage=plan.link.voltage,
        power=float(max(powers)),
        switching_frequency=stage_number(plan, "switching_frequency", "frequency") or USUAL_FREQUENCY,
    )


def _with_proposed(plan: Plan, proposed: Mapping[str, float | str], name: str) -> tuple[Plan, list[str]]:
    """Return the plan with the values that the topology proposes; keys under [stage] that the plan gives stay."""
    notes = []
    for dotted, value in proposed.items():
        table, _, key = dotted.rpartition(".")
        if not table and dotted in plan.stage.settings:
            continue
        before = plan.stage.parts.get(table, {}).get(key) if table else None
        instead = "" if before is None else f" instead of {before}"
        notes.append(f"{dotted} = {_text(key, value)}{instead}: proposed by {name}")
        if dotted == "inductor.inductance":
            plan = with_inductance(plan, value)
        else:
            plan = with_part(plan, table, **{key: value}) if table else with_stage(plan, **{key: value})
    return plan, notes


def _text(key: str, value: float | str) -> str:
    """Return a proposed value to four digits, with its unit where the key is that of a part's main quantity."""
    if isinstance(value, str):
        return value
    return format_quantity(float(f"{value:.4g}"), key) if key in ("inductance", "capacitance") else f"{value:.4g}"


def _without_refused(plan: Plan, topology: Topology, name: str) -> tuple[Plan, list[str]]:
    """Return the plan without keys whose value the topology refuses: its own default holds instead.

    Raises
    ------
    InputError
        If a key that has no default is refused or missing.
    """
    notes: list[str] = []
    for _ in range(len(plan.stage.settings) + 1):
        try:
            topology.settings.model_validate(plan.stage.settings)
        except ValidationError as error:
            fault = error.errors()[0]
            key = str(fault["loc"][0]) if fault["loc"] else ""
            field = topology.settings.model_fields.get(key)
            if key not in plan.stage.settings or field is None or field.is_required():
                raise InputError(
                    f"topology {name!r} cannot take this plan's [stage]: {key or 'its keys'}: {fault['msg']};"
                    " compare a plan of its own instead"
                ) from error
            notes.append(f"{key} = {field.default} instead of {plan.stage.settings[key]}: {name} takes no other")
            plan = without_stage_key(plan, key)
            continue
        break
    return plan, notes


def _with_lives(plan: Plan, before: Mapping[str, Slot], after: Mapping[str, Slot]) -> tuple[Plan, list[str]]:
    """Return the plan with the lives of parts that the new topology has; what wears beside the stage stays.

    A switch table that is gone leaves its life to the switch tables that took its data.
    """
    if plan.life is None:
        return plan, []
    heirs = [table for table, slot in after.items() if slot.kind == "switch" and table not in before]
    kept, notes = [], []
    for worn in plan.life.parts:
        if worn.part in after or worn.part not in before:
            kept.append(worn)
        elif before[worn.part].kind == "switch" and heirs:
            kept += [worn.model_copy(update={"part": table}) for table in heirs]
            notes.append(f"the life of {worn.part} is asked of {', '.join(heirs)}")
        else:
            notes.append(f"the life of {worn.part} is not asked: there is no such part")
    return plan.model_copy(update={"life": plan.life.model_copy(update={"parts": tuple(kept)})}), notes


def _with_chips(plan: Plan, topology: Topology, chips: int, registry: Registry) -> tuple[Plan, list[str]]:
    """Return the plan with so many chips in all, or as near as whole chips in every position come."""
    slots = [slot for slot in _slots(plan, topology, registry) if slot.kind == "switch"]
    positions = sum(slot.copies for slot in slots)
    each = max(1, round(chips / positions))
    before = {slot.table: plan.stage.parts.get(slot.table, {}).get("in_parallel", 1) for slot in slots}
    if all(number == each for number in before.values()):
        return plan, []
    for table in before:
        plan = with_part(plan, table, in_parallel=each)
    told = f"{chips} chips" if each * positions == chips else f"{each * positions} chips, the nearest to {chips}"
    return plan, [f"in_parallel = {each} in each of {positions} positions: {told}"]


def _slots(plan: Plan, topology: Topology, registry: Registry) -> tuple[Slot, ...]:
    """Return the slots of a topology with the plan's settings."""
    settings = call_plugin(registry, topology, partial(topology.settings.model_validate, dict(plan.stage.settings)))
    return call_plugin(registry, topology, partial(topology.slots, settings))


def _tables(plan: Plan, topology: Topology, registry: Registry) -> dict[str, Slot]:
    """Return the first slot of each part table of a topology, with the plan's settings."""
    found: dict[str, Slot] = {}
    for slot in _slots(plan, topology, registry):
        found.setdefault(slot.table, slot)
    return found


def _with_tables(
    plan: Plan, before: Mapping[str, Slot], after: Mapping[str, Slot], name: str
) -> tuple[Plan, list[str]]:
    """Return the plan with the part tables of the new topology.

    A switch table that the plan lacks takes the data of a switch that it has: the same chips, placed elsewhere. Other
    parts that it lacks have other duties, and no data is made up for them: they stand as not modelled.
    """
    notes, parts = [], dict(plan.stage.parts)
    for table, slot in after.items():
        if table in parts or table in before:
            continue
        donors = [other for other in before if before[other].kind == "switch" and other in plan.stage.parts]
        if slot.kind == "switch" and donors:
            parts[table] = plan.stage.parts[donors[0]]
            notes.append(f"{table} takes the data of {donors[0]}")
        else:
            notes.append(f"no data for {table}, a part that the plan's own topology lacks: its losses are not modelled")
    for table in [t for t in parts if t in before and t not in after]:
        del parts[table]
        notes.append(f"data of {table} left out: {name} has no such part")
    stage = plan.stage.model_copy(update={"parts": parts})
    return plan.model_copy(update={"stage": stage}), notes
