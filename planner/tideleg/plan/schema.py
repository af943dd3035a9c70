"""One JSON Schema of the plan with everything that is installed, so that an editor completes and checks."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from pydantic import BaseModel

from tideleg.contract import CoolingModel, LossModel, Need, PartKind, Starter, Topology, read_as
from tideleg.plan.parts import GRADES
from tideleg.plan.tables import CapacitorBase, DiodeBase, InductorBase, Plan, SwitchBase, TransformerBase
from tideleg.source import ProfileSource
from tideleg.stress import LifeModel

_BASES: dict[PartKind, list[type[BaseModel]]] = {
    "switch": [SwitchBase],
    "diode": [DiodeBase],
    "inductor": [InductorBase],
    "transformer": [TransformerBase],
    "capacitor": [CapacitorBase],
    "busbar": [],
    "control": [],
}

_CURVE = {
    "description": "a constant with unit, pairs [[state of charge, value], ...], triples with a temperature, or a CSV"
    " file name",
    "anyOf": [{"type": "number"}, {"type": "string"}, {"type": "array", "items": {"type": "array", "minItems": 2}}],
}


def plan_schema(
    topologies: Sequence[Topology],
    loss_models: Sequence[LossModel],
    cooling_models: Sequence[CoolingModel],
    life_models: Sequence[LifeModel] = (),
    profile_sources: Sequence[ProfileSource] = (),
) -> dict[str, Any]:
    """Return the JSON Schema (draft 2020-12) of a plan, with the keys of every plugin in its place."""
    schema = Plan.model_json_schema()
    definitions = schema["$defs"]
    for key in ("open_circuit_voltage", "resistance", "resistance_charge"):
        definitions["BatteryTable"]["properties"][key] = _CURVE
    definitions.pop("Curve", None)
    definitions["StageTable"] = _stage(topologies, loss_models, cooling_models)
    definitions["CoolingTable"] = _cooling(cooling_models)
    definitions["LifeTable"] = _life(definitions["LifeTable"], life_models)
    definitions.pop("WornTable", None)
    _sources(definitions["MissionTable"], profile_sources)
    return {"$schema": "https://json-schema.org/draft/2020-12/schema", **schema}


def part_schema(
    kind: PartKind, loss_models: Sequence[LossModel], cooling_models: Sequence[CoolingModel]
) -> dict[str, Any]:
    """Return the JSON Schema (draft 2020-12) of a part file: the keys of one kind of part, without a further file."""
    schema = _part(kind, loss_models, cooling_models)
    schema["properties"].pop("part")
    return {"$schema": "https://json-schema.org/draft/2020-12/schema", "title": f"part file: {kind}", **schema}


def _stage(
    topologies: Sequence[Topology], loss_models: Sequence[LossModel], cooling_models: Sequence[CoolingModel]
) -> dict[str, Any]:
    keys: dict[str, Any] = {"topology": {"enum": [t.name for t in topologies]}}
    kinds: dict[str, PartKind] = {"busbar": "busbar", "control": "control"}
    for topology in topologies:
        for name, one in _properties(topology.settings).items():
            keys[name] = _either(keys.get(name), one)
        kinds |= {slot.table: slot.kind for slot in _slots(topology)}
    for table, kind in sorted(kinds.items()):
        keys[table] = _part(kind, loss_models, cooling_models)
    return {"type": "object", "properties": keys, "required": ["topology"], "additionalProperties": False}


def _either(known: Any, another: Any) -> Any:
    """Return what satisfies one of two descriptions: topologies may read one key in different ranges."""
    if known is None or known == another:
        return another
    choices = known["anyOf"] if set(known) == {"anyOf"} else [known]
    return known if another in choices else {"anyOf": [*choices, another]}


def _slots(topology: Topology) -> Sequence[Any]:
    """Return a topology's slots for settings built from its defaults; names of tables do not depend on numbers."""
    fields = topology.settings.model_fields
    given: dict[str, Any] = {name: 1 for name, field in fields.items() if field.is_required()}
    if isinstance(topology, Starter):
        own = topology.starting_values(Need(300.0, 800.0, 50e3, 40e3))  # any stage serves: names of tables are wanted
        given |= {key: value for key, value in own.items() if key in fields}
    return topology.slots(topology.settings.model_validate(given))


