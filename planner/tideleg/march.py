"""The relaxation between battery, currents, losses and temperatures, block by block: the only loop of the physics.

Within a block of steps all of these depend on each other: the battery gives the wanted power plus the losses; the
currents follow from the battery; the losses from the currents and temperatures; the temperatures from the losses. One
pass evaluates the chain for the whole block at once; passes repeat until nothing moves. Blocks are counted from step
0, so the result does not depend on how the profile was read.

Shapes: arrays (C, S), candidates first and steps last; temperatures (seated part, C, S).
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Any, Literal, NamedTuple

import numpy as np
from numpy.typing import NDArray

from tideleg.battery import (
    Battery,
    BatteryAnswer,
    BatteryPath,
    BatteryState,
    Cause,
    answer,
    at_rest,
    nodes_of,
    path_of,
    resting_path,
    state_after,
)
from tideleg.choices import NO_CHOICE, chosen, loss_with
from tideleg.contract import Choice, Point, Rest
from tideleg.errors import NoEquilibriumError
from tideleg.heat import Propagator
from tideleg.rootsearch import RootSearch
from tideleg.stage import Losses, Stage
from tideleg.waveform import FloatArray

BLOCK = 8192
"""Steps in a numeric block: about what a core's cache holds, all arrays together."""

MOST_PASSES = 60
TEMPERATURE_TOLERANCE = 1e-5
"""The relaxation ends when no mean temperature moves by more than this in a pass [K]."""

ENERGY_TOLERANCE = 1e-10
"""... and when the loss energy moves by no more than this share of the battery's throughput in a pass [-]."""

POWER_FLOOR = 1e-7
"""... or by no more than this mean power, where next to nothing flows [W]."""

CEILING = 1000.0
"""A part above this temperature has run away: no data holds there [degC]."""


@dataclass(frozen=True)
class Demand:
    """What a mission asks of the stage, step by step; arrays (S,).

    power : requested, positive = discharge [W]
    terminals : where `power` is meant
    duration : of each step [s]
    link_voltage : [V]
    boundary : (B, S) temperatures of the thermal boundaries, in the order of the stage's modes [degC]
    held : temperature at which parts without a thermal path are held [degC]
    greatest, least : bounds on the power from the profile [W], infinite where none
    battery_degc : temperature of the battery [degC]; None where nothing depends on it
    """

    power: FloatArray
    terminals: Literal["link", "battery"]
    duration: FloatArray
    link_voltage: FloatArray
    boundary: FloatArray
    held: FloatArray
    greatest: FloatArray
    least: FloatArray
    battery_degc: FloatArray | None = None

    def block(self, begin: int) -> Demand:
        """Return the block of steps that starts at `begin`."""
        cut = slice(begin, begin + BLOCK)
        return Demand(
            self.power[cut],
            self.terminals,
            self.duration[cut],
            self.link_voltage[cut],
            self.boundary[:, cut],
            self.held[cut],
            self.greatest[cut],
            self.least[cut],
            None if self.battery_degc is None else self.battery_degc[cut],
        )

    @property
    def allowed(self) -> FloatArray:
        """Requested power within the profile's own bounds [W]."""
        return np.clip(self.power, self.least, self.greatest)


class Carry(NamedTuple):
    """What one block hands to the next.

    battery : the battery between two steps
    heat : modal thermal state
    temperature : (seated part, C, 1) last mean temperatures, the first guess of the next block [degC]
    choice : what the topology's choices need to go on; None at the start
    """

    battery: BatteryState
    heat: FloatArray
    temperature: FloatArray
    choice: Any = None


class Settled(NamedTuple):
    """A block whose relaxation has ended; arrays (C, S), temperatures (seated part, C, S).

    power : delivered at the link, positive = discharge [W]
    curtailed : requested less delivered, at the profile's terminals [W]
    direction : 1 where discharge is asked, -1 where charge is, 0 where nothing is
    battery : the battery's answer
    point : what the topology was asked at the end
    losses : what the battery supplied; `checked` the same evaluated anew from the reported currents and temperatures
    mean, end : temperatures over and at the end of each step [degC]
    gain : (seated part, C, S) loop gain at rest [-]
    passes : how many were taken
    """

    power: FloatArray
    curtailed: FloatArray
    direction: FloatArray
    battery: BatteryAnswer
    point: Point
    losses: Losses
    checked: Losses
    mean: FloatArray
    end: FloatArray
    gain: FloatArray
    passes: int
    carry: Carry


def march(
    stage: Stage,
    battery: Battery,
    demand: Demand,
    carry: Carry,
    done: Callable[[int], None] | None = None,
) -> Iterator[Settled]:
    """Yield the settled blocks of a mission in order.

    Parameters
    ----------
    stage, battery, demand : what to run
    carry : state before the first step, see `start`
    done : called with the number of steps finished after each block

    Raises
    ------
    NoEquilibriumError
        If a part finds no temperature: the part, the instant and the loop gain are named.
    """
    elapsed = 0.0
    for begin in range(0, len(demand.power), BLOCK):
        block = demand.block(begin)
        settled = relax(stage, battery, block, carry, elapsed)
        carry = settled.carry
        elapsed += float(block.duration.sum())
        yield settled
        if done is not None:
            done(begin + len(block.power))


