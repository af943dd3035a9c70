"""A reach on the terminal and as JSON."""

from __future__ import annotations

import json
from collections.abc import Sequence
from typing import TYPE_CHECKING

from rich.table import Table
from rich.text import Text

from tideleg.caution import GENERAL_SENTENCES

if TYPE_CHECKING:
    from rich.console import Console

    from tideleg.reaching import Reach


def print_reach(found: Sequence[Reach], console: Console) -> None:
    """Print, for each mission, the share of time in reach and what stands in the way, with its first instant."""
    for one in found:
        table = Table("", "share of time", "first at", title=f"{one.mission}: {one.topology}", title_justify="left")
        for word, share in one.share_of_time.items():
            when = f"{one.first_s[word]:.6g} s" if word in one.first_s else "-"
            table.add_row(Text(word), f"{100.0 * share:.4g} %", when)
        console.print(table)


def reach_json(found: Sequence[Reach]) -> str:
    """Return the reach for machines: shares and first instants, with the caution."""
    missions = [
        {
            "mission": one.mission,
            "topology": one.topology,
            "whole": one.whole,
            "share_of_time": dict(one.share_of_time),
            "first_s": dict(one.first_s),
            "power_w": [float(one.power_w.min()), float(one.power_w.max())],
            "ratio": [float(one.ratio.min()), float(one.ratio.max())],
        }
        for one in found
    ]
    return json.dumps({"missions": missions, "caution": list(GENERAL_SENTENCES)}, indent=2, allow_nan=False)
