"""Where a plan comes from, and reading TOML text with its faults in words."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any, NamedTuple

from tideleg.errors import PlanError
from tideleg.plan.lines import line_of


class Source(NamedTuple):
    """Where a plan comes from: its file and text (None and "" for one made in Python), and its folder."""

    file: Path | None
    text: str
    folder: Path

    def fault(self, key: str, what: str) -> PlanError:
        """Return the error for one key."""
        return PlanError(what, file=self.file, key=key, line=line_of(self.text, key) if self.text else None)


def read_toml(file: Path) -> tuple[dict[str, Any], str]:
    """Return the content of a TOML file and its text.

    Raises
    ------
    PlanError
        If it is missing, no text or no TOML.
    """
    try:
        text = file.read_text(encoding="utf-8-sig")
    except FileNotFoundError:
        raise PlanError("the file does not exist; check the path", file=file) from None
    except OSError as error:
        raise PlanError(f"the file cannot be read ({error.strerror})", file=file) from None
    except UnicodeDecodeError:
        raise PlanError("the file is not UTF-8 text; save it so", file=file) from None
    try:
        return tomllib.loads(text), text
    except tomllib.TOMLDecodeError as error:
        raise PlanError(f"not valid TOML: {error}", file=file) from None
