"""The plan: what the user writes, validated; no physics."""

from tideleg.plan.curve import Curve
from tideleg.plan.parts import GRADES
from tideleg.plan.reading import load_plan, plan_from_mapping, read_table
from tideleg.plan.schema import part_schema, plan_schema
from tideleg.plan.tables import (
    BatteryTable,
    CapacitorBase,
    CoolingTable,
    DiodeBase,
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
    TransformerBase,
    VehicleTable,
    WornTable,
)
from tideleg.plan.writing import format_quantity, write_plan

__all__ = [
    "GRADES",
    "BatteryTable",
    "CapacitorBase",
    "CoolingTable",
    "Curve",
    "DiodeBase",
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
    "TransformerBase",
    "VehicleTable",
    "WornTable",
    "format_quantity",
    "load_plan",
    "part_schema",
    "plan_from_mapping",
    "plan_schema",
    "read_table",
    "write_plan",
]
