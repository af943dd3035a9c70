"""tideleg plans, sizes and defends bidirectional DC-DC stages over whole missions.

The names below are the public face: what a plan runner, a notebook or a stranger's plugin may import.
"""

from tideleg import quantity
from tideleg.contract import (
    BOUNDARY,
    CONDUCTION,
    CONTINUOUS,
    DISCONTINUOUS,
    IDLE,
    CooledPart,
    CoolingModel,
    Exchange,
    Flow,
    Line,
    LossModel,
    LossTerm,
    Operation,
    PartKind,
    Point,
    Position,
    Slot,
    Timing,
    Topology,
    Winding,
    hookimpl,
)
from tideleg.errors import InputError, NoEquilibriumError, PlanError, PluginError, ProfileError, TidelegError
from tideleg.network import Mass, Network, Path, Seat
from tideleg.waveform import FloatArray, Segment, Values, Waveform

__all__ = [
    "BOUNDARY",
    "CONDUCTION",
    "CONTINUOUS",
    "DISCONTINUOUS",
    "IDLE",
    "CooledPart",
    "CoolingModel",
    "Exchange",
    "FloatArray",
    "Flow",
    "InputError",
    "Line",
    "LossModel",
    "LossTerm",
    "Mass",
    "Network",
    "NoEquilibriumError",
    "Operation",
    "PartKind",
    "Path",
    "PlanError",
    "PluginError",
    "Point",
    "Position",
    "ProfileError",
    "Seat",
    "Segment",
    "Slot",
    "TidelegError",
    "Timing",
    "Topology",
    "Values",
    "Waveform",
    "Winding",
    "hookimpl",
    "quantity",
]

__version__ = "0.1.0"
