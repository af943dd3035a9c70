"""Run a plan over its missions: print the verdict page and write report, summary, steps and figures."""

from __future__ import annotations

import argparse
from pathlib import Path

HELP = "run a plan and write its report"


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare what the command takes."""
    parser.add_argument("plan", type=Path, metavar="PLAN", help="plan file (TOML)")
    parser.add_argument("--out", type=Path, metavar="DIR", help="folder for the results; default: results beside PLAN")
    parser.add_argument("--enforce", action="store_true", help="exit with status 3 if a limit does not hold")
    parser.add_argument("--brief", action="store_true", help="leave out the re-runs that tell what changes the answer")


def execute(given: argparse.Namespace) -> int:
    """Run, write, print; return the exit status."""
    from rich.console import Console

    from tideleg.command.progress import shown
    from tideleg.decide.explain import explained
    from tideleg.plan import load_plan
    from tideleg.report import print_page, write_results
    from tideleg.running import run

    plan = load_plan(given.plan)
    with shown() as progress:
        outcome = run(plan, progress=progress)
        if not given.brief:
            outcome = explained(plan, outcome, progress=progress)
    folder = given.out or plan.folder / "results"
    written = write_results(outcome, folder)  # first: a reader that closes the page early must not cost the results
    console = Console()
    print_page(outcome, console)
    console.print(f"\n{len(written)} files in {folder}; open {folder / 'report.html'}", soft_wrap=True)
    return 3 if given.enforce and not outcome.holds else 0
