"""tideleg plans, sizes and defends bidirectional DC-DC stages over whole missions.

The names below are the public face: what a plan runner, a notebook or a stranger's plugin may import. The main jobs
(`load_plan`, `plan_from_mapping`, `run`, `size`, `compare`, `read_profile`, `passport`) are loaded when first asked
for, so that importing tideleg stays quick and loads no plugin, no pandas and no matplotlib.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

from tideleg import quantity
from tideleg.contract import (
    BOUNDARY,
    CONDUCTION,
    CONTINUOUS,
    DISCONTINUOUS,
    IDLE,
    Choice,
    Chooser,
    CooledPart,
    CoolingModel,
    Exchange,
    Flow,
    Line,
    LossModel,
    LossTerm,
    Need,
    Operation,
    PartKind,
    Point,
    Position,
    Rest,
    Slot,
    Starter,
    Timing,
    Topology,
    Winding,
    hookimpl,
)
from tideleg.errors import InputError, NoEquilibriumError, PlanError, PluginError, ProfileError, TidelegError
from tideleg.network import Mass, Network, Path, Seat
from tideleg.points import PointReader, PointsFile, PointTable
from tideleg.source import MadeProfile, ProfileSource
from tideleg.stress import Consumption, Cycles, LifeModel, LifeTerm, Stress, WornKind
from tideleg.waveform import FloatArray, Segment, Values, Waveform

if TYPE_CHECKING:
    from tideleg.decide.compare import compare
    from tideleg.decide.derating import derate
    from tideleg.decide.size import size
    from tideleg.mission import passport, read_profile
    from tideleg.outcome import Outcome
    from tideleg.plan import Plan, load_plan, plan_from_mapping
    from tideleg.reaching import reach
    from tideleg.report import write_results
    from tideleg.running import run

_ON_DEMAND = {
    "Outcome": "tideleg.outcome",
    "Plan": "tideleg.plan",
    "compare": "tideleg.decide.compare",
    "derate": "tideleg.decide.derating",
    "load_plan": "tideleg.plan",
    "passport": "tideleg.mission",
    "plan_from_mapping": "tideleg.plan",
    "reach": "tideleg.reaching",
    "read_profile": "tideleg.mission",
    "run": "tideleg.running",
    "size": "tideleg.decide.size",
    "write_results": "tideleg.report",
}
"""Public names that are loaded when first asked for -> where they live."""


def __getattr__(name: str) -> Any:
    """Load a main job when it is first asked for."""
    if name not in _ON_DEMAND:
        raise AttributeError(f"module 'tideleg' has no attribute {name!r}")
    return getattr(import_module(_ON_DEMAND[name]), name)


__all__ = [
    "BOUNDARY",
    "CONDUCTION",
    "CONTINUOUS",
    "DISCONTINUOUS",
    "IDLE",
    "Choice",
    "Chooser",
    "Consumption",
    "CooledPart",
    "CoolingModel",
    "Cycles",
    "Exchange",
    "FloatArray",
    "Flow",
    "InputError",
    "LifeModel",
    "LifeTerm",
    "Line",
    "LossModel",
    "LossTerm",
    "MadeProfile",
    "Mass",
    "Need",
    "Network",
    "NoEquilibriumError",
    "Operation",
    "Outcome",
    "PartKind",
    "Path",
    "Plan",
    "PlanError",
    "PluginError",
    "Point",
    "PointReader",
    "PointTable",
    "PointsFile",
    "Position",
    "ProfileError",
    "ProfileSource",
    "Rest",
    "Seat",
    "Segment",
    "Slot",
    "Starter",
    "Stress",
    "TidelegError",
    "Timing",
    "Topology",
    "Values",
    "Waveform",
    "Winding",
    "WornKind",
    "compare",
    "derate",
    "hookimpl",
    "load_plan",
    "passport",
    "plan_from_mapping",
    "quantity",
    "reach",
    "read_profile",
    "run",
    "size",
    "write_results",
]

__version__ = "0.1.0"
