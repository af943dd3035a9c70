"""Promises of a life model: damage is finite and never negative, grows with stress, and adds up."""

from __future__ import annotations

from collections.abc import Callable, Mapping

import numpy as np

from tideleg.conformance.checks import Check, require_close, require_finite
from tideleg.stress import Cycles, LifeModel, LifeTerm, Stress
from tideleg.waveform import FloatArray


def stress_of(swing: FloatArray, low: FloatArray, count: float = 1.0, seconds: float = 60.0) -> Stress:
    """Return a stress of one cycle and one step for each swing [K] and lowest temperature [degC]."""
    n = len(swing)
    begin = 2.0 * seconds * np.arange(n, dtype=np.float64)
    cycles = Cycles(low, low + swing, begin, begin + seconds, np.full(n, count))
    same = np.full(n, 2.0 * seconds)
    return Stress(cycles, low + 0.5 * swing, same, np.full(n, 60.0), np.full(n, 400.0), np.ones(n))


def life_checks(model: LifeModel, settings: Mapping[str, object]) -> tuple[Check, ...]:
    """Return every check of a life model.

    Parameters
    ----------
    model : LifeModel
    settings : its keys of [life.<part>], as a plan would give them
    """
    term = model.term(model.settings.model_validate(dict(settings)))
    return tuple(Check(model.name, words, _bind(hold, term)) for words, hold in _PROMISES.items())


def _bind(hold: Callable[[LifeTerm], None], term: LifeTerm) -> Callable[[], None]:
    return lambda: hold(term)


# Where damage is compared the first cycle or step is left out: of what wears by starts it is the start.
SWINGS = np.geomspace(0.01, 150.0, 60)


def _never_negative(term: LifeTerm) -> None:
    for low in (-40.0, 25.0, 120.0):
        found = term.consumed(stress_of(SWINGS, np.full(60, low)))
        require_finite(found.damage, "damage")
        assert found.damage.shape == found.outside.shape == (60,), "one answer for each cycle or step is due"
        assert np.all(found.damage >= 0.0), f"damage {found.damage.min():.6g} at {low:g} degC"


def _grows_with_swing(term: LifeTerm) -> None:
    damage = term.consumed(stress_of(SWINGS, np.full(60, 40.0))).damage
    assert np.all(np.diff(damage[1:]) >= -1e-12 * damage[2:]), "a greater swing consumes less"


def _grows_with_temperature(term: LifeTerm) -> None:
    damage = term.consumed(stress_of(np.full(60, 40.0), np.linspace(-20.0, 120.0, 60))).damage
    assert np.all(np.diff(damage[1:]) >= -1e-12 * damage[2:]), "a hotter cycle consumes less"


def _halves(term: LifeTerm) -> None:
    low = np.full(60, 40.0)
    whole, half = (term.consumed(stress_of(SWINGS, low, count)).damage for count in (1.0, 0.5))
    factor = 0.5 if term.reads == "cycles" else 1.0
    require_close(half, factor * whole, whole, 1e-12, "damage of half cycles")


def _order_is_free(term: LifeTerm) -> None:
    if term.reads == "cycles":
        stress = stress_of(SWINGS, np.full(60, 40.0))
        turned = stress._replace(cycles=Cycles(*(column[::-1] for column in stress.cycles)))
        there, back = (term.consumed(s).damage for s in (stress, turned))
        require_close(back[::-1], there, there, 1e-12, "damage with the cycles in another order")


def _nothing_for_nothing(term: LifeTerm) -> None:
    damage = term.consumed(stress_of(np.zeros(0), np.zeros(0))).damage
    assert len(damage) == 0, f"{len(damage)} answers come from no cycle and no step"


def _says_itself(term: LifeTerm) -> None:
    assert term.mechanism, "the mechanism has no name"
    assert term.box, "the box has no words"
    assert term.reads in ("cycles", "steps"), f"it reads {term.reads!r}; cycles or steps"
    assert np.isfinite(term.spread), f"spread {term.spread}"
    assert term.spread >= 0.0, f"spread {term.spread}"


_PROMISES: dict[str, Callable[[LifeTerm], None]] = {
    "damage is finite and never negative": _never_negative,
    "a greater swing never consumes less": _grows_with_swing,
    "a hotter cycle never consumes less": _grows_with_temperature,
    "half a cycle consumes half": _halves,
    "the order of cycles does not matter": _order_is_free,
    "nothing is consumed by nothing": _nothing_for_nothing,
    "it names mechanism, box and spread": _says_itself,
}
