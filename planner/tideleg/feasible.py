"""Saying where a stage cannot operate, before anyone reads numbers that mean nothing."""

from __future__ import annotations

import numpy as np

from tideleg.battery import Battery
from tideleg.choices import chosen
from tideleg.contract import Point, Rest
from tideleg.errors import InfeasibleError, InputError
from tideleg.march import Demand, Settled
from tideleg.stage import Stage


def refuse_infeasible_rest(stage: Stage, battery: Battery, demand: Demand, mission: str) -> None:
    """Refuse a mission whose link and resting battery voltages leave no way to operate.

    Raises
    ------
    InfeasibleError
        With the first instant, both voltages and the topology's reason.
    """
    shape = (1, len(demand.power))
    soc = np.full(shape, battery.start_soc)
    voltage, _ = battery.source(soc, np.ones(shape, dtype=bool), demand.battery_degc)
    zero = np.zeros(shape)
    link = np.broadcast_to(demand.link_voltage, shape)
    every = np.ones(shape, dtype=bool)
    rest = Rest(demand.duration, voltage, link, zero, every, lambda _: zero)
    point = Point(voltage, link, zero, zero, every, chosen(stage, rest, None).code)
    reason = np.broadcast_to(stage.operate(point).reason, shape)
    _refuse(stage, reason, point, demand, 0, mission)


def refuse_impossible_power(battery: Battery, demand: Demand, mission: str) -> None:
    """Refuse a request that the battery could give at no state of charge: most likely a slip of the unit.

    Raises
    ------
    InputError
        With the first instant, the power asked, and the greatest that E²/(4 R) ever allows.
    """
    ohms = battery.discharge_resistance
    if np.any(ohms <= 0.0):
        return
    greatest = float(np.max(battery.open_circuit_voltage**2 / (4.0 * ohms)))
    over = demand.allowed > greatest
    if np.any(over):
        step = int(np.argmax(over))
        time = float(demand.duration[:step].sum())
        raise InputError(
            f"mission {mission!r}, {time:g} s: {demand.power[step]:.4g} W is asked, more than the battery could give at"
            f" any state of charge (E²/4R = {greatest:.4g} W). Check the unit of the profile (W, kW, MW) and the"
            " battery's resistance"
        )


def refuse_infeasible_steps(stage: Stage, demand: Demand, blocks: list[Settled], mission: str) -> None:
    """Refuse a mission in which the stage could not operate at some step; raises as `refuse_infeasible_rest`."""
    begin = 0
    for block in blocks:
        reason = np.broadcast_to(block.checked.operation.reason, block.losses.total.shape)
        _refuse(stage, reason, block.point, demand, begin, mission)
        begin += block.losses.total.shape[-1]


def _refuse(stage: Stage, reason: object, point: Point, demand: Demand, begin: int, mission: str) -> None:
    codes = np.asarray(reason)
    if not np.any(codes):
        return
    step = int(np.argmax(np.any(codes > 0, axis=0)))
    row = int(np.argmax(codes[:, step]))
    battery = float(point.battery_voltage[row, step])
    link = float(point.link_voltage[row, step])
    time = float(demand.duration[: begin + step].sum())
    raise InfeasibleError(
        f"mission {mission!r}, {time:g} s: topology {stage.topology.name!r} cannot operate:"
        f" {stage.topology.reasons[int(codes[row, step]) - 1]} (battery {battery:.4g} V, link {link:.4g} V)."
        " Change the link or battery voltage, or choose a topology for this range; `tideleg reach PLAN` draws where it"
        " can operate"
    )
