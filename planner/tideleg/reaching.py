"""Where a topology can operate, and where the mission asks it to: known before any loss is.

The mission's points are those of the request alone: the battery gives the wanted power without losses, its terminal
voltage and the link voltage are what the topology is asked at. Around them a map of the same topology over power and
voltage ratio, at the mission's median link voltage, shows how far the points lie from what it cannot do.
"""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from tideleg.battery import Battery, answer, at_rest, nodes_of, path_of, resting_path
from tideleg.choices import chosen
from tideleg.contract import Point, Rest
from tideleg.demand import battery_of, demand_of, profile_of
from tideleg.march import Demand
from tideleg.plan import Plan, load_plan
from tideleg.registry import Registry
from tideleg.stage import Stage, build_stage
from tideleg.waveform import FloatArray

GRID = 160
"""Points of the map along each axis."""

ROOM = 0.25
"""How far the map reaches beyond the mission's points, as a share of their span [-]."""


class Map(NamedTuple):
    """A topology over battery power and voltage ratio.

    power_w : (G,) battery power, positive = discharge
    ratio : (H,) battery over link voltage
    reason, caution : (H, G) codes of the topology, 0 where there is none
    link_voltage_v : at which it was drawn
    """

    power_w: FloatArray
    ratio: FloatArray
    reason: NDArray[np.int8]
    caution: NDArray[np.int8]
    link_voltage_v: float


class Reach(NamedTuple):
    """Where one mission asks a topology to operate.

    mission, topology : names
    power_w, ratio, reason, caution : (S,) battery power, voltage ratio and the topology's codes at each step
    reasons, cautions : words of the codes, counted from 1
    share_of_time : of each reason and caution that occurs, by its words; "operates" for the rest [-]
    first_s : first instant of each reason and caution that occurs [s]
    around : the map around these points
    """

    mission: str
    topology: str
    power_w: FloatArray
    ratio: FloatArray
    reason: NDArray[np.int8]
    caution: NDArray[np.int8]
    reasons: tuple[str, ...]
    cautions: tuple[str, ...]
    share_of_time: Mapping[str, float]
    first_s: Mapping[str, float]
    around: Map

    @property
    def whole(self) -> bool:
        """Whether the topology can operate at every step."""
        return not np.any(self.reason)


def reach(plan: Plan | str | Path, *, registry: Registry | None = None) -> tuple[Reach, ...]:
    """Return where every mission of a plan asks its topology to operate.

    Raises
    ------
    InputError
        If the plan or a profile cannot be used.
    """
    plan = plan if isinstance(plan, Plan) else load_plan(plan)
    stage = build_stage(plan, registry)
    found = []
    for index, table in enumerate(plan.mission):
        profile = profile_of(plan, table, registry)
        found.append(reach_of(stage, battery_of(plan, table), demand_of(plan, index, profile, stage), profile.name))
    return tuple(found)


def reach_of(stage: Stage, battery: Battery, demand: Demand, mission: str) -> Reach:
    """Return where one demand asks a stage to operate."""
    rested = at_rest(battery)
    shape = (1, len(demand.power))
    wanted = np.broadcast_to(demand.allowed, shape)
    path = resting_path(rested, shape[-1], nodes_of(battery, demand.allowed, demand.duration))
    for _ in range(2):  # the first answer finds the state of charge, the second the voltage there
        given = answer(battery, wanted, demand.duration, rested, path, demand.battery_degc)
        path = path_of(given, path)
    link = np.broadcast_to(demand.link_voltage, shape)
    active = np.broadcast_to(~((demand.power == 0.0) & stage.idles_off), shape)
    rest = Rest(demand.duration, given.source_voltage, link, given.current, active, _no_loss(shape))
    point = Point(given.voltage, link, given.current, np.zeros(shape), active, chosen(stage, rest, None).code)
    reason, caution = (codes[0] for codes in _codes(stage, point))
    ratio = (given.voltage / link)[0]
    reasons, cautions = stage.topology.reasons, tuple(getattr(stage.topology, "cautions", ()))
    shares, first = _told(reason, caution, reasons, cautions, demand.duration)
    return Reach(
        mission,
        stage.topology.name,
        given.power[0],
        ratio,
        reason,
        caution,
        reasons,
        cautions,
        shares,
        first,
        _map(stage, given.power[0], ratio, float(np.median(link))),
    )


def _no_loss(shape: tuple[int, ...]) -> Any:
    """Return a loss that is not known yet: none, whatever is chosen."""
    return lambda code: np.zeros(shape) * code


def _codes(stage: Stage, point: Point) -> tuple[NDArray[np.int8], NDArray[np.int8]]:
    """Return reason and caution at each point; a caution only where the topology can operate."""
    operation = stage.operate(point)
    shape = point.battery_current.shape
    reason = np.broadcast_to(np.asarray(operation.reason, dtype=np.int8), shape)
    caution = np.broadcast_to(np.asarray(operation.caution, dtype=np.int8), shape)
    return reason, np.where(reason > 0, np.int8(0), caution)


def _told(
    reason: NDArray[np.int8],
    caution: NDArray[np.int8],
    reasons: tuple[str, ...],
    cautions: tuple[str, ...],
    duration: FloatArray,
) -> tuple[dict[str, float], dict[str, float]]:
    """Return the share of time and the first instant of everything that occurs."""
    whole = float(duration.sum())
    shares = {"operates": float(duration[reason == 0].sum()) / whole}
    first = {}
    begins = np.cumsum(duration) - duration
    for codes, words in ((reason, reasons), (caution, cautions)):
        for code, word in enumerate(words, 1):
            here = codes == code
            if np.any(here):
                shares[word] = float(duration[here].sum()) / whole
                first[word] = float(begins[int(np.argmax(here))])
    return shares, first


def _map(stage: Stage, power: FloatArray, ratio: FloatArray, link_voltage: float) -> Map:
    """Return the topology's codes on a grid around the mission's points; each grid point is a candidate of its own."""
    across = _around(power, least=float("-inf"))
    up = _around(ratio, least=1e-3)
    x, y = np.meshgrid(across, up)
    battery = y.reshape(-1, 1) * link_voltage
    current = x.reshape(-1, 1) / battery
    link = np.full_like(battery, link_voltage)
    active = np.ones(battery.shape, dtype=bool)
    rest = Rest(np.ones(1), battery, link, current, active, _no_loss(battery.shape))
    point = Point(battery, link, current, np.zeros_like(battery), active, chosen(stage, rest, None).code)
    reason, caution = _codes(stage, point)
    return Map(across, up, reason.reshape(x.shape), caution.reshape(x.shape), link_voltage)


def _around(values: FloatArray, least: float) -> FloatArray:
    """Return a grid that covers the values, zero power or ratio one if near, and some room."""
    low, high = float(values.min()), float(values.max())
    span = max(high - low, 0.05 * max(abs(low), abs(high)), 1e-3)
    return np.linspace(max(low - ROOM * span, least), high + ROOM * span, GRID)
