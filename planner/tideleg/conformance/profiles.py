"""Promises of a profile source: a whole table, the same each time, that says what was done and what was read."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from functools import partial
from pathlib import Path
from tempfile import TemporaryDirectory

import numpy as np
from pydantic import ValidationError

from tideleg.conformance.checks import Check
from tideleg.source import MadeProfile, ProfileSource
from tideleg.sourced import fault_of

Given = tuple[Mapping[str, object], Path]
"""Keys as in [mission.source_settings], and the folder where relative file names start."""


def profile_checks(source: ProfileSource, given: Given | None = None) -> tuple[Check, ...]:
    """Return every check of a profile source.

    Parameters
    ----------
    source : ProfileSource
    given : its keys and the folder of its files; its own example if None
    """
    promises: dict[str, Callable[[ProfileSource, Given], None]] = {
        "its table is whole and finite and its rules speak": _is_whole,
        "the same settings and files make the same table": _repeats,
        "every file it is given is named for the fingerprints": _names,
        "unknown keys are refused": _refuses,
    }
    return tuple(Check(source.name, promise, partial(_held, hold, source, given)) for promise, hold in promises.items())


def _held(hold: Callable[[ProfileSource, Given], None], source: ProfileSource, given: Given | None) -> None:
    if given is not None:
        return hold(source, given)
    with TemporaryDirectory() as name:
        folder = Path(name)
        return hold(source, (source.example(folder), folder))


def _made(source: ProfileSource, given: Given) -> MadeProfile:
    settings, folder = given
    return source.make(source.settings.model_validate(dict(settings)), folder)


def _is_whole(source: ProfileSource, given: Given) -> None:
    fault = fault_of(_made(source, given))
    assert not fault, f"its profile {fault}"


def _repeats(source: ProfileSource, given: Given) -> None:
    one, again = _made(source, given), _made(source, given)
    for column in ("time_s", "duration_s", "power_w"):
        same = np.array_equal(getattr(one, column), getattr(again, column))
        assert same, f"{column} differs from one time to the next"
    assert one.rules == again.rules, "its rules differ from one time to the next"


def _names(source: ProfileSource, given: Given) -> None:
    made = _made(source, given)
    unknown = set(source.file_keys) - set(source.settings.model_fields)
    assert not unknown, f"file_keys holds {sorted(unknown)}, which its settings do not know"
    settings, folder = given
    read = {file.resolve() for file in made.files}
    due = {(folder / str(settings[key])).resolve() for key in source.file_keys if key in settings}
    assert due <= read, f"it was given {sorted(map(str, due - read))} and does not name them as read"


def _refuses(source: ProfileSource, given: Given) -> None:
    try:
        source.settings.model_validate({**given[0], "no_such_key": 1})
    except ValidationError:
        return
    raise AssertionError("a key that it does not know was taken in silence")
