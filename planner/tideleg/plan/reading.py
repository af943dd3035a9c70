"""Reading a plan: TOML text to validated tables, with every fault named by file, line and key."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

from pydantic import BaseModel, ValidationError

from tideleg.errors import PlanError
from tideleg.plan import tables
from tideleg.plan.curve import Curve
from tideleg.plan.curves import COLUMNS, read_curve
from tideleg.plan.faults import dotted, errors_of, unknown_key, words
from tideleg.plan.lines import line_of
from tideleg.plan.parts import part_tables
from tideleg.plan.source import Source, read_toml
from tideleg.plan.tables import Plan
from tideleg.quantity import parse


def load_plan(path: str | Path) -> Plan:
    """Read a plan file.

    Raises
    ------
    PlanError
        If the file is missing, is no TOML, or holds anything that cannot be used: file, line and key are named.
    """
    file = Path(path)
    data, text = read_toml(file)
    return _plan(data, Source(file, text, file.parent))


def plan_from_mapping(data: Mapping[str, Any], *, folder: str | Path = ".") -> Plan:
    """Return a plan from the mapping that its TOML file would hold; relative file names start at `folder`."""
    return _plan(dict(data), Source(None, "", Path(folder)))


def _plan(data: dict[str, Any], source: Source) -> Plan:
    files: list[Path] = []
    shaped = {key: dict(value) if isinstance(value, dict) else value for key, value in data.items()}
    for name in ("battery", "stage", "link"):
        if not isinstance(shaped.get(name), dict):
            raise source.fault(name, f"the table [{name}] is missing; give it")
    shaped["battery"] = _battery(shaped["battery"], source, files)
    shaped["stage"] = _stage(shaped["stage"], source, files)
    if isinstance(shaped.get("cooling"), dict):
        cooling = shaped["cooling"]
        own = {key: value for key, value in cooling.items() if key != "model"}
        shaped["cooling"] = {"model": cooling.get("model", "plate"), "settings": own}
    if isinstance(shaped.get("life"), dict):
        shaped["life"] = _life(shaped["life"], source)
    try:
        plan = Plan.model_validate(shaped)
    except ValidationError as error:
        raise _faults(error, source) from None
    for i, mission in enumerate(plan.mission):
        if mission.profile is not None and not (source.folder / mission.profile).is_file():
            raise source.fault(f"mission.{i}.profile", f"found {mission.profile!r}, which is no file; check the name")
    plan._file, plan._folder, plan._text, plan._extra_files = source.file, source.folder, source.text, tuple(files)
    return plan


def _faults(error: ValidationError, source: Source) -> PlanError:
    """Return one error for all faults: the first gives file, line and key, the others follow, a line each."""
    found = errors_of(error)
    texts = [words(one, _allowed(one["loc"])) for one in found]
    first = source.fault(dotted(found[0]["loc"]), texts[0])
    others = [str(source.fault(dotted(one["loc"]), text)) for one, text in zip(found[1:], texts[1:], strict=True)]
    if not others:
        return first
    return PlanError("\n".join([first.fault, *others]), file=first.file, key=first.key, line=first.line)


def _allowed(location: tuple[Any, ...]) -> list[str]:
    """Return the keys that the table around an unknown key allows."""
    model: type[BaseModel] = Plan
    for step in location[:-1]:
        if isinstance(step, str) and step in model.model_fields:
            inner = _model_in(model.model_fields[step].annotation)
            if inner is None:
                return []
            model = inner
    return list(model.model_fields)


def _model_in(annotation: Any) -> type[BaseModel] | None:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    for inner in getattr(annotation, "__args__", ()):
        found = _model_in(inner)
        if found is not None:
            return found
    return None


def _battery(data: dict[str, Any], source: Source, files: list[Path]) -> dict[str, Any]:
    """Return [battery] with its curves read, and scaled from cells to the pack where cells are given."""
    out = dict(data)
    if "open_circuit_voltage" not in out:
        raise source.fault("battery.open_circuit_voltage", "this key is missing; give it")
    for key in COLUMNS:
        if key in out:
            try:
                out[key] = read_curve(out[key], key, source.folder, files)
            except ValueError as error:
                raise source.fault(f"battery.{key}", str(error)) from None
    series, parallel = out.get("cells_in_series", 1), out.get("cells_in_parallel", 1)
    if not (isinstance(series, int) and isinstance(parallel, int) and series >= 1 and parallel >= 1):
        raise source.fault("battery.cells_in_series", "cells_in_series and cells_in_parallel are whole numbers from 1")
    scales = {"open_circuit_voltage": series, "resistance": series / parallel, "resistance_charge": series / parallel}
    for key, scale in scales.items():
        if isinstance(out.get(key), Curve):
            out[key] = out[key].scaled(scale)
    if "capacity" in out:
        try:
            out["capacity"] = parse(out["capacity"], "charge") * parallel
        except ValueError as error:
            raise source.fault("battery.capacity", str(error)) from None
    return out


def _stage(data: dict[str, Any], source: Source, files: list[Path]) -> dict[str, Any]:
    """Return [stage] as topology, settings and part tables, with part files merged in under inline keys."""
    settings = {key: value for key, value in data.items() if not isinstance(value, dict) and key != "topology"}
    parts, notes = part_tables(data, source)
    files += notes.files
    shaped: dict[str, Any] = {
        "settings": settings,
        "parts": parts,
        "origins": notes.origins,
        "grades": notes.grades,
        "overridden": notes.overridden,
        "placeholders": tuple(notes.placeholders),
        "part_files": notes.part_files,
    }
    return {"topology": data["topology"], **shaped} if "topology" in data else shaped


def _life(data: dict[str, Any], source: Source) -> dict[str, Any]:
    """Return [life] as its own keys and a list of the life models, part by part; a part may have several."""
    own: dict[str, Any] = {}
    parts: list[dict[str, Any]] = []
    for key, value in data.items():
        given = [value] if isinstance(value, dict) else value
        if not (isinstance(given, list) and given and all(isinstance(one, dict) for one in given)):
            own[key] = value
            continue
        for index, one in enumerate(given):
            dotted_key = f"life.{key}" if isinstance(value, dict) else f"life.{key}.{index}"
            if not isinstance(one.get("model"), str):
                raise source.fault(f"{dotted_key}.model", "this key is missing; give the name of a life model")
            settings = {name: inner for name, inner in one.items() if name != "model"}
            parts.append({"part": key, "key": dotted_key, "model": one["model"], "settings": settings})
    if "parts" in own:
        raise source.fault("life.parts", unknown_key("parts", set(tables.LifeTable.model_fields) - {"parts"}))
    return {**own, "parts": parts}


def read_table(
    plan: Plan, key: str, raw: Mapping[str, Any], models: Mapping[str, type[BaseModel]]
) -> dict[str, BaseModel]:
    """Validate one table that several models share: each gets the keys it declares, and a key of none is refused.

    Parameters
    ----------
    plan : the plan, for file and lines
    key : dotted key of the table, such as "stage.switch"
    raw : the table as written
    models : by any name

    Raises
    ------
    PlanError
        With file, line and key of each fault, also where the key came from a part file.
    """
    allowed = {name for model in models.values() for name in model.model_fields}
    faults = [(name, unknown_key(name, allowed)) for name in raw if name not in allowed]
    found: dict[str, BaseModel] = {}
    for label, model in models.items():
        own = {name: value for name, value in raw.items() if name in model.model_fields}
        try:
            found[label] = model.model_validate(own)
        except ValidationError as error:
            faults += [(dotted(one["loc"]), words(one)) for one in errors_of(error)]
    if faults:
        raise _table_faults(plan, key, dict(faults))
    return found


def _table_faults(plan: Plan, key: str, faults: dict[str, str]) -> PlanError:
    made = []
    for name, what in faults.items():
        whole = f"{key}.{name}" if name else key
        file = plan.stage.origins.get(whole, plan.file)
        if file is not None and file != plan.file:
            line = _line_in_part_file(file, whole)
        else:
            line = line_of(plan.text, whole) if plan.text else None
        made.append(PlanError(what, file=file, key=whole, line=line))
    if len(made) == 1:
        return made[0]
    text = "\n".join([made[0].fault, *(str(one) for one in made[1:])])
    return PlanError(text, file=made[0].file, key=made[0].key, line=made[0].line)


def _line_in_part_file(file: Path, key: str) -> int | None:
    """Return the line of a dotted key of the plan in the part file that it came from, in which it is shorter."""
    text = file.read_text(encoding="utf-8-sig")
    names = key.split(".")
    for begin in range(2, len(names)):
        line = line_of(text, ".".join(names[begin:]))
        if line is not None:
            return line
    return None


__all__ = ["load_plan", "plan_from_mapping", "read_table", "tables"]