def start(stage: Stage, battery: Battery, demand: Demand, temperature: float | None, candidates: int = 1) -> Carry:
    """Return the state before the first step: at rest with the first boundaries, or all at one temperature [degC]."""
    rested = at_rest(battery, candidates)
    if stage.modes is None:
        return Carry(rested, np.zeros((0, candidates)), np.zeros((0, candidates, 1)))
    first = demand.boundary[:, 0] if temperature is None else np.full(len(demand.boundary), temperature)
    heat = stage.modes.soaked(first)
    heat = np.broadcast_to(heat.reshape(heat.shape[0], -1), (heat.shape[0], candidates)).copy()
    rest = stage.modes.steady(np.zeros((len(stage.seated), 1)), first[:, None])
    guess = np.broadcast_to(rest.reshape(len(stage.seated), -1, 1), (len(stage.seated), candidates, 1)).copy()
    return Carry(rested, heat, guess)


def relax(stage: Stage, battery: Battery, demand: Demand, carry: Carry, elapsed: float) -> Settled:
    """Relax one block until neither temperatures nor losses move.

    Notes
    -----
    The temperature update is damped by 1/(1 - gain), with the gain of a step upon itself: the slope of the loss times
    the response of the step's mean temperature to its own loss. Heat left by earlier steps needs no damping: it only
    flows forward in time, and each pass carries it exactly.
    """
    shape = (len(carry.battery.soc), len(demand.power))
    propagator = None if stage.modes is None else Propagator(stage.modes, demand.duration)
    temperature = np.broadcast_to(carry.temperature, (len(stage.seated), *shape)).copy()
    search = RootSearch()
    loss = np.zeros(shape)
    path = resting_path(carry.battery, shape[-1], nodes_of(battery, demand.allowed, demand.duration))
    path_resistance = np.zeros(shape)
    active = np.broadcast_to(~((demand.power == 0.0) & stage.idles_off), shape)
    choice = _chosen(stage, battery, demand, carry, temperature, active)
    for passes in range(1, MOST_PASSES + 1):
        given = answer(battery, _wanted(demand, loss), demand.duration, carry.battery, path, demand.battery_degc)
        link = np.broadcast_to(demand.link_voltage, shape)
        point = Point(given.voltage, link, given.current, path_resistance, active, choice.code)
        losses = stage.losses(point, stage.by_name(temperature, demand.held, shape))
        moved, response = _warm(propagator, carry, losses, temperature, demand)
        drift = np.sum(np.abs(losses.total - loss) * demand.duration, axis=-1)
        throughput = np.sum(np.abs(given.power) * demand.duration, axis=-1)
        still = _battery_still(path, path_of(given, path))
        temperature = temperature + moved
        loss = search.next(loss, losses.total)
        path_resistance, path = losses.path_resistance, path_of(given, path)
        _refuse_runaway(stage, temperature, losses, demand, elapsed)
        still = still and float(np.max(np.abs(moved), initial=0.0)) < TEMPERATURE_TOLERANCE
        if still and np.all(drift <= ENERGY_TOLERANCE * throughput + POWER_FLOOR * demand.duration.sum()):
            carry = carry._replace(choice=choice.carry)
            return _finish(stage, battery, demand, carry, losses, temperature, response, path, point, passes)
    raise _unsettled(stage, moved, losses, demand, elapsed)


def _chosen(
    stage: Stage,
    battery: Battery,
    demand: Demand,
    carry: Carry,
    temperature: FloatArray,
    active: NDArray[np.bool_],
) -> Choice:
    """Return the topology's choice for each step, from the request alone and the battery at rest."""
    shape = active.shape
    path = resting_path(carry.battery, shape[-1])
    if stage.choices:  # twice: the first answer finds the state of charge, the second the voltage there
        request = _wanted(demand, np.zeros(shape))
        degc = demand.battery_degc
        path = path_of(answer(battery, request, demand.duration, carry.battery, path, degc), path)
        given = answer(battery, request, demand.duration, carry.battery, path, degc)
        link = np.broadcast_to(demand.link_voltage, shape)
        point = Point(given.voltage, link, given.current, np.zeros(shape), active)
        loss = loss_with(stage, point, stage.by_name(temperature, demand.held, shape))
        rest = Rest(demand.duration, given.source_voltage, link, given.current, active, loss)
        return chosen(stage, rest, carry.choice)
    return NO_CHOICE


def _battery_still(before: BatteryPath, after: BatteryPath) -> bool:
    """Whether neither charge nor RC pairs moved in a pass; what is left is far below the energy tolerance."""
    charge = np.max(np.abs(after.soc_nodes - before.soc_nodes))
    pairs = np.max(np.abs(after.pair_start - before.pair_start), initial=0.0)
    return bool(charge < 1e-9 and pairs < 1e-6)


