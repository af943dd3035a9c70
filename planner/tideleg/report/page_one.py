"""Page one on the terminal: the verdict, what binds, what would change it, how sure it is, and the caution last."""

from __future__ import annotations

from collections.abc import Iterable
from typing import TYPE_CHECKING

from rich import box
from rich.padding import Padding
from rich.panel import Panel
from rich.table import Table
from rich.text import Text

from tideleg.outcome import Change, Outcome, ThermalEntry
from tideleg.report import words

if TYPE_CHECKING:
    from rich.console import Console

WIDE = 110
"""Columns from which the tables stand with all their cells."""

TOP_LOSSES = 8


def print_page(outcome: Outcome, console: Console) -> None:
    """Print page one; it also reads well at 80 columns and where the output is no terminal."""
    console.print()
    console.print(Text(outcome.title, style="bold"))
    console.print(Panel(Text(words.sentence(outcome.verdict), style="bold"), box=box.HEAVY, expand=False))
    _pairs(console, words.answers(outcome)[1:])
    _section(console, "Limits, tightest first")
    _limits(console, outcome)
    _section(console, "The stage")
    _pairs(console, outcome.stage_facts.items())
    _section(console, "Energy of one pass")
    _rows(console, words.energy_rows(outcome), ("", *(m.name for m in outcome.missions)))
    _pairs(console, [("efficiency over all missions", words.efficiency_text(outcome.efficiency))])
    _section(console, "A year")
    _rows(console, words.year_rows(outcome), words.YEAR_HEADS)
    if choices := words.choice_rows(outcome):
        _section(console, "Choices of the topology, made before each step is solved")
        _pairs(console, choices)
    _section(console, "Losses by mechanism, mean over the missions")
    _pairs(console, _losses(outcome))
    _section(console, "Hottest parts")
    _pairs(console, [_thermal(entry) for entry in outcome.thermal] or [("none", "no temperature is modelled")])
    if outcome.changes:
        _section(console, "What would change the answer (each line is a run of every mission)")
        _changes(console, outcome.changes)
    if outcome.packs:
        _section(console, "New and aged battery, side by side")
        heads, *rows = words.pack_rows(outcome)
        _rows(console, rows, ("", *heads[1:]))
    _section(console, "How sure is it")
    _list(console, words.sureness(outcome))
    _section(console, "Not modelled")
    _list(console, outcome.not_modelled or ("nothing that the installed plugins know was left out",))
    _section(console, "Rules of this page")
    _list(console, words.all_rules(outcome))
    _section(console, "CAUTION")
    _list(console, outcome.safety.sentences)


def _section(console: Console, title: str) -> None:
    console.print()
    console.print(Text(title, style="bold underline"))


def _limits(console: Console, outcome: Outcome) -> None:
    if not outcome.limits:
        _list(console, ["the plan states no limit that could be checked"])
        return
    cells = [words.limit_cells(check) for check in outcome.limits]
    if console.width >= WIDE:
        _rows(console, cells, words.LIMIT_HEADS)
        return
    narrow = [(*row[:5], "yes" if row[6] == "holds" else "NO") for row in cells]
    _rows(console, narrow, (*words.LIMIT_HEADS[:5], "holds"))


def _losses(outcome: Outcome) -> Iterable[tuple[str, str]]:
    """Yield the greatest mechanisms, the rest as one, and the whole."""
    by_mechanism = list(outcome.loss_by_mechanism().items())
    whole = sum(watts for _, watts in by_mechanism)
    for name, watts in by_mechanism[:TOP_LOSSES]:
        yield name, f"{watts:.4g} W"
    if len(by_mechanism) > TOP_LOSSES:
        rest = sum(watts for _, watts in by_mechanism[TOP_LOSSES:])
        yield f"{len(by_mechanism) - TOP_LOSSES} smaller ones", f"{rest:.4g} W"
    yield "all together", f"{whole:.4g} W"


def _thermal(entry: ThermalEntry) -> tuple[str, str]:
    when = words.time_text(entry.time_s, entry.mission)
    return words.plain(entry.part), f"{entry.greatest_degc:.1f} degC at {when}, mean {entry.mean_degc:.1f} degC"


def _changes(console: Console, changes: tuple[Change, ...]) -> None:
    if console.width >= WIDE:
        _rows(console, [words.change_cells(change) for change in changes], words.CHANGE_HEADS)
        return
    for what, holds, binding, used, junction, efficiency, damage in map(words.change_cells, changes):
        numbers = {f"at {used}": used, f"hottest junction {junction}": junction, f"efficiency {efficiency}": efficiency}
        numbers[f"damage {damage}"] = damage
        told = ", ".join([binding, *(text for text, number in numbers.items() if number != "-")])
        _list(console, [f"{what}: {holds}; {told}"])


def _rows(console: Console, rows: Iterable[tuple[str, ...]], heads: tuple[str, ...]) -> None:
    table = Table(box=box.SIMPLE_HEAD, pad_edge=False)
    for i, head in enumerate(heads):
        table.add_column(Text(head), overflow="fold", justify="left" if i == 0 else "right")
    for row in rows:
        table.add_row(*(Text(cell, style="bold" if cell in (words.BROKEN, "NO") else "") for cell in row))
    console.print(Padding(table, (0, 0, 0, 2), expand=False))


def _pairs(console: Console, pairs: Iterable[tuple[str, str]]) -> None:
    table = Table(box=None, show_header=False, pad_edge=False)
    table.add_column(overflow="fold")
    table.add_column(overflow="fold")
    for label, value in pairs:
        table.add_row(Text(label), Text(value))
    console.print(Padding(table, (0, 0, 0, 2), expand=False))


def _list(console: Console, lines: Iterable[str]) -> None:
    """Print each line with its later lines hanging, so that a reader sees where one ends."""
    for line in lines:
        table = Table(box=None, show_header=False, pad_edge=False, padding=0)
        table.add_column(width=2)
        table.add_column(overflow="fold")
        table.add_row(Text("- "), Text(line))
        console.print(Padding(table, (0, 0, 0, 2), expand=False))
