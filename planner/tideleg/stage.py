"""One stage built from a plan: topology, parts, losses, cooling; and its losses at given currents and temperatures."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
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
from tideleg.dies import DIODE, dies_of, leaves_to_diode, refuse_wrong_ways, with_diodes
from tideleg.errors import InputError, PlanError
from tideleg.heat import Modes, modes
from tideleg.plan import CapacitorBase, DiodeBase, InductorBase, Plan, SwitchBase, TransformerBase, read_table
from tideleg.registry import Registry, call_plugin, installed
from tideleg.rolloff import LinkageCurve, effective_inductance
from tideleg.waveform import FloatArray, Values

WHOLE_STAGE = (Slot("busbar", "busbar", "busbar"), Slot("control", "control", "control"))
"""Slots that every stage has, whatever its topology."""

_BASES: dict[str, dict[str, Any]] = {
    "switch": {"base": SwitchBase},
    "diode": {"base": DiodeBase},
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

    slot : its place in the topology, or that of a die beside it (see `dies`)
    base : core-known data (SwitchBase, DiodeBase, InductorBase, CapacitorBase) or None
    in_parallel : such chips in one place; broadcastable to (C, 1)
    terms : the loss terms that its data support
    host : name of the topology's slot whose current it carries; None for its own
    chip_share : current of one chip over that of its place [-]; None for equal shares
    decides : False for chips that another of their place is always hotter than: no limit need look at them
    forward_only : whether the reverse current of its place is carried by a diode of its own
    """

    slot: Slot
    base: Any
    in_parallel: Values
    terms: tuple[BoundTerm, ...]
    host: str | None = None
    chip_share: Values | None = None
    decides: bool = True
    forward_only: bool = False

    @property
    def place(self) -> str:
        """Name of the topology's slot whose current it carries."""
        return self.slot.name if self.host is None else self.host

    @property
    def share(self) -> Values:
        """Current of one chip over that of its place [-]."""
        return 1.0 / self.in_parallel if self.chip_share is None else self.chip_share

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
    not_modelled: tuple[str, ...]
    registry: Registry
    rolloff: Mapping[str, LinkageCurve] = field(default_factory=dict)

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
            reading = self.reading(part, operation, point)
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

    def reading(self, part: StagePart, operation: Operation, point: Point) -> Any:
        """Return what the loss terms of one part read: its waveform, scaled to one chip."""
        name, kind = part.slot.name, part.slot.kind
        if kind in ("switch", "diode"):
            position = operation.positions[part.place]
            if np.all(np.asarray(part.share) == 1.0):
                return position
            return position._replace(current=position.current.scaled(part.share))
        if read_as(kind) == "inductor":
            return operation.windings[name]
        if kind == "capacitor":
            return operation.exchanges[name]
        link_current = operation.exchanges["link_capacitor"].current.mean()
        active = point.active.astype(np.float64)
        return Flow(point.battery_voltage, point.link_voltage, point.battery_current, link_current, active)

    def by_name(self, mean: FloatArray, held: FloatArray, shape: tuple[int, ...]) -> dict[str, FloatArray]:
        """Return the mean temperature of every part [degC]; one without a thermal path is held at the coolant."""
        rest = np.broadcast_to(held, shape)
        seated = {name: mean[i] for i, name in enumerate(self.seated)}
        return {part.slot.name: seated.get(part.slot.name, rest) for part in self.parts}

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
    parts: list[StagePart] = []
    cooled, missing = [], []
    for slot, place, has_diode in with_diodes(slots, plan.stage.parts):
        data = _part_data(plan, registry, slot)
        terms, lacking = _bound_terms(plan, registry, slot, data, has_diode)
        base = data.get("base")
        host = next((p.base for p in parts if p.slot.name == place), base)
        chips, spread = _of_chips("in_parallel", base, host, 1), _of_chips("sharing_spread", base, host, 0.0)
        for die in dies_of(slot, int(chips), float(spread)):
            parts.append(StagePart(die.slot, base, die.chips, terms, place, die.share, die.decides, has_diode))
            if cooling is not None and read_as(slot.kind) in cooling.part_settings:
                seat = data[f"cooling {cooling.name}"]
                cooled.append(CooledPart(die.slot.name, slot.kind, slot.copies * die.chips, seat))
        missing += [(slot, name) for name in lacking]
    thermal = _thermal(plan, registry, cooling, cooled)
    inductors = [p for p in parts if p.slot.kind == "inductor"]
    inductance = {p.slot.name: p.base.inductance for p in inductors}
    rolloff = {p.slot.name: LinkageCurve.of(p.base.inductance_curve) for p in inductors if p.base.inductance_curve}
    return Stage(
        topology, settings, tuple(parts), thermal, inductance, _not_modelled(missing, parts, thermal), registry, rolloff
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


def _of_chips(key: str, base: Any, host: Any, default: Any) -> Any:
    """Return a number of the chips of a part: its own, or for a diode that gives none that of its switch."""
    own = getattr(base, key, None)
    return getattr(host, key, default) if own is None else own


def _part_data(plan: Plan, registry: Registry, slot: Slot) -> dict[str, Any]:
    """Return the validated keys of one part's table: the core's own, each loss model's, each cooling model's."""
    wanted: dict[str, Any] = dict(_BASES.get(slot.kind, {}))
    wanted |= {f"loss {m.name}": m.settings for m in registry.loss_models() if m.reads == read_as(slot.kind)}
    for model in registry.cooling_models():
        if read_as(slot.kind) in model.part_settings:
            wanted[f"cooling {model.name}"] = model.part_settings[read_as(slot.kind)]
    return read_table(plan, f"stage.{slot.table}", plan.stage.keys_of(slot.table), wanted)


def _bound_terms(
    plan: Plan, registry: Registry, slot: Slot, data: dict[str, Any], has_diode: bool
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
        if not (has_diode and leaves_to_diode(model)):
            lacking += [name for name in model.mechanisms if name not in given]
        terms += [BoundTerm(model, term) for term in offered]
    _refuse_twin_terms(slot, terms)
    if slot.kind == "switch":
        refuse_wrong_ways(slot, {bound.model.name: bound.model for bound in terms}.values(), has_diode)
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
    for name, keys in plan.stage.parts.items():
        kind = next((slot.kind for slot in slots if slot.table == name), None)
        inner = [key for key, value in keys.items() if isinstance(value, dict) and (kind, key) != ("switch", DIODE)]
        if kind is not None and inner:
            key = f"stage.{name}.{inner[0]}"
            what = f"found the table [{key}], which no {kind} has; of tables inside a part there is a switch's diode"
            origin = next((file for of, file in plan.stage.origins.items() if of.startswith(f"{key}.")), None)
            raise plan.fault(key, what) if origin is None else PlanError(what, file=origin, key=key)
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
    sentences = [f"{name} of {_table_words(table)}: no data given" for table, name in by_mechanism]
    alike = {p.slot.table: None for p in parts if p.chip_share is not None and p.in_parallel > 1 and p.decides}
    sentences += [f"uneven sharing of chips in parallel of {_table_words(t)}: no sharing_spread given" for t in alike]
    level = {p.slot.table: None for p in parts if p.slot.kind == "inductor" and not p.base.inductance_curve}
    sentences += [
        f"fall of the inductance of {_table_words(table)} with current: no inductance_curve given, held constant"
        for table in level
    ]
    held = {p.slot.table: None for p in parts if p.slot.kind not in ("busbar", "control") and p.slot.name not in seated}
    sentences += [f"temperature of {_table_words(table)}: no thermal path given, held at the coolant" for table in held]
    return tuple(sentences)


def _table_words(table: str) -> str:
    return table.replace("_", " ").replace(".", " ")
