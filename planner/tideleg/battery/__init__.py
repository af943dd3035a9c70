"""The battery: power to voltage, current and state of charge, with limits that curtail."""

from tideleg.battery.answering import (
    BatteryAnswer,
    BatteryPath,
    BatteryState,
    answer,
    at_rest,
    current_at_power,
    nodes_of,
    path_of,
    resting_path,
    state_after,
)
from tideleg.battery.pack import ALWAYS, CAUSE_WORDS, Battery, Cause

__all__ = [
    "ALWAYS",
    "CAUSE_WORDS",
    "Battery",
    "BatteryAnswer",
    "BatteryPath",
    "BatteryState",
    "Cause",
    "answer",
    "at_rest",
    "current_at_power",
    "nodes_of",
    "path_of",
    "resting_path",
    "state_after",
]
