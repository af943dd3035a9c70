"""A profile made by a source: its keys validated, its table held against the contract, its inputs fingerprinted."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping

import numpy as np
from pydantic import BaseModel

from tideleg.errors import PluginError
from tideleg.mission import SourcedProfile
from tideleg.plan import Plan, read_table
from tideleg.registry import Registry, call_plugin, installed
from tideleg.source import MadeProfile, ProfileSource

STEP_TOLERANCE = 1e-9
"""A step may end this share of the whole length before or after the next begins."""


def sourced_profile(plan: Plan, index: int, registry: Registry | None = None) -> SourcedProfile:
    """Return the profile of one mission that names a source.

    Raises
    ------
    PlanError
        If a key cannot be used, or names no file; file, line and key are named.
    PluginError
        If no such source is installed, or it raised, or what it made breaks its contract.
    """
    registry = registry or installed()
    mission = plan.mission[index]
    source = registry.profile_source(str(mission.source))
    settings = read_settings(plan, index, source)
    made = call_plugin(registry, source, lambda: source.make(settings, plan.folder))
    fault = fault_of(made)
    if fault:
        raise PluginError(f"{registry.owner(source)} made a profile that {fault}")
    files = {file.name: hashlib.sha256(file.read_bytes()).hexdigest() for file in made.files}
    return SourcedProfile(
        mission.label,
        None,
        _digest(made),
        mission.terminals,
        time_s=made.time_s,
        duration_s=made.duration_s,
        power_w=made.power_w,
        rules=(_echo(source, mission.source_settings, mission.terminals), *made.rules),
        files_sha256=files,
    )


def read_settings(plan: Plan, index: int, source: ProfileSource) -> BaseModel:
    """Return the keys of [mission.source_settings], validated by the source's own model.

    Raises
    ------
    PlanError
        If a key cannot be used, or names no file.
    """
    key, raw = f"mission.{index}.source_settings", plan.mission[index].source_settings
    settings = read_table(plan, key, raw, {source.name: source.settings})[source.name]
    for name in source.file_keys:
        given = getattr(settings, name, None)
        if given is not None and not (plan.folder / str(given)).is_file():
            raise plan.fault(f"{key}.{name}", f"found {str(given)!r}, which is no file; check the name")
    return settings


def fault_of(made: MadeProfile) -> str:
    """Return how a table breaks the contract, or nothing."""
    time, duration, power = (np.asarray(column) for column in made[:3])
    if not (time.ndim == 1 and time.shape == duration.shape == power.shape and len(time) > 0):
        return f"has columns of shapes {time.shape}, {duration.shape}, {power.shape}; give three equal ones, (S,)"
    if not all(np.all(np.isfinite(column)) for column in (time, duration, power)):
        return "holds a number that is not finite"
    if np.any(duration <= 0.0):
        return f"holds a step of {float(duration.min()):g} s; every step is longer than zero"
    ends = time + duration
    if time[0] != 0.0 or np.any(np.abs(ends[:-1] - time[1:]) > STEP_TOLERANCE * ends[-1]):
        return "has a gap or an overlap between its steps, or does not start at zero"
    return "" if made.rules else "says nothing about what was done: its rules are empty"


def _digest(made: MadeProfile) -> str:
    table = np.stack([made.time_s, made.duration_s, made.power_w]).astype("<f8")
    return hashlib.sha256(table.tobytes()).hexdigest()


def _echo(source: ProfileSource, given: Mapping[str, object], terminals: str) -> str:
    keys = ", ".join(f"{key} = {value}" for key, value in given.items()) or "its own defaults"
    return f"the profile is power at the {terminals} terminals, made by the source {source.name} with {keys}"


__all__ = ["fault_of", "read_settings", "sourced_profile"]
