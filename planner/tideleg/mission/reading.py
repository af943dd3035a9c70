"""Reading a profile: a file taken as it stands, or refused with file, line and column. Nothing is repaired."""

from __future__ import annotations

import dataclasses
import hashlib
from pathlib import Path
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from tideleg.errors import ProfileError
from tideleg.mission.layout import UNITS, Column, Found, Layout
from tideleg.mission.profile import Profile
from tideleg.mission.road_load import Vehicle, at_wheels, stage_power
from tideleg.mission.rows import CHUNK_ROWS, Rows, in_si, read_rows
from tideleg.waveform import FloatArray

OVERRIDES = {
    "link_voltage": "link_voltage_v",
    "coolant": "coolant_degc",
    "ambient": "ambient_degc",
    "battery_temperature": "battery_degc",
    "power_max": "power_max_w",
    "power_min": "power_min_w",
}
"""Roles of columns that override the plan -> the profile's own names."""

STAMP_TOLERANCE = 1e-6
"""A duration may differ from the stamps by this much [s]."""


def read_profile(
    file: str | Path,
    *,
    name: str | None = None,
    terminals: Literal["link", "battery"] = "link",
    interpolation: Literal["hold", "linear"] = "hold",
    positive: Literal["discharge", "charge"] = "discharge",
    vehicle: Vehicle | None = None,
    layout: Layout | None = None,
    chunk_rows: int = CHUNK_ROWS,
) -> Profile:
    """Read one profile.

    Parameters
    ----------
    file : text with a header: time_s, one of power_w, power_kw, power_mw, speed_m_s, speed_km_h, speed_mph; optional
        duration_s and the columns that override the plan. Other names, units in brackets, separators, decimal commas
        and kinds of time stamps are taken where they are certain. Parquet with such columns, where pyarrow is installed
    name : for the outputs; the file's stem if None
    terminals : where the power is meant
    interpolation : "hold": a row holds from its stamp to the next; "linear": straight between two rows, each interval
        then carries the mean of both
    positive : which direction is positive in the file
    vehicle : needed for a speed profile
    layout : what is declared of the file
    chunk_rows : rows that are held as text at a time; the result does not depend on it

    Raises
    ------
    ProfileError
        If the file cannot be used as it stands; line (from 1, header included) and column are named.
    """
    path, layout = Path(file), layout or Layout()
    rows = _parquet(path) if path.suffix.lower() == ".parquet" else read_rows(path, layout, chunk_rows)
    kind = rows.found.columns[rows.found.value].name
    time, values = rows.columns["time"], in_si(rows)
    _refuse_backward(path, rows)
    steps = _Steps(path, rows, layout)
    is_speed = rows.found.value == "speed"
    rules = [*rows.notes, _holding_rule(interpolation, is_speed, steps.closes), *steps.notes]
    overrides = {own: steps.held(rows.columns[role]) for role, own in OVERRIDES.items() if role in rows.columns}
    speed, friction = None, 0.0
    if is_speed:
        if vehicle is None:
            raise ProfileError("a speed profile needs [vehicle] in the plan to become power", file=path, column=kind)
        if steps.declared:
            what = "a speed profile takes no durations: speed runs from row to row"
            raise ProfileError(what, file=path, column="duration_s")
        wheel = at_wheels(vehicle, values, steps.duration)
        demanded = stage_power(vehicle, wheel, steps.duration)
        power, speed, friction = demanded.power, wheel.speed, demanded.friction_j
        rules.append(f"{kind} became power by the road load of the plan's vehicle, interval by interval, at mean speed")
        rules.append(f"friction brakes take {friction / 3.6e6:.4g} kWh a pass at the wheels, which is not recovered")
    else:
        linear = interpolation == "linear" and not steps.declared
        watts = values * (1.0 if positive == "discharge" else -1.0)
        power = 0.5 * (watts[1:] + watts[:-1]) if linear else steps.held(watts)
        rules.append(f"{kind} is power at the {terminals} terminals; positive in the file is {positive}")
    _refuse_bad_overrides(path, rows, overrides)
    peak, valley = _inside(path, rows, steps, positive)
    profile = Profile(
        name or path.stem,
        path,
        rows.sha256,
        terminals,
        time_s=time[: len(steps.duration)] - time[0],
        duration_s=steps.duration,
        power_w=power,
        power_peak_w=peak,
        power_valley_w=valley,
        speed_m_s=speed,
        braked_by_friction_j=friction,
        rules=tuple(rules),
        **overrides,
    )
    if layout.gap == "zero" and len(steps.holes):
        return _with_zeros(path, profile, steps.holes, layout, interpolation)
    return profile


