"""What all pictures share: shades that differ in lightness, axes, time scales, and envelopes of long traces."""

from __future__ import annotations

from typing import TYPE_CHECKING, NamedTuple

import numpy as np

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from tideleg.waveform import FloatArray

INK, BLUE, SAND, STONE, GRID = "#1c2733", "#1f5f8b", "#d9b36a", "#b9c1c8", "#e1e5e8"
WIDTH = 8.6
"""Of every picture [inch]; on an A4 page it is scaled to the text's width."""

COLUMNS = 900
"""Pixel columns of a trace: twice as many steps and more are drawn as the envelope of least and greatest."""


class Picture(NamedTuple):
    """A drawn figure with the words that stand with it.

    caption : printed below
    alt : what it shows, for those who do not see it
    """

    figure: Figure
    caption: str
    alt: str


class Envelope(NamedTuple):
    """Least and greatest value by column of time; `begin` has one more entry, the end of the last column."""

    begin: FloatArray
    least: FloatArray
    greatest: FloatArray


def new_figure(height: float) -> Figure:
    """Return an empty figure of the common width; no state is shared with any other drawing of the process."""
    from matplotlib.figure import Figure

    return Figure(figsize=(WIDTH, height), layout="constrained")


def finish(axes: Axes, grid: str = "both") -> None:
    """Give the axes the common look."""
    axes.grid(True, axis=grid, color=GRID, linewidth=0.7)  # type: ignore[arg-type]
    axes.set_axisbelow(True)
    axes.tick_params(labelsize=9, color=INK)
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)


def legend_above(axes: Axes, columns: int) -> None:
    """Put the legend over the axes, where no data can lie."""
    axes.legend(
        loc="lower left", bbox_to_anchor=(0.0, 1.0), ncols=columns, frameon=False, fontsize=9, borderaxespad=0.2
    )


def time_scale(seconds: float) -> tuple[float, str]:
    """Return the divisor and the unit in which a duration reads well.

    Examples
    --------
    >>> time_scale(1800.0), time_scale(86400.0)
    ((60.0, 'min'), (3600.0, 'h'))
    """
    if seconds > 3 * 3600.0:
        return 3600.0, "h"
    return (60.0, "min") if seconds > 300.0 else (1.0, "s")


def envelope(edges: FloatArray, held: FloatArray) -> Envelope | None:
    """Return the envelope of a held trace by pixel column, or None where it is short enough to be drawn whole.

    Parameters
    ----------
    edges : begin of each step and the end of the last
    held : value of each step

    Every value enters the column its step begins in and, as it may still hold there, the next one.
    """
    if len(held) <= 2 * COLUMNS:
        return None
    borders = np.linspace(edges[0], edges[-1], COLUMNS + 1)[:-1]
    first = np.unique(np.searchsorted(edges[:-1], borders))
    first = first[first < len(held)]  # a long last step may hold over several columns, and none begins in them
    before = held[np.maximum(first - 1, 0)]
    least = np.minimum(np.minimum.reduceat(held, first), before)
    greatest = np.maximum(np.maximum.reduceat(held, first), before)
    return Envelope(np.append(edges[first], edges[-1]), least, greatest)


def draw_held(axes: Axes, edges: FloatArray, held: FloatArray, shade: str, label: str, dash: str = "-") -> None:
    """Draw a trace that holds over each step: whole, or as its envelope where it is long."""
    band = envelope(edges, held)
    if band is None:
        axes.stairs(held, edges, baseline=None, color=shade, linewidth=1.4, linestyle=dash, label=label)
        return
    least, greatest = (np.append(v, v[-1]) for v in (band.least, band.greatest))
    axes.fill_between(band.begin, least, greatest, step="post", color=shade, linewidth=0.5, label=label)


def drawn_of(steps: int) -> str:
    """Return how a trace of so many steps is drawn, as a sentence for the caption."""
    if steps > 2 * COLUMNS:
        return f"Envelope of {steps} steps: every column shows least and greatest, no peak is lost."
    return f"All {steps} steps." if steps > 1 else "One step."
