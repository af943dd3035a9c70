"""One stage built from a plan: topology, parts, losses, cooling; and its losses at given currents and temperatures."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import partial
from typing import Any, NamedTuple

import numpy as np

from tideleg.contract import (
    Chooser,
    CooledPart,
    CoolingModel,
    Flow,
    LossModel,
    LossTerm,
    Operation,
    Point,
    Slot,
    Topology,
    read_as,
)
from tideleg.errors import InputError
from tideleg.heat import Modes, modes
from tideleg.plan import CapacitorBase, InductorBase, Plan, SwitchBase, TransformerBase, read_table
from tideleg.registry import Registry, call_plugin, installed
from tideleg.rolloff import LinkageCurve, effective_inductance
from tideleg.waveform import FloatArray, Values

WHOLE_STAGE = (Slot("busbar", "busbar", "busbar"), Slot("control", "control", "control"))
"""Slots that every stage has, whatever its topology."""

_BASES: dict[str, dict[str, Any]] = {
    "switch": {"base": SwitchBase},
    "inductor": {"base": InductorBase},
    "transformer": {"base": TransformerBase},
    "capacitor": {"base": CapacitorBase},
}


MOST_ROUNDS = 100
SETTLED_INDUCTANCE = 1e-9
"""Relative change of an inductance that falls with current at which its rounds end [-]."""


@dataclass(frozen=True)
class BoundTerm:
    """A loss term and the model that offered it, so that a fault can name its plugin."""

    model: LossModel
    term: LossTerm[Any]


@dataclass(frozen=True)
class StagePart:
    """One sort of part in a stage.

    slot : its place in the topology
    base : core-known data (SwitchBase, InductorBase, CapacitorBase) or None
    in_parallel : chips that share the current of one place; broadcastable to (C, 1)
    terms : the loss terms that its data support
    """

    slot: Slot
    base: Any
    in_parallel: Values
    terms: tuple[BoundTerm, ...]

    @property
    def total(self) -> Values:
        """How many equal parts the whole stage has."""
        return self.slot.copies * self.in_parallel


class Losses(NamedTuple):
    """Losses of a stage at each step, arrays (C, S).

    operation : the steady state they were read from
    total : of the whole stage [W]
    by_term : (part, mechanism) -> all equal parts together [W]
    heat : (seated part, C, S) what enters the seat of ONE part [W]
    slope : (seated part, C, S) how that grows with the part's own temperature [W/K]
    path_resistance : ohmic resistance in the way of one leg's current [Ω]
    """

    operation: Operation
    total: FloatArray
    by_term: dict[tuple[str, str], FloatArray]
    heat: FloatArray
    slope: FloatArray
    path_resistance: FloatArray


@dataclass(frozen=True)
class Stage:
    """A stage that can be asked for its losses.

    modes : exact thermal modes, or None where no part has a thermal path
    inductance : by inductor slot, at zero current [H]
    rolloff : by inductor slot, how it falls with current; none for those that do not
    not_modelled : one sentence for each mechanism or temperature that lacks data
    """

    topology: Topology
    settings: Any
    parts: tuple[StagePart, ...]
    modes: Modes | None
    inductance: Mapping[str, Values]
    rolloff: Mapping[str, LinkageCurve]
    not_modelled: tuple[str, ...]
    registry: Registry

    @property
    def seated(self) -> tuple[str, ...]:
        """Names of the parts whose temperature is modelled, in the order of the thermal arrays."""
        return () if self.modes is None else tuple(self.modes.parts)

    @property
    def choices(self) -> tuple[str, ...]:
        """Words of the choices that the topology makes for each step; empty where it makes none."""
        return self.topology.choices(self.settings) if isinstance(self.topology, Chooser) else ()

    @property
    def idles_off(self) -> bool:
        """Whether the gates are off while no power is asked."""
        return getattr(self.settings, "idle", "switching") == "off"

    def part(self, name: str) -> StagePart:
        """Return the part in the slot of that name."""
        return next(part for part in self.parts if part.slot.name == name)

    def operate(self, point: Point) -> Operation:
        """Return the steady state that the topology states at each step.

        Where an inductance falls with current, the topology is asked again with the inductance that its own currents
        mean, until they no longer move. More swing means less inductance means more swing, but less than in
        proportion, since the flux linkage still grows: the rounds contract.

        Raises
        ------
        InputError
            If they do not settle: the curve falls so steeply that no current can be told.
        """
        inductance = dict(self.inductance)
        for _ in range(MOST_ROUNDS):
            asked = partial(self.topology.operate, point, self.settings, inductance)
            operation = call_plugin(self.registry, self.topology, asked)
            if not self.rolloff:
                return operation
            still = True
            for name, curve in self.rolloff.items():
                current = operation.windings[name].current
                henry = effective_inductance(curve, current.valley(), current.peak(), inductance[name])
                still = still and bool(np.all(np.abs(henry - inductance[name]) <= SETTLED_INDUCTANCE * henry))
                inductance[name] = henry
            if still:
                return operation
        raise InputError(
            f"stage.inductor.inductance_curve: currents and inductance did not settle in {MOST_ROUNDS} rounds; the"
            " inductor saturates so far that no current can be told: lower the ripple or the current, or give a curve"
            " that falls less steeply"
        )

    def losses(self, point: Point, temperature: Mapping[str, FloatArray]) -> Losses:
        """Return every loss at each step.

        Parameters
        ----------
        point : Point
            What the stage does, arrays (C, S).
        temperature : mapping of slot name to (C, S)
            Mean temperature of each part in each step [degC].
        """
        operation = self.operate(point)
        shape = np.shape(point.battery_current)
        total = np.zeros(shape)
        by_term: dict[tuple[str, str], FloatArray] = {}
        heat = np.zeros((len(self.seated), *shape))
        slope = np.zeros_like(heat)
        ohmic = np.zeros(shape)
        index = {name: i for i, name in enumerate(self.seated)}
        for part in self.parts:
            name = part.slot.name
            reading = self._reading(part, operation, point)
            # Parts of a slot that rest in this step (a shed leg) spend nothing; the heat of those that work is the
            # slot's, evenly, since the ones that rest take turns.
            working = getattr(reading, "copies", part.slot.copies)
            share = working / part.slot.copies
            for model, term in ((bound.model, bound.term) for bound in part.terms):
                ask = partial(term.at, reading, operation.timing, temperature[name])
                line = call_plugin(self.registry, model, ask)
                watts = line.watts * (working * part.in_parallel)
                by_term[name, term.mechanism] = np.broadcast_to(watts, shape)
                total += watts
                if term.heats and name in index:
                    heat[index[name]] += line.watts * share
                    slope[index[name]] += line.watts_per_kelvin * share
                if term.ohmic:
                    ohmic += watts
        return Losses(operation, total, by_term, heat, slope, self._path_resistance(operation, ohmic))

    def _reading(self, part: StagePart, operation: Operation, point: Point) -> Any:
        """Return what the loss terms of one part read: its waveform, scaled to one chip."""
        name, kind = part.slot.name, part.slot.kind
        if kind == "switch":
            position = operation.positions[name]
            if np.all(np.asarray(part.in_parallel) == 1):
                return position
            return position._replace(current=position.current.scaled(1.0 / part.in_parallel))
        if read_as(kind) == "inductor":
            return operation.windings[name]
        if kind == "capacitor":
            return operation.exchanges[name]
        link_current = operation.exchanges["link_capacitor"].current.mean()
        active = point.active.astype(np.float64)
        return Flow(point.battery_voltage, point.link_voltage, point.battery_current, link_current, active)

    def _path_resistance(self, operation: Operation, ohmic: FloatArray) -> FloatArray:
        """Return all ohmic loss over the squared leg current, per leg [Ω]: what one leg's current must overcome.

        The leg current is that of the inductors. A transformer's winding lies in series with one and carries the same
        current once more: counted again, it would make the resistance too small.
        """
        square = np.zeros_like(ohmic)
        for winding in (operation.windings[part.slot.name] for part in self.parts if part.slot.kind == "inductor"):
            square = square + winding.copies * winding.current.mean_square()
        return np.where(square > 0.0, ohmic / np.where(square > 0.0, square, 1.0), 0.0)


def build_stage(plan: Plan, registry: Registry | None = None) -> Stage:
    """Return the stage that a plan describes.

    Raises
    ------
    PlanError
        If a table holds an unknown key or a value that a plugin refuses; file, line and key are named.
    PluginError
        If a plugin that the plan names is not installed, broken, or raises.
    """
    registry = registry or installed()
    topology = registry.topology(plan.stage.topology)
    settings = read_table(plan, "stage", plan.stage.settings, {"topology": topology.settings})["topology"]
    slots = (*call_plugin(registry, topology, partial(topology.slots, settings)), *WHOLE_STAGE)
    _refuse_unknown_names(plan, registry, slots)
    cooling = registry.cooling(plan.cooling.model) if plan.cooling is not None else None
    parts, cooled, missing = [], [], []
    for slot in slots:
        data = _part_data(plan, registry, slot)
        terms, lacking = _bound_terms(plan, registry, slot, data)
        base = data.get("base")
        in_parallel = getattr(base, "in_parallel", 1)
        parts.append(StagePart(slot, base, in_parallel, terms))
        missing += [(slot, name) for name in lacking]
        if cooling is not None and read_as(slot.kind) in cooling.part_settings:
            cooled.append(CooledPart(slot.name, slot.kind, slot.copies * in_parallel, data[f"cooling {cooling.name}"]))
    thermal = _thermal(plan, registry, cooling, cooled)
    inductors = [p for p in parts if p.slot.kind == "inductor"]
    inductance = {p.slot.name: p.base.inductance for p in inductors}
    rolloff = {p.slot.name: LinkageCurve.of(p.base.inductance_curve) for p in inductors if p.base.inductance_curve}
    return Stage(
        topology, settings, tuple(parts), thermal, inductance, rolloff, _not_modelled(missing, parts, thermal), registry
    )


def without_coolant(plan: Plan, registry: Registry | None = None) -> Stage | None:
    """Return the stage after its coolant has stopped; None where the cooling model cannot tell, or none is used.

    A cooling model tells by a method `without_coolant(settings)` that returns its settings after the loss, with which
    it describes the same places.
    """
    registry = registry or installed()
    if plan.cooling is None:
        return None
    cooling = registry.cooling(plan.cooling.model)
    lost = getattr(cooling, "without_coolant", None)
    if lost is None:
        return None
    settings = read_table(plan, "cooling", plan.cooling.settings, {"cooling": cooling.settings})["cooling"]
    left = call_plugin(registry, cooling, partial(lost, settings))
    if left is None:
        return None
    table = plan.cooling.model_copy(update={"settings": left.model_dump(exclude_none=True, exclude_defaults=True)})
    return build_stage(plan.model_copy(update={"cooling": table}), registry)


def _part_data(plan: Plan, registry: Registry, slot: Slot) -> dict[str, Any]:
    """Return the validated keys of one part's table: the core's own, each loss model's, each cooling model's."""
    wanted: dict[str, Any] = dict(_BASES.get(slot.kind, {}))
    wanted |= {f"loss {m.name}": m.settings for m in registry.loss_models() if m.reads == read_as(slot.kind)}
    for model in registry.cooling_models():
        if read_as(slot.kind) in model.part_settings:
            wanted[f"cooling {model.name}"] = model.part_settings[read_as(slot.kind)]
    return read_table(plan, f"stage.{slot.table}", plan.stage.parts.get(slot.table, {}), wanted)


def _bound_terms(
    plan: Plan, registry: Registry, slot: Slot, data: dict[str, Any]
) -> tuple[tuple[BoundTerm, ...], list[str]]:
    """Return the loss terms that one part's data support, and the mechanisms that lack data or were left out."""
    terms: list[BoundTerm] = []
    lacking: list[str] = []
    for model in registry.loss_models():
        if model.reads != read_as(slot.kind):
            continue
        offered: tuple[LossTerm[Any], ...] = ()
        if model.name not in plan.losses.leave_out:
            offered = call_plugin(registry, model, partial(model.terms, data[f"loss {model.name}"]))
        given = {term.mechanism for term in offered}
        lacking += [name for name in model.mechanisms if name not in given]
        terms += [BoundTerm(model, term) for term in offered]
    _refuse_twin_terms(slot, terms)
    given = {bound.term.mechanism for bound in terms}
    return tuple(terms), [name for name in lacking if name not in given]


