"""Choose core, turns, gap and wire for an inductor: least volume first, each rejected choice with its reason."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tideleg import FloatArray, InputError, Segment, Timing, Waveform, Winding
from tideleg_losses.core import CoreTerm, igse_k
from tideleg_losses.dowell import skin_depth
from tideleg_losses.inductor_build import InductorBuild
from tideleg_losses.inductor_build_core import CoreShape, gaps_for, magnetize
from tideleg_losses.inductor_build_winding import Wire, fits, turns_per_layer, winding_keys, window_fill
from tideleg_losses.winding import WindingSettings, ac_term

MOST_TURNS = 400
GAP_SURPLUS = (1.0, 1.03, 1.1, 1.25)
"""How far above the wanted inductance a gapped core is ground at zero current, tried in this order [-]."""


@dataclass(frozen=True)
class InductorNeed:
    """What an inductor must do.

    inductance : differential, still there at the peak current [H]
    peak_current, rms_current : magnitudes; the peak sets the flux, the rms the copper loss [A]
    ripple_current : peak-to-peak of a triangle with equal slopes [A]
    frequency : of that ripple [Hz]
    loss_budget : greatest loss of winding and core together [W]
    degc : temperature of the copper [degC]
    fill_limit : greatest share of the window that may be copper [-]
    """

    inductance: float
    peak_current: float
    rms_current: float
    ripple_current: float
    frequency: float
    loss_budget: float
    degc: float = 100.0
    fill_limit: float = 0.5

    def __post_init__(self) -> None:
        for name in ("inductance", "peak_current", "rms_current", "frequency", "loss_budget", "fill_limit"):
            value = getattr(self, name)
            if not 0.0 < value < np.inf:
                raise InputError(f"{name}: found {value:g}; give a number above zero")
        if not 0.0 <= self.ripple_current <= 2.0 * self.peak_current:
            raise InputError(
                f"ripple_current: found {self.ripple_current:g} A; it lies from 0 to twice the peak current,"
                f" {2.0 * self.peak_current:g} A"
            )
        if self.rms_current > self.peak_current:
            raise InputError(f"rms_current: found {self.rms_current:g} A, above the peak, {self.peak_current:g} A")
        least = self.ripple_current / np.sqrt(12.0)  # a triangle's own rms; a mean current only adds to it
        if self.rms_current < least * (1.0 - 1e-12):
            raise InputError(
                f"rms_current: found {self.rms_current:g} A, below the {least:.4g} A of the ripple alone; give more"
            )
        if not -60.0 <= self.degc <= 250.0:
            raise InputError(f"degc: found {self.degc:g} degC; give the copper's temperature, -60 to 250 degC")


@dataclass(frozen=True)
class Candidate:
    """A build that fulfils the need, with its loss.

    winding_loss, core_loss : [W]
    """

    build: InductorBuild
    winding_loss: float
    core_loss: float

    @property
    def loss(self) -> float:
        """Loss of winding and core [W]."""
        return self.winding_loss + self.core_loss


@dataclass(frozen=True)
class Rejected:
    """A pair of core and wire that was left out, and why, in words with numbers."""

    core: str
    wire: str
    reason: str


@dataclass(frozen=True)
class InductorChoice:
    """What was found: candidates by rising volume (the first is the choice), and every pair that was left out."""

    candidates: tuple[Candidate, ...]
    rejected: tuple[Rejected, ...]


def choose_inductor(need: InductorNeed, cores: Sequence[CoreShape], wires: Sequence[Wire]) -> InductorChoice:
    """Return every pair of core and wire that fulfils the need, least volume first, and every other with its reason.

    For each pair all numbers of turns that fit are tried, gapped cores with some surplus of inductance, and the least
    volume within the loss budget is kept; pairs of equal volume stand by rising loss.
    """
    found: list[Candidate] = []
    rejected: list[Rejected] = []
    for core in cores:
        magnetics = _magnetics(need, core)
        for wire in wires:
            outcome = _pair(need, core, wire, magnetics)
            if isinstance(outcome, str):
                rejected.append(Rejected(core.name, wire.name, outcome))
            else:
                found.append(outcome)
    ordered = sorted(found, key=lambda one: (one.build.volume, one.loss))
    return InductorChoice(tuple(ordered), tuple(rejected))


def losses(need: InductorNeed, build: InductorBuild) -> tuple[float, float]:
    """Return the loss of the winding and of the core [W].

    Copper: dc resistance times the squared rms, and the excess of the triangle's harmonics by the plan's own winding
    loss. Core: iGSE on the swing L dI/(N A) with the differential inductance at zero current, its greatest.

    Raises
    ------
    InputError
        If the strands of a litz wire are thicker than the skin depth at the frequency.
    """
    half = 0.5 * need.ripple_current
    triangle = Waveform((Segment(0.0, 0.5, -half, half), Segment(0.5, 0.5, half, -half)))
    volt = 2.0 * build.inductance * need.ripple_current * need.frequency
    part, timing = Winding(triangle, (volt, -volt)), Timing(need.frequency, 0.0)
    warm = np.array([[need.degc]])
    settings = WindingSettings.model_validate(winding_keys(build.core, build.wire, build.turns))
    assert settings.winding_resistance is not None
    excess = ac_term(settings, settings.winding_resistance)
    copper = float(build.resistance(need.degc)) * need.rms_current**2
    if excess is not None:
        copper += float(excess.at(part, timing, warm).watts[0, 0])
    k, alpha, beta = build.core.steinmetz
    core = CoreTerm(igse_k(k, alpha, beta), alpha, beta, build.core.area, build.core.volume, float(build.turns))
    return copper, float(core.at(part, timing, warm).watts[0, 0])


def shortfalls(need: InductorNeed, build: InductorBuild) -> tuple[str, ...]:
    """Return what a build lacks against the need, in words with numbers; nothing where it fulfils it."""
    peak = build.at(need.peak_current)
    short = []
    if float(peak.differential_inductance) < need.inductance * (1.0 - 1e-12):
        short.append(
            f"inductance at {need.peak_current:g} A is {1e6 * float(peak.differential_inductance):.4g} uH,"
            f" {1e6 * need.inductance:.4g} uH is wanted"
        )
    if float(peak.flux_density) > build.core.flux_limit * (1.0 + 1e-12):
        short.append(f"peak flux density is {float(peak.flux_density):.3g} T, {build.core.flux_limit:g} T is allowed")
    if build.window_fill > need.fill_limit:
        short.append(f"copper fills {build.window_fill:.0%} of the window, {need.fill_limit:.0%} is allowed")
    loss = sum(losses(need, build))
    if loss > need.loss_budget:
        short.append(f"loss is {loss:.4g} W, {need.loss_budget:g} W is allowed")
    return tuple(short)


class _Magnetics(NamedTuple):
    """What a core can do with every number of turns, whatever the wire.

    choices : turns and gap with which inductance and flux hold at the peak, by rising turns
    reason : why there is none, else empty
    """

    choices: tuple[tuple[int, float], ...]
    reason: str


def _magnetics(need: InductorNeed, core: CoreShape) -> _Magnetics:
    """Return the turns, each with the first surplus of inductance that holds at the peak current."""
    turns = np.arange(1.0, MOST_TURNS + 1.0)
    gaps = np.zeros((1, MOST_TURNS))
    if core.may_be_gapped:
        gaps = gaps_for(core, turns, need.inductance * np.array(GAP_SURPLUS)[:, None])
    made = ~np.isnan(gaps)
    peak = magnetize(core, turns, np.where(made, gaps, 0.0), need.peak_current)
    held = made & (peak.flux_density <= core.flux_limit)
    good = held & (peak.differential_inductance >= need.inductance)
    first = np.argmax(good, axis=0)
    choices = tuple((n + 1, float(gaps[first[n], n])) for n in np.flatnonzero(good.any(axis=0)).tolist())
    return _Magnetics(choices, "" if choices else _magnetic_reason(need, core, held, peak.differential_inductance))


def _magnetic_reason(need: InductorNeed, core: CoreShape, held: NDArray[np.bool_], left: FloatArray) -> str:
    """Return how near the core comes, from where the flux holds and from the inductance left at the peak [H]."""
    limit = f"{core.flux_limit:g} T at {need.peak_current:g} A"
    if not held.any():
        return f"no turns up to {MOST_TURNS} and gap for {1e6 * need.inductance:.4g} uH keep within {limit}"
    best = np.where(held, left, 0.0)
    turns = int(np.argmax(best.max(axis=0))) + 1
    return (
        f"within {limit} it keeps at most {1e6 * float(best.max()):.4g} uH ({turns} turns),"
        f" {1e6 * need.inductance:.4g} uH is wanted"
    )


def _pair(need: InductorNeed, core: CoreShape, wire: Wire, magnetics: _Magnetics) -> Candidate | str:
    """Return the best build of one core and one wire, or why there is none."""
    seats = _seats(need, core, wire, magnetics)
    if isinstance(seats, str):
        return seats
    made = []
    for n, gap in seats:  # volume rises with the turns, so the first within the budget is the least
        made.append(_candidate(need, InductorBuild(core, wire, n, gap)))
        if made[-1].loss <= need.loss_budget:
            return made[-1]
    least = min(made, key=lambda one: one.loss)
    return (
        f"least loss is {least.loss:.4g} W with {least.build.turns} turns (winding {least.winding_loss:.4g} W,"
        f" core {least.core_loss:.4g} W), {need.loss_budget:g} W is allowed"
    )


def _seats(
    need: InductorNeed, core: CoreShape, wire: Wire, magnetics: _Magnetics
) -> tuple[tuple[int, float], ...] | str:
    """Return the turns and gaps whose winding goes into the window, or why there are none."""
    if not magnetics.choices:
        return magnetics.reason
    try:
        turns_per_layer(core, wire)
    except InputError as error:
        return str(error)
    if wire.kind == "litz" and wire.thickness > (depth := float(skin_depth(need.frequency, need.degc))):
        return f"strands of {1e3 * wire.thickness:.3g} mm are thicker than the skin depth, {1e3 * depth:.3g} mm"
    seated = tuple((n, gap) for n, gap in magnetics.choices if fits(core, wire, n))
    if not seated:
        return f"the {magnetics.choices[0][0]} turns that it needs at least do not fit the window"
    filled = tuple((n, gap) for n, gap in seated if float(window_fill(core, wire, n)) <= need.fill_limit)
    if not filled:
        share = float(window_fill(core, wire, seated[0][0]))
        return f"its {seated[0][0]} turns fill {share:.0%} of the window with copper, {need.fill_limit:.0%} is allowed"
    return filled


def _candidate(need: InductorNeed, build: InductorBuild) -> Candidate:
    return Candidate(build, *losses(need, build))
