"""What a profile source is: a way to make the power profile of a mission from something else than a table of power."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any, NamedTuple, Protocol, runtime_checkable

from pydantic import BaseModel

from tideleg.waveform import FloatArray


class MadeProfile(NamedTuple):
    """What a profile source returns; arrays (S,).

    time_s : start of each step, from zero [s]
    duration_s : length of each step; a step runs to the start of the next [s]
    power_w : held over the step at the mission's terminals, positive = discharge [W]
    rules : sentences that say what the source did; every output prints them
    files : every file that it read, for the fingerprints of the inputs
    """

    time_s: FloatArray
    duration_s: FloatArray
    power_w: FloatArray
    rules: tuple[str, ...]
    files: tuple[Path, ...] = ()


@runtime_checkable
class ProfileSource(Protocol):
    """A way to make the power profile of a mission from something else than a table of power."""

    @property
    def name(self) -> str:
        """Name that a plan gives in `mission.source`."""
        ...

    @property
    def source(self) -> str:
        """Where its rules come from."""
        ...

    @property
    def settings(self) -> type[BaseModel]:
        """Model of the keys it reads in [mission.source_settings]."""
        ...

    @property
    def file_keys(self) -> tuple[str, ...]:
        """Those of its keys that hold names of files, relative to the folder of the plan."""
        ...

    def example(self, folder: Path) -> Mapping[str, object]:
        """Write the input files of a small example into an empty folder and return its keys.

        `tideleg plugins check` holds the source against its promises with it where the plan has no mission of it.
        """
        ...

    def make(self, settings: Any, folder: Path) -> MadeProfile:
        """Return the profile; the same for the same settings and files, byte for byte.

        What is random takes its seed from the settings and says it in the rules.
        """
        ...
