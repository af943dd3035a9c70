"""Reading a profile: a CSV file taken as it stands, or refused with file, line and column. Nothing is repaired."""

from __future__ import annotations

import hashlib
import io
import warnings
from pathlib import Path
from typing import TYPE_CHECKING, Literal

import numpy as np

from tideleg.errors import ProfileError
from tideleg.mission.profile import Profile
from tideleg.mission.road_load import Vehicle, at_wheels, stage_power

if TYPE_CHECKING:
    import pandas as pd

    from tideleg.waveform import FloatArray

POWER = {"power_w": 1.0, "power_kw": 1e3, "power_mw": 1e6}
SPEED = {"speed_m_s": 1.0, "speed_km_h": 1.0 / 3.6, "speed_mph": 0.44704}
OVERRIDES = ("link_voltage_v", "coolant_degc", "ambient_degc", "power_max_w", "power_min_w")
KNOWN = ("time_s", "duration_s", *POWER, *SPEED, *OVERRIDES)

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
) -> Profile:
    """Read one profile.

    Parameters
    ----------
    file : CSV with a header: time_s, one of power_w, power_kw, power_mw, speed_m_s, speed_km_h, speed_mph; optional
        duration_s and the columns that override the plan
    name : for the outputs; the file's stem if None
    terminals : where the power is meant
    interpolation : "hold": a row holds from its stamp to the next; "linear": straight between two rows, each interval
        then carries the mean of both
    positive : which direction is positive in the file
    vehicle : needed for a speed profile

    Raises
    ------
    ProfileError
        If the file cannot be used as it stands; line (from 1, header included) and column are named.
    """
    path = Path(file)
    table, digest = _table(path)
    kind = _value_column(path, table)
    time = _numbers(path, table, "time_s")
    _refuse_backward(path, time)
    values = _numbers(path, table, kind)
    steps = _Steps(path, table, time)
    rules = [_holding_rule(interpolation, kind in SPEED, steps.closes)]
    overrides = {key: steps.held(_numbers(path, table, key)) for key in OVERRIDES if key in table}
    speed, friction = None, 0.0
    if kind in SPEED:
        if vehicle is None:
            raise ProfileError("a speed profile needs [vehicle] in the plan to become power", file=path, column=kind)
        if steps.declared:
            what = "a speed profile takes no durations: speed runs from row to row"
            raise ProfileError(what, file=path, column="duration_s")
        wheel = at_wheels(vehicle, values * SPEED[kind], steps.duration)
        demanded = stage_power(vehicle, wheel, steps.duration)
        power, speed, friction = demanded.power, wheel.speed, demanded.friction_j
        rules.append(f"{kind} became power by the road load of the plan's vehicle, interval by interval, at mean speed")
        rules.append(f"friction brakes take {friction / 3.6e6:.4g} kWh a pass at the wheels, which is not recovered")
    else:
        linear = interpolation == "linear" and not steps.declared
        watts = values * POWER[kind] * (1.0 if positive == "discharge" else -1.0)
        power = 0.5 * (watts[1:] + watts[:-1]) if linear else steps.held(watts)
        rules.append(f"{kind} is power at the {terminals} terminals; positive in the file is {positive}")
    _refuse_bad_overrides(path, overrides)
    return Profile(
        name or path.stem,
        path,
        digest,
        terminals,
        time_s=time[: len(steps.duration)] - time[0],
        duration_s=steps.duration,
        power_w=power,
        speed_m_s=speed,
        braked_by_friction_j=friction,
        rules=tuple(rules),
        **overrides,
    )


class _Steps:
    """The steps between the rows of a file."""

    def __init__(self, path: Path, table: pd.DataFrame, time: FloatArray) -> None:
        self.declared = "duration_s" in table
        self.closes = not self.declared
        if self.declared:
            self.duration = _numbers(path, table, "duration_s")
            _refuse_bad_durations(path, self.duration, time)
        elif len(time) < 2:
            raise ProfileError(
                "the file holds one row, which says nothing about how long it lasts; add a closing row or duration_s",
                file=path,
            )
        else:
            self.duration = np.diff(time)

    def held(self, values: FloatArray) -> FloatArray:
        """Return the value that holds in each step: that of the row at its beginning."""
        return values[: len(self.duration)]


def _holding_rule(interpolation: str, is_speed: bool, closes: bool) -> str:
    if is_speed:
        return "speed runs straight from row to row"
    if interpolation == "linear" and closes:
        return "power runs straight from row to row; each interval carries the mean of both, peaks inside are averaged"
    last = "the last row only closes the file" if closes else "each row holds for its own duration_s"
    return f"a row holds from its time stamp to the next; {last}"


