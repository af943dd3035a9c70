"""Promises of a cooling model: a network that can be solved, at rest with its boundaries, warmer with more loss."""

from __future__ import annotations

from collections.abc import Mapping
from functools import partial

import numpy as np

from tideleg.conformance.checks import Check, require_close
from tideleg.contract import CooledPart, CoolingModel, PartKind
from tideleg.heat import Modes, modes

PARTS: tuple[tuple[str, PartKind, int], ...] = (
    ("upper_switch", "switch", 8),
    ("lower_switch", "switch", 8),
    ("inductor", "inductor", 4),
    ("link_capacitor", "capacitor", 1),
)


def cooling_checks(
    model: CoolingModel, settings: Mapping[str, object], part_settings: Mapping[PartKind, Mapping[str, object]]
) -> tuple[Check, ...]:
    """Return every check of a cooling model.

    Parameters
    ----------
    model : CoolingModel
    settings : its keys in [cooling]
    part_settings : its keys in the tables of the kinds of parts
    """
    ask = partial(_modes, model, settings, part_settings)
    return (
        Check(model.name, "its network can be solved and seats known parts", lambda: _solves(ask())),
        Check(model.name, "at rest every part has the boundaries' temperature", lambda: _rests(ask())),
        Check(model.name, "no loss cools any part", lambda: _warms(ask())),
        Check(model.name, "parts without data get no seat", lambda: _leaves_out(model, settings)),
    )


def _modes(
    model: CoolingModel, settings: Mapping[str, object], part_settings: Mapping[PartKind, Mapping[str, object]]
) -> Modes:
    bound = model.settings.model_validate(dict(settings))
    cooled = [
        CooledPart(name, kind, copies, model.part_settings[kind].model_validate(dict(part_settings.get(kind, {}))))
        for name, kind, copies in PARTS
        if kind in model.part_settings
    ]
    return modes(model.network(bound, cooled))


def _solves(solved: Modes) -> None:
    unknown = set(solved.parts) - {name for name, _, _ in PARTS}
    assert not unknown, f"seats for unknown parts {sorted(unknown)}"
    assert solved.parts, "no part has a seat: give the thermal keys that it needs"
    assert set(solved.boundaries) <= {"coolant", "ambient"}, f"unknown boundaries {solved.boundaries}"


def _rests(solved: Modes) -> None:
    rest = solved.steady(np.zeros((len(solved.parts), 1)), np.full((len(solved.boundaries), 1), 40.0))
    require_close(
        rest, np.full_like(rest, 40.0), np.full_like(rest, 40.0), 1e-9, "temperature at rest at 40 degC [degC]"
    )


def _warms(solved: Modes) -> None:
    matrix = np.asarray(solved.resistance_matrix())
    assert np.all(matrix >= -1e-12), f"a loss cools a part: {matrix.min():.3g} K/W"


def _leaves_out(model: CoolingModel, settings: Mapping[str, object]) -> None:
    bound = model.settings.model_validate(dict(settings))
    bare = [
        CooledPart(name, kind, copies, model.part_settings[kind].model_validate({}))
        for name, kind, copies in PARTS
        if kind in model.part_settings
    ]
    seats = model.network(bound, bare).seats
    assert not seats, f"seats {[seat.part for seat in seats]} come from no data"
