"""List the plugins that are installed: kind, name, version, where each came from; and name the broken ones."""

from __future__ import annotations

import argparse

HELP = "list the installed plugins"


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare what the command takes."""
    parser.add_argument("--json", action="store_true", help="print JSON for machines")


def execute(given: argparse.Namespace) -> int:
    """List; return the exit status."""
    import json

    from tideleg.registry import installed

    registry = installed()
    if given.json:
        rows = [
            {key: getattr(p, key) for key in ("kind", "name", "version", "module", "distribution")}
            for p in registry.plugins
        ]
        print(json.dumps({"plugins": rows, "faults": [fault._asdict() for fault in registry.faults]}, indent=2))
        return 0
    from rich.console import Console
    from rich.table import Table

    table = Table(
        "kind", "name", "version", "distribution", "module", "source of its equations", box=None, pad_edge=False
    )
    for p in registry.plugins:
        table.add_row(p.kind, p.name, p.version, p.distribution, p.module, p.offer.source)
    console = Console()
    console.print(table)
    for fault in registry.faults:
        console.print(f"[bold]broken[/bold] {fault.sentence()}", soft_wrap=True)
    return 0
