"""What a run found: frames, totals, limits, and the JSON of it. No physics and no drawing here."""

from __future__ import annotations

import dataclasses
import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any

from tideleg.caution import Safety
from tideleg.limits import LimitCheck
from tideleg.worn import NO_WEAR, Wear

if TYPE_CHECKING:
    import pandas as pd

    from tideleg.reaching import Reach
    from tideleg.waveform import FloatArray

SCHEMA_VERSION = 1
"""Version of summary.json; grows when a key changes its meaning or goes."""


@dataclass(frozen=True)
class LossEntry:
    """Energy that one mechanism of one sort of part costs in one pass of one mission, all equal parts together.

    part : slot name
    mechanism : such as "channel conduction"
    discharge_j, charge_j, idle_j : energy while the stage discharges, charges, idles [J]
    """

    part: str
    mechanism: str
    discharge_j: float
    charge_j: float
    idle_j: float

    @property
    def total_j(self) -> float:
        """Energy of one pass in all directions [J]."""
        return self.discharge_j + self.charge_j + self.idle_j


@dataclass(frozen=True)
class OutsideEntry:
    """A loss term that asked its table of points beyond what they cover, in one pass of one mission.

    part, mechanism : of the term
    time_share : share of the mission's time [-]
    energy_share : share of the term's own energy [-]
    """

    part: str
    mechanism: str
    time_share: float
    energy_share: float


@dataclass(frozen=True)
class GradeEntry:
    """What one number of a part is worth, and what rests on it.

    key : dotted key in the plan
    grade : "measured", "datasheet", "typical" or "guess"
    touches : loss terms that come out otherwise without it, or temperatures
    loss_share : how much of the loss of a year would move if the number were left out [-]; None where no term reads it
    """

    key: str
    grade: str
    touches: tuple[str, ...]
    loss_share: float | None


@dataclass(frozen=True)
class EnergyAccount:
    """Where the energy of one pass went [J]; the residuals show how well the books close.

    link_out_j, link_in_j : delivered to and taken from the link, magnitudes
    battery_out_j, battery_in_j : given and taken at the battery terminals, magnitudes
    loss_j : lost in the stage
    battery_heat_j : lost in the battery's own resistance
    curtailed_j : requested and not delivered, magnitude
    requested_j : requested, magnitude
    throughput_j : magnitudes of battery energy both ways, the measure for the residuals
    residual : (battery - link - loss)/throughput as reported [-]
    recomputed_residual : the same with losses computed anew from the reported currents and temperatures [-]
    """

    link_out_j: float
    link_in_j: float
    battery_out_j: float
    battery_in_j: float
    loss_j: float
    battery_heat_j: float
    curtailed_j: float
    requested_j: float
    throughput_j: float
    residual: float
    recomputed_residual: float


@dataclass(frozen=True)
class ThermalEntry:
    """Temperatures of one sort of part over all missions.

    part : slot name
    greatest_degc, mean_degc : greatest at the end of any step, time mean
    swing_k : greatest less least
    time_s, mission : instant of the greatest
    loop_gain : greatest K by which one kelvin of warming comes back through loss and cooling at rest [-]; 1 is runaway
    """

    part: str
    greatest_degc: float
    mean_degc: float
    swing_k: float
    time_s: float
    mission: str
    loop_gain: float


@dataclass(frozen=True)
class BatteryEntry:
    """The battery over one pass of one mission; soc fields are None where the state of charge is not modelled.

    throughput_wh : at the terminals, both ways [Wh]
    stored_change_j : energy at open-circuit voltage put in less taken out [J]
    depth_cycles : (least depth, greatest depth [-], cycles in one pass [-]) by rainflow, rest as half cycles; full
        cycles of equal throughput do not tell how deep they went
    """

    start_soc: float | None
    end_soc: float | None
    least_soc: float | None
    greatest_soc: float | None
    throughput_ah: float
    equivalent_full_cycles: float | None
    least_voltage_v: float
    greatest_voltage_v: float
    greatest_discharge_a: float
    greatest_charge_a: float
    throughput_wh: float = 0.0
    stored_change_j: float = 0.0
    depth_cycles: tuple[tuple[float, float, float], ...] = ()


