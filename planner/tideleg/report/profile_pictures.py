"""Pictures of a profile before anything is computed from it: trace, duration curve, rms by window, energy by power."""

from __future__ import annotations

import numpy as np

from tideleg.mission import Passport, Profile
from tideleg.report.drawing import (
    BLUE,
    SAND,
    Picture,
    draw_held,
    drawn_of,
    finish,
    legend_above,
    new_figure,
    time_scale,
)

BINS = 40
"""Bars of the histogram."""


def draw_profile(profile: Profile, found: Passport) -> dict[str, Picture]:
    """Return the pictures of one profile by the name of their file."""
    return {
        "trace": _trace(profile),
        "duration-curve": _duration_curve(profile),
        "rms-by-window": _rms_by_window(found),
        "energy-by-power": _energy_by_power(profile),
    }


def _trace(profile: Profile) -> Picture:
    figure = new_figure(2.8)
    axes = figure.add_subplot()
    edges = np.append(profile.time_s, profile.time_s[-1] + profile.duration_s[-1])
    scale, unit = time_scale(float(edges[-1]))
    draw_held(axes, edges / scale, profile.power_w / 1e3, BLUE, "power")
    axes.set_xlabel(f"time in {unit}")
    axes.set_ylabel("power in kW\ndischarge +, charge \N{MINUS SIGN}")
    finish(axes)
    return Picture(figure, f"Power over time. {drawn_of(len(profile.power_w))}", "Power of the profile over time")


def _duration_curve(profile: Profile) -> Picture:
    figure = new_figure(2.8)
    axes = figure.add_subplot()
    order = np.argsort(-profile.power_w, kind="stable")
    edges = np.concatenate([[0.0], np.cumsum(profile.duration_s[order])])
    draw_held(axes, 100.0 * edges / edges[-1], profile.power_w[order] / 1e3, BLUE, "power")
    axes.set_xlabel("share of time at this power or above in %")
    axes.set_ylabel("power in kW")
    finish(axes)
    return Picture(figure, "How long the profile holds each power or more.", "Power against share of time, sorted")


def _rms_by_window(found: Passport) -> Picture:
    figure = new_figure(2.8)
    axes = figure.add_subplot()
    pairs = [(window, rms) for window, rms in found.rms_by_window_w.items() if rms is not None]
    pairs.append((found.duration_s, found.rms_w))
    window, rms = np.array(sorted(pairs)).T
    axes.plot(window, rms / 1e3, color=BLUE, marker="o", linewidth=1.4)
    axes.set_xscale("log")
    axes.set_ylim(bottom=0.0)
    axes.set_xlabel("window in s, the last is the whole profile")
    axes.set_ylabel("greatest rms in kW")
    finish(axes)
    return Picture(figure, "Greatest rms over any window of each length.", "Greatest rms against length of window")


def _energy_by_power(profile: Profile) -> Picture:
    figure = new_figure(2.8)
    axes = figure.add_subplot()
    energy, power = profile.power_w * profile.duration_s / 3.6e6, profile.power_w / 1e3
    borders = np.histogram_bin_edges(power, BINS)
    for part, shade, label in ((energy > 0.0, BLUE, "discharge"), (energy < 0.0, SAND, "charge")):
        height, _ = np.histogram(power[part], borders, weights=np.abs(energy[part]))
        axes.stairs(height, borders, fill=True, color=shade, label=label)
    axes.set_xlabel("power in kW")
    axes.set_ylabel("energy in kWh")
    legend_above(axes, 2)
    finish(axes)
    return Picture(figure, "Energy that flows at each power.", "Histogram of energy by power, discharge and charge")
