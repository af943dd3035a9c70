"""Sizing, first honest form: each value from the limit that asks for it, then the sized stage proven on the mission.

Order: legs from current; inductance from ripple and peak current; port capacitances from ripple and RMS rating; device
class from the highest link voltage; chips in parallel and plate resistance from the temperatures over the whole
mission. The plan that is written is read back and run once more, and that run is the proof.
"""

from __future__ import annotations

import dataclasses
from pathlib import Path

from tideleg.decide.changes import with_part, with_stage
from tideleg.decide.electrical import size_capacitors, size_device_class, size_inductance, size_legs
from tideleg.decide.thermal import size_chips_and_plate
from tideleg.decide.trial import Decision, Trial
from tideleg.errors import InputError
from tideleg.outcome import Outcome
from tideleg.plan import Plan, load_plan, write_plan
from tideleg.registry import Registry, installed
from tideleg.running import Progress, run
from tideleg.stage import build_stage

MOST_ROUNDS = 5
"""Rounds of the electrical sizing: ripple shifts a little with legs, losses and conduction mode."""

MOST_REPEATS = 3
"""Times that electrical and thermal sizing follow each other: they share only the temperature of the losses."""

FIRST_INDUCTANCE = "100 uH"
FIRST_CAPACITANCE = "100 uF"


@dataclasses.dataclass(frozen=True)
class Sized:
    """A sized stage and its proof.

    decisions : every value chosen, with what set it
    plan : the plan with those values
    outcome : of the whole mission with the sized stage
    notes : what was not sized, and why
    """

    decisions: tuple[Decision, ...]
    plan: Plan
    outcome: Outcome
    notes: tuple[str, ...]


def size(
    plan: Plan | str | Path,
    *,
    destination: Path | None = None,
    registry: Registry | None = None,
    progress: Progress | None = None,
) -> Sized:
    """Size the stage of a plan from its limits and missions, and prove it by a run of the whole mission.

    Parameters
    ----------
    plan : Plan, or the path of a plan file
    destination : file for the sized plan ("sized.toml"); it is then read back from there and that plan is proven
    registry : plugins to use; those installed if None
    progress : called as steps are finished

    Raises
    ------
    InputError, NoEquilibriumError
        As `run` does.
    """
    if not isinstance(plan, Plan):
        plan = load_plan(plan)
    known = registry or installed()
    trial = Trial(_prepared(plan), {}, ())
    several_legs, has_plate = _takes_several_legs(trial.plan, known), _has_plate(trial.plan, known)
    uncooled = True
    for _ in range(MOST_REPEATS):
        before = _values(trial)
        trial = _electrical(trial, several_legs, uncooled, known, progress)
        trial = size_chips_and_plate(trial, has_plate, known, progress)
        uncooled = False
        if _values(trial) == before:
            break
    proven = trial.plan
    if destination is not None:
        write_plan(plan, _values(trial), destination, _heading(trial))
        proven = load_plan(destination)
    return Sized(tuple(trial.decisions.values()), proven, run(proven, registry=known, progress=progress), trial.notes)


def _heading(trial: Trial) -> str:
    """Return the comment on top of the sized plan: every value, what set it, and what was left alone."""
    lines = ["Sized by tideleg from the limits and missions of this plan; a planning estimate, no release.", ""]
    for decision in trial.decisions.values():
        at = f", at {decision.at}" if decision.at else ""
        lines.append(f"{decision.key} = {decision.value} (was {decision.before or 'not given'}): {decision.set_by}{at}")
    return "\n".join([*lines, *trial.notes, ""])


def _values(trial: Trial) -> dict[str, str | int]:
    return {key: decision.value for key, decision in trial.decisions.items()}


def _electrical(
    trial: Trial, several_legs: bool, uncooled: bool, registry: Registry, progress: Progress | None
) -> Trial:
    """Repeat the electrical choices until none moves.

    The first time round the parts are held at the coolant and their life is not asked: a stage that has not been sized
    may find no equilibrium.
    """
    for _ in range(MOST_ROUNDS):
        before = _values(trial)
        plan = trial.plan.model_copy(update={"cooling": None, "life": None}) if uncooled else trial.plan
        outcome = run(plan, registry=registry, progress=progress)
        trial = size_legs(trial, outcome, several_legs)
        if _values(trial).get("stage.legs") == before.get("stage.legs"):
            trial = size_device_class(size_capacitors(size_inductance(trial, outcome), outcome), outcome)
            if _values(trial) == before:
                break
    return trial


def _prepared(plan: Plan) -> Plan:
    """Return the plan with first guesses where the person left a value to be sized."""
    guesses = {
        "inductor": {"inductance": FIRST_INDUCTANCE},
        "battery_capacitor": {"capacitance": FIRST_CAPACITANCE},
        "link_capacitor": {"capacitance": FIRST_CAPACITANCE},
    }
    for table, guess in guesses.items():
        for key, value in guess.items():
            if key not in plan.stage.parts.get(table, {}):
                plan = with_part(plan, table, **{key: value})
    return plan


def _takes_several_legs(plan: Plan, registry: Registry) -> bool:
    """Whether the topology can be built with more legs than one."""
    try:
        build_stage(with_stage(plan, legs=2), registry)
    except InputError:
        return False
    return True


def _has_plate(plan: Plan, registry: Registry) -> bool:
    """Whether the plan's cooling model has a plate resistance to size."""
    return plan.cooling is not None and "plate_resistance" in registry.cooling(plan.cooling.model).settings.model_fields
