"""Promises of a topology: waveforms that obey the circuit, in both directions, at every point, and say where not."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from functools import partial
from itertools import pairwise
from typing import Any

import numpy as np

from tideleg.conformance.checks import Check, require_close, require_finite
from tideleg.contract import CONDUCTION, DISCONTINUOUS, Chooser, Operation, Point, Rest, Topology, read_as
from tideleg.waveform import NEGLIGIBLE_WIDTH, FloatArray, Values, Waveform

POINTS = 400
EXACT = 1e-9
"""Rounding of the piecewise-linear algebra, relative to the size of the currents [-]."""


@dataclass(frozen=True)
class Bench:
    """A topology with settings and inductances, and a cloud of points at which to ask it.

    battery, link : ranges of the port voltages [V]
    current : greatest battery current either way [A]
    """

    topology: Topology
    settings: Any
    inductance: Mapping[str, Values]
    battery: tuple[float, float]
    link: tuple[float, float]
    current: float

    def cloud(self, points: int = POINTS) -> Point:
        """Return random lossless points in both directions, seeded."""
        rng = np.random.default_rng(7)
        return self.point(
            rng.uniform(*self.battery, points),
            rng.uniform(*self.link, points),
            rng.uniform(-self.current, self.current, points),
        )

    def point(self, battery: FloatArray, link: FloatArray, current: FloatArray, active: bool = True) -> Point:
        """Return lossless points, arrays (1, S)."""
        battery, link, current = (np.atleast_2d(np.asarray(v, dtype=float)) for v in (battery, link, current))
        shape = np.broadcast_shapes(battery.shape, link.shape, current.shape)
        battery, link, current = (np.broadcast_to(v, shape) for v in (battery, link, current))
        return Point(battery, link, current, np.zeros(shape), np.full(shape, active))

    @property
    def choices(self) -> tuple[str, ...]:
        """Words of the choices that the topology makes with these settings."""
        return self.topology.choices(self.settings) if isinstance(self.topology, Chooser) else ()

    def ask(self, point: Point) -> Operation:
        """Return what the topology states, its own choices made first, each step for itself."""
        if self.choices and isinstance(point.choice, int):
            point = point._replace(choice=self._chosen(point))
        return self.topology.operate(point, self.settings, self.inductance)

    def _chosen(self, point: Point) -> Any:
        """Return the choice of every step as if it stood alone: each is a candidate of one step."""
        assert isinstance(self.topology, Chooser)
        shape = point.battery_current.shape
        battery, link, current = (np.reshape(np.broadcast_to(v, shape), (-1, 1)) for v in point[:3])
        active = np.reshape(np.broadcast_to(point.active, shape), (-1, 1))
        rest = Rest(np.ones(1), battery, link, current, active, partial(_nothing, np.zeros(battery.shape)))
        return np.reshape(self.topology.choose(rest, self.settings, None).code, shape)


def topology_checks(
    topology: Topology,
    settings: Mapping[str, object],
    *,
    inductance: float = 150e-6,
    battery: tuple[float, float] = (250.0, 450.0),
    link: tuple[float, float] = (600.0, 900.0),
    current: float = 300.0,
) -> tuple[Check, ...]:
    """Return every check of a topology.

    Parameters
    ----------
    topology : Topology
    settings : keys of [stage] that it needs, as a plan would give them
    inductance : of every inductor slot [H]
    battery, link, current : ranges in which it should mostly operate [V], [V], [A]
    """
    bound = topology.settings.model_validate(dict(settings))
    inductors = [slot.name for slot in topology.slots(bound) if slot.kind == "inductor"]
    bench = Bench(topology, bound, dict.fromkeys(inductors, inductance), battery, link, current)
    return tuple(Check(topology.name, words, _bind(hold, bench)) for words, hold in _PROMISES.items())


def _nothing(zero: FloatArray, code: int) -> FloatArray:
    """Return the loss with any code where no losses are known: none."""
    return zero * code


def _bind(hold: Callable[[Bench], None], bench: Bench) -> Callable[[], None]:
    return lambda: hold(bench)


def _fits_its_slots(bench: Bench) -> None:
    slots = bench.topology.slots(bench.settings)
    operation = bench.ask(bench.cloud())
    places: dict[str, Any] = {
        "switch": operation.positions,
        "inductor": operation.windings,
        "capacitor": operation.exchanges,
    }
    for slot in slots:
        stated = places[read_as(slot.kind)]
        assert slot.name in stated, f"slot {slot.name} has no waveform among {sorted(stated)}"
        copies = int(np.max(getattr(stated[slot.name], "copies", slot.copies)))
        most = copies <= slot.copies if bench.choices else copies == slot.copies
        assert most, f"{slot.name}: {copies} copies stated, the slot has {slot.copies}"
    assert {"battery_capacitor", "link_capacitor"} <= set(operation.exchanges), "an exchange with each port is needed"


def _is_finite_everywhere(bench: Bench) -> None:
    rng = np.random.default_rng(11)
    wild = bench.point(rng.uniform(0, 2000, POINTS), rng.uniform(0, 2000, POINTS), rng.uniform(-3000, 3000, POINTS))
    edge = bench.point(np.array([0.0, 400.0, 400.0, 0.0]), np.array([0.0, 400.0, 0.0, 800.0]), np.zeros(4))
    for point in (bench.cloud(), wild, edge):
        for name, number in _numbers(bench.ask(point)):
            require_finite(number, name)


def _numbers(operation: Operation) -> Iterator[tuple[str, Any]]:
    """Yield every number that an operation states, with its name."""
    yield "duty_ratio", operation.duty_ratio
    yield "frequency", operation.timing.frequency
    for name, waveform in _waveforms(operation):
        for i, segment in enumerate(waveform.segments):
            for field, number in zip(segment._fields, segment, strict=True):
                yield f"{name} segment {i} {field}", number
    for name, position in operation.positions.items():
        yield f"{name} blocks", position.blocks
        yield f"{name} turn_on_voltage", position.turn_on_voltage
    for name, winding in operation.windings.items():
        for i, voltage in enumerate(winding.voltages):
            yield f"{name} voltage {i}", voltage


def _waveforms(operation: Operation) -> Iterator[tuple[str, Waveform]]:
    for group in (operation.positions, operation.windings, operation.exchanges):
        for name, reading in group.items():
            yield name, reading.current


def _names_what_it_cannot(bench: Bench) -> None:
    reason = np.asarray(bench.ask(bench.cloud()).reason)
    assert reason.min() >= 0, "reason codes count from 0"
    assert reason.max() <= len(bench.topology.reasons), f"reason {reason.max()} has no words"
    share = float(np.mean(reason == 0))
    assert share > 0.2, f"only {100 * share:.0f} % of the cloud can be operated: give the ranges it is made for"


def _feasible(bench: Bench) -> tuple[Point, Operation, FloatArray]:
    """Return the points of the cloud that can be operated, what is stated there, and the size of the currents [A]."""
    cloud = bench.cloud()
    good = np.broadcast_to(np.asarray(bench.ask(cloud).reason) == 0, cloud.battery_current.shape)[0]
    point = bench.point(cloud.battery_voltage[0, good], cloud.link_voltage[0, good], cloud.battery_current[0, good])
    operation = bench.ask(point)
    size = sum(np.abs(w.current.peak()) + np.abs(w.current.valley()) for w in operation.windings.values())
    return point, operation, np.maximum(size, 1e-9)


def _windings_close(bench: Bench) -> None:
    _, operation, size = _feasible(bench)
    for name, winding in operation.windings.items():
        tiles = winding.current.fold(1.0).segments
        for before, after in zip(tiles, [*tiles[1:], tiles[0]], strict=True):
            real = (before.width > NEGLIGIBLE_WIDTH) & (after.width > NEGLIGIBLE_WIDTH)
            jump = np.where(real, before.end - after.start, 0.0)
            require_close(jump, 0.0, size, 1e-7, f"{name} jumps at the end of a segment")


def _windings_balance(bench: Bench) -> None:
    point, operation, _ = _feasible(bench)
    for name, winding in operation.windings.items():
        assert len(winding.voltages) == len(winding.current.segments), f"{name}: one voltage for each segment"
        seconds = [s.width * v for s, v in zip(winding.current.segments, winding.voltages, strict=True)]
        require_close(sum(seconds), 0.0, point.link_voltage, EXACT, f"{name} volt-seconds over a period")
        if not winding.lone:
            continue
        frequency = operation.timing.frequency
        for i, (s, voltage) in enumerate(zip(winding.current.segments, winding.voltages, strict=True)):
            rise = voltage * s.width / (bench.inductance[name] * frequency)
            scale = np.abs(rise) + np.abs(s.start) + np.abs(s.end) + 1e-9
            require_close(s.end - s.start, rise, scale, 1e-7, f"{name} segment {i}: rise against v/(L f)")


def _charge_balances(bench: Bench) -> None:
    point, operation, size = _feasible(bench)
    given = operation.exchanges["battery_capacitor"].current.mean()
    require_close(given, point.battery_current, size, EXACT, "mean of the battery exchange against the battery current")


def _power_balances(bench: Bench) -> None:
    point, operation, size = _feasible(bench)
    link = operation.exchanges["link_capacitor"].current.mean() * point.link_voltage
    battery = point.battery_current * point.battery_voltage
    require_close(link, battery, size * point.link_voltage, EXACT, "lossless link power against battery power")


def _runs_are_runs(bench: Bench) -> None:
    point, operation, size = _feasible(bench)
    for name, position in operation.positions.items():
        width = position.current.width()
        assert np.all(width >= -NEGLIGIBLE_WIDTH), f"{name}: negative run width {np.min(width):.3g}"
        assert np.all(width <= 1.0 + NEGLIGIBLE_WIDTH), f"{name}: run width {np.max(width):.9g} above 1"
        segments = position.current.segments
        for before, after in pairwise(segments):
            gap = np.mod(before.place + before.width - after.place + 0.5, 1.0) - 0.5
            both = (np.asarray(before.width) > NEGLIGIBLE_WIDTH) & (np.asarray(after.width) > NEGLIGIBLE_WIDTH)
            require_close(np.where(both, gap, 0.0), 0.0, 1.0, EXACT, f"{name}: its run has a gap")
        greatest = point.battery_voltage + point.link_voltage
        assert np.all(position.blocks >= 0.0), f"{name} blocks a negative voltage"
        assert np.all(position.blocks <= greatest * (1 + EXACT)), f"{name} blocks more than both ports together"
        require_close(np.minimum(size * 2 - np.abs(position.current.peak()), 0.0), 0.0, size, EXACT, f"{name} peak")


def _reverses(bench: Bench) -> None:
    point, operation, size = _feasible(bench)
    back = bench.ask(point._replace(battery_current=-point.battery_current))
    good = np.asarray(back.reason) == 0
    there = operation.exchanges["link_capacitor"].current.mean()
    again = back.exchanges["link_capacitor"].current.mean()
    require_close(np.where(good, there + again, 0.0), 0.0, size, EXACT, "link current of the reversed battery current")


def _has_no_jump(bench: Bench) -> None:
    steps = 4001
    middle = [0.5 * sum(pair) for pair in (bench.battery, bench.link)]
    sweep = np.linspace(-bench.current, bench.current, steps)
    operation = bench.ask(bench.point(np.full(steps, middle[0]), np.full(steps, middle[1]), sweep))
    for name, waveform in _waveforms(operation):
        square = waveform.mean_square()[0]
        rms = np.sqrt(square)
        jump = np.max(np.abs(np.diff(rms)))
        # A root like sqrt(I) near zero is steep but continuous: allow it, catch jumps of a fifth of the whole range.
        allowed = 0.2 * float(np.ptp(rms)) + 1e-9 * bench.current
        assert jump <= allowed, f"{name}: rms jumps by {jump:.4g} A between neighbouring currents"


def _broadcasts(bench: Bench) -> None:
    cloud = bench.cloud(24)
    several = Point(*(np.concatenate([np.asarray(v)] * 3) for v in cloud[:5]))
    one, three = bench.ask(cloud), bench.ask(several)
    for (name, single), (_, many) in zip(_waveforms(one), _waveforms(three), strict=True):
        square = np.broadcast_to(many.mean_square(), (3, 24))
        require_close(
            square, np.broadcast_to(single.mean_square(), (1, 24)), 1.0 + square, EXACT, f"{name}, 3 candidates"
        )
    for k in (0, 7, 23):
        alone = bench.ask(Point(*(np.asarray(v)[:, k : k + 1] for v in cloud[:5])))
        for (name, single), (_, whole) in zip(_waveforms(alone), _waveforms(one), strict=True):
            among = np.broadcast_to(whole.mean_square(), (1, 24))[:, k : k + 1]
            require_close(single.mean_square(), among, 1.0 + among, EXACT, f"{name}, step {k} alone")


def _idles(bench: Bench) -> None:
    cloud = bench.cloud(8)
    idle = bench.ask(cloud._replace(battery_current=np.zeros((1, 8)), active=np.zeros((1, 8), dtype=bool)))
    for name, waveform in _waveforms(idle):
        require_close(waveform.mean_square(), 0.0, 1.0, 1e-18, f"{name} carries current while idle")
    for name, position in idle.positions.items():
        assert not np.any(position.driven), f"{name} is driven while idle"


def _names_its_conduction(bench: Bench) -> None:
    _, operation, _ = _feasible(bench)
    code = np.asarray(operation.conduction)
    assert code.min() >= 0, "conduction codes count from 0"
    assert code.max() < len(CONDUCTION), f"conduction code {code.max()} has no word"
    narrow = [w.current.width() < 1.0 - 1e-6 for w in operation.windings.values()]
    if narrow:
        stated = np.broadcast_to(code == DISCONTINUOUS, np.shape(narrow[0]))
        flows = [w.current.width() > NEGLIGIBLE_WIDTH for w in operation.windings.values()]
        wrong = np.any(np.stack(narrow) & np.stack(flows), axis=0) & ~stated
        assert not np.any(wrong), "a winding rests within the period where conduction is not called discontinuous"


_PROMISES: dict[str, Callable[[Bench], None]] = {
    "every slot has its waveform": _fits_its_slots,
    "every number is finite, also where it cannot operate": _is_finite_everywhere,
    "points that it cannot operate are named": _names_what_it_cannot,
    "winding currents are continuous over the period": _windings_close,
    "volt-seconds balance and currents rise as v over L": _windings_balance,
    "charge balances at the battery port": _charge_balances,
    "power balances without losses": _power_balances,
    "switch runs are contiguous and block what the ports imply": _runs_are_runs,
    "the reversed direction mirrors": _reverses,
    "no jump along the current": _has_no_jump,
    "candidates and steps broadcast": _broadcasts,
    "an idle stage is at rest": _idles,
    "conduction is named": _names_its_conduction,
}
