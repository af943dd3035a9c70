"""Copy a shipped scenario into a folder of your own, to run it and to change it."""

from __future__ import annotations

import argparse
from pathlib import Path

HELP = "copy a shipped scenario to begin with"


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare what the command takes."""
    parser.add_argument("scenario", metavar="SCENARIO", nargs="?", help="name; leave out to list the scenarios")
    parser.add_argument("folder", type=Path, metavar="DIR", nargs="?", help="new folder for the copy")


def execute(given: argparse.Namespace) -> int:
    """List or copy; return the exit status."""
    from tideleg.errors import InputError
    from tideleg.scenario import copy_scenario, scenario_names

    if given.scenario is None:
        for name, title in scenario_names().items():
            print(f"{name:<12} {title}")
        return 0
    if given.folder is None:
        raise InputError(f"give the new folder for the copy: tideleg start {given.scenario} DIR")
    copied = copy_scenario(given.scenario, given.folder)
    print(f"{len(copied)} files in {given.folder}; now: tideleg run {given.folder / 'plan.toml'}")
    return 0
