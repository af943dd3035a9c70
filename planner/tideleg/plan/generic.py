"""The generic parts that ship with the package: invented numbers of no maker, to begin with before there is data.

A plan names one as part = "generic:NAME". Each says placeholder = true, and page one shows that.
"""

from __future__ import annotations

import shutil
import tomllib
from collections.abc import Iterator
from pathlib import Path
from typing import Any

from tideleg.errors import InputError

GENERIC = "generic:"
"""How a plan names a part that ships with the package rather than a file of its own."""

FOLDER = Path(__file__).resolve().parents[1] / "parts"


def generic_file(name: str) -> Path:
    """Return where the generic part of that name would lie; the name may begin with "generic:"."""
    return FOLDER / f"{Path(name.removeprefix(GENERIC)).name}.toml"


def generic_names() -> dict[str, str]:
    """Return the generic parts, "generic:NAME" -> what they are, in words."""
    files = sorted(FOLDER.glob("*.toml"))
    return {f"{GENERIC}{file.stem}": str(tomllib.loads(file.read_text(encoding="utf-8"))["name"]) for file in files}


def copy_generic(name: str, folder: Path) -> list[Path]:
    """Copy one generic part with the CSV files that it names, and return the files made, the part file first.

    Raises
    ------
    InputError
        If there is no such part, or a file of one of these names exists: nothing is overwritten.
    """
    source = generic_file(name)
    if not source.is_file():
        raise InputError(f"found no generic part {name!r}; there are {', '.join(generic_names())}")
    files = [source, *(FOLDER / csv for csv in _points_of(tomllib.loads(source.read_text(encoding="utf-8"))))]
    for file in files:
        if (folder / file.name).exists():
            raise InputError(f"{folder / file.name} exists; give another folder, nothing is overwritten")
    folder.mkdir(parents=True, exist_ok=True)
    return [Path(shutil.copy(file, folder / file.name)) for file in files]


def _points_of(table: dict[str, Any]) -> Iterator[str]:
    for value in table.values():
        if isinstance(value, dict):
            yield from _points_of(value)
        elif isinstance(value, str) and value.lower().endswith(".csv"):
            yield value
