"""Promises of a profile source: a whole table, the same each time, that says what was done and what was read."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

import numpy as np

from tideleg.conformance.checks import Check
from tideleg.contract import MadeProfile, ProfileSource
from tideleg.sourced import fault_of


def profile_checks(source: ProfileSource, settings: Mapping[str, object], folder: Path) -> tuple[Check, ...]:
    """Return every check of a profile source.

    Parameters
    ----------
    source : ProfileSource
    settings : its keys, as in [mission.source_settings]
    folder : where relative file names start
    """

    def make() -> MadeProfile:
        return source.make(source.settings.model_validate(dict(settings)), folder)

    return (
        Check(source.name, "its table is whole and finite and its rules speak", lambda: _is_whole(make())),
        Check(source.name, "the same settings and files make the same table", lambda: _repeats(make(), make())),
        Check(source.name, "every file it is given is named for the fingerprints", lambda: _names(source, make())),
        Check(source.name, "unknown keys are refused", lambda: _refuses(source, settings)),
    )


def _is_whole(made: MadeProfile) -> None:
    fault = fault_of(made)
    assert not fault, f"its profile {fault}"


def _repeats(one: MadeProfile, again: MadeProfile) -> None:
    for column in ("time_s", "duration_s", "power_w"):
        same = np.array_equal(getattr(one, column), getattr(again, column))
        assert same, f"{column} differs from one time to the next"
    assert one.rules == again.rules, "its rules differ from one time to the next"


def _names(source: ProfileSource, made: MadeProfile) -> None:
    missing = [file for file in made.files if not file.is_file()]
    assert not missing, f"it names files that do not exist: {missing}"
    assert not source.file_keys or made.files, "it has keys for files and names none that it read"
    unknown = set(source.file_keys) - set(source.settings.model_fields)
    assert not unknown, f"file_keys holds {sorted(unknown)}, which its settings do not know"


def _refuses(source: ProfileSource, settings: Mapping[str, object]) -> None:
    from pydantic import ValidationError

    try:
        source.settings.model_validate({**settings, "no_such_key": 1})
    except ValidationError:
        return
    raise AssertionError("a key that it does not know was taken in silence")
