"""Choices that a topology makes for each step before the relaxation: how many legs work, which mode a leg is in.

They are made from the request and the battery at rest, and then stay: a choice that followed the losses could flip
between passes, and the relaxation might have no fixed point.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np

from tideleg.contract import Choice, Chooser, Point, Rest
from tideleg.errors import PluginError
from tideleg.registry import call_plugin
from tideleg.stage import Stage
from tideleg.waveform import FloatArray

NO_CHOICE = Choice(np.zeros((1, 1), dtype=np.int64), None)
"""What a stage holds whose topology leaves nothing to choose."""


def chosen(stage: Stage, rest: Rest, before: Any) -> Choice:
    """Return the choice of each step of a block, or `NO_CHOICE`.

    Raises
    ------
    PluginError
        If the topology raises, or answers with a code that has no words.
    """
    topology = stage.topology
    if not stage.choices:
        return NO_CHOICE
    assert isinstance(topology, Chooser)
    choice = call_plugin(stage.registry, topology, lambda: topology.choose(rest, stage.settings, before))
    if np.shape(choice.code) != rest.battery_current.shape or not np.issubdtype(choice.code.dtype, np.integer):
        raise PluginError(
            f"topology {topology.name!r}: choose gave an array of shape {np.shape(choice.code)} and type"
            f" {choice.code.dtype}; whole numbers of shape {rest.battery_current.shape} are needed"
        )
    if np.any(choice.code < 0) or np.any(choice.code >= len(stage.choices)):
        raise PluginError(
            f"topology {topology.name!r}: choose gave codes from {choice.code.min()} to {choice.code.max()};"
            f" it has {len(stage.choices)} choices, counted from 0"
        )
    return choice


def loss_with(stage: Stage, point: Point, temperature: dict[str, FloatArray]) -> Callable[[int], FloatArray]:
    """Return a function that gives the loss of the whole stage with one code at every step [W]."""

    def loss(code: int) -> FloatArray:
        codes = np.full(point.battery_current.shape, code, dtype=np.int64)
        return stage.losses(point._replace(choice=codes), temperature).total

    return loss


def plain_choice(stage: Stage) -> int | None:
    """Return the code that a stage without choices would hold; None where that means nothing."""
    if not stage.choices:
        return None
    assert isinstance(stage.topology, Chooser)
    return stage.topology.plain_choice(stage.settings)
