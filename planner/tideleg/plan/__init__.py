"""The plan: what the user writes, validated; no physics."""

from tideleg.plan.curve import Curve
from tideleg.plan.reading import load_plan, plan_from_mapping, read_table
from tideleg.plan.schema import plan_schema
from tideleg.plan.tables import (
    BatteryTable,
    CapacitorBase,
    CoolingTable,
    InductorBase,
    LifeTable,
    LimitsTable,
    LinkTable,
    LossesTable,
    MissionTable,
    Plan,
    SizeTable,
    StageTable,
    SwitchBase,
    VehicleTable,
    WornTable,
)
from tideleg.plan.writing import format_quantity, write_plan

__all__ = [
    "BatteryTable",
    "CapacitorBase",
    "CoolingTable",
    "Curve",
    "InductorBase",
    "LifeTable",
    "LimitsTable",
    "LinkTable",
    "LossesTable",
    "MissionTable",
    "Plan",
    "SizeTable",
    "StageTable",
    "SwitchBase",
    "VehicleTable",
    "WornTable",
    "format_quantity",
    "load_plan",
    "plan_from_mapping",
    "plan_schema",
    "read_table",
    "write_plan",
]