def _inside(path: Path, rows: Rows, steps: _Steps, positive: str) -> tuple[FloatArray | None, FloatArray | None]:
    """Return the greatest and the least power inside each step where the file tells them [W]; None where it does not.

    Raises
    ------
    ProfileError
        If the mean power of a row does not lie between them, or they stand beside a speed.
    """
    found = [role for role in ("power_peak", "power_valley") if role in rows.columns]
    if not found:
        return None, None
    if rows.found.value != "power":
        what = "power inside a step stands beside a speed; give it with a power"
        raise ProfileError(what, file=path, column=rows.found.columns[found[0]].name)
    size = UNITS[str(rows.found.columns["power"].unit)][1]
    mean = rows.columns["power"]
    for role, sign in (("power_peak", 1.0), ("power_valley", -1.0)):
        beyond = sign * (mean - rows.columns[role]) > 0.0 if role in rows.columns else np.zeros(1, dtype=bool)
        if np.any(beyond):
            row = int(np.argmax(beyond))
            what = "the mean power of the row does not lie between the least and the greatest inside it"
            raise ProfileError(what, file=path, line=int(rows.line[row]), column=rows.found.columns[role].name)
    peak, valley = (steps.held(rows.columns[role] * size) if role in rows.columns else None for role in ROLES_INSIDE)
    if positive == "discharge":
        return peak, valley
    return (None if valley is None else -valley), (None if peak is None else -peak)


ROLES_INSIDE = ("power_peak", "power_valley")
INSIDE_OR_MEAN = ("power_w", "power_peak_w", "power_valley_w")
"""Powers that are none in a hole that is declared to hold no power."""


class _Steps:
    """The steps between the rows of a file, and the holes among them."""

    def __init__(self, path: Path, rows: Rows, layout: Layout) -> None:
        time = rows.columns["time"]
        self.declared = "duration" in rows.columns
        self.closes = not self.declared
        self.notes: list[str] = []
        if self.declared:
            self.duration = rows.columns["duration"]
            _refuse_bad_durations(path, rows, self.duration)
        elif len(time) < 2:
            raise ProfileError(
                "the file holds one row, which says nothing about how long it lasts; add a closing row or duration_s",
                file=path,
            )
        else:
            self.duration = np.diff(time)
        self.holes = self._holes(path, rows, layout)

    def held(self, values: FloatArray) -> FloatArray:
        """Return the value that holds in each step: that of the row at its beginning."""
        return values[: len(self.duration)]

    def _holes(self, path: Path, rows: Rows, layout: Layout) -> NDArray[np.int64]:
        """Return the steps that are holes; refuse them unless a rule is declared."""
        if layout.longest_gap_s is None:
            return np.zeros(0, dtype=np.int64)
        holes = np.flatnonzero(self.duration > layout.longest_gap_s).astype(np.int64)
        if len(holes) and layout.gap == "refuse":
            first = int(holes[0])
            raise ProfileError(
                f"nothing is logged for {self.duration[first]:g} s, more than longest_gap = {layout.longest_gap_s:g} s"
                f" ({len(holes)} such holes). Declare layout = {{ gap = 'hold' }} or 'zero' to say what held there",
                file=path,
                line=int(rows.line[first]),
            )
        if len(holes):
            what = (
                "the row before each holds on"
                if layout.gap == "hold"
                else (f"the row before each holds for {layout.longest_gap_s:g} s, then no power flows")
            )
            seconds = float(self.duration[holes].sum())
            self.notes.append(
                f"{len(holes)} holes longer than {layout.longest_gap_s:g} s, {seconds:g} s in all: {what}"
            )
        return holes


def _with_zeros(path: Path, profile: Profile, holes: NDArray[np.int64], layout: Layout, interpolation: str) -> Profile:
    """Return the profile with a step of no power in each hole, after the longest gap that the row before may fill."""
    if profile.speed_m_s is not None or interpolation == "linear":
        raise ProfileError("gap = 'zero' is for power that holds from row to row; use gap = 'hold' here", file=path)
    longest = float(layout.longest_gap_s or 0.0)
    after = holes + 1
    duration = profile.duration_s.copy()
    rest = duration[holes] - longest
    duration[holes] = longest
    changes: dict[str, Any] = {}
    for key in (*INSIDE_OR_MEAN, *OVERRIDES.values()):
        values = getattr(profile, key)
        if values is not None:
            changes[key] = np.insert(values, after, 0.0 if key in INSIDE_OR_MEAN else values[holes])
    duration = np.insert(duration, after, rest)
    time = np.concatenate([[0.0], np.cumsum(duration)[:-1]])
    return dataclasses.replace(profile, duration_s=duration, time_s=time, **changes)


