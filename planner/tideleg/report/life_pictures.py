"""Pictures of wear: hours by temperature, cycles with the bounds of the data, damage along time, spread of life."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from tideleg.outcome import Outcome
from tideleg.report.drawing import BLUE, INK, SAND, STONE, Picture, finish, legend_above, new_figure, time_scale
from tideleg.report.wear_words import life_text, plain, target_text, years
from tideleg.wear import lifetime_quantile
from tideleg.worn import CycleTrace, PartWear, Wear

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from tideleg.waveform import FloatArray

CELLS_K = (1.0, 2.0, 5.0, 10.0, 20.0)
"""Widths of a cell of the cycle matrix [K]; the finest that gives at most so many cells is taken, for each way."""

MOST_CELLS = 16

WRITTEN = 0.02
"""Share of the damage from which a cell says its own [-]."""

MOST_LINES = 4

LOOKS = ((BLUE, "-"), (INK, (0, (6, 2))), (SAND, "-"), (STONE, (0, (2, 2))))


def draw_hours(wear: Wear) -> Picture:
    """Draw the hours of a year by temperature, a panel a part, on one axis of temperature."""
    figure = new_figure(0.8 + 1.15 * len(wear.heat))
    panels = figure.subplots(len(wear.heat), 1, sharex=True, squeeze=False)[:, 0]
    told = []
    for axes, entry in zip(panels, wear.heat, strict=True):
        edges, hours = np.asarray(entry.band_edges_degc), np.asarray(entry.band_hours)
        axes.bar(edges[:-1], hours, np.diff(edges), align="edge", color=BLUE, edgecolor="white", linewidth=0.8)
        hot = ""
        if entry.hot_above_degc is not None:
            axes.axvline(entry.hot_above_degc, color=INK, linewidth=1.2, linestyle=(0, (6, 3)))
            hot = f", {entry.hot_hours:,.3g} h above {entry.hot_above_degc:g} degC"
        title = f"{plain(entry.part)}: mean {entry.mean_degc:.1f} degC, greatest {entry.greatest_degc:.1f} degC{hot}"
        axes.set_title(title, loc="left", fontsize=9)
        told.append(title)
        axes.margins(y=0.1)
        finish(axes)
    panels[-1].set_xlabel("mean temperature of a step in degC")
    figure.supylabel("hours a year", fontsize=10)
    caption = (
        "Hours a year by mean temperature of each step, in bands of equal width for each part; dashed: the temperature"
        " that counts as hot."
    )
    return Picture(figure, caption, f"Hours by temperature: {'; '.join(told)}.")


def draw_cycles(part: PartWear) -> Picture:
    """Draw cycles by mean and swing: the shade is the share of the damage, hatched where the data do not reach."""
    assert part.cycles is not None
    trace = part.cycles
    means, swings = _cells(trace.mean_degc), _cells(trace.swing_k)
    damage = _summed(trace, means, swings, trace.damage_per_year)
    beyond = _summed(trace, means, swings, trace.damage_per_year * trace.outside)
    number = _summed(trace, means, swings, trace.per_year)
    share = damage / damage.sum()
    figure = new_figure(4.6)
    axes = figure.subplots()
    shades = np.where(number > 0.0, share, np.nan).T
    mesh = axes.pcolormesh(means, swings, 100.0 * shades, cmap="Blues", vmin=0.0, edgecolors="white", linewidth=0.4)
    figure.colorbar(mesh, ax=axes, label="share of the damage in %", pad=0.02)
    _mark_outside(axes, means, swings, (number > 0.0) & (beyond > 0.5 * damage))
    for i, k in zip(*np.nonzero(share >= WRITTEN), strict=True):
        middle = 0.5 * (means[i] + means[i + 1]), 0.5 * (swings[k] + swings[k + 1])
        dark = share[i, k] > 0.55 * share.max()
        box = {"boxstyle": "round,pad=0.15", "facecolor": INK if dark else "white", "edgecolor": "none"}
        words = f"{100.0 * share[i, k]:.0f}"
        axes.text(*middle, words, ha="center", va="center", fontsize=8, color="white" if dark else INK, bbox=box)
    axes.set_xlabel("mean temperature of the cycle in degC")
    axes.set_ylabel("swing in K")
    finish(axes)
    outside = f"{100.0 * part.outside_share:.0f} % of the damage lies outside the data"
    caption = (
        f"Cycles of {plain(part.part)} by mean and swing. Shade and figures: share of the damage by {part.model} in %;"
        f" hatched: mostly outside the data it stands on ({part.box}). {outside[:1].upper()}{outside[1:]}. Cells are"
        " for display, damage is summed cycle by cycle."
    )
    return Picture(figure, caption, f"Cycle matrix of {plain(part.part)}; {outside}.")


def _cells(values: FloatArray) -> FloatArray:
    """Return the edges of the cells that hold all values."""
    width = next((w for w in CELLS_K if np.ptp(values) <= MOST_CELLS * w), CELLS_K[-1])
    low = width * np.floor(values.min() / width)
    return np.asarray(np.arange(low, values.max() + 1.001 * width, width))


def _summed(trace: CycleTrace, means: FloatArray, swings: FloatArray, weights: FloatArray) -> FloatArray:
    return np.asarray(np.histogram2d(trace.mean_degc, trace.swing_k, (means, swings), weights=weights)[0])


def _mark_outside(axes: Axes, means: FloatArray, swings: FloatArray, cells: NDArray[np.bool_]) -> None:
    from matplotlib.patches import Rectangle

    for i, k in zip(*np.nonzero(cells), strict=True):
        size = means[i + 1] - means[i], swings[k + 1] - swings[k]
        axes.add_patch(
            Rectangle((means[i], swings[k]), *size, fill=False, hatch="////", edgecolor=STONE, linewidth=0.0)
        )


def draw_damage(parts: list[PartWear], outcome: Outcome) -> Picture:
    """Draw the damage along each mission as a share of the part's damage a year; the parts with the shortest lives."""
    missions = outcome.missions
    figure = new_figure(0.9 + 2.3 * len(missions))
    panels = figure.subplots(len(missions), 1, squeeze=False)[:, 0]
    shown = parts[:MOST_LINES]
    for axes, mission in zip(panels, missions, strict=True):
        longest = float(mission.steps["duration_s"].sum())
        scale, unit = time_scale(longest)
        for part, (shade, dash) in zip(shown, LOOKS, strict=False):
            trace = part.along[mission.name]
            share = 100.0 * trace.damage * mission.passes_per_year / part.damage_per_year
            label = f"{plain(part.part)}, {part.model}"
            axes.plot(trace.time_s / scale, share, color=shade, linestyle=dash, linewidth=1.7, label=label)
        axes.set_xlim(0.0, longest / scale)
        axes.set_ylim(bottom=0.0)
        axes.set_ylabel("share of the\ndamage a year in %")
        axes.set_xlabel(f"time in {unit}, {mission.name}")
        finish(axes)
    legend_above(panels[0], 2)
    caption = (
        "Damage done up to each instant of a pass, over a year of passes; each cycle's is spread evenly over its swing."
        " Steep stretches consume the life."
    )
    return Picture(figure, caption, f"Damage along time of {', '.join(plain(p.part) for p in shown)}.")


