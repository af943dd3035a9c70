"""Size a stage from its limits and missions, write sized.toml, and prove it by a run of the whole mission."""

from __future__ import annotations

import argparse
import shutil
from pathlib import Path

HELP = "size a stage from its limits and prove it"


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare what the command takes."""
    parser.add_argument("plan", type=Path, metavar="PLAN", help="plan file (TOML)")
    parser.add_argument("--out", type=Path, metavar="DIR", help="folder for the results; default: sized beside PLAN")
    parser.add_argument("--enforce", action="store_true", help="exit with status 3 if a limit of the sized stage fails")


def execute(given: argparse.Namespace) -> int:
    """Size, print, write; return the exit status."""
    from rich.console import Console

    from tideleg.command.progress import shown
    from tideleg.command.sizing_page import print_sizing
    from tideleg.decide.size import size
    from tideleg.plan import load_plan
    from tideleg.report import print_page, write_results

    plan = load_plan(given.plan)
    folder = given.out or plan.folder / "sized"
    # The sized plan is first written beside, at the same depth, so that its relative file names hold in both places.
    beside = folder.with_name(f".{folder.name}.sized.toml") / "sized.toml"
    try:
        with shown() as progress:
            sized = size(plan, destination=beside, progress=progress)
        text = beside.read_text(encoding="utf-8")
    finally:
        shutil.rmtree(beside.parent, ignore_errors=True)
    written = write_results(sized.outcome, folder, extra={"sized.toml": text})
    console = Console()
    print_page(sized.outcome, console)
    print_sizing(sized, console)
    console.print(f"\n{len(written)} files in {folder}; the plan is {folder / 'sized.toml'}", soft_wrap=True)
    return 3 if given.enforce and not sized.outcome.holds else 0
