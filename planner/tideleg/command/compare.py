"""Compare stages on the same missions: several plans, or one plan with several topologies."""

from __future__ import annotations

import argparse
from pathlib import Path

HELP = "compare stages on the same missions"


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare what the command takes."""
    parser.add_argument("plans", type=Path, nargs="+", metavar="PLAN", help="plan files (TOML)")
    parser.add_argument("--topology", action="append", default=[], metavar="NAME", help="repeat it, with one PLAN")
    parser.add_argument("--json", action="store_true", help="print JSON for machines")


def execute(given: argparse.Namespace) -> int:
    """Compare, print; return the exit status."""
    from rich.console import Console

    from tideleg.command.comparison_page import comparison_json, print_comparison
    from tideleg.command.progress import shown
    from tideleg.decide.compare import compare

    with shown() as progress:
        found = compare(given.plans, topologies=given.topology, progress=progress)
    if given.json:
        print(comparison_json(found))
    else:
        print_comparison(found, Console())
    return 0
