"""Pictures of an outcome: one idea each, axes with units, readable in grey. Long traces are drawn as envelopes."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from tideleg.outcome import MissionResult, Outcome
from tideleg.report.words import plain

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from tideleg.waveform import FloatArray

INK, BLUE, SAND, STONE = "#1c2733", "#1f5f8b", "#d9a441", "#8a949e"
SHADES = (BLUE, SAND, STONE, INK)
DASHES = ("-", "--", "-.", ":")
HATCHES = ("", "///", "...")
COLUMNS = 900
"""Pixel columns of a trace: more steps than this are drawn as the envelope of least and greatest."""


def draw_all(outcome: Outcome) -> dict[str, tuple[Figure, str]]:
    """Return every picture with its caption, by file name."""
    drawn: dict[str, tuple[Figure, str]] = {}
    for mission in outcome.missions:
        end = "" if len(outcome.missions) == 1 else f"-{mission.name}"
        drawn[f"power{end}"] = draw_power(mission)
        if outcome.thermal:
            drawn[f"temperatures{end}"] = draw_temperatures(outcome, mission)
    if any(entry.total_j > 0.0 for mission in outcome.missions for entry in mission.losses):
        drawn["losses"] = draw_losses(outcome)
    if outcome.limits:
        drawn["margins"] = draw_margins(outcome)
    if outcome.worst.traces:
        drawn["waveforms"] = draw_waveforms(outcome)
    return drawn


def _figure(width: float, height: float) -> Figure:
    from matplotlib.figure import Figure

    return Figure(figsize=(width, height), layout="constrained")


def _finish(axes: Axes) -> None:
    axes.grid(True, color="#d5dade", linewidth=0.6)
    axes.set_axisbelow(True)
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)


def time_scale(seconds: float) -> tuple[float, str]:
    """Return the divisor and the unit in which a duration reads well."""
    if seconds > 3 * 3600.0:
        return 3600.0, "h"
    return (60.0, "min") if seconds > 300.0 else (1.0, "s")


def envelope(time: FloatArray, value: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray] | None:
    """Return (time, least, greatest) by pixel column, or None where the trace is short enough to be drawn whole."""
    if len(value) <= 2 * COLUMNS:
        return None
    edges = np.linspace(time[0], time[-1], COLUMNS + 1)
    starts = np.unique(np.searchsorted(time, edges[:-1]))
    return time[starts], np.minimum.reduceat(value, starts), np.maximum.reduceat(value, starts)


def _trace(axes: Axes, time: FloatArray, value: FloatArray, **style: Any) -> bool:
    """Draw a held trace; return whether it was drawn as an envelope."""
    column = envelope(time, value)
    if column is None:
        axes.step(time, value, where="post", linewidth=1.2, **style)
        return False
    dash = style.pop("linestyle", "-")
    axes.fill_between(column[0], column[1], column[2], step="post", linewidth=0.6, linestyle=dash, **style)
    return True


def _caption(mission: MissionResult, drawn_as_envelope: bool) -> str:
    steps = f"{len(mission.steps)} steps"
    return f" Envelope of {steps}: no peak is lost." if drawn_as_envelope else f" {steps}."


def draw_power(mission: MissionResult) -> tuple[Figure, str]:
    """Draw requested and delivered power, and the state of charge below."""
    steps = mission.steps
    has_soc = "soc" in steps
    figure = _figure(8.6, 4.6 if has_soc else 3.2)
    panels = figure.subplots(2 if has_soc else 1, 1, sharex=True, squeeze=False, height_ratios=[2.4, 1][: 1 + has_soc])
    size, unit = time_scale(float(steps["time_s"].iloc[-1]))
    time = steps["time_s"].to_numpy() / size
    top = panels[0][0]
    dense = _trace(top, time, steps["power_requested_w"].to_numpy() / 1e3, color=STONE, label="requested")
    _trace(top, time, steps["power_w"].to_numpy() / 1e3, color=BLUE, label="delivered")
    top.axhline(0.0, color=INK, linewidth=0.8)
    top.set_ylabel("link power in kW\ndischarge +, charge -")
    top.legend(loc="lower left", bbox_to_anchor=(0.0, 1.0), ncols=2, frameon=False)
    _finish(top)
    if has_soc:
        bottom = panels[1][0]
        bottom.plot(time, 100.0 * steps["soc"].to_numpy(), color=INK, linewidth=1.4)
        bottom.set_ylabel("state of\ncharge in %")
        _finish(bottom)
    panels[-1][0].set_xlabel(f"time in {unit}")
    panels[-1][0].set_xlim(time[0], max(time[-1], time[0] + 1e-9))
    what = "Requested power lies behind delivered power; where it shows, power was curtailed."
    return figure, what + _caption(mission, dense)


def draw_temperatures(outcome: Outcome, mission: MissionResult) -> tuple[Figure, str]:
    """Draw the temperature of every part with the limits that the plan states."""
    steps = mission.steps
    figure = _figure(8.6, 3.8)
    axes = figure.subplots()
    size, unit = time_scale(float(steps["time_s"].iloc[-1]))
    time = steps["time_s"].to_numpy() / size
    dense = False
    for i, entry in enumerate(outcome.thermal):
        degc = steps[f"{entry.part}.temperature_degc"].to_numpy()
        shade, dash = SHADES[i % len(SHADES)], DASHES[i % len(DASHES)]
        column = envelope(time, degc)
        if column is not None:
            dense = True
            axes.fill_between(column[0], column[1], column[2], step="post", color=shade, alpha=0.35, linewidth=0)
            axes.plot(column[0], column[2], color=shade, linestyle=dash, linewidth=1.1, label=plain(entry.part))
        else:
            axes.step(time, degc, where="post", color=shade, linestyle=dash, linewidth=1.2, label=plain(entry.part))
    limits = {check.limit: check.name for check in outcome.limits if check.unit == "degC"}
    for limit, name in limits.items():
        axes.axhline(limit, color=INK, linewidth=1.0, linestyle=(0, (6, 3)))
        axes.annotate(
            f"limit: {name}", (1.0, limit), xycoords=("axes fraction", "data"), ha="right", va="bottom", fontsize=8
        )
    axes.set_ylabel("temperature in degC")
    axes.set_xlabel(f"time in {unit}")
    axes.set_xlim(time[0], max(time[-1], time[0] + 1e-9))
    axes.legend(loc="lower left", bbox_to_anchor=(0.0, 1.0), ncols=4, frameon=False)
    _finish(axes)
    return figure, "Temperature at the end of each step; line: greatest, band: least to greatest." + _caption(
        mission, dense
    )


def draw_losses(outcome: Outcome) -> tuple[Figure, str]:
    """Draw the mean loss of every mechanism, split by direction."""
    seconds = sum(m.passes_per_year * float(m.steps["duration_s"].sum()) for m in outcome.missions)
    parts: dict[str, FloatArray] = {}
    for mission in outcome.missions:
        for e in mission.losses:
            row = parts.setdefault(e.mechanism, np.zeros(3))
            row += mission.passes_per_year * np.array([e.discharge_j, e.charge_j, e.idle_j]) / seconds
    ordered = sorted(parts.items(), key=lambda item: item[1].sum())
    figure = _figure(8.6, 1.2 + 0.34 * len(ordered))
    axes = figure.subplots()
    names = [name for name, _ in ordered]
    left = np.zeros(len(ordered))
    for k, word in enumerate(("discharge", "charge", "idle")):
        values = np.array([row[k] for _, row in ordered])
        axes.barh(names, values, left=left, color=(BLUE, SAND, "white")[k], hatch=HATCHES[k], edgecolor=INK, label=word)
        left = left + values
    for i, whole in enumerate(left):
        axes.annotate(f" {whole:.3g}", (whole, i), va="center", fontsize=8)
    axes.set_xlabel("mean loss in W, all equal parts together")
    axes.legend(loc="lower right", frameon=True, edgecolor="none")
    axes.margins(x=0.1)
    _finish(axes)
    return figure, "Mean loss of the whole stage over the missions, by mechanism and direction of power."


def draw_margins(outcome: Outcome) -> tuple[Figure, str]:
    """Draw the share of every limit that is in use."""
    checks = list(reversed(outcome.limits))
    figure = _figure(8.6, 1.1 + 0.34 * len(checks))
    axes = figure.subplots()
    names = [f"{check.name}, {plain(check.part)}" for check in checks]
    shares = [min(100.0 * check.used, 160.0) for check in checks]
    shades = [BLUE if check.holds else SAND for check in checks]
    hatches = ["" if check.holds else "///" for check in checks]
    axes.barh(range(len(checks)), shares, color=shades, hatch=hatches, edgecolor=INK)
    axes.set_yticks(range(len(checks)), names)
    for i, check in enumerate(checks):
        beyond = " (bar cut)" if 100.0 * check.used > 160.0 else ""
        axes.annotate(f" {100.0 * check.used:.0f} %{beyond}", (shares[i], i), va="center", fontsize=8)
    axes.axvline(100.0, color=INK, linewidth=1.4)
    axes.set_xlim(0.0, max(118.0, max(shares) * 1.18))
    axes.set_xlabel("share of the limit in use, in %; the line at 100 % is the limit")
    _finish(axes)
    return figure, "How much of each limit is in use; a hatched bar does not hold."


def draw_waveforms(outcome: Outcome) -> tuple[Figure, str]:
    """Draw one switching period of every current at the worst instant."""
    worst = outcome.worst
    traces = worst.traces
    figure = _figure(8.6, 1.15 * len(traces) + 0.8)
    panels = figure.subplots(len(traces), 1, sharex=True, squeeze=False)[:, 0]
    period = max(float(trace.time_s.max(initial=0.0)) for trace in traces)
    for axes, trace in zip(panels, traces, strict=True):
        if len(trace.time_s):
            own = float(trace.time_s.max())
            repeats = max(1, round(period / own)) if own > 0.0 else 1
            time = np.concatenate([trace.time_s + k * own for k in range(repeats)])
            axes.plot(1e6 * time, np.tile(trace.current_a, repeats), color=BLUE, linewidth=1.5)
        axes.axhline(0.0, color=INK, linewidth=0.7)
        axes.set_title(trace.label, loc="left", fontsize=9)
        axes.set_ylabel("A")
        axes.margins(y=0.15)
        _finish(axes)
    panels[-1].set_xlabel("time within one switching period in µs")
    where = f"{worst.time_s:.6g} s of {worst.mission}"
    return figure, f"One switching period at {where} ({worst.why}); one leg, all chips of a position together."
