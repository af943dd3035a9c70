"""Every check of an installed plugin, with the data of a plan: what `tideleg plugins check` runs."""

from __future__ import annotations

import tomllib
from collections.abc import Iterator, Mapping
from typing import Any

from pydantic import BaseModel, ValidationError

from tideleg.conformance.checks import Check
from tideleg.conformance.cooling import cooling_checks
from tideleg.conformance.life import life_checks
from tideleg.conformance.losses import loss_checks
from tideleg.conformance.profiles import profile_checks
from tideleg.conformance.topologies import topology_checks
from tideleg.contract import CoolingModel, LossModel, Need, PartKind, Starter, Topology
from tideleg.errors import InputError
from tideleg.plan import Plan, load_plan, plan_from_mapping
from tideleg.plan.generic import GENERIC
from tideleg.quantity import parse
from tideleg.registry import Plugin, Registry
from tideleg.scenario import scenarios_folder
from tideleg.source import ProfileSource
from tideleg.stress import LifeModel

GREATEST_CURRENT = 300.0
"""Battery current either way up to which a topology is asked [A]."""

TABLES: dict[PartKind, tuple[str, ...]] = {
    "switch": ("switch",),
    "diode": ("switch.diode",),
    "inductor": ("inductor",),
    "transformer": ("transformer",),
    "capacitor": ("link_capacitor", "battery_capacitor"),
    "busbar": ("busbar",),
    "control": ("control",),
}


def plugin_checks(name: str, plan: Plan, registry: Registry) -> tuple[Check, ...]:
    """Return the checks of every plugin of that name.

    Raises
    ------
    InputError
        If none of that name is installed.
    """
    found = [plugin for plugin in registry.plugins if plugin.name == name]
    if not found:
        names = ", ".join(sorted({plugin.name for plugin in registry.plugins}))
        broken = "".join(f"\n  {fault.sentence()}" for fault in registry.faults if fault.name == name)
        raise InputError(f"no plugin named {name!r} can be checked; installed are {names}{broken}")
    return tuple(check for plugin in found for check in _checks(plugin, plan))


def _checks(plugin: Plugin, plan: Plan) -> Iterator[Check]:
    offer: Any = plugin.offer
    if plugin.kind == "topology":
        yield from _topology(offer, plan)
    elif plugin.kind == "loss":
        yield from _loss(offer, plan)
    elif plugin.kind == "life":
        yield from _life(offer, plan)
    elif plugin.kind == "cooling":
        yield from _cooling(offer, plan)
    else:
        yield from _profile(offer, plan)


def _topology(topology: Topology, plan: Plan) -> Iterator[Check]:
    voltages = plan.battery.open_circuit_voltage.value
    link = plan.link.voltage
    frequency = parse(plan.stage.settings.get("switching_frequency", 40e3), "frequency")
    start = _starting_values(topology, Need(min(voltages), link, GREATEST_CURRENT * max(voltages), frequency))
    settings: dict[str, Any] = {key: value for key, value in start.items() if key in topology.settings.model_fields}
    settings |= _own(plan.stage.settings, topology.settings)
    if "legs" in topology.settings.model_fields:
        settings["legs"] = _legs(topology, settings)
    inductance = start.get("inductor.inductance", plan.stage.parts.get("inductor", {}).get("inductance", 150e-6))
    yield from topology_checks(
        topology,
        settings,
        inductance=parse(inductance, "inductance"),
        battery=(min(voltages), max(voltages)),
        link=(0.9 * link, 1.1 * link),
        current=GREATEST_CURRENT,
    )


def _starting_values(topology: Topology, need: Need) -> Mapping[str, float | str]:
    return topology.starting_values(need) if isinstance(topology, Starter) else {}


def _legs(topology: Topology, settings: Mapping[str, object]) -> int:
    """Return as many legs as the plan has, or those that the topology has by default, or one."""
    default = topology.settings.model_fields["legs"].default
    for wanted in (settings.get("legs", 2), default):
        try:
            topology.settings.model_validate({**settings, "legs": wanted})
        except ValidationError:
            continue
        return int(str(wanted))
    return 1


def _loss(model: LossModel, plan: Plan) -> Iterator[Check]:
    yield from loss_checks(model, _loss_settings(model, plan))


def _loss_settings(model: LossModel, plan: Plan) -> dict[str, object]:
    settings: dict[str, object] = {}
    for table in TABLES[model.reads]:
        settings = settings or _own(plan.stage.keys_of(table), model.settings)
    return settings


def shipped_plan(name: str, registry: Registry) -> Plan:
    """Return a shipped plan with data for the plugin of that name: with MOSFETs, or with IGBTs and their diodes."""
    file = scenarios_folder() / "kerbside" / "plan.toml"
    plan = load_plan(file)
    models = [p.offer for p in registry.plugins if p.name == name and p.kind == "loss"]
    if all(m.terms(m.settings.model_validate(_loss_settings(m, plan))) for m in models):
        return plan
    data = tomllib.loads(file.read_text(encoding="utf-8"))
    data["stage"]["switch"] = {"part": f"{GENERIC}igbt-1700v"}
    return plan_from_mapping(data, folder=file.parent)


def _life(model: LifeModel, plan: Plan) -> Iterator[Check]:
    tables = () if plan.life is None else plan.life.parts
    given = [table.settings for table in tables if table.model == model.name]
    if not given:
        raise InputError(
            f"no [life.<part>] of the plan has model = {model.name!r}, so there are no data to check it with; give"
            " --plan a plan that has"
        )
    for settings in given:
        yield from life_checks(model, settings)


def _cooling(model: CoolingModel, plan: Plan) -> Iterator[Check]:
    own = _own(plan.cooling.settings if plan.cooling else {}, model.settings)
    parts: dict[PartKind, Mapping[str, object]] = {}
    for kind, keys in model.part_settings.items():
        for table in TABLES[kind]:
            parts[kind] = parts.get(kind) or _own(plan.stage.keys_of(table), keys)
    yield from cooling_checks(model, own, parts)


def _profile(source: ProfileSource, plan: Plan) -> Iterator[Check]:
    """Take the keys of the first mission that names the source, or the source's own example."""
    named = [mission.source_settings for mission in plan.mission if mission.source == source.name]
    yield from profile_checks(source, (named[0], plan.folder) if named else None)


def _own(given: Mapping[str, Any], model: type[BaseModel]) -> dict[str, object]:
    return {key: value for key, value in given.items() if key in model.model_fields}
