"""A comparison on the terminal and as JSON."""

from __future__ import annotations

import json
from typing import TYPE_CHECKING

from rich.markup import escape
from rich.table import Table
from rich.text import Text

from tideleg.caution import GENERAL_SENTENCES

if TYPE_CHECKING:
    from rich.console import Console

    from tideleg.decide.compare import Comparison, Contender


def print_comparison(found: Comparison, console: Console) -> None:
    """Print the answers side by side, then what each stage was given to spend, then the caution."""
    labels = [escape(contender.label) for contender in found.contenders]
    answers = Table("", *labels, title="The same missions, stage by stage", title_justify="left")
    for row, cells in _answers(found).items():
        answers.add_row(row, *(Text(cell) for cell in cells))
    console.print(answers)
    fairness = Table(
        "", *labels, "", title="What each was given: differing rows bend the comparison", title_justify="left"
    )
    for row in found.contenders[0].fairness:
        mark = "differs" if row in found.unequal else "equal"
        fairness.add_row(row, *(c.fairness.get(row, "") for c in found.contenders), mark)
    console.print(fairness)
    for contender in found.contenders:
        for note in contender.adaptations:
            console.print(f"{contender.label}: {note}", soft_wrap=True, markup=False)
    console.print()
    outcomes = [contender.outcome for contender in found.contenders if contender.outcome is not None]
    for sentence in outcomes[0].safety.sentences if outcomes else GENERAL_SENTENCES:
        console.print(sentence, soft_wrap=True, markup=False)


def _answers(found: Comparison) -> dict[str, list[str]]:
    rows: dict[str, list[str]] = {}
    for contender in found.contenders:
        for row, cell in _answer(contender).items():
            rows.setdefault(row, []).append(cell)
    return rows


def _answer(contender: Contender) -> dict[str, str]:
    outcome = contender.outcome
    if outcome is None:
        nothing = dict.fromkeys(("tightest limit", "share in use", "efficiency", "loss per pass", "hottest part"), "-")
        return {"holds": contender.fault, **nothing, "not modelled": "-"}
    binding = outcome.binding
    hottest = outcome.thermal[0] if outcome.thermal else None
    loss = sum(m.energy.loss_j for m in outcome.missions) / 3.6e6
    return {
        "holds": "yes" if outcome.holds else "no",
        "tightest limit": "none stated" if binding is None else f"{binding.name}, {binding.part.replace('_', ' ')}",
        "share in use": "-" if binding is None else f"{100 * binding.used:.1f} %",
        "efficiency": f"{100 * outcome.efficiency:.3f} %",
        "loss per pass": f"{loss:.4g} kWh",
        "hottest part": "-"
        if hottest is None
        else f"{hottest.part.replace('_', ' ')} {hottest.greatest_degc:.1f} degC",
        "not modelled": f"{len(outcome.not_modelled)} mechanisms",
    }


def comparison_json(found: Comparison) -> str:
    """Return the comparison for machines; every contender's summary is whole, its caution included."""
    contenders = [
        {
            "label": c.label,
            "fault": c.fault or None,
            "caution": list(GENERAL_SENTENCES if c.outcome is None else c.outcome.safety.sentences),
            "fairness": dict(c.fairness),
            "adaptations": list(c.adaptations),
            "summary": None if c.outcome is None else c.outcome.summary(),
        }
        for c in found.contenders
    ]
    return json.dumps({"contenders": contenders, "unequal": list(found.unequal)}, indent=2, allow_nan=False)