@dataclass(frozen=True)
class ChoiceAccount:
    """What a topology chose along one pass, and what choosing was worth.

    name : what is chosen, such as "active_legs"
    share_of_time : by word [-]
    changes_per_hour : how often the choice changed
    plain : the word that a stage without choices would hold; None where that means nothing
    saved_j : loss with `plain` at every step less the loss as chosen, at the same temperatures [J]; None without it
    """

    name: str
    share_of_time: Mapping[str, float]
    changes_per_hour: float
    plain: str | None
    saved_j: float | None


@dataclass(frozen=True)
class MissionResult:
    """One mission, run once.

    name, passes_per_year : of the mission
    rules : sentences that say how the profile was read
    steps : one row a step, columns with units in their names
    energy, losses, battery, choice : accounts of one pass
    passes : passes that the relaxation took in its hardest block
    reach : where it asks the topology to operate
    outside : terms that asked their tables beyond what those cover
    """

    name: str
    passes_per_year: float
    rules: tuple[str, ...]
    steps: pd.DataFrame = field(repr=False)
    energy: EnergyAccount
    losses: tuple[LossEntry, ...]
    battery: BatteryEntry
    passes: int
    choice: ChoiceAccount | None = None
    reach: Reach | None = field(default=None, repr=False)
    outside: tuple[OutsideEntry, ...] = ()


@dataclass(frozen=True)
class MissionYear:
    """One mission over a year: hours, energy through the battery, loss of the stage and its share of the year's."""

    mission: str
    passes: float
    hours: float
    throughput_kwh: float
    loss_kwh: float
    loss_share: float


@dataclass(frozen=True)
class Year:
    """A whole year.

    missions : each over the year
    standby_hours, standby_kwh, standby_share : with the gates off and the control alive
    parked_hours : the rest, in which nothing is drawn
    """

    missions: tuple[MissionYear, ...]
    standby_hours: float
    standby_kwh: float
    standby_share: float
    parked_hours: float


@dataclass(frozen=True)
class PartEntry:
    """One sort of part in the stage.

    name, kind : slot and sort
    copies : equal places in the stage
    in_parallel : chips that share each place
    facts : label -> value as a person reads it, such as "inductance" -> "110 uH"
    grades : key -> what its number is worth, where that is said
    """

    name: str
    kind: str
    copies: int
    in_parallel: int
    facts: Mapping[str, str]
    grades: Mapping[str, str] = field(default_factory=dict)


@dataclass(frozen=True)
class Trace:
    """One waveform over one switching period at the worst instant, as corner points.

    label : such as "inductor current"
    part : slot name
    time_s : corner points within the period [s]
    current_a : [A]
    """

    label: str
    part: str
    time_s: FloatArray = field(repr=False)
    current_a: FloatArray = field(repr=False)


@dataclass(frozen=True)
class WorstInstant:
    """The step at which the binding limit (or the greatest loss, where no limit binds) is met."""

    why: str
    mission: str
    time_s: float
    values: Mapping[str, float]
    traces: tuple[Trace, ...] = field(repr=False)


@dataclass(frozen=True)
class Change:
    """What one change of the plan does to the answer: a re-run, not a derivative.

    what : the change in words, such as "coolant 10 K warmer"
    holds : whether every limit still holds
    binding : name and part of the limit that binds then, or why there is no answer
    used : share of that limit in use [-]; None where there is no answer
    greatest_junction_degc : None where no junction is modelled or there is no answer
    efficiency : [-]; None where there is no answer
    damage : of the part that temperature wears most in the unchanged plan, over its damage there [-]; None where no
        life is modelled or there is no answer
    """

    what: str
    holds: bool
    binding: str
    used: float | None
    greatest_junction_degc: float | None
    efficiency: float | None
    damage: float | None = None


