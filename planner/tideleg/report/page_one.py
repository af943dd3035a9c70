"""Page one on the terminal: the verdict, what binds, what would change it, how sure it is, and the caution."""

from __future__ import annotations

from collections.abc import Iterable
from typing import TYPE_CHECKING

from rich import box
from rich.padding import Padding
from rich.panel import Panel
from rich.table import Table
from rich.text import Text

from tideleg.outcome import Outcome
from tideleg.report.words import CHANGE_HEADS, LIMIT_HEADS, change_cells, energy_rows, limit_cells, plain, sureness

if TYPE_CHECKING:
    from rich.console import Console


def print_page(outcome: Outcome, console: Console) -> None:
    """Print page one; it also reads well at 80 columns and where the output is no terminal."""
    console.print()
    console.print(Text(outcome.title, style="bold"))
    console.print(
        Panel(Text(outcome.verdict[0].upper() + outcome.verdict[1:] + ".", style="bold"), box=box.HEAVY, expand=False)
    )
    _section(console, "Limits, tightest first")
    _limits(console, outcome)
    _section(console, "The stage")
    _pairs(console, outcome.stage_facts.items())
    _section(console, "Energy of one pass")
    _rows(console, energy_rows(outcome), ("", *(m.name for m in outcome.missions)))
    console.print(f"  efficiency over all missions: {100.0 * outcome.efficiency:.3f} %")
    _section(console, "Losses by mechanism, mean over the mission")
    _pairs(console, ((name, f"{watts:.4g} W") for name, watts in outcome.loss_by_mechanism().items()))
    if outcome.thermal:
        _section(console, "Hottest parts")
        _pairs(
            console,
            (
                (
                    plain(t.part),
                    f"{t.greatest_degc:.1f} degC at {t.time_s:.6g} s of {t.mission}, mean {t.mean_degc:.1f}",
                )
                for t in outcome.thermal
            ),
        )
    if outcome.changes:
        _section(console, "What would change the answer (each line is a run of the whole mission)")
        _rows(console, [change_cells(change) for change in outcome.changes], CHANGE_HEADS)
    _section(console, "How sure is it")
    _list(console, sureness(outcome))
    if outcome.not_modelled:
        _section(console, "Not modelled")
        _list(console, outcome.not_modelled)
    _section(console, "Rules of this page")
    _list(console, [*outcome.rules, *(f"{m.name}: {rule}" for m in outcome.missions for rule in m.rules)])
    _section(console, "CAUTION")
    _list(console, outcome.safety.sentences)


def _section(console: Console, title: str) -> None:
    console.print()
    console.print(Text(title, style="bold underline"))


def _limits(console: Console, outcome: Outcome) -> None:
    if console.width >= 110:
        _rows(console, [limit_cells(check) for check in outcome.limits], LIMIT_HEADS)
        return
    for check in outcome.limits:
        name, part, found, allowed, margin, used, at, holds = limit_cells(check)
        line = f"{holds}: {name}, {part}: {found} of {allowed}, margin {margin}, {used} in use, at {at}"
        console.print(Padding(Text(line), (0, 0, 0, 2)))


def _rows(console: Console, rows: Iterable[tuple[str, ...]], heads: tuple[str, ...]) -> None:
    table = Table(*heads, box=box.SIMPLE_HEAD, pad_edge=False)
    for row in rows:
        table.add_row(*(Text(cell) for cell in row))
    console.print(Padding(table, (0, 0, 0, 2)))


def _pairs(console: Console, pairs: Iterable[tuple[str, str]]) -> None:
    table = Table(box=None, show_header=False, pad_edge=False)
    table.add_column(no_wrap=False)
    table.add_column()
    for label, value in pairs:
        table.add_row(Text(label), Text(value))
    console.print(Padding(table, (0, 0, 0, 2)))


def _list(console: Console, lines: Iterable[str]) -> None:
    for line in lines:
        console.print(Padding(Text(line), (0, 0, 0, 2)))
