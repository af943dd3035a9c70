"""What a plugin is: the shapes that pass between the core and topologies, losses, cooling and (see `stress`) life.

A topology only states waveforms; a loss model only reads them; a cooling model only describes a network. So any loss
works with any topology, and the core knows none of them.

Shapes: arrays are broadcastable to (..., S), candidates first and steps last. Signs: power and battery current are
positive in discharge (battery to link, boost). SI units, temperatures in degC.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from types import MappingProxyType
from typing import Any, Literal, NamedTuple, Protocol, TypeVar, runtime_checkable

import numpy as np
import pluggy
from numpy.typing import NDArray
from pydantic import BaseModel

from tideleg.network import Network
from tideleg.source import ProfileSource
from tideleg.stress import LifeModel
from tideleg.waveform import NEGLIGIBLE_WIDTH, FloatArray, Values, Waveform

PROJECT = "tideleg"
"""Entry-point group and hook project name."""

hookspec = pluggy.HookspecMarker(PROJECT)
hookimpl = pluggy.HookimplMarker(PROJECT)

PartKind = Literal["switch", "diode", "inductor", "transformer", "capacitor", "busbar", "control"]

READ_AS: Mapping[PartKind, PartKind] = {"transformer": "inductor"}
"""A kind whose losses and cooling are those of another: a transformer's winding is read as an inductor's is."""


def read_as(kind: PartKind) -> PartKind:
    """Return the kind under which loss and cooling models know a part."""
    return READ_AS.get(kind, kind)


IDLE, CONTINUOUS, BOUNDARY, DISCONTINUOUS = 0, 1, 2, 3
CONDUCTION = ("idle", "continuous", "boundary", "discontinuous")
"""Words for the conduction codes, in the order of the codes."""


class Point(NamedTuple):
    """What the stage is asked to do at each step.

    battery_voltage : at the battery port [V]
    link_voltage : at the link port [V]
    battery_current : mean battery current of the whole stage, positive = discharge [A]
    path_resistance : ohmic resistance in the way of one leg's current (windings and channels), from the last pass
        of the relaxation [Ω]; its drop shifts the duty ratio
    active : whether the stage switches in this step; False where it idles with its gates off
    choice : code of the choice made for this step by a topology that makes choices (see `Chooser`), else 0
    """

    battery_voltage: FloatArray
    link_voltage: FloatArray
    battery_current: FloatArray
    path_resistance: Values
    active: NDArray[np.bool_]
    choice: NDArray[np.int64] | int = 0


class Position(NamedTuple):
    """One switch position: the current through it in one contiguous run per period.

    current : positive = drain to source (collector to emitter) [A]; segments in time order, one contiguous run
    blocks : voltage it commutates at turn-off and holds while off [V]
    turn_on_voltage : voltage across it just before its run begins [V]; differs from `blocks` where the node floats
    driven : 1 where its gate is switched in this step, 0 where it is not [-]
    copies : how many such positions work in this step, all alike; at most the copies of the slot
    """

    current: Waveform
    blocks: Values
    turn_on_voltage: Values
    driven: Values
    copies: Values = 1

    def has_edges(self) -> NDArray[np.bool_]:
        """Return where the run has a beginning and an end: its width lies strictly between 0 and 1."""
        width = self.current.width()
        return np.asarray((width > NEGLIGIBLE_WIDTH) & (width < 1.0 - NEGLIGIBLE_WIDTH))

    def turn_on_current(self) -> FloatArray:
        """Return the current at the beginning of the run, signed [A]; 0 where there is no edge."""
        return np.where(self.has_edges(), self.current.segments[0].start, 0.0)

    def turn_off_current(self) -> FloatArray:
        """Return the current at the end of the run, signed [A]; 0 where there is no edge."""
        return np.where(self.has_edges(), self.current.segments[-1].end, 0.0)


class Winding(NamedTuple):
    """One winding of a magnetic part.

    current : [A]
    voltages : voltage across it during each segment of `current`, in the same order [V]; sets the flux
    copies : how many such windings work in this step, all alike; at most the copies of the slot
    lone : whether the current follows from its own voltage and inductance alone; False where another winding shares
        the flux (coupled inductors, a transformer)
    """

    current: Waveform
    voltages: tuple[Values, ...]
    copies: Values = 1
    lone: bool = True


class Exchange(NamedTuple):
    """What the stage exchanges with one capacitor's port; the source or load takes its mean, the capacitor the rest.

    current : over one period of its own (folded for interleaved legs), positive in discharge [A]
    frequency : of that period [Hz]
    voltage : mean voltage on the capacitor [V]
    """

    current: Waveform
    frequency: Values
    voltage: Values


class Flow(NamedTuple):
    """What passes through the stage as a whole: read by busbar and control losses.

    battery_voltage, link_voltage : [V]
    battery_current, link_current : mean, positive in discharge [A]
    active : 1 where the stage switches, 0 where it idles [-]
    """

    battery_voltage: FloatArray
    link_voltage: FloatArray
    battery_current: FloatArray
    link_current: FloatArray
    active: FloatArray


class Timing(NamedTuple):
    """When the switches act.

    frequency : switching frequency of one leg [Hz]
    dead_time : at each of the two edges of a period [s]
    """

    frequency: Values
    dead_time: Values


class Operation(NamedTuple):
    """The steady state of a stage at each step, as a topology states it.

    positions, windings, exchanges : by slot name, of ONE of the `copies` equal parts
    timing : switching frequency and dead time
    duty_ratio : of the position the topology names in its documentation [-]
    conduction : code IDLE, CONTINUOUS, BOUNDARY or DISCONTINUOUS
    reason : 0 where the stage can operate, else 1 + index into the topology's `reasons`
    caution : 0, or 1 + index into the topology's `cautions` (see `Topology`) where it works near a border
    columns : further numbers of each step that a reader of the topology wants, by column name with its unit
    """

    positions: Mapping[str, Position]
    windings: Mapping[str, Winding]
    exchanges: Mapping[str, Exchange]
    timing: Timing
    duty_ratio: FloatArray
    conduction: NDArray[np.int8]
    reason: NDArray[np.int8]
    caution: NDArray[np.int8] | int = 0
    columns: Mapping[str, Values] = MappingProxyType({})


class Slot(NamedTuple):
    """A place for a part in a topology.

    name : such as "upper_switch"; the prefix of its columns
    kind : what sort of part fits
    table : name of the table under [stage] that holds its data; several slots may share one
    copies : how many equal parts the stage has there (before chips in parallel)
    in_series : how many of them stand in series across their port
    """

    name: str
    kind: PartKind
    table: str
    copies: int = 1
    in_series: int = 1


@runtime_checkable
class Topology(Protocol):
    """A circuit: states the waveforms of a stage in both power directions.

    A topology whose diodes cannot carry battery current into the link while every gate is off says so with an
    attribute `feeds_link_through_diodes = False`; without it the caution warns of that path. One that can say where
    it works near a border lists the words in an attribute `cautions` and sets `Operation.caution`. Modelling choices
    that a reader of the report must know stand in an attribute `assumptions`. A topology that reads keys for which
    another topology's plan has no value is a `Starter` too; one that makes a choice for each step (how many legs work,
    which mode) is a `Chooser` too.
    """

    @property
    def name(self) -> str:
        """Name that a plan gives in `stage.topology`."""
        ...

    @property
    def source(self) -> str:
        """Where its equations come from."""
        ...

    @property
    def settings(self) -> type[BaseModel]:
        """Model of the keys it reads directly under [stage] (not the part tables)."""
        ...

    @property
    def reasons(self) -> tuple[str, ...]:
        """Why it cannot operate at a point; `Operation.reason` counts them from 1."""
        ...

    def slots(self, settings: Any) -> tuple[Slot, ...]:
        """Return the places for parts, with how many of each."""
        ...

    def operate(self, point: Point, settings: Any, inductance: Mapping[str, Values]) -> Operation:
        """Return the steady state at each step.

        `inductance` gives each inductor slot's inductance [H]. Results must be finite everywhere, also where the
        stage cannot operate; such steps carry a reason.
        """
        ...


class Need(NamedTuple):
    """What a stage must do, in four numbers: enough for a topology to propose values of its own.

    battery_voltage : lowest at rest [V]
    link_voltage : [V]
    power : greatest, either way [W]
    switching_frequency : [Hz]
    """

    battery_voltage: float
    link_voltage: float
    power: float
    switching_frequency: float


@runtime_checkable
class Starter(Protocol):
    """A topology that proposes values for keys that a plan made for another topology does not have."""

    def starting_values(self, need: Need) -> Mapping[str, float | str]:
        """Return values by dotted key under [stage], such as "turns_ratio" or "inductor.inductance", SI units."""
        ...


class Rest(NamedTuple):
    """What is known of a block of steps before its relaxation: choices are made from it and then stay.

    A choice that followed the losses could flip between passes, and the relaxation might have no fixed point.

    duration : of each step (S,) [s]
    battery_voltage : at rest, at the state of charge to which the request alone leads (C, S) [V]
    link_voltage : (C, S) [V]
    battery_current : what the request alone would draw, positive = discharge (C, S) [A]
    active : whether the stage switches (C, S)
    loss : gives the loss of the whole stage with one code at every step, at the first guess of temperature (C, S) [W]
    """

    duration: FloatArray
    battery_voltage: FloatArray
    link_voltage: FloatArray
    battery_current: FloatArray
    active: NDArray[np.bool_]
    loss: Callable[[int], FloatArray]


class Choice(NamedTuple):
    """The choices of a block.

    code : whole numbers from 0, index into the topology's `choices` (C, S)
    carry : whatever the next block needs to go on, such as the last code and how long it has held
    """

    code: NDArray[np.int64]
    carry: Any


@runtime_checkable
class Chooser(Protocol):
    """A topology that makes a choice for each step, before anything is solved."""

    @property
    def choice_name(self) -> str:
        """What is chosen, as the name of a column, such as "active_legs" or "mode"."""
        ...

    def choices(self, settings: Any) -> tuple[str, ...]:
        """Return the words of the codes in order; empty where these settings leave nothing to choose."""
        ...

    def plain_choice(self, settings: Any) -> int | None:
        """Return the code that a stage without choices would hold, to tell what choosing saves; None if none."""
        ...

    def choose(self, rest: Rest, settings: Any, before: Any) -> Choice:
        """Return the choice for each step; `before` is the carry of the block before, None at the start."""
        ...


class Line(NamedTuple):
    """A loss as a straight line in temperature about the estimate it was asked at.

    watts : loss of one part at that temperature [W]
    watts_per_kelvin : its slope there [W/K]
    """

    watts: FloatArray
    watts_per_kelvin: FloatArray


Reading_contra = TypeVar("Reading_contra", contravariant=True)


class LossTerm(Protocol[Reading_contra]):
    """One mechanism of one part, with its data bound.

    A term may also have `outside(part, timing, temperature)`, with the arguments of `at`: where it asks its table of
    points beyond what they cover. The core counts the time and the energy of it once all has settled.
    """

    @property
    def mechanism(self) -> str:
        """Name of the mechanism in reports, such as "channel conduction"."""
        ...

    @property
    def ohmic(self) -> bool:
        """Whether it acts as a resistance in the way of the leg current and so shifts the duty ratio."""
        ...

    @property
    def heats(self) -> bool:
        """Whether its heat enters the part itself; False for gate charge, whose heat stays in the driver."""
        ...

    def at(self, part: Reading_contra, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one part at a temperature estimate [degC].

        For a switch, and for a diode of its own beside one, `part` is the Position with the current of ONE chip, both
        ways: the diode's terms count what is below zero. For an inductor it is a Winding; for a capacitor an
        Exchange; for busbar and control a Flow.
        """
        ...


