"""Print one JSON Schema of the plan file with everything that is installed, so that editors complete and check."""

from __future__ import annotations

import argparse

HELP = "print the JSON Schema of the plan file"


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare what the command takes: nothing."""


def execute(given: argparse.Namespace) -> int:
    """Print; return the exit status."""
    import json

    from tideleg.plan import plan_schema
    from tideleg.registry import installed

    registry = installed()
    plugins = (registry.topologies(), registry.loss_models(), registry.cooling_models(), registry.profile_sources())
    print(json.dumps(plan_schema(*plugins), indent=2))
    return 0
