"""Promises of a loss model: never negative, zero with zero current, no jump through zero, an honest slope."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

import numpy as np

from tideleg.conformance.checks import Check, require_close, require_finite
from tideleg.contract import Exchange, Flow, LossModel, LossTerm, PartKind, Position, Timing, Winding
from tideleg.waveform import FloatArray, Segment, Waveform

TIMING = Timing(40e3, 200e-9)
TEMPERATURE = 85.0


def reading(kind: PartKind, current: FloatArray, ripple: float = 20.0) -> Any:
    """Return what a loss term of that kind reads at some mean currents [A] with a ripple peak-to-peak [A]."""
    low, high = current - 0.5 * ripple, current + 0.5 * ripple
    triangle = Waveform((Segment(0.0, 0.45, low, high), Segment(0.45, 0.55, high, low)))
    if kind in ("switch", "diode"):
        driven = np.ones_like(current)
        return Position(Waveform((Segment(0.0, 0.45, low, high),)), 750.0, 750.0, driven)
    if kind == "inductor":
        return Winding(triangle, (412.5, -337.5))
    if kind == "capacitor":
        return Exchange(triangle, 40e3, 750.0)
    ones = np.ones_like(current)
    return Flow(400.0 * ones, 750.0 * ones, current, current * 400.0 / 750.0, ones)


def loss_checks(model: LossModel, settings: Mapping[str, object]) -> tuple[Check, ...]:
    """Return every check of a loss model.

    Parameters
    ----------
    model : LossModel
    settings : keys of its part's table with which it offers at least one term, as a plan would give them
    """
    bound = model.settings.model_validate(dict(settings))
    terms = model.terms(bound)
    checks = [Check(model.name, "without data it offers nothing", lambda: _offers_nothing(model))]
    checks.append(Check(model.name, "with these data it offers a term it announces", lambda: _announces(model, terms)))
    for term in terms:
        for words, hold in _PROMISES.items():
            checks.append(Check(model.name, f"{term.mechanism}: {words}", _bind(hold, model, term)))
    return tuple(checks)


def _bind(
    hold: Callable[[LossModel, LossTerm[Any]], None], model: LossModel, term: LossTerm[Any]
) -> Callable[[], None]:
    return lambda: hold(model, term)


def _offers_nothing(model: LossModel) -> None:
    offered = model.terms(model.settings.model_validate({}))
    assert not offered, f"terms {[term.mechanism for term in offered]} come from no data"


def _announces(model: LossModel, terms: tuple[LossTerm[Any], ...]) -> None:
    assert terms, "no term: give the settings that it needs"
    unknown = {term.mechanism for term in terms} - set(model.mechanisms)
    assert not unknown, f"mechanisms {sorted(unknown)} are not among those announced {model.mechanisms}"


def _watts(model: LossModel, term: LossTerm[Any], current: FloatArray, ripple: float, degc: float) -> FloatArray:
    line = term.at(reading(model.reads, current, ripple), TIMING, np.full_like(current, degc))
    return np.broadcast_to(line.watts, current.shape)


def _never_negative(model: LossModel, term: LossTerm[Any]) -> None:
    current = np.linspace(-300.0, 300.0, 601)[None, :]
    for degc in (-40.0, 25.0, 150.0):
        watts = _watts(model, term, current, 20.0, degc)
        require_finite(watts, "loss")
        assert np.all(watts >= 0.0), f"{watts.min():.6g} W at {degc:g} degC"


def _no_jump(model: LossModel, term: LossTerm[Any]) -> None:
    fine = _watts(model, term, np.linspace(-15.0, 15.0, 6001)[None, :], 20.0, TEMPERATURE)[0]
    coarse = _watts(model, term, np.linspace(-15.0, 15.0, 601)[None, :], 20.0, TEMPERATURE)[0]
    jump, bound = np.max(np.abs(np.diff(fine))), np.max(np.abs(np.diff(coarse)))
    # A jump keeps its size however fine the current is stepped; a slope gives a tenth, a root about a third.
    assert jump <= 0.6 * bound + 1e-12, f"a jump of {jump:.6g} W near zero current"


def _slope_is_true(model: LossModel, term: LossTerm[Any]) -> None:
    current = np.array([[-120.0, -5.0, 5.0, 120.0]])
    part = reading(model.reads, current)
    at = [term.at(part, TIMING, np.full_like(current, TEMPERATURE + shift)) for shift in (-0.5, 0.0, 0.5)]
    difference = np.broadcast_to(at[2].watts - at[0].watts, current.shape)
    scale = 1e-3 * np.abs(difference) + 1e-6 * np.abs(at[1].watts) + 1e-9
    require_close(np.asarray(at[1].watts_per_kelvin), difference, scale, 1.0, "slope in temperature [W/K]")


def _broadcasts(model: LossModel, term: LossTerm[Any]) -> None:
    current = np.linspace(-200.0, 200.0, 12)
    flat = _watts(model, term, current[None, :], 20.0, TEMPERATURE)
    stacked = _watts(model, term, np.stack([current] * 3), 20.0, TEMPERATURE)
    require_close(stacked, flat, 1.0 + np.abs(flat), 1e-12, "three candidates against one")


def _same_both_ways_or_edge(model: LossModel, term: LossTerm[Any]) -> None:
    both_ways = model.reads != "diode" and getattr(model, "carries", "both") == "both"
    if term.ohmic and both_ways:
        current = np.array([[100.0, 37.0]])
        there, back = (_watts(model, term, sign * current, 0.0, TEMPERATURE) for sign in (1.0, -1.0))
        # The diode takes the dead times and a part of a large current in reverse alone; still it is one resistance.
        require_close(there, back, np.abs(there), 0.5, "ohmic loss in the two directions")


def _tells_outside(model: LossModel, term: LossTerm[Any]) -> None:
    outside = getattr(term, "outside", None)
    if outside is None:
        return
    for shape in ((1, 12), (3, 12)):
        current = np.broadcast_to(np.linspace(-400.0, 400.0, 12), shape)
        mask = np.asarray(outside(reading(model.reads, current), TIMING, np.full(shape, TEMPERATURE)))
        assert mask.dtype == np.bool_, f"where it is asked beyond its table is no mask but {mask.dtype}"
        try:
            np.broadcast_to(mask, shape)
        except ValueError:
            raise AssertionError(f"where it is asked beyond its table has the shape {mask.shape}") from None


def _goes_on_beyond(model: LossModel, term: LossTerm[Any]) -> None:
    if not hasattr(term, "outside"):
        return
    for degc in (-60.0, 25.0, 300.0):
        watts = _watts(model, term, np.linspace(-3000.0, 3000.0, 61)[None, :], 20.0, degc)
        require_finite(watts, "loss beyond the table")
        assert np.all(watts >= 0.0), f"{watts.min():.6g} W beyond the table at {degc:g} degC"


_PROMISES: dict[str, Callable[[LossModel, LossTerm[Any]], None]] = {
    "never negative, always finite": _never_negative,
    "no jump through zero current": _no_jump,
    "its slope in temperature is true": _slope_is_true,
    "candidates broadcast": _broadcasts,
    "an ohmic loss is alike both ways": _same_both_ways_or_edge,
    "it tells where it is asked beyond its table": _tells_outside,
    "beyond its table it stays finite and not negative": _goes_on_beyond,
}
