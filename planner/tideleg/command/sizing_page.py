"""The sizing on the terminal: every value, what set it, at which instant."""

from __future__ import annotations

from typing import TYPE_CHECKING

from rich.table import Table
from rich.text import Text

if TYPE_CHECKING:
    from rich.console import Console

    from tideleg.decide.size import Sized


def print_sizing(sized: Sized, console: Console) -> None:
    """Print the decisions and the notes of a sizing."""
    table = Table(title="What was sized, and by what", title_justify="left")
    for head in ("value", "was", "now", "set by", "at"):
        table.add_column(head, overflow="fold")
    for decision in sized.decisions:
        cells = (decision.key, decision.before or "not given", str(decision.value), decision.set_by, decision.at)
        table.add_row(*(Text(cell) for cell in cells))
    console.print()
    console.print(table)
    for note in sized.notes:
        console.print(f"  {note}", soft_wrap=True, markup=False)