def _holding_rule(interpolation: str, is_speed: bool, closes: bool) -> str:
    if is_speed:
        return "speed runs straight from row to row"
    if interpolation == "linear" and closes:
        return "power runs straight from row to row; each interval carries the mean of both, peaks inside are averaged"
    last = "the last row only closes the file" if closes else "each row holds for its own duration_s"
    return f"a row holds from its time stamp to the next; {last}"


def _refuse_backward(path: Path, rows: Rows) -> None:
    time = rows.columns["time"]
    steps = np.diff(time)
    if np.any(steps <= 0.0):
        row = int(np.argmax(steps <= 0.0)) + 1
        since = time - time[0] if abs(time[0]) > 1e6 else time  # dates count from a far origin
        what = "repeats the time before" if steps[row - 1] == 0.0 else f"goes back from {since[row - 1]:g} s"
        change = "; at a change of the clock, give the stamps their offset" if abs(time[0]) > 1e6 else ""
        raise ProfileError(
            f"{since[row]:g} s {what}; time must rise from row to row{change}",
            file=path,
            line=int(rows.line[row]),
            column=rows.found.columns["time"].name,
        )


def _refuse_bad_durations(path: Path, rows: Rows, duration: FloatArray) -> None:
    gaps = np.diff(rows.columns["time"])
    bad = duration <= 0.0
    bad[:-1] |= np.abs(duration[:-1] - gaps) > STAMP_TOLERANCE
    if np.any(bad):
        row = int(np.argmax(bad))
        due = f"; the stamps say {gaps[row]:g} s" if row < len(gaps) else ""
        raise ProfileError(
            f"found {duration[row]:g} s{due}. A duration is above zero and runs to the next stamp",
            file=path,
            line=int(rows.line[row]),
            column=rows.found.columns["duration"].name,
        )


def _refuse_bad_overrides(path: Path, rows: Rows, overrides: dict[str, FloatArray]) -> None:
    voltage = overrides.get("link_voltage_v")
    if voltage is not None and np.any(voltage <= 0.0):
        row = int(np.argmax(voltage <= 0.0))
        what = f"found {voltage[row]:g} V; a link voltage is above zero"
        raise ProfileError(what, file=path, line=int(rows.line[row]), column="link_voltage_v")
    low, high = overrides.get("power_min_w"), overrides.get("power_max_w")
    if low is not None and high is not None and np.any(low > high):
        row = int(np.argmax(low > high))
        line = int(rows.line[row])
        raise ProfileError("power_min_w is above power_max_w", file=path, line=line, column="power_min_w")


def _parquet(path: Path) -> Rows:
    """Return the rows of a Parquet file; its columns carry the names of a plain text profile and are numbers."""
    from tideleg.mission.layout import find_columns

    try:
        import pyarrow.parquet  # type: ignore[import-not-found]
    except ImportError:
        raise ProfileError(
            "reading Parquet needs the package pyarrow, which is not installed; install it (extra 'parquet'), or give"
            " the profile as CSV",
            file=path,
        ) from None
    if not path.is_file():
        raise ProfileError("the file does not exist; check the path", file=path)
    table = pyarrow.parquet.read_table(path)
    found: Found = find_columns(path, list(table.column_names))
    columns = {}
    for role, column in found.columns.items():
        values = np.asarray(table.column(column.position).to_numpy(), dtype=np.float64)
        if not np.all(np.isfinite(values)):
            row = int(np.argmin(np.isfinite(values)))
            raise ProfileError("a value is missing or not finite", file=path, line=row + 1, column=column.name)
        columns[role] = values
    line = np.arange(1.0, len(columns["time"]) + 1.0)
    if not len(line):
        raise ProfileError("the file holds no rows", file=path)
    digest = hashlib.sha256(path.read_bytes()).hexdigest()
    return Rows(columns, line, found, digest, ("rows are counted from 1, as Parquet has no lines",))


__all__ = ["Column", "Layout", "read_profile"]
