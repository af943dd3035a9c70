"""Print one JSON Schema of the plan file, or of a part file, with everything that is installed, for editors."""

from __future__ import annotations

import argparse

HELP = "print the JSON Schema of the plan file"

KINDS = ("switch", "diode", "inductor", "capacitor", "busbar", "control")


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare what the command takes."""
    parser.add_argument("--part", choices=KINDS, help="print that of a part file of this kind instead")


def execute(given: argparse.Namespace) -> int:
    """Print; return the exit status."""
    import json

    from tideleg.plan import part_schema, plan_schema
    from tideleg.registry import installed

    registry = installed()
    losses, coolings = registry.loss_models(), registry.cooling_models()
    if given.part is not None:
        print(json.dumps(part_schema(given.part, losses, coolings), indent=2))
    else:
        others = (registry.life_models(), registry.profile_sources())
        print(json.dumps(plan_schema(registry.topologies(), losses, coolings, *others), indent=2))
    return 0
