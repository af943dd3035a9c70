"""List the generic parts that ship with tideleg, or copy one to begin a part file of your own."""

from __future__ import annotations

import argparse
from pathlib import Path

HELP = "list the generic parts, or copy one"


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare what the command takes."""
    parser.add_argument("part", metavar="PART", nargs="?", help="generic:NAME; leave out to list the parts")
    parser.add_argument("folder", type=Path, metavar="DIR", nargs="?", help="folder for the copy and its CSV files")


def execute(given: argparse.Namespace) -> int:
    """List or copy; return the exit status."""
    from tideleg.errors import InputError
    from tideleg.plan.generic import copy_generic, generic_names

    if given.part is None:
        names = generic_names()
        width = max(len(name) for name in names)
        for name, words in names.items():
            print(f"{name:<{width}}  {words}")
        print('All are placeholders: invented numbers of no maker. A plan names one as part = "generic:NAME".')
        return 0
    if given.folder is None:
        raise InputError(f"give the folder for the copy: tideleg parts {given.part} DIR")
    files = copy_generic(given.part, given.folder)
    print(
        f'{", ".join(file.name for file in files)} in {given.folder}; name it in a part table: part = "{files[0].name}"'
    )
    return 0
