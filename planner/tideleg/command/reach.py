"""Tell where a plan's missions ask its topology to operate, and where it cannot: before any loss is known."""

from __future__ import annotations

import argparse
from pathlib import Path

HELP = "tell where the topology can operate"


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare what the command takes."""
    parser.add_argument("plan", type=Path, metavar="PLAN", help="plan file (TOML)")
    parser.add_argument("--out", type=Path, metavar="DIR", help="folder for the pictures; default: beside PLAN")
    parser.add_argument("--json", action="store_true", help="print JSON for machines, draw nothing")


def execute(given: argparse.Namespace) -> int:
    """Look, tell, draw; return the exit status."""
    from rich.console import Console

    from tideleg.caution import GENERAL_SENTENCES
    from tideleg.command.reach_page import print_reach, reach_json
    from tideleg.plan import load_plan
    from tideleg.reaching import reach

    plan = load_plan(given.plan)
    found = reach(plan)
    if given.json:
        print(reach_json(found))
        return 0
    console = Console()
    print_reach(found, console)
    from tideleg.report.reach_map import write_reach

    for path in write_reach(found, given.out or plan.folder):
        console.print(f"picture: {path}", soft_wrap=True, markup=False)
    for sentence in GENERAL_SENTENCES:
        console.print(sentence, soft_wrap=True, markup=False)
    return 0
