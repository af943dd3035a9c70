"""Pictures of sums: losses by mechanism and direction, and the share of every limit in use."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from tideleg.outcome import Outcome
from tideleg.report.drawing import BLUE, INK, SAND, Picture, finish, legend_above, new_figure
from tideleg.report.words import limit_label, margin_text, share_text

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from tideleg.waveform import FloatArray

ROW = 0.33
"""Height of one bar with its gap [inch]."""

LONGEST = 1.6
"""Share of a limit at which a bar is cut, so that one broken limit does not hide the others."""

LOOKS = (("discharge", BLUE, ""), ("charge", SAND, "////"), ("idle", "white", "...."))


def draw_losses(outcome: Outcome) -> Picture:
    """Draw the mean loss of every mechanism over a year's passes, split by direction of power."""
    split = loss_by_direction(outcome)
    names = sorted(split, key=lambda name: float(split[name].sum()))
    rows = np.array([split[name] for name in names])
    figure = new_figure(1.1 + ROW * len(names))
    axes = figure.subplots()
    left = np.zeros(len(names))
    for k, (word, shade, hatch) in enumerate(LOOKS):
        if rows[:, k].any():
            axes.barh(names, rows[:, k], left=left, color=shade, hatch=hatch, edgecolor=INK, linewidth=0.8, label=word)
            left = left + rows[:, k]
    whole = rows.sum(axis=1)
    for i, watts in enumerate(whole):
        axes.annotate(f"{watts:.3g}", (watts, i), (4, 0), textcoords="offset points", va="center", fontsize=9)
    axes.set_xlim(0.0, 1.1 * float(whole.max()))
    axes.set_ylim(-0.7, len(names) - 0.3)
    axes.set_xlabel("mean loss in W, all equal parts together")
    legend_above(axes, 3)
    finish(axes, grid="x")
    told = ", ".join(f"{name} {watts:.3g} W" for name, watts in reversed(list(zip(names, whole, strict=True))))
    caption = f"Mean loss over the missions by mechanism and direction of power; {whole.sum():.4g} W in all."
    return Picture(figure, caption, f"Mean losses: {told}.")


def loss_by_direction(outcome: Outcome) -> dict[str, FloatArray]:
    """Return the mean loss in discharge, charge and idle by mechanism [W], missions weighted by passes a year."""
    seconds = sum(m.passes_per_year * float(m.steps["duration_s"].sum()) for m in outcome.missions)
    split: dict[str, FloatArray] = {}
    for mission in outcome.missions:
        for e in mission.losses:
            joules = np.array([e.discharge_j, e.charge_j, e.idle_j])
            split[e.mechanism] = split.get(e.mechanism, np.zeros(3)) + mission.passes_per_year * joules / seconds
    return split


def draw_margins(outcome: Outcome) -> Picture:
    """Draw the share of every limit that is in use; the margin itself stands in a column of its own at the right."""
    checks = list(reversed(outcome.limits))
    figure = new_figure(1.0 + ROW * len(checks))
    axes = figure.subplots()
    shares = [100.0 * min(max(check.used, 0.0), LONGEST) for check in checks]
    looks = [(BLUE, "") if check.holds else (SAND, "////") for check in checks]
    for i, (share, (shade, hatch)) in enumerate(zip(shares, looks, strict=True)):
        axes.barh(i, share, height=0.72, color=shade, hatch=hatch, edgecolor=INK, linewidth=0.8)
    axes.set_yticks(range(len(checks)), [limit_label(check) for check in checks])
    for i, check in enumerate(checks):
        side = "left" if check.holds else "DOES NOT HOLD"
        cut = ", bar cut" if check.used > LONGEST else ""
        _beside(axes, i, share_text(check.used), 42.0, "right")
        _beside(axes, i, f"{margin_text(check)} {side}{cut}", 54.0, "left")
    axes.axvline(100.0, color=INK, linewidth=1.8)
    axes.set_xlim(0.0, max(105.0, 1.04 * max(shares)))
    axes.set_ylim(-0.7, len(checks) - 0.3)
    axes.set_xlabel("share of the limit in use in %; the line at 100 % is the limit")
    finish(axes, grid="x")
    broken = sum(not check.holds for check in checks)
    told = ", ".join(f"{limit_label(check)} {share_text(check.used)}" for check in outcome.limits)
    state = "Every limit holds." if broken == 0 else f"{broken} limits do not hold (hatched)."
    caption = f"Share of each limit in use, with the margin. {state} Temperatures count from the coolest coolant."
    return Picture(figure, caption, f"Share of each limit in use: {told}.")


def _beside(axes: Axes, row: int, words: str, points: float, side: str) -> None:
    """Write in a column at the right of the axes, where no bar can run into the words."""
    axes.annotate(
        words,
        (1.0, row),
        (points, 0.0),
        xycoords=("axes fraction", "data"),
        textcoords="offset points",
        ha=side,
        va="center",
        fontsize=9,
    )
