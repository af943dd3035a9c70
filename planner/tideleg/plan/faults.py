"""Turning a validation fault into words for the person who wrote the plan."""

from __future__ import annotations

import difflib
from collections.abc import Iterable
from typing import Any

from pydantic import ValidationError


def dotted(location: Iterable[Any]) -> str:
    """Return a pydantic location as the dotted key a person knows, without the names of union branches."""
    return ".".join(str(x) for x in location if not (isinstance(x, str) and ("[" in x or x in ("float", "str"))))


def words(error: Any, allowed: Iterable[str] = ()) -> str:
    """Return one pydantic error as what was found and what is allowed."""
    kind, given = error["type"], error.get("input")
    if kind == "extra_forbidden":
        return unknown_key(str(error["loc"][-1]), allowed)
    if kind == "missing":
        return "this key is missing; give it"
    if kind == "value_error":
        return str(error["ctx"]["error"])
    message = str(error["msg"])
    return f"found {given!r}; {message[0].lower()}{message[1:]}"


def unknown_key(key: str, allowed: Iterable[str]) -> str:
    """Return the sentence for a key that nobody declares."""
    names = sorted(allowed)
    close = difflib.get_close_matches(key, names, n=1)
    hint = f" Did you mean {close[0]!r}?" if close else ""
    return f"unknown key {key!r}.{hint} Allowed are: {', '.join(names)}"


def errors_of(error: ValidationError) -> list[Any]:
    """Return the errors, the same place only once (a union reports every branch)."""
    seen: dict[str, Any] = {}
    for one in error.errors(include_url=False):
        seen.setdefault(dotted(one["loc"]), one)
    return list(seen.values())