@dataclass(frozen=True)
class Coarser:
    """What the answer becomes on the same profile with neighbouring steps merged: how far its resolution limits it.

    merged : how many steps became one
    mean_square_change : of the battery current, over its own value [-]
    greatest_junction_change_k : None where no junction is modelled
    damage_change : of the part that temperature wears most, over its own value [-]; None where no life is modelled
    """

    merged: int
    mean_square_change: float
    greatest_junction_change_k: float | None
    damage_change: float | None = None


@dataclass(frozen=True)
class CoolantLoss:
    """What follows if the coolant stops at the worst instant and the power is held.

    part, limit_degc : which reaches its limit first, or comes nearest to it
    seconds : until then [s]; None where no limit is reached within two hours
    runs_away : whether the part then finds no temperature at all; `seconds` is the last time at which it still did
    time_s, mission, power_w : when the coolant stops, and the power asked from then on
    """

    part: str
    limit_degc: float
    seconds: float | None
    runs_away: bool
    time_s: float
    mission: str
    power_w: float


@dataclass(frozen=True)
class PackAnswer:
    """What the plan comes to with one pack: the new one, or the aged one that is run beside it.

    pack : "new", or what makes the other one aged
    holds : whether every limit holds
    binding : name and part of the limit that binds, or why there is no answer
    used : share of that limit in use [-]; None where there is no answer, as in all that follows
    curtailed_share : requested energy that is not delivered, over all missions [-]
    least_voltage_v : lowest terminal voltage
    end_soc : state of charge at the end of each mission, by its name [-]; empty where it is not modelled
    battery_heat_share : energy lost in the pack over its throughput [-]
    """

    pack: str
    holds: bool
    binding: str
    used: float | None
    greatest_junction_degc: float | None
    efficiency: float | None
    curtailed_share: float | None
    least_voltage_v: float | None
    end_soc: Mapping[str, float]
    battery_heat_share: float | None


@dataclass(frozen=True)
class Inputs:
    """What went in, so that a run can be repeated: file -> SHA-256, package -> version, seed (None: no chance)."""

    sha256: Mapping[str, str]
    versions: Mapping[str, str]
    seed: int | None = None


