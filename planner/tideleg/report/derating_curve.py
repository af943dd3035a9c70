"""The picture of a derating: power held for good over coolant temperature, with what the mission asks."""

from __future__ import annotations

from pathlib import Path

from tideleg.decide.derating import Derating
from tideleg.errors import InputError
from tideleg.report.drawing import BLUE, INK, SAND, Picture, finish, legend_above, new_figure


def draw_derating(found: Derating) -> Picture:
    """Draw the greatest power each way over coolant temperature, discharge above zero and charge below."""
    figure = new_figure(3.8)
    axes = figure.subplots()
    degc = [point.coolant_degc for point in found.points]
    give = [point.discharge_w / 1e3 for point in found.points]
    take = [-point.charge_w / 1e3 for point in found.points]
    axes.plot(degc, give, "o-", color=BLUE, label="discharge, held for good")
    axes.plot(degc, take, "s--", color=SAND, markeredgecolor=INK, label="charge, held for good")
    for watts, style in ((found.greatest_discharge_w, ":"), (-found.greatest_charge_w, ":")):
        axes.axhline(watts / 1e3, color=INK, linewidth=1.0, linestyle=style)
    axes.plot([], [], ":", color=INK, label="greatest that the missions ask")
    axes.axhline(0.0, color=INK, linewidth=0.8)
    axes.set_xlabel("coolant at the inlet in degC")
    axes.set_ylabel("power in kW")
    legend_above(axes, 3)
    finish(axes)
    first, last = found.points[0], found.points[-1]
    caption = (
        f"Power that the stage holds for good: {first.discharge_w / 1e3:.4g} kW out, {first.charge_w / 1e3:.4g} kW in"
        f" at {first.coolant_degc:.4g} degC. Short peaks may pass above it."
    )
    alt = (
        f"Derating from {first.coolant_degc:.4g} to {last.coolant_degc:.4g} degC: discharge falls from"
        f" {first.discharge_w / 1e3:.4g} to {last.discharge_w / 1e3:.4g} kW."
    )
    return Picture(figure, caption, alt)


def write_derating(found: Derating, folder: Path) -> Path:
    """Write the picture into a folder and return the file.

    Raises
    ------
    InputError
        If the folder cannot be written.
    """
    path = folder / "derating.png"
    beside = path.with_suffix(".png.new")
    try:
        folder.mkdir(parents=True, exist_ok=True)
        draw_derating(found).figure.savefig(beside, format="png", dpi=150, metadata={"Software": None})
        beside.replace(path)
    except OSError as error:
        raise InputError(f"{path} cannot be written: {error.strerror}; give another folder with --out") from error
    return path
