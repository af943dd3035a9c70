"""What stands on the page about the stage and the inputs: as the person wrote it, not as numbers read back."""

from __future__ import annotations

import hashlib
import platform
from collections.abc import Iterable, Mapping
from importlib import metadata
from pathlib import Path

from tideleg.mission import Profile, SourcedProfile
from tideleg.outcome import Inputs, PartEntry
from tideleg.plan import Plan
from tideleg.stage import Stage

LIBRARIES = ("numpy", "pandas", "pydantic", "pluggy")
"""Packages whose version can change a number."""

MOST_SHOWN = 6
"""A list of a part table that is longer stands on the page as the number of its rows."""


def stage_facts(plan: Plan, stage: Stage) -> Mapping[str, str]:
    """Return the stage at a glance, label -> value."""
    facts = {"topology": stage.topology.name}
    facts |= {_words(key): _text(value) for key, value in plan.stage.settings.items()}
    facts["link voltage"] = _volts(plan.link.voltage)
    if plan.link.trip_voltage is not None:
        facts["link trip voltage"] = _volts(plan.link.trip_voltage)
    if plan.link.capacitance is not None:
        facts["link capacitance, whole bus (energy, discharge)"] = f"{plan.link.capacitance * 1e6:.4g} uF"
    own = plan.stage.parts.get("link_capacitor", {}).get("capacitance")
    if own is not None:
        facts["link capacitance, the stage's own (ripple)"] = _text(own)
    if plan.cooling is not None:
        facts["cooling"] = plan.cooling.model
    if plan.stage.placeholders:
        facts["PLACEHOLDER parts"] = ", ".join(table.removeprefix("stage.") for table in plan.stage.placeholders)
    return facts


def part_entries(plan: Plan, stage: Stage) -> tuple[PartEntry, ...]:
    """Return every sort of part with the data that the plan gives for it."""
    entries = []
    for part in stage.parts:
        given = plan.stage.keys_of(part.slot.table)
        grades = {key: plan.stage.grades.get(f"stage.{part.slot.table}.{key}") for key in given}
        stated = {key: grade for key, grade in grades.items() if grade is not None}
        facts = {_words(key): _graded(_text(value), grades[key]) for key, value in given.items()}
        facts |= _of_part_file(plan, f"stage.{part.slot.table}")
        if given or part.terms:
            in_parallel = int(part.in_parallel) if not hasattr(part.in_parallel, "shape") else 0
            entries.append(PartEntry(part.slot.name, part.slot.kind, part.slot.copies, in_parallel, facts, stated))
    return tuple(entries)


def _of_part_file(plan: Plan, table: str) -> dict[str, str]:
    """Return which part file a table names, and what of it the plan's own keys replace."""
    facts = {}
    if table in plan.stage.part_files:
        facts["part file"] = plan.stage.part_files[table]
    replaced = [
        f"{_words(key.removeprefix(f'{table}.'))} {_text(value)}"
        for key, value in plan.stage.overridden.items()
        if key.rpartition(".")[0] == table
    ]
    if replaced:
        facts["of the part file, replaced by the plan"] = ", ".join(replaced)
    if table in plan.stage.placeholders:
        facts["PLACEHOLDER"] = "invented numbers of no maker"
    return facts


def _graded(text: str, grade: str | None) -> str:
    return text if grade is None else f"{text} ({grade})"


def inputs_of(plan: Plan, profiles: Iterable[Profile]) -> Inputs:
    """Return the fingerprints of what went in: every file by SHA-256, every library by version."""
    sha256 = {}
    if plan.file is not None:
        sha256[plan.file.name] = file_sha256(plan.file)
    for profile in profiles:
        sha256[profile.file.name if profile.file else f"{profile.name}, table made by its source"] = profile.sha256
        if isinstance(profile, SourcedProfile):
            sha256 |= profile.files_sha256
    for extra in plan.extra_files:
        name = extra.name if extra.name not in sha256 else str(extra)
        sha256[name] = file_sha256(extra)
    versions = {"tideleg": metadata.version("tideleg"), "python": platform.python_version()}
    versions |= {name: metadata.version(name) for name in LIBRARIES}
    return Inputs(sha256, versions)


def file_sha256(file: Path) -> str:
    """Return the SHA-256 of a file's bytes, in hexadecimal."""
    return hashlib.sha256(file.read_bytes()).hexdigest()


def _words(key: str) -> str:
    return key.replace("_", " ")


def _volts(value: float) -> str:
    return f"{value:.4g} V"


def _text(value: object) -> str:
    if isinstance(value, list) and len(value) > MOST_SHOWN:
        return f"{len(value)} rows"
    if isinstance(value, dict):
        return ", ".join(f"{key} {_text(one)}" for key, one in value.items())
    if isinstance(value, list):
        return "; ".join(_text(item) for item in value)
    return f"{value:.6g}" if isinstance(value, float) else str(value)
