"""Wear and life in words and table cells."""

from __future__ import annotations

import math

from tideleg.outcome import Outcome
from tideleg.wear import Life
from tideleg.worn import Consumer, HeatHistory, PartWear

HEAT_HEADS = ("part", "greatest", "mean", "greatest swing", "cycles a year by swing", "hours a year", "of these hot")
WEAR_HEADS = (
    "part and model",
    "damage a year",
    "life of one, P10 / P50 / P90",
    "first of all to fail, P10 / P50 / P90",
    "against the target",
    "damage outside the model's data",
)
CONSUMER_HEADS = ("part", "mission", "from", "to", "damage a year", "of the part's damage")


def years(value: float) -> str:
    """Return years with three digits; beyond a thousand the digits mean nothing.

    Examples
    --------
    >>> years(7.4567), years(43.72), years(2960.0), years(float("inf"))
    ('7.46', '43.7', 'over 1000', 'no end')
    """
    if not math.isfinite(value):
        return "no end"
    return "over 1000" if value > 1000.0 else f"{value:.3g}"


def life_text(life: Life) -> str:
    """Return P10, P50 and P90 in years."""
    low, middle, high = (years(value) for value in (life.p10, life.p50, life.p90))
    return f"{low} / {middle} / {high}" + (" years" if any(c.isdigit() for c in low + middle + high) else "")


def life_answer(outcome: Outcome) -> str:
    """Return the life of the part that limits it, with its spread and its margin, as one paragraph."""
    worst = outcome.wear.worst
    if worst is None:
        return "Not known: the plan gives no life model; add [life.switch] and the like."
    text = sentence_of("limits it", worst)
    heated = outcome.wear.worst_heated
    if heated is not None and heated is not worst:
        text += f" {sentence_of('is what temperature wears most', heated)}"
    return text + halving_text(outcome)


def halving_text(outcome: Outcome) -> str:
    """Return which of the changes that were tried halve the damage, the strongest first; empty where none was."""
    asked = [change for change in outcome.changes if change.damage is not None]
    if not asked:
        return ""
    halving = sorted((c for c in asked if c.damage is not None and c.damage <= 0.5), key=lambda c: c.damage or 0.0)
    told = "; ".join(f"{c.what} ({c.damage:.2g} times{'' if c.holds else ', but limits break'})" for c in halving)
    return f" Damage at least halves with: {told}." if told else " None of the changes tried halves the damage."


def sentence_of(role: str, part: PartWear) -> str:
    """Return the life of one part as a sentence that says what part it plays."""
    among = f", first of {part.copies}" if part.copies > 1 else ""
    text = f"{plain(part.part)} {role} ({part.model}{among}): P10 / P50 / P90 {life_text(part.first_life)}"
    if part.target_years is not None:
        text += f"; {target_text(part)}"
    if part.outside_share > 0.1:
        text += f"; {100.0 * part.outside_share:.0f} % of its damage lies outside the data of the model"
    return f"{text[:1].upper()}{text[1:]}."


def plain(name: str) -> str:
    """Return a slot or key as words."""
    return name.replace("_", " ")


def target_text(part: PartWear) -> str:
    """Return the life at the allowed share of failures against the target."""
    if part.target_years is None or part.margin_years is None:
        return "no target stated"
    side = "more than" if part.margin_years >= 0.0 else "SHORT of"
    reached = f"{years(part.life_at_target_years)} years at {100.0 * part.target_failures:g} % failed"
    return f"{reached}, {years(abs(part.margin_years))} {side} the target of {part.target_years:.3g} years"


def heat_cells(entry: HeatHistory) -> tuple[str, ...]:
    """Return the thermal stress of one part as cells under `HEAT_HEADS`."""
    bands = zip(entry.swing_edges_k[:-1], entry.swing_edges_k[1:], entry.swing_counts, strict=True)
    told = [f"{_band(low, high)}: {number:,.0f}" for low, high, number in bands if number > 0.0]
    if entry.hot_above_degc is None:
        hot = "no limit stated"
    else:
        hot = f"{entry.hot_hours:,.4g} h above {entry.hot_above_degc:g} degC"
    return (
        plain(entry.part),
        f"{entry.greatest_degc:.1f} degC",
        f"{entry.mean_degc:.1f} degC",
        f"{entry.greatest_swing_k:.1f} K",
        "; ".join(told) or "none",
        f"{entry.hours_per_year:,.0f} h",
        hot,
    )


def _band(low: float, high: float) -> str:
    return f"{low:g} K and up" if math.isinf(high) else f"{low:g}-{high:g} K"


def wear_cells(part: PartWear) -> tuple[str, ...]:
    """Return what one life model says of one part as cells under `WEAR_HEADS`."""
    copies = f" (one of {part.copies})" if part.copies > 1 else ""
    return (
        f"{plain(part.part)}{copies}, {part.model}: {part.mechanism}",
        f"{part.damage_per_year:.3g}",
        life_text(part.life),
        life_text(part.first_life),
        target_text(part),
        f"{100.0 * part.outside_share:.0f} % ({part.box})",
    )


def consumer_cells(one: Consumer) -> tuple[str, ...]:
    """Return a stretch of a mission as cells under `CONSUMER_HEADS`."""
    return (
        plain(one.part),
        one.mission,
        f"{one.begin_s:.6g} s",
        f"{one.end_s:.6g} s",
        f"{one.damage_per_year:.3g}",
        f"{100.0 * one.share:.3g} %",
    )


def mission_rows(outcome: Outcome) -> list[tuple[str, ...]]:
    """Return the damage of each part by mission, a row each."""
    passes = {m.name: m.passes_per_year for m in outcome.missions}
    return [
        (
            f"{plain(part.part)}, {part.model}",
            mission,
            f"{damage:.3g}",
            f"{damage * passes[mission]:.3g}",
            f"{100.0 * damage * passes[mission] / part.damage_per_year:.3g} %" if part.damage_per_year > 0.0 else "-",
        )
        for part in outcome.wear.parts
        for mission, damage in part.damage_per_pass.items()
    ]