@dataclass(frozen=True)
class Outcome:
    """Everything that a run of one plan found.

    holds : every limit holds, and the whole mission is served or its curtailment is within its limit
    verdict : one sentence for page one
    binding : the limit with the greatest share in use, or None where the plan states none
    stage_facts : label -> value, the stage at a glance
    rules : sentences that every output echoes (signs, holding, terminals)
    grades : what the graded numbers of parts are worth and what rests on them
    placeholders : one sentence for each part that is invented
    wear : cycles, damage and life of parts
    """

    title: str
    holds: bool
    verdict: str
    binding: LimitCheck | None
    limits: tuple[LimitCheck, ...]
    missions: tuple[MissionResult, ...]
    thermal: tuple[ThermalEntry, ...]
    parts: tuple[PartEntry, ...]
    stage_facts: Mapping[str, str]
    worst: WorstInstant
    changes: tuple[Change, ...]
    safety: Safety
    not_modelled: tuple[str, ...]
    warnings: tuple[str, ...]
    rules: tuple[str, ...]
    inputs: Inputs
    plan_file: Path | None = None
    coarser: tuple[Coarser, ...] = ()
    packs: tuple[PackAnswer, ...] = ()
    coolant_loss: CoolantLoss | None = None
    year: Year | None = None
    grades: tuple[GradeEntry, ...] = ()
    placeholders: tuple[str, ...] = ()
    wear: Wear = NO_WEAR

    @property
    def steps(self) -> pd.DataFrame:
        """All steps in one frame; with several missions a first column names the mission."""
        import pandas as pd

        if len(self.missions) == 1:
            return self.missions[0].steps
        frames = [m.steps.assign(mission=m.name) for m in self.missions]
        whole = pd.concat(frames, ignore_index=True)
        return whole[["mission", *[c for c in whole.columns if c != "mission"]]]

    @property
    def efficiency(self) -> float:
        """Return one less the loss over the battery and link throughput of a year: (in - loss)/in [-]; nan if none."""
        energy_in = sum(m.passes_per_year * (m.energy.battery_out_j + m.energy.link_in_j) for m in self.missions)
        loss = sum(m.passes_per_year * m.energy.loss_j for m in self.missions)
        return 1.0 - loss / energy_in if energy_in > 0.0 else float("nan")

    def loss_by_mechanism(self) -> dict[str, float]:
        """Return mean loss power by mechanism over one pass of each mission, weighted by passes a year [W]."""
        hours = sum(m.passes_per_year * float(m.steps["duration_s"].sum()) for m in self.missions)
        totals: dict[str, float] = {}
        for mission in self.missions:
            for entry in mission.losses:
                share = mission.passes_per_year * entry.total_j / hours
                totals[entry.mechanism] = totals.get(entry.mechanism, 0.0) + share
        return dict(sorted(totals.items(), key=lambda item: -item[1]))

    def _wear_summary(self) -> dict[str, Any]:
        """Return wear for summary.json: cycles and curves for the pictures are left out; an endless life is null."""
        return {
            "residue": self.wear.residue,
            "heat": {entry.part: _plain(entry) for entry in self.wear.heat},
            "parts": [_plain(part, leave_out=("cycles", "along")) for part in self.wear.parts],
            "consumers": [_plain(one) for one in self.wear.consumers],
        }

    def summary(self) -> dict[str, Any]:
        """Return the content of summary.json: plain lists, mappings, numbers and strings."""
        return {
            "schema_version": SCHEMA_VERSION,
            "title": self.title,
            "verdict": {"holds": self.holds, "sentence": self.verdict},
            "limits": [_plain(check) for check in self.limits],
            "stage": dict(self.stage_facts),
            "parts": [_plain(part) for part in self.parts],
            "energy": {m.name: {**_plain(m.energy), "losses": [_plain(x) for x in m.losses]} for m in self.missions},
            "efficiency": _number(self.efficiency),
            "worst": _plain(self.worst, leave_out=("traces",)),
            "thermal": {entry.part: _plain(entry) for entry in self.thermal},
            "outside_tables": {m.name: [_plain(entry) for entry in m.outside] for m in self.missions},
            "grades": [_plain(entry) for entry in self.grades],
            "placeholders": list(self.placeholders),
            "wear": self._wear_summary(),
            "battery": {m.name: _plain(m.battery) for m in self.missions},
            "year": _plain(self.year),
            "coolant_loss": _plain(self.coolant_loss),
            "packs": [_plain(pack) for pack in self.packs],
            "resolution": [_plain(one) for one in self.coarser],
            "changes": [_plain(change) for change in self.changes],
            "safety": _plain(self.safety),
            "not_modelled": list(self.not_modelled),
            "warnings": list(self.warnings),
            "rules": list(self.rules) + [f"{m.name}: {rule}" for m in self.missions for rule in m.rules],
            "missions": [
                {
                    "name": m.name,
                    "passes_per_year": m.passes_per_year,
                    "steps": len(m.steps),
                    "relaxation_passes": m.passes,
                    "choice": _plain(m.choice),
                }
                for m in self.missions
            ],
            "inputs": _plain(self.inputs),
        }


def _number(value: float) -> float | None:
    """JSON knows no nan and no infinity: an undefined or endless number is null."""
    return value if math.isfinite(value) else None


def _plain(thing: Any, leave_out: tuple[str, ...] = ()) -> Any:
    """Return dataclasses, mappings and arrays as what JSON knows."""
    if dataclasses.is_dataclass(thing) and not isinstance(thing, type):
        names = [f.name for f in dataclasses.fields(thing) if f.name not in leave_out]
        return {name: _plain(getattr(thing, name)) for name in names}
    if isinstance(thing, Mapping):
        return {str(key): _plain(value) for key, value in thing.items()}
    if isinstance(thing, tuple) and hasattr(thing, "_asdict"):
        return {name: _plain(value) for name, value in thing._asdict().items()}
    if isinstance(thing, (list, tuple)):
        return [_plain(value) for value in thing]
    if hasattr(thing, "item"):
        thing = thing.item()
    return _number(thing) if isinstance(thing, float) else thing
