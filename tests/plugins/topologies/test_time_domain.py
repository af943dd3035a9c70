"""Acceptance: the stages against a time-domain solution of the switched circuit.

The reference knows carriers, comparators, switches, inductors (with series resistance, where asked) and ideal sources
at both ports. It steps each leg from event to event with the exact solution of L di/dt = v - R i, lets an emulated
rectifier open where its current reaches zero, and looks for the periodic state that carries the wanted mean current by
root finding. Currents of all legs are then added on the common list of events and integrated by Gauss points. Nothing
of the product's formulas or waveform algebra is used.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
import pytest
from scipy.integrate import solve_ivp
from scipy.optimize import brentq

from tideleg import Operation, Point, Topology
from tideleg_topologies.half_bridge import topology as half_bridge
from tideleg_topologies.interleaved import topology as interleaved

LOWER, UPPER, NONE = 0, 1, 2
GAUSS, WEIGHT = np.polynomial.legendre.leggauss(7)
GAUSS, WEIGHT = 0.5 * (GAUSS + 1.0), 0.5 * WEIGHT


@dataclass(frozen=True)
class Circuit:
    """One operating point: sources, legs, and how the gates are driven. `current` is the mean of one leg."""

    battery: float
    link: float
    current: float
    frequency: float
    inductance: float
    resistance: float
    legs: int
    diode: bool

    @property
    def period(self) -> float:
        return 1.0 / self.frequency


@dataclass(frozen=True)
class Piece:
    """A stretch of one leg between two events: who conducts, and the current, here and after any time in it."""

    begin: float
    end: float
    state: int
    current: float
    volts: float
    circuit: Circuit

    def at(self, time: Any) -> Any:
        return _current_after(self.circuit, self.current, self.volts, np.asarray(time) - self.begin)


def _current_after(circuit: Circuit, start: float, volts: float, elapsed: Any) -> Any:
    if circuit.resistance == 0.0:
        return start + volts / circuit.inductance * elapsed
    # expm1 keeps the digits where the exponential is nearly straight
    towards = volts / circuit.resistance
    return start + (start - towards) * np.expm1(-circuit.resistance / circuit.inductance * elapsed)


def _time_to_zero(circuit: Circuit, start: float, volts: float) -> float:
    """Return how long the current takes to zero, infinite if it moves away from it."""
    if start == 0.0 or volts == 0.0 or start * volts > 0.0:
        return math.inf
    if circuit.resistance == 0.0:
        return -start * circuit.inductance / volts
    return circuit.inductance / circuit.resistance * math.log1p(-start * circuit.resistance / volts)


def _leg(circuit: Circuit, active_share: float, start: float, begin: float, periods: int) -> list[Piece]:
    """Return the pieces of one leg whose carrier starts at `begin`.

    In discharge the lower switch is the active one: it conducts from each carrier start for `active_share` of the
    period. In charge the upper switch is. The other one rectifies: until the period ends, or until zero if emulated.
    """
    active = LOWER if circuit.current >= 0.0 else UPPER
    volts = {LOWER: circuit.battery, UPPER: circuit.battery - circuit.link, NONE: 0.0}
    pieces: list[Piece] = []
    now, current = begin, start

    def run(state: int, until: float) -> None:
        nonlocal now, current
        if until > now:
            pieces.append(Piece(now, until, state, current, volts[state], circuit))
            current = 0.0 if state == NONE else float(pieces[-1].at(until))
            now = until

    for index in range(periods):
        carrier_start = begin + index * circuit.period
        crossing = carrier_start + active_share * circuit.period  # carrier meets the comparator
        carrier_end = carrier_start + circuit.period
        run(active, crossing)
        if circuit.diode:
            zero = now + _time_to_zero(circuit, current, volts[1 - active])
            if zero < carrier_end:
                run(1 - active, zero)
                current = 0.0
                run(NONE, carrier_end)
                continue
        run(1 - active, carrier_end)
    return pieces


def _mean(pieces: list[Piece]) -> float:
    total = span = 0.0
    for piece in pieces:
        width = piece.end - piece.begin
        total += width * float(WEIGHT @ piece.at(piece.begin + GAUSS * width))
        span += width
    return total / span


def _drift(circuit: Circuit, share: float, start: float) -> float:
    last = _leg(circuit, share, start, 0.0, 1)[-1]
    return float(last.at(last.end)) - start


def _steady(circuit: Circuit) -> tuple[float, float]:
    """Return (active share, current at the carrier start) of the periodic state with the wanted mean."""
    forced = Circuit(**{**circuit.__dict__, "diode": False})
    tight = {"xtol": 1e-15, "rtol": 1e-14}
    if circuit.diode:
        # The share at which a current that starts at zero just returns to zero as the period ends.
        limit = brentq(lambda share: _drift(forced, share, 0.0), 1e-9, 1.0 - 1e-9, **tight)
        if abs(_mean(_leg(forced, limit, 0.0, 0.0, 1))) > abs(circuit.current):

            def lack(share: float) -> float:
                return _mean(_leg(circuit, share, 0.0, 0.0, 1)) - circuit.current

            return brentq(lack, 0.0, limit, **tight), 0.0
    if circuit.resistance == 0.0:
        share = brentq(lambda share: _drift(forced, share, circuit.current), 1e-9, 1.0 - 1e-9, **tight)
    else:
        share = brentq(lambda share: _mean(_periodic(forced, share)) - circuit.current, 1e-6, 1.0 - 1e-6, **tight)
        return share, _periodic(forced, share)[0].current
    at_zero = _mean(_leg(forced, share, 0.0, 0.0, 1))
    bound = 2.0 * (abs(circuit.current) + abs(at_zero)) + 1.0
    start = brentq(
        lambda start: _mean(_leg(forced, share, start, 0.0, 1)) - circuit.current, -bound, bound, xtol=1e-12, rtol=1e-14
    )
    return share, start


def _periodic(circuit: Circuit, share: float) -> list[Piece]:
    """Return one period of the state that a share settles to: the drift is linear in the current at its start."""
    at_zero, at_one = _drift(circuit, share, 0.0), _drift(circuit, share, 1.0)
    return _leg(circuit, share, at_zero / (at_zero - at_one), 0.0, 1)


class Measured:
    """What an instrument would read in one period of the steady state, all legs running."""

    def __init__(self, circuit: Circuit) -> None:
        share, start = _steady(circuit)
        period = circuit.period
        self.period = period
        legs = [_leg(circuit, share, start, k * period / circuit.legs, 2) for k in range(circuit.legs)]
        times = sorted({period, 2.0 * period, *(t for leg in legs for p in leg for t in (p.begin, p.end))})
        window = np.array([t for t in times if period <= t <= 2.0 * period])
        keep = np.diff(window) > 1e-13 * period
        self.begin, self.width = window[:-1][keep], np.diff(window)[keep]
        nodes = self.begin[:, None] + self.width[:, None] * GAUSS
        edges = np.stack([self.begin, self.begin + self.width], axis=1)
        states, inner, outer = zip(*(self._sampled(leg, nodes, edges) for leg in legs), strict=True)
        self.state, self.inner, self.outer = np.array(states), np.array(inner), np.array(outer)
        self.leg = legs[0]

    def _sampled(self, leg: list[Piece], nodes: np.ndarray, edges: np.ndarray) -> tuple[Any, Any, Any]:
        begins = np.array([p.begin for p in leg])
        where = np.searchsorted(begins, self.begin + 0.5 * self.width, side="right") - 1
        state = np.array([leg[i].state for i in where])
        inner = np.array([leg[i].at(row) for i, row in zip(where, nodes, strict=True)])
        outer = np.array([leg[i].at(row) for i, row in zip(where, edges, strict=True)])
        return state, inner, outer

    def _readings(self, inner: np.ndarray, outer: np.ndarray) -> dict[str, float]:
        """Return mean, rms and so on of a current given at the Gauss points and ends of every interval."""
        share = self.width / self.period
        mean = float(share @ (inner @ WEIGHT))
        return {
            "mean": mean,
            "rms": float(np.sqrt(share @ (inner**2 @ WEIGHT))),
            "ac_rms": float(np.sqrt(max(share @ ((inner - mean) ** 2 @ WEIGHT), 0.0))),
            "peak": float(outer.max()),
            "valley": float(outer.min()),
            "swing": self._swing(inner - mean, outer - mean),
        }

    def _swing(self, inner: np.ndarray, outer: np.ndarray) -> float:
        """Return the swing of the charge; inside an interval it turns where the current, nearly straight, is zero."""
        charge = np.concatenate([[0.0], np.cumsum(self.width * (inner @ WEIGHT))])
        before, after = outer[:, 0], outer[:, 1]
        turns = before * after < 0.0
        until = before[turns] / (before[turns] - after[turns]) * self.width[turns]
        inside = charge[:-1][turns] + 0.5 * before[turns] * until
        every = np.concatenate([charge, inside])
        return float(every.max() - every.min())

    def readings(self) -> dict[str, float]:
        found: dict[str, float] = {}
        upper = (self.state == UPPER)[..., None]
        lower = (self.state == LOWER)[..., None]
        ports = {
            "inductor": (self.inner[0], self.outer[0]),
            "lower": (self.inner[0] * lower[0], self.outer[0] * lower[0]),
            "upper": (-self.inner[0] * upper[0], -self.outer[0] * upper[0]),
            "battery": (self.inner.sum(axis=0), self.outer.sum(axis=0)),
            "link": ((self.inner * upper).sum(axis=0), (self.outer * upper).sum(axis=0)),
        }
        for name, (inner, outer) in ports.items():
            found |= {f"{name} {key}": value for key, value in self._readings(inner, outer).items()}
        for name, state, sign in (("lower", LOWER, 1.0), ("upper", UPPER, -1.0)):
            pieces = [p for p in self.leg if p.state == state]
            found[f"{name} turn-on"] = sign * pieces[-1].current
            found[f"{name} turn-off"] = sign * float(pieces[-1].at(pieces[-1].end))
            found[f"{name} width"] = (pieces[-1].end - pieces[-1].begin) / self.period
        return found


def product_readings(operation: Operation) -> dict[str, np.ndarray]:
    """Return the same readings from what the topology states."""
    currents = {
        "inductor": (operation.windings["inductor"].current, operation.timing.frequency),
        "lower": (operation.positions["lower_switch"].current, operation.timing.frequency),
        "upper": (operation.positions["upper_switch"].current, operation.timing.frequency),
        "battery": operation.exchanges["battery_capacitor"][:2],
        "link": operation.exchanges["link_capacitor"][:2],
    }
    found: dict[str, np.ndarray] = {}
    for name, (current, frequency) in currents.items():
        found |= {
            f"{name} mean": current.mean(),
            f"{name} rms": current.rms(),
            f"{name} ac_rms": current.ac_rms(),
            f"{name} peak": current.peak(),
            f"{name} valley": current.valley(),
            f"{name} swing": current.charge_swing() / frequency,
        }
    for name in ("lower", "upper"):
        position = operation.positions[f"{name}_switch"]
        found[f"{name} turn-on"] = position.turn_on_current()
        found[f"{name} turn-off"] = position.turn_off_current()
        found[f"{name} width"] = position.current.width()
    return found


def drawn(seed: int, count: int, legs: int, *, diode: bool, drop: float) -> list[Circuit]:
    """Return random circuits: both directions, ratios 0.05 to 0.95, ripple from 0.1 to 10 times the mean current.

    `drop` is the greatest ohmic drop relative to the smaller of the two voltages across the inductor.
    """
    random = np.random.default_rng(seed)
    circuits = []
    for _ in range(count):
        link, ratio = random.uniform(50.0, 1500.0), random.uniform(0.05, 0.95)
        frequency, ripple = 10.0 ** random.uniform(3.5, 5.3), 10.0 ** random.uniform(-1.0, 1.0)
        current = 10.0 ** random.uniform(0.0, 2.5) * random.choice([-1.0, 1.0])
        inductance = link * ratio * (1.0 - ratio) / (frequency * ripple * abs(current))
        smaller = link * min(ratio, 1.0 - ratio)
        resistance = drop * smaller * random.uniform(0.2, 1.0) / (abs(current) * max(1.0, ripple))
        circuits.append(Circuit(link * ratio, link, current, frequency, inductance, resistance, legs, diode))
    return circuits


def operated(circuits: list[Circuit]) -> Operation:
    """Return what the product says of all circuits at once: frequency and inductance differ from step to step."""
    legs = circuits[0].legs

    def column(name: str) -> np.ndarray:
        return np.array([getattr(c, name) for c in circuits])

    topology: Topology = half_bridge() if legs == 1 else interleaved()
    modulation = "diode" if circuits[0].diode else "synchronous"
    settings = topology.settings.model_validate({"switching_frequency": 1.0, "modulation": modulation, "legs": legs})
    settings = settings.model_copy(update={"switching_frequency": column("frequency")})
    active = np.ones(len(circuits), dtype=bool)
    point = Point(column("battery"), column("link"), legs * column("current"), column("resistance"), active)
    return topology.operate(point, settings, {"inductor": column("inductance")})


def assert_agree(circuits: list[Circuit], relative: float, floor: float) -> None:
    """Compare every reading; `floor` is the absolute tolerance relative to the largest current of the leg."""
    operation = operated(circuits)
    assert not np.any(operation.reason)
    ours = product_readings(operation)
    for index, circuit in enumerate(circuits):
        wanted = Measured(circuit).readings()
        scale = max(abs(wanted["inductor peak"]), abs(wanted["inductor valley"])) * circuit.legs
        for name, value in wanted.items():
            unit = 1.0 if name.endswith("width") else scale / circuit.frequency if name.endswith("swing") else scale
            assert ours[name][index] == pytest.approx(value, rel=relative, abs=floor * unit), (name, circuit)


@pytest.mark.parametrize("diode", [False, True], ids=["synchronous", "diode"])
@pytest.mark.parametrize("legs", range(1, 7))
def test_lossless_stage_equals_the_switched_circuit(legs: int, diode: bool) -> None:
    # 12 x 42 = 504 points. Both sides are exact up to rounding; the root of a difference of squares keeps half its
    # digits near a ripple null, hence a floor of 1e-7 of the largest current.
    circuits = drawn(1000 + 10 * legs + diode, 42, legs, diode=diode, drop=0.0)
    assert_agree(circuits, relative=1e-6, floor=1e-7)


@pytest.mark.parametrize("diode", [False, True], ids=["synchronous", "diode"])
@pytest.mark.parametrize("legs", [1, 3])
def test_stage_with_drops_stays_near_the_switched_circuit(legs: int, diode: bool) -> None:
    # Drops up to 1.5 % of the smaller inductor voltage. The product keeps currents straight; the bow that the
    # exponential adds, about an eighth of the drop's own swing, stays within 0.2 % of the largest current.
    circuits = drawn(2000 + 10 * legs + diode, 25, legs, diode=diode, drop=0.015)
    assert_agree(circuits, relative=2e-3, floor=2e-3)


@pytest.mark.parametrize("diode", [False, True], ids=["synchronous", "diode"])
def test_drops_matter_to_the_duty_ratio(diode: bool) -> None:
    # The comparison above would not mean much if leaving the drop out passed as well.
    circuits = drawn(2001, 25, 1, diode=diode, drop=0.015)
    plain = operated([Circuit(**{**c.__dict__, "resistance": 0.0}) for c in circuits]).duty_ratio
    wanted = np.array([Measured(c).readings()["upper width"] for c in circuits])
    with_drop = operated(circuits).duty_ratio
    assert np.max(np.abs(with_drop / wanted - 1.0)) < 1e-3
    assert np.max(np.abs(plain / wanted - 1.0)) > 5e-3


def test_draws_cover_both_directions_and_both_kinds_of_conduction() -> None:
    circuits = [c for legs in range(1, 7) for c in drawn(1000 + 10 * legs + 1, 42, legs, diode=True, drop=0.0)]
    kinds = {(c.current > 0.0, _steady(c)[1] == 0.0) for c in circuits}
    assert kinds == {(True, True), (True, False), (False, True), (False, False)}


@pytest.mark.parametrize("resistance", [0.0, 0.5])
def test_reference_agrees_with_a_general_solver(resistance: float) -> None:
    # The reference itself, against scipy's solver with events, over one discontinuous period.
    circuit = Circuit(200.0, 500.0, 4.0, 20e3, 60e-6, resistance, 1, diode=True)
    share, start = _steady(circuit)
    assert start == 0.0
    pieces = _leg(circuit, share, 0.0, 0.0, 1)

    def slope(volts: float) -> Any:
        return lambda _, i: [(volts - resistance * i[0]) / circuit.inductance]

    def reaches_zero(_: float, i: np.ndarray) -> float:
        return float(i[0])

    reaches_zero.terminal, reaches_zero.direction = True, -1.0  # type: ignore[attr-defined]
    tight = {"rtol": 1e-10, "atol": 1e-12}
    rise = solve_ivp(slope(200.0), (0.0, share * circuit.period), [0.0], **tight)
    fall = solve_ivp(
        slope(-300.0), (rise.t[-1], circuit.period), [rise.y[0, -1]], events=reaches_zero, max_step=1e-6, **tight
    )
    assert pieces[0].at(pieces[0].end) == pytest.approx(rise.y[0, -1], rel=1e-8)
    assert pieces[1].end == pytest.approx(fall.t_events[0][0], rel=1e-8)
    assert [p.state for p in pieces] == [LOWER, UPPER, NONE]