def _part(kind: PartKind, loss_models: Sequence[LossModel], cooling_models: Sequence[CoolingModel]) -> dict[str, Any]:
    models = [*_BASES[kind], *(m.settings for m in loss_models if m.reads == read_as(kind))]
    models += [m.part_settings[read_as(kind)] for m in cooling_models if read_as(kind) in m.part_settings]
    keys: dict[str, Any] = {
        "part": {"type": "string", "description": "file (TOML) whose keys are merged in, or generic:NAME"},
        "grades": {
            "type": "object",
            "description": "what the number of a key is worth; * stands for all keys of this table",
            "additionalProperties": {"enum": list(GRADES)},
        },
        "placeholder": {"type": "boolean", "description": "whether the part is invented; page one says so"},
    }
    for model in models:
        keys |= _properties(model)
    if kind == "switch":
        keys["diode"] = _part("diode", loss_models, cooling_models)
        keys["diode"]["description"] = "a diode on a die of its own, which carries all reverse current"
    return {"type": "object", "properties": keys, "additionalProperties": False}


def _cooling(cooling_models: Sequence[CoolingModel]) -> dict[str, Any]:
    keys: dict[str, Any] = {"model": {"enum": [m.name for m in cooling_models], "default": "plate"}}
    for model in cooling_models:
        keys |= _properties(model.settings)
    return {"type": "object", "properties": keys, "additionalProperties": False}


def _life(own: dict[str, Any], life_models: Sequence[LifeModel]) -> dict[str, Any]:
    """Return [life] with a table, or several, for each part that wears."""
    properties = {name: value for name, value in own["properties"].items() if name != "parts"}
    tables = []
    for model in life_models:
        schema = model.settings.model_json_schema()
        keys = {"model": {"const": model.name}, **_properties(model.settings)}
        required = ["model", *schema.get("required", [])]
        tables.append({"type": "object", "properties": keys, "required": required, "additionalProperties": False})
    one: dict[str, Any] = {"anyOf": tables} if tables else {"type": "object"}
    several = {"anyOf": [one, {"type": "array", "items": one, "minItems": 1}]}
    return {"type": "object", "properties": properties, "additionalProperties": several}


def _sources(mission: dict[str, Any], sources: Sequence[ProfileSource]) -> None:
    """Put into [[mission]] which sources there are, and the keys of each beside its name."""
    mission["oneOf"] = [{"required": ["profile"]}, {"required": ["source"]}]
    if not sources:
        return
    mission["properties"]["source"] = {"enum": [source.name for source in sources]}
    mission["properties"]["source_settings"] = {"type": "object"}
    mission["allOf"] = [
        {
            "if": {"properties": {"source": {"const": one.name}}, "required": ["source"]},
            "then": {"properties": {"source_settings": _settings(one.settings)}},
        }
        for one in sources
    ]


def _settings(model: type[BaseModel]) -> dict[str, Any]:
    required = model.model_json_schema().get("required", [])
    return {
        "type": "object",
        "properties": _properties(model),
        "required": required,
        "additionalProperties": False,
    }


def _properties(model: type[BaseModel]) -> dict[str, Any]:
    """Return the properties of a plugin's model, its own definitions written in place."""
    schema = model.model_json_schema()
    return {name: _inlined(value, schema.get("$defs", {})) for name, value in schema.get("properties", {}).items()}


def _inlined(value: Any, definitions: dict[str, Any]) -> Any:
    if isinstance(value, dict):
        if "$ref" in value:
            return _inlined(definitions[value["$ref"].rpartition("/")[2]], definitions)
        return {key: _inlined(inner, definitions) for key, inner in value.items()}
    return [_inlined(inner, definitions) for inner in value] if isinstance(value, list) else value
