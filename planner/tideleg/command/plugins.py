"""List the installed plugins and name the broken ones; check one against its contract; begin one of your own."""

from __future__ import annotations

import argparse
from pathlib import Path

HELP = "list, check or begin plugins"


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare what the command takes."""
    parser.add_argument("--json", action="store_true", help="print the list as JSON for machines")
    parser.set_defaults(act=_list)
    acts = parser.add_subparsers(title="instead of the list", metavar="")
    check = acts.add_parser("check", help="put one installed plugin through its contract")
    check.add_argument("name", metavar="NAME", help="name of the plugin")
    check.add_argument("--plan", type=Path, metavar="PLAN", help="plan whose data it is given; default: a shipped one")
    check.set_defaults(act=_check)
    new = acts.add_parser("new", help="write a small plugin project with its test")
    new.add_argument("kind", metavar="KIND", help="topology, loss, cooling or life")
    new.add_argument("name", metavar="NAME", help="lower-case words joined by hyphens")
    new.add_argument("folder", type=Path, metavar="DIR", help="new folder")
    new.set_defaults(act=_new)


def execute(given: argparse.Namespace) -> int:
    """List, check or begin; return the exit status."""
    status: int = given.act(given)
    return status


def _list(given: argparse.Namespace) -> int:
    import json

    from tideleg.registry import installed

    registry = installed()
    if given.json:
        columns = ("kind", "name", "version", "module", "distribution")
        rows = [{column: getattr(plugin, column) for column in columns} for plugin in registry.plugins]
        print(json.dumps({"plugins": rows, "faults": [fault._asdict() for fault in registry.faults]}, indent=2))
        return 0
    from rich.console import Console
    from rich.table import Table

    table = Table("kind", "name", "version", "distribution", "module", "source", box=None, pad_edge=False)
    for p in registry.plugins:
        table.add_row(p.kind, p.name, p.version, p.distribution, p.module, p.offer.source)
    console = Console()
    console.print(table)
    for fault in registry.faults:
        console.print(f"broken: {fault.sentence()}", soft_wrap=True, markup=False)
    return 0


def _check(given: argparse.Namespace) -> int:
    from tideleg.conformance.by_plan import plugin_checks, shipped_plan
    from tideleg.plan import load_plan
    from tideleg.registry import installed

    plan = load_plan(given.plan) if given.plan else shipped_plan(given.name, installed())
    broken = 0
    for check in plugin_checks(given.name, plan, installed()):
        try:
            check()
        except AssertionError as error:
            broken += 1
            print(f"BROKEN  {error}")
        except Exception as error:
            broken += 1
            print(f"BROKEN  {check.plugin}: {check.promise}: it raised {type(error).__name__}: {error}")
        else:
            print(f"kept    {check.plugin}: {check.promise}")
    print(f"{broken} promises broken" if broken else "every promise kept")
    return 3 if broken else 0


def _new(given: argparse.Namespace) -> int:
    from tideleg.starter import new_plugin

    for path in new_plugin(given.kind, given.name, given.folder):
        print(path)
    print(f"now: pip install -e '{given.folder}[test]' && pytest {given.folder}")
    return 0
