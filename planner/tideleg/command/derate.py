"""Tell how much power the stage holds for good at each coolant temperature, and what the missions then lose."""

from __future__ import annotations

import argparse
from pathlib import Path

HELP = "power held for good over coolant temperature"


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare what the command takes."""
    parser.add_argument("plan", type=Path, metavar="PLAN", help="plan file (TOML)")
    parser.add_argument(
        "--coolant", type=float, nargs="+", default=[], metavar="DEGC", help="coolant temperatures to look at in degC"
    )
    parser.add_argument("--out", type=Path, metavar="DIR", help="folder for the picture; default: beside PLAN")
    parser.add_argument("--json", action="store_true", help="print JSON for machines, draw nothing")


def execute(given: argparse.Namespace) -> int:
    """Look, tell, draw; return the exit status."""
    import json

    from rich.console import Console
    from rich.table import Table

    from tideleg.caution import GENERAL_SENTENCES
    from tideleg.decide.derating import derate
    from tideleg.plan import load_plan

    plan = load_plan(given.plan)
    found = derate(plan, coolant_degc=given.coolant)
    if given.json:
        points = [point._asdict() for point in found.points]
        told = {**found._asdict(), "points": points, "caution": list(GENERAL_SENTENCES)}
        print(json.dumps(told, indent=2, allow_nan=False))
        return 0
    console = Console()
    table = Table(
        "coolant", "discharge", "set by", "charge", "set by", "asked energy above", title="Power held for good at rest"
    )
    for point in found.points:
        lost = ", ".join(f"{name} {100.0 * share:.3g} %" for name, share in point.lost_share.items())
        table.add_row(
            f"{point.coolant_degc:.4g} degC",
            f"{point.discharge_w / 1e3:.4g} kW",
            point.discharge_binds,
            f"{point.charge_w / 1e3:.4g} kW",
            point.charge_binds,
            lost,
        )
    console.print(table)
    from tideleg.report.derating_curve import write_derating

    console.print(f"picture: {write_derating(found, given.out or plan.folder)}", soft_wrap=True, markup=False)
    for sentence in GENERAL_SENTENCES:
        console.print(sentence, soft_wrap=True, markup=False)
    return 0
