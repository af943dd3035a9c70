"""What can go wrong, as one tree.

TidelegError
├── InputError            the person's input: exit status 2, one message, no traceback
│   ├── PlanError         a plan or parts file: file, line, key, what was found, what is allowed
│   ├── ProfileError      a profile file: file, line, column
│   ├── InfeasibleError   the topology cannot do what a mission asks at some step
│   └── PluginError       a plugin that is needed is missing, broken or raised
└── NoEquilibriumError    the losses outrun the cooling: no steady temperature exists for a part at an instant
"""

from __future__ import annotations

from pathlib import Path


class TidelegError(Exception):
    """Base of every error that tideleg raises on purpose."""


class InputError(TidelegError):
    """Something the person gave cannot be used; the message says where, what came, what is wanted, what to do."""


class PlanError(InputError):
    """A plan or parts file holds something that cannot be used.

    file : the file
    key : dotted path of the key, such as `stage.inductor.inductance`, or None for the whole file
    line : line number in the file, from 1, or None where it is not known
    fault : what was found, what is allowed and what to do, as one or two sentences
    """

    def __init__(self, fault: str, *, file: Path | str | None = None, key: str | None = None, line: int | None = None):
        self.file, self.key, self.line, self.fault = file, key, line, fault
        where = [] if file is None else [str(file)]
        if line is not None:
            where.append(f"line {line}")
        if key:
            where.append(key)
        super().__init__(f"{', '.join(where)}: {fault}" if where else fault)


class ProfileError(InputError):
    """A profile file holds something that cannot be used; `line` counts from 1 and includes the header."""

    def __init__(self, fault: str, *, file: Path | str, line: int | None = None, column: str | None = None):
        self.file, self.line, self.column, self.fault = file, line, column, fault
        where = [str(file)]
        if line is not None:
            where.append(f"line {line}")
        if column:
            where.append(column)
        super().__init__(f"{', '.join(where)}: {fault}")


class InfeasibleError(InputError):
    """A stage cannot operate at some step of a mission; the message gives the instant, the voltages and the reason."""


class PluginError(InputError):
    """A plugin that the work needs is missing, could not be loaded, or raised; the message names its distribution."""


class NoEquilibriumError(TidelegError):
    """No steady temperature exists: the loss of a part grows faster with temperature than its cooling takes away."""