def _thermal(plan: Plan, registry: Registry, cooling: CoolingModel | None, cooled: list[CooledPart]) -> Modes | None:
    if cooling is None or plan.cooling is None:
        return None
    settings = read_table(plan, "cooling", plan.cooling.settings, {"cooling": cooling.settings})["cooling"]
    network = call_plugin(registry, cooling, partial(cooling.network, settings, cooled))
    return modes(network) if network.seats else None


def _refuse_unknown_names(plan: Plan, registry: Registry, slots: tuple[Slot, ...]) -> None:
    tables = {slot.table for slot in slots}
    for name in plan.stage.parts:
        if name not in tables:
            known = ", ".join(sorted(tables))
            what = f"found the table [stage.{name}], which topology {plan.stage.topology!r} does not have"
            raise plan.fault(f"stage.{name}", f"{what}; it has {known}")
    models = {m.name for m in registry.loss_models()}
    for name in plan.losses.leave_out:
        if name not in models:
            what = f"found {name!r}; the installed loss plugins are {', '.join(sorted(models))}"
            raise plan.fault("losses.leave_out", what)


def _refuse_twin_terms(slot: Slot, terms: list[BoundTerm]) -> None:
    seen: set[str] = set()
    for mechanism in (bound.term.mechanism for bound in terms):
        if mechanism in seen:
            raise InputError(
                f"two loss plugins offer {mechanism!r} for {slot.name}; it would count twice. Name the one to"
                " leave out in [losses] leave_out"
            )
        seen.add(mechanism)


def _not_modelled(missing: list[tuple[Slot, str]], parts: list[StagePart], thermal: Modes | None) -> tuple[str, ...]:
    """Return one sentence for each mechanism and each temperature without data, slots of one table together."""
    by_mechanism: dict[tuple[str, str], None] = {(slot.table, name): None for slot, name in missing}
    seated = set() if thermal is None else set(thermal.parts)
    sentences = [f"{name} of {table.replace('_', ' ')}: no data given" for table, name in by_mechanism]
    level = {p.slot.table: None for p in parts if p.slot.kind == "inductor" and not p.base.inductance_curve}
    sentences += [
        f"fall of the inductance of {table.replace('_', ' ')} with current: no inductance_curve given, held constant"
        for table in level
    ]
    held = {p.slot.table: None for p in parts if p.slot.kind not in ("busbar", "control") and p.slot.name not in seated}
    sentences += [
        f"temperature of {table.replace('_', ' ')}: no thermal path given, held at the coolant" for table in held
    ]
    return tuple(sentences)
