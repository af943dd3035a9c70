"""The picture of a reach: the mission's points over what the topology cannot do."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from tideleg.errors import InputError
from tideleg.reaching import Reach
from tideleg.report.drawing import BLUE, INK, SAND, STONE, Picture, finish, new_figure

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.patches import Patch

    from tideleg.waveform import FloatArray

HATCHES = ("////", "....", "xxxx", "||||", "----")
MOST_POINTS = 20_000
"""Points drawn one by one; of more, every so many-th, which the caption says."""


def write_reach(found: Sequence[Reach], folder: Path) -> list[Path]:
    """Write a picture of each mission's reach into a folder and return the files.

    Raises
    ------
    InputError
        If the folder cannot be written.
    """
    from tideleg.report.figures import endings

    written = []
    for one, end in zip(found, endings([r.mission for r in found]), strict=True):
        path = folder / f"reach{end}.png"
        beside = path.with_suffix(".png.new")
        try:
            folder.mkdir(parents=True, exist_ok=True)
            draw_reach(one).figure.savefig(beside, format="png", dpi=150, metadata={"Software": None})
            beside.replace(path)
        except OSError as error:
            raise InputError(f"{path} cannot be written: {error.strerror}; give another folder with --out") from error
        written.append(path)
    return written


def draw_reach(reach: Reach) -> Picture:
    """Draw power against voltage ratio: points of the mission, and regions where the topology cannot operate."""
    figure = new_figure(4.6)
    axes = figure.subplots()
    watts, unit = _scale(reach.around.power_w)
    regions = _regions(axes, reach, watts)
    every = max(1, -(-len(reach.power_w) // MOST_POINTS))
    good = reach.reason == 0
    x, y = reach.power_w / watts, reach.ratio
    axes.plot(x[good][::every], y[good][::every], ".", color=BLUE, markersize=3, label="steps of the mission", zorder=3)
    if not np.all(good):
        axes.plot(x[~good], y[~good], "x", color=INK, markersize=5, label="steps out of reach", zorder=4)
    axes.set_xlabel(f"battery power in {unit}, positive = discharge")
    axes.set_ylabel("battery over link voltage (no unit)")
    axes.set_xlim(reach.around.power_w[0] / watts, reach.around.power_w[-1] / watts)
    axes.set_ylim(reach.around.ratio[0], reach.around.ratio[-1])
    finish(axes)
    handles = [*axes.get_legend_handles_labels()[0], *regions]
    figure.legend(handles=handles, loc="outside upper left", ncols=1, frameon=False, fontsize=9)
    return Picture(figure, _caption(reach, every), _alt(reach))


def _scale(power: FloatArray) -> tuple[float, str]:
    greatest = float(np.abs(power).max())
    return (1e6, "MW") if greatest >= 2e6 else (1e3, "kW") if greatest >= 2e3 else (1.0, "W")


def _regions(axes: Axes, reach: Reach, watts: float) -> list[Patch]:
    """Shade each reason and each caution that occurs on the map; return what the legend shows of them."""
    from matplotlib.patches import Patch

    x, y = reach.around.power_w / watts, reach.around.ratio
    shown: list[Patch] = []
    for codes, words, shade, verb in (
        (reach.around.reason, reach.reasons, STONE, "cannot operate"),
        (reach.around.caution, reach.cautions, SAND, "near a border"),
    ):
        for code, word in enumerate(words, 1):
            here = codes == code
            if np.any(here):
                hatch = HATCHES[(code - 1) % len(HATCHES)]
                axes.contourf(x, y, here.astype(float), levels=[0.5, 1.5], colors=[shade], hatches=[hatch], zorder=1)
                label = textwrap.fill(f"{verb}: {word}", 118)
                shown.append(Patch(facecolor=shade, hatch=hatch, edgecolor=INK, linewidth=0.4, label=label))
    return shown


def _caption(reach: Reach, every: int) -> str:
    state = "Every step can be operated." if reach.whole else "Steps marked x cannot be operated."
    told = f" Every {every}th step is drawn." if every > 1 else ""
    return (
        f"Where {reach.mission} asks {reach.topology} to operate, before any loss; regions are drawn at"
        f" {reach.around.link_voltage_v:.4g} V of link. {state}{told}"
    )


def _alt(reach: Reach) -> str:
    shares = ", ".join(f"{word}: {100.0 * share:.3g} % of the time" for word, share in reach.share_of_time.items())
    return f"Battery power against voltage ratio for {reach.mission}: {shares}."