@runtime_checkable
class LossModel(Protocol):
    """A loss mechanism, or several that share data.

    A model that reads switches may have `carries`: "forward", "reverse" or "both" says which current its terms count
    conducting. A switch with a diode of its own leaves the reverse current to that diode; see `dies`.
    """

    @property
    def name(self) -> str:
        """Name of the model in `tideleg plugins`."""
        ...

    @property
    def source(self) -> str:
        """Where its formula comes from."""
        ...

    @property
    def reads(self) -> PartKind:
        """The kind of part it reads."""
        ...

    @property
    def mechanisms(self) -> tuple[str, ...]:
        """Every mechanism it can offer; those it has no data for are listed as not modelled."""
        ...

    @property
    def settings(self) -> type[BaseModel]:
        """Model of the keys it reads in the part's table; models of one table may share keys."""
        ...

    def terms(self, settings: Any) -> tuple[LossTerm[Any], ...]:
        """Return the terms that the given data support; none where the data are left out."""
        ...


class CooledPart(NamedTuple):
    """A part that a cooling model may place.

    name : slot name
    kind : sort of part
    copies : how many equal parts there are in all (chips in parallel included)
    settings : the validated cooling keys of its table
    """

    name: str
    kind: PartKind
    copies: int
    settings: Any


@runtime_checkable
class CoolingModel(Protocol):
    """A way to take heat from the parts to the coolant.

    A model that knows what is left of it when the coolant stops says so by a method `without_coolant(settings)`, which
    returns settings that describe the same places without that way, or None where nothing is cooled by it.
    """

    @property
    def name(self) -> str:
        """Name that a plan gives in `cooling.model`."""
        ...

    @property
    def source(self) -> str:
        """Where its equations come from."""
        ...

    @property
    def settings(self) -> type[BaseModel]:
        """Model of the keys it reads in [cooling]."""
        ...

    @property
    def part_settings(self) -> Mapping[PartKind, type[BaseModel]]:
        """Models of the keys it reads in the table of each kind of part."""
        ...

    def network(self, settings: Any, parts: Sequence[CooledPart]) -> Network:
        """Return the thermal network. A part without thermal data gets no seat; its temperature is not modelled.

        Boundaries are named "coolant" (at the inlet) and "ambient"; their temperatures come with each step.
        """
        ...


class Hooks:
    """The hooks of plugin interface 1. A plugin module implements any of them as plain functions."""

    @hookspec
    def topology(self) -> Topology:  # type: ignore[empty-body]
        """Offer one topology; called once when plugins are first listed; return at once."""

    @hookspec
    def loss_model(self) -> LossModel:  # type: ignore[empty-body]
        """Offer one loss model; called once when plugins are first listed; return at once."""

    @hookspec
    def cooling_model(self) -> CoolingModel:  # type: ignore[empty-body]
        """Offer one cooling model; called once when plugins are first listed; return at once."""

    @hookspec
    def life_model(self) -> LifeModel:  # type: ignore[empty-body]
        """Offer one life model; called once when plugins are first listed; return at once."""

    @hookspec
    def profile_source(self) -> ProfileSource:  # type: ignore[empty-body]
        """Offer one profile source; called once when plugins are first listed; return at once."""
