"""The command line: one thin file a command, heavy imports inside functions so that help comes at once.

Exit statuses: 0 done; 1 unexpected fault; 2 bad input, one message and no traceback; 3 a limit does not hold and
--enforce was given, or no thermal equilibrium exists; 130 interrupted.
"""

from __future__ import annotations

import argparse
import os
import sys
from collections.abc import Sequence

from tideleg.command import compare, derate, parts, plugins, profile, reach, run, schema, size, start
from tideleg.errors import InputError, NoEquilibriumError

COMMANDS = (run, size, compare, reach, derate, profile, parts, plugins, schema, start)

DONE, BAD_INPUT, NOT_HELD, INTERRUPTED = 0, 2, 3, 130


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command and return its exit status."""
    given = parser().parse_args(arguments)
    try:
        status: int = given.execute(given)
    except InputError as error:
        print(f"tideleg: {error}", file=sys.stderr)
        return BAD_INPUT
    except NoEquilibriumError as error:
        print(f"tideleg: {error}", file=sys.stderr)
        return NOT_HELD
    except BrokenPipeError:
        # The reader of the output went away (a pager, `head`): nothing is wrong, and nothing more can be said to it.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return DONE
    except KeyboardInterrupt:
        print("tideleg: interrupted; earlier results are as they were", file=sys.stderr)
        return INTERRUPTED
    return status


def parser() -> argparse.ArgumentParser:
    """Return the parser of all commands."""
    whole = argparse.ArgumentParser(
        prog="tideleg",
        description="Plans, sizes and defends bidirectional DC-DC stages between a battery and a high-voltage link.",
        epilog="Exit status: 0 done, 1 unexpected fault, 2 bad input, 3 a limit does not hold (with --enforce).",
    )
    commands = whole.add_subparsers(title="commands", required=True, metavar="COMMAND")
    for module in COMMANDS:
        name = module.__name__.rpartition(".")[2]
        one = commands.add_parser(name, help=module.HELP, description=module.__doc__)
        module.add_arguments(one)
        one.set_defaults(execute=module.execute)
    return whole