def _table(path: Path) -> tuple[pd.DataFrame, str]:
    import pandas as pd

    try:
        raw = path.read_bytes()
    except FileNotFoundError:
        raise ProfileError("the file does not exist; check the path", file=path) from None
    except OSError as error:
        raise ProfileError(f"the file cannot be read ({error.strerror})", file=path) from None
    digest = hashlib.sha256(raw).hexdigest()
    try:
        text = raw.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = raw[: error.start].count(b"\n") + 1
        raise ProfileError("the file is not UTF-8 text; save it so", file=path, line=line) from None
    if not text.strip():
        raise ProfileError("the file is empty", file=path)
    header = text.splitlines()[0]
    columns = [cell.strip().strip('"') for cell in header.split(",")]
    _refuse_bad_header(path, header, columns)
    try:
        rows = io.StringIO(text)
        with warnings.catch_warnings():
            warnings.simplefilter("error", pd.errors.ParserWarning)  # it would drop the cells beyond the header
            table = pd.read_csv(rows, names=columns, header=0, dtype=str, keep_default_na=False, index_col=False)
    except (pd.errors.ParserError, pd.errors.ParserWarning) as error:
        raise ProfileError(f"the rows do not fit the header: {error}", file=path) from None
    if table.empty:
        raise ProfileError("the file holds a header and no rows", file=path)
    return table, digest


def _refuse_bad_header(path: Path, header: str, columns: list[str]) -> None:
    for separator, word in ((";", "semicolons"), ("\t", "tabs")):
        if separator in header and "," not in header:
            raise ProfileError(f"found {word} between the columns; save it with commas", file=path, line=1)
    unknown = [column for column in columns if column not in KNOWN]
    if unknown:
        raise ProfileError(
            f"found the column {unknown[0]!r}; allowed are {', '.join(KNOWN)}. Rename or remove it", file=path, line=1
        )
    double = [column for column in columns if columns.count(column) > 1]
    if double:
        raise ProfileError(f"the column {double[0]!r} stands twice", file=path, line=1)
    if "time_s" not in columns:
        raise ProfileError(f"the column time_s is missing; found {', '.join(columns)}", file=path, line=1)


def _value_column(path: Path, table: pd.DataFrame) -> str:
    found = [column for column in (*POWER, *SPEED) if column in table]
    if len(found) != 1:
        wanted = ", ".join((*POWER, *SPEED))
        what = f"one column of power or speed is needed ({wanted}); found {', '.join(found) or 'none'}"
        raise ProfileError(what, file=path, line=1)
    return found[0]


def _numbers(path: Path, table: pd.DataFrame, column: str) -> FloatArray:
    """Return a column as finite numbers, or name the first cell that is none."""
    import pandas as pd

    values = np.array(pd.to_numeric(table[column].str.strip(), errors="coerce"), dtype=np.float64)
    bad = ~np.isfinite(values)
    if np.any(bad):
        row = int(np.argmax(bad))
        given = table[column].iloc[row]
        cell = given.strip() if isinstance(given, str) else ""
        what = "the value is missing" if not cell else f"found {cell!r}, which is no finite number"
        raise ProfileError(
            f"{what}. Fill it or drop the row; nothing is guessed", file=path, line=_line(path, row), column=column
        )
    return values


def _line(path: Path, row: int) -> int:
    """Return the line of a data row, counting from 1 with the header; blank lines are counted as they stand."""
    filled = [n for n, text in enumerate(path.read_text(encoding="utf-8-sig").splitlines(), start=1) if text.strip()]
    return filled[row + 1]


def _refuse_backward(path: Path, time: FloatArray) -> None:
    steps = np.diff(time)
    if np.any(steps <= 0.0):
        row = int(np.argmax(steps <= 0.0)) + 1
        what = "repeats the time before" if steps[row - 1] == 0.0 else f"goes back from {time[row - 1]:g} s"
        raise ProfileError(
            f"{time[row]:g} s {what}; time must rise from row to row", file=path, line=_line(path, row), column="time_s"
        )


def _refuse_bad_durations(path: Path, duration: FloatArray, time: FloatArray) -> None:
    bad = duration <= 0.0
    bad[:-1] |= np.abs(duration[:-1] - np.diff(time)) > STAMP_TOLERANCE
    if np.any(bad):
        row = int(np.argmax(bad))
        due = f"; the stamps say {np.diff(time)[row]:g} s" if row < len(time) - 1 else ""
        raise ProfileError(
            f"found {duration[row]:g} s{due}. A duration is above zero and runs to the next stamp",
            file=path,
            line=_line(path, row),
            column="duration_s",
        )


def _refuse_bad_overrides(path: Path, overrides: dict[str, FloatArray]) -> None:
    voltage = overrides.get("link_voltage_v")
    if voltage is not None and np.any(voltage <= 0.0):
        row = int(np.argmax(voltage <= 0.0))
        raise ProfileError(
            f"found {voltage[row]:g} V; a link voltage is above zero",
            file=path,
            line=_line(path, row),
            column="link_voltage_v",
        )
    low, high = overrides.get("power_min_w"), overrides.get("power_max_w")
    if low is not None and high is not None and np.any(low > high):
        row = int(np.argmax(low > high))
        raise ProfileError("power_min_w is above power_max_w", file=path, line=_line(path, row), column="power_min_w")
