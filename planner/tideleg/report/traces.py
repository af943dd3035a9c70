"""Pictures over time: power with state of charge, temperatures, and one switching period at the worst instant."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from tideleg.outcome import MissionResult, Outcome, ThermalEntry, Trace
from tideleg.report.drawing import (
    BLUE,
    INK,
    SAND,
    STONE,
    Picture,
    draw_held,
    drawn_of,
    envelope,
    finish,
    legend_above,
    new_figure,
    time_scale,
)
from tideleg.report.words import plain, time_text

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from tideleg.waveform import FloatArray


def step_edges(mission: MissionResult) -> tuple[FloatArray, str]:
    """Return the begin of each step and the end of the last, in the unit of time that is named with them."""
    begin, duration = mission.steps["time_s"].to_numpy(), mission.steps["duration_s"].to_numpy()
    edges = np.append(begin, begin[-1] + duration[-1])
    size, unit = time_scale(float(edges[-1] - edges[0]))
    return edges / size, unit


def draw_power(mission: MissionResult) -> Picture:
    """Draw requested and delivered power, and the state of charge below where it is modelled."""
    steps = mission.steps
    has_soc = "soc" in steps
    figure = new_figure(4.8 if has_soc else 3.4)
    ratios = [2.4, 1.0] if has_soc else [1.0]
    panels = figure.subplots(len(ratios), 1, sharex=True, squeeze=False, height_ratios=ratios)[:, 0]
    edges, unit = step_edges(mission)
    top = panels[0]
    draw_held(top, edges, steps["power_requested_w"].to_numpy() / 1e3, STONE, "requested", dash="--")
    draw_held(top, edges, steps["power_w"].to_numpy() / 1e3, BLUE, "delivered")
    curtailed = steps["curtailed_w"].to_numpy() != 0.0
    if curtailed.any():
        _mark_curtailed(top, edges, curtailed)
    top.axhline(0.0, color=INK, linewidth=0.8)
    top.set_ylabel("power at the link in kW\ndischarge +, charge \u2212")
    legend_above(top, 3)
    finish(top)
    if has_soc:
        start = mission.battery.start_soc
        soc = np.concatenate([[steps["soc"].iloc[0] if start is None else start], steps["soc"].to_numpy()])
        panels[1].plot(edges, 100.0 * soc, color=INK, linewidth=1.4)
        panels[1].set_ylabel("state of\ncharge in %")
        finish(panels[1])
    panels[-1].set_xlabel(f"time in {unit}")
    panels[-1].set_xlim(edges[0], edges[-1])
    figure.align_ylabels()
    below = " State of charge below, at the end of each step." if has_soc else ""
    cut = (
        f" The bar at the foot marks {int(curtailed.sum())} curtailed steps." if curtailed.any() else " None curtailed."
    )
    greatest, least = steps["power_w"].max() / 1e3, steps["power_w"].min() / 1e3
    alt = f"Link power of {mission.name} over time, from {least:.4g} to {greatest:.4g} kW.{cut}{below}"
    caption = f"Power requested and delivered in {mission.name}.{cut}{below} {drawn_of(len(steps))}"
    return Picture(figure, caption, alt)


def _mark_curtailed(axes: Axes, edges: FloatArray, curtailed: FloatArray) -> None:
    """Mark curtailed steps by a bar at the foot: a difference of two traces can be too thin to be seen."""
    band = envelope(edges, curtailed.astype(float))
    begin, marked = (edges, curtailed) if band is None else (band.begin, band.greatest > 0.0)
    where = np.append(marked, marked[-1])
    foot = axes.get_xaxis_transform()
    axes.fill_between(begin, 0.0, 0.035, where=where, step="post", transform=foot, color=INK, label="curtailed")


def draw_temperatures(outcome: Outcome, mission: MissionResult) -> Picture:
    """Draw the temperature of every part in a panel of its own, with the limit that the plan states for it."""
    entries = outcome.thermal
    figure = new_figure(0.7 + 1.35 * len(entries))
    panels = figure.subplots(len(entries), 1, sharex=True, squeeze=False)[:, 0]
    edges, unit = step_edges(mission)
    told = [
        _temperature_panel(axes, entry, outcome, mission, edges) for axes, entry in zip(panels, entries, strict=True)
    ]
    panels[-1].set_xlabel(f"time in {unit}")
    panels[-1].set_xlim(edges[0], edges[-1])
    figure.supylabel("temperature in degC", fontsize=10)
    caption = (
        f"Temperature of one part of each sort in {mission.name} at the end of each step; dot: the greatest; dashed:"
        f" its limit. {drawn_of(len(mission.steps))}"
    )
    return Picture(figure, caption, f"Temperatures in {mission.name}: {'; '.join(told)}.")


def _temperature_panel(
    axes: Axes, entry: ThermalEntry, outcome: Outcome, mission: MissionResult, edges: FloatArray
) -> str:
    """Draw one part and return what is to be seen, in words."""
    degc = mission.steps[f"{entry.part}.temperature_degc"].to_numpy()
    band = envelope(edges, degc)
    if band is None:
        axes.plot(edges[1:], degc, color=BLUE, linewidth=1.3)
    else:
        axes.fill_between(band.begin[:-1], band.least, band.greatest, color=BLUE, linewidth=0.6)
    row = int(degc.argmax())
    axes.plot(edges[row + 1], degc[row], "o", color=SAND, markeredgecolor=INK, markersize=6, clip_on=False, zorder=5)
    limits = [c.limit for c in outcome.limits if c.unit == "degC" and c.part == entry.part]
    for limit in limits:
        axes.axhline(limit, color=INK, linewidth=1.2, linestyle=(0, (6, 3)))
    stated = "".join(f", limit {limit:g} degC" for limit in limits) or ", no limit stated"
    title = f"{plain(entry.part)}: greatest {degc[row]:.1f} degC{stated}"
    axes.set_title(title, loc="left", fontsize=9)
    low, high = float(degc.min()), max([float(degc.max()), *limits])
    room = max(0.08 * (high - low), 0.5)
    axes.set_ylim(low - room, high + room)
    finish(axes)
    return title


def has_waveforms(outcome: Outcome) -> bool:
    """Return whether the worst instant has any waveform to draw; an idle stage has none."""
    return any(_length(trace) > 0.0 for trace in outcome.worst.traces)


def draw_waveforms(outcome: Outcome) -> Picture:
    """Draw one switching period of every current at the worst instant, in panels that share the axis of time."""
    worst = outcome.worst
    traces = [trace for trace in worst.traces if _length(trace) > 0.0]
    figure = new_figure(0.7 + 1.2 * len(traces))
    panels = figure.subplots(len(traces), 1, sharex=True, squeeze=False)[:, 0]
    period = max(_length(trace) for trace in traces)
    for axes, trace in zip(panels, traces, strict=True):
        time, ampere = _repeated(trace, period)
        axes.axhline(0.0, color=INK, linewidth=0.7)
        axes.plot(1e6 * time, ampere, color=BLUE, linewidth=1.5)
        axes.set_title(trace.label, loc="left", fontsize=9)
        axes.set_ylabel("A", rotation=0, labelpad=8)
        axes.margins(y=0.15)
        finish(axes)
    panels[-1].set_xlabel("time within one switching period in \u00b5s")
    panels[-1].set_xlim(0.0, 1e6 * period)
    figure.align_ylabels()
    when = time_text(worst.time_s, worst.mission)
    caption = (
        f"Currents over one switching period at {when} ({worst.why}). One of each sort of part, the chips of a"
        " position together; capacitors carry what the port exchanges less its mean."
    )
    spans = (f"{t.label} from {t.current_a.min():.4g} to {t.current_a.max():.4g} A" for t in traces)
    return Picture(figure, caption, f"Waveforms at {when}: {'; '.join(spans)}.")


def _length(trace: Trace) -> float:
    return float(np.ptp(trace.time_s)) if len(trace.time_s) else 0.0


def _repeated(trace: Trace, period: float) -> tuple[FloatArray, FloatArray]:
    """Return the trace repeated until it covers the period; folded currents have a shorter period of their own."""
    own = _length(trace)
    turns = np.arange(-1, round(period / own) + 1)
    time = (trace.time_s[None, :] + own * turns[:, None]).ravel()
    return time, np.tile(trace.current_a, len(turns))