def draw_life(part: PartWear) -> Picture:
    """Draw the share that has failed over the years: of single parts, and of stages by their first part."""
    from matplotlib.ticker import LogLocator

    figure = new_figure(3.6)
    axes = figure.subplots()
    shares = np.linspace(0.01, 0.99, 99)
    spreads = (part.damage_per_year, part.spread)
    curves = [("one part", 1, part.life)]
    if part.copies > 1:
        curves.append((f"first of {part.copies} parts", part.copies, part.first_life))
    for (label, among, life), (shade, dash) in zip(curves, LOOKS, strict=False):
        times = [lifetime_quantile(*spreads, float(f), among, part.load_spread) for f in shares]
        axes.plot(times, 100.0 * shares, color=shade, linestyle=dash, linewidth=1.8, label=label)
        axes.plot([life.p10, life.p50, life.p90], [10.0, 50.0, 90.0], "o", color=shade, markersize=6)
        for value, height in ((life.p10, 10.0), (life.p50, 50.0), (life.p90, 90.0)):
            # The curve rises to the right: below it to the right and above it to the left there is room.
            side, level, shift = ("left", "top", (7, -3)) if among == 1 else ("right", "bottom", (-7, 3))
            axes.annotate(
                years(value), (value, height), shift, textcoords="offset points", ha=side, va=level, fontsize=9
            )
    if part.target_years is not None:
        axes.axvline(part.target_years, color=INK, linewidth=1.2, linestyle=(0, (2, 2)), label="target")
    axes.set_xscale("log")
    axes.xaxis.set_major_locator(LogLocator(subs=(1.0, 2.0, 5.0)))
    axes.xaxis.set_major_formatter(lambda value, _: f"{value:g}")
    axes.set_ylim(0.0, 100.0)
    axes.set_xlabel("time in service in years")
    axes.set_ylabel("share that has failed in %")
    legend_above(axes, 3)
    finish(axes)
    told = f"P10 / P50 / P90 of the first of {part.copies}: {life_text(part.first_life)}; {target_text(part)}"
    caption = (
        f"Life of {plain(part.part)} by {part.model}; spread of ln(life) {part.spread:g} from part"
        f" to part and {part.load_spread:g} from stage to stage. {told}."
    )
    return Picture(figure, caption, f"Share failed over the years of {plain(part.part)}. {told}.")
