"""A profile's passport: what is in it, before anything is computed from it."""

from __future__ import annotations

import dataclasses
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tideleg.mission.profile import Profile
from tideleg.waveform import FloatArray

WINDOWS_S = (1.0, 10.0, 60.0, 1800.0)
"""Windows of the greatest rms [s]."""


@dataclass(frozen=True)
class Passport:
    """What is in a profile; powers in W, energies in J, times in s from the start.

    rms_by_window_w : window [s] -> greatest rms over any window of that length; None where the profile is shorter
    longest_run_s : longest time without a break above `run_above_w` (half the peak, by magnitude)
    inside_discharge_w, inside_charge_w : greatest power inside any step, where the file tells it, else None
    steepest_w_per_s : greatest change between neighbouring rows over the time between them
    """

    steps: int
    step_least_s: float
    step_median_s: float
    step_greatest_s: float
    duration_s: float
    discharge_j: float
    charge_j: float
    net_j: float
    peak_discharge_w: float
    peak_discharge_s: float
    peak_charge_w: float
    peak_charge_s: float
    mean_w: float
    rms_w: float
    rms_by_window_w: dict[float, float | None]
    idle_share: float
    steepest_w_per_s: float
    steepest_s: float
    run_above_w: float
    longest_run_s: float
    inside_discharge_w: float | None = None
    inside_charge_w: float | None = None

    def _step_sizes(self) -> tuple[float, float, float]:
        return self.step_least_s, self.step_median_s, self.step_greatest_s

    def to_dict(self) -> dict[str, Any]:
        """Return everything as plain numbers for JSON."""
        plain = dataclasses.asdict(self)
        plain["rms_by_window_w"] = {f"{window:g}": rms for window, rms in self.rms_by_window_w.items()}
        return plain

    def rows(self) -> list[tuple[str, str]]:
        """Return (label, text) for a table."""
        kwh = 3.6e6
        windows = [
            (f"greatest rms over {window:g} s", "profile is shorter" if rms is None else f"{rms / 1e3:.4g} kW")
            for window, rms in self.rms_by_window_w.items()
        ]
        return [
            ("steps", f"{self.steps}"),
            ("step, least / median / greatest", " / ".join(f"{step:g}" for step in self._step_sizes()) + " s"),
            ("duration", f"{self.duration_s:g} s ({self.duration_s / 3600:.4g} h)"),
            ("energy discharged", f"{self.discharge_j / kwh:.5g} kWh"),
            ("energy charged", f"{self.charge_j / kwh:.5g} kWh"),
            ("net, positive = discharge", f"{self.net_j / kwh:.5g} kWh"),
            ("peak discharge", f"{self.peak_discharge_w / 1e3:.5g} kW at {self.peak_discharge_s:g} s"),
            ("peak charge", f"{self.peak_charge_w / 1e3:.5g} kW at {self.peak_charge_s:g} s"),
            *self._inside_rows(),
            ("mean", f"{self.mean_w / 1e3:.4g} kW"),
            ("rms", f"{self.rms_w / 1e3:.4g} kW"),
            *windows,
            ("longest run above half the peak", f"{self.longest_run_s:g} s above {self.run_above_w / 1e3:.4g} kW"),
            ("steepest change", f"{self.steepest_w_per_s / 1e3:.4g} kW/s at {self.steepest_s:g} s"),
            ("share of time at zero power", f"{100 * self.idle_share:.3g} %"),
        ]

    def _inside_rows(self) -> list[tuple[str, str]]:
        pairs = (
            ("discharge", self.peak_discharge_w, self.inside_discharge_w),
            ("charge", self.peak_charge_w, self.inside_charge_w),
        )
        return [
            (f"peak {way} inside a step", f"between {mean / 1e3:.5g} kW (means) and {peak / 1e3:.5g} kW (file)")
            for way, mean, peak in pairs
            if peak is not None
        ]


def passport(profile: Profile) -> Passport:
    """Return the passport of a profile; exact for power held in unequal steps."""
    power, duration, time = profile.power_w, profile.duration_s, profile.time_s
    whole = float(duration.sum())
    high, low = int(np.argmax(power)), int(np.argmin(power))
    half = 0.5 * float(np.max(np.abs(power)))
    change = np.abs(np.diff(power)) / duration[:-1] if len(power) > 1 else np.zeros(1)
    steep = int(np.argmax(change))
    return Passport(
        steps=len(power),
        step_least_s=float(duration.min()),
        step_median_s=float(np.median(duration)),
        step_greatest_s=float(duration.max()),
        duration_s=whole,
        discharge_j=float(np.sum(np.maximum(power, 0.0) * duration)),
        charge_j=float(np.sum(np.maximum(-power, 0.0) * duration)),
        net_j=float(np.sum(power * duration)),
        peak_discharge_w=max(float(power[high]), 0.0),
        peak_discharge_s=float(time[high]),
        peak_charge_w=max(-float(power[low]), 0.0),
        peak_charge_s=float(time[low]),
        mean_w=float(np.sum(power * duration)) / whole,
        rms_w=float(np.sqrt(np.sum(power * power * duration) / whole)),
        rms_by_window_w={window: greatest_rms(power, duration, window) for window in WINDOWS_S},
        idle_share=float(np.sum(duration[power == 0.0])) / whole,
        steepest_w_per_s=float(change[steep]),
        steepest_s=float(time[steep + 1]) if len(power) > 1 else 0.0,
        run_above_w=half,
        longest_run_s=_longest_run(np.abs(power) > half, duration),
        inside_discharge_w=None if profile.power_peak_w is None else max(float(profile.power_peak_w.max()), 0.0),
        inside_charge_w=None if profile.power_valley_w is None else max(-float(profile.power_valley_w.min()), 0.0),
    )


def greatest_rms(power: FloatArray, duration: FloatArray, window: float) -> float | None:
    """Return the greatest rms over any window of one length [W]; None where the profile is shorter.

    The integral of the square is straight between the edges of steps, so the window with the greatest integral
    begins or ends at an edge: only those are looked at, exactly.
    """
    edges = np.concatenate([[0.0], np.cumsum(duration)])
    if window > edges[-1] * (1 + 1e-12):
        return None
    square = np.concatenate([[0.0], np.cumsum(power * power * duration)])
    begins = np.concatenate([edges, edges - window])
    begins = begins[(begins >= 0.0) & (begins + window <= edges[-1] * (1 + 1e-12))]
    inside = np.interp(begins + window, edges, square) - np.interp(begins, edges, square)
    return float(np.sqrt(max(float(inside.max()), 0.0) / window))


def _longest_run(above: NDArray[np.bool_], duration: FloatArray) -> float:
    edges = np.concatenate([[0.0], np.cumsum(duration)])
    steps = np.diff(np.concatenate([[0], np.asarray(above, dtype=np.int8), [0]]))
    begins, ends = np.flatnonzero(steps == 1), np.flatnonzero(steps == -1)
    return float(np.max(edges[ends] - edges[begins])) if len(begins) else 0.0