def _wanted(demand: Demand, loss: FloatArray) -> FloatArray:
    """Return the battery power that the request and the losses ask for [W]."""
    return demand.allowed + loss if demand.terminals == "link" else demand.allowed + np.zeros_like(loss)


class _Warmth(NamedTuple):
    mean: FloatArray
    end: FloatArray
    state: FloatArray
    same_step: FloatArray


def _warm(
    propagator: Propagator | None, carry: Carry, losses: Losses, temperature: FloatArray, demand: Demand
) -> tuple[FloatArray, _Warmth]:
    """Return how far the temperatures move in this pass, and the thermal response behind it."""
    if propagator is None:
        return temperature, _Warmth(temperature, temperature, carry.heat, temperature)
    answer_ = propagator.respond(carry.heat, losses.heat, demand.boundary)
    same_step = propagator.same_step_response()
    gain = np.minimum(losses.slope * same_step, 0.9)
    return (answer_.mean - temperature) / (1.0 - gain), _Warmth(answer_.mean, answer_.end, answer_.state, same_step)


def _finish(
    stage: Stage,
    battery: Battery,
    demand: Demand,
    carry: Carry,
    losses: Losses,
    temperature: FloatArray,
    warmth: _Warmth,
    path: BatteryPath,
    asked: Point,
    passes: int,
) -> Settled:
    """Solve the battery last, so that in - out - loss is an identity, and evaluate the losses once more as a check."""
    given = answer(battery, _wanted(demand, losses.total), demand.duration, carry.battery, path, demand.battery_degc)
    shape = losses.total.shape
    point = asked._replace(
        battery_voltage=given.voltage, battery_current=given.current, path_resistance=losses.path_resistance
    )
    checked = stage.losses(point, stage.by_name(warmth.mean, demand.held, shape))
    served = (given.cause == Cause.NONE) & (demand.allowed == demand.power)
    if demand.terminals == "link":
        power = np.where(served, demand.power, given.power - losses.total)
        curtailed = demand.power - power
    else:
        power = given.power - losses.total
        curtailed = np.where(served, 0.0, demand.power - given.power)
    cause = np.where((given.cause == Cause.NONE) & ~served, Cause.PROFILE, given.cause).astype(np.int8)
    gain = np.zeros_like(temperature)
    if stage.modes is not None:
        gain = np.einsum("pq...,q...->p...", stage.modes.resistance_matrix(), losses.slope)
    after = Carry(state_after(given), warmth.state, warmth.mean[..., -1:], carry.choice)
    return Settled(
        power,
        curtailed,
        np.broadcast_to(np.sign(demand.allowed), shape),
        given._replace(cause=cause),
        point,
        losses,
        checked,
        warmth.mean,
        warmth.end,
        gain,
        passes,
        after,
    )


def _refuse_runaway(stage: Stage, temperature: FloatArray, losses: Losses, demand: Demand, elapsed: float) -> None:
    bad = ~np.isfinite(temperature) | (temperature > CEILING)
    if np.any(bad):
        raise _no_equilibrium(stage, bad, losses, demand, elapsed, "runs away")
    if not np.all(np.isfinite(losses.total)):
        first = int(np.argmax(~np.isfinite(losses.total).all(axis=0)))
        time = elapsed + float(demand.duration[:first].sum())
        raise NoEquilibriumError(f"the loss of the stage is not finite at {time:g} s; look at the parts' data")


def _unsettled(stage: Stage, moved: FloatArray, losses: Losses, demand: Demand, elapsed: float) -> NoEquilibriumError:
    bad = np.abs(moved) >= TEMPERATURE_TOLERANCE if moved.size else np.zeros((0, *losses.total.shape), dtype=bool)
    if not np.any(bad):
        return NoEquilibriumError(
            f"losses and currents did not settle in {MOST_PASSES} passes in the steps after {elapsed:g} s"
        )
    return _no_equilibrium(stage, bad, losses, demand, elapsed, f"did not settle in {MOST_PASSES} passes")


def _no_equilibrium(
    stage: Stage, bad: NDArray[np.bool_], losses: Losses, demand: Demand, elapsed: float, what: str
) -> NoEquilibriumError:
    """Name the part, the instant and the loop gain of the first step that finds no temperature."""
    step = int(np.argmax(bad.any(axis=(0, 1))))
    part = int(np.argmax(bad[:, :, step].any(axis=1)))
    assert stage.modes is not None
    gain = np.einsum("pq...,q...->p...", stage.modes.resistance_matrix(), losses.slope[..., step : step + 1])
    time = elapsed + float(demand.duration[:step].sum())
    worst = float(np.nanmax(gain[part]))
    return NoEquilibriumError(
        f"no thermal equilibrium: {stage.seated[part]} {what} at {time:g} s (loop gain at rest {worst:.2f}; 1 or more"
        " has no steady temperature). Improve the cooling, put more chips in parallel or lower the losses"
    )
