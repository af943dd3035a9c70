"""Thermal networks that cannot be, each refused with the place, what was found and what is allowed."""

from __future__ import annotations

import math
from collections.abc import Sequence

from tideleg.errors import InputError
from tideleg.network import Network, Path, Seat

LEAST = 1e-15
"""Least heat capacity [J/K] and time constant [s] above zero: a 0.1 µm cube of silicon holds more."""


def refuse_bad(network: Network) -> None:
    """Raise InputError for the first thing that keeps a network from being solved."""
    places = [*network.boundaries, *(mass.name for mass in network.masses)]
    _refuse_twins(places, "place")
    _refuse_twins([seat.part for seat in network.seats], "seated part")
    for mass in network.masses:
        if not _is_zero_or_real(mass.heat_capacity):
            raise InputError(
                f"thermal network: {mass.name!r} has {mass.heat_capacity:g} J/K; it must not be below zero, and finite;"
                f" a place that follows at once has 0, not less than {LEAST:g}"
            )
    for path in network.paths:
        _refuse_bad_path(path, places)
    for seat in network.seats:
        _refuse_bad_seat(seat, places)
    _refuse_islands(network)


def _refuse_twins(names: Sequence[str], what: str) -> None:
    for name in names:
        if names.count(name) > 1:
            raise InputError(f"thermal network: the name {name!r} stands twice; give every {what} its own")


def _refuse_bad_path(path: Path, places: Sequence[str]) -> None:
    ends = f"{path.one!r} to {path.other!r}"
    if path.one not in places or path.other not in places:
        raise InputError(f"thermal network: a path runs from {ends}; places are {', '.join(places)}")
    if path.one == path.other:
        raise InputError(f"thermal network: a path runs from {ends}; it must join two places")
    if not 0.0 < path.resistance < math.inf:
        raise InputError(
            f"thermal network: {ends} has {path.resistance:g} K/W; it must be above zero and finite."
            " Leave a path out where no heat passes"
        )


def _refuse_bad_seat(seat: Seat, places: Sequence[str]) -> None:
    if seat.base not in places:
        raise InputError(f"thermal network: {seat.part!r} stands on {seat.base!r}; places are {', '.join(places)}")
    if seat.copies < 1:
        raise InputError(f"thermal network: {seat.part!r} has {seat.copies} copies; it must have 1 or more")
    for resistance, tau in seat.cells:
        if not (0.0 < resistance < math.inf and _is_zero_or_real(tau)):
            raise InputError(
                f"thermal network: {seat.part!r} has a cell of {resistance:g} K/W and {tau:g} s;"
                " resistance must be above zero and the time constant not below, both finite;"
                f" a cell that follows at once has 0 s, not less than {LEAST:g}"
            )


def _is_zero_or_real(value: float) -> bool:
    return value == 0.0 or LEAST <= value < math.inf


def _refuse_islands(network: Network) -> None:
    """Refuse a mass that reaches no boundary: it would warm for ever."""
    reached = set(network.boundaries)
    grew = True
    while grew:
        before = len(reached)
        for path in network.paths:
            if path.one in reached or path.other in reached:
                reached |= {path.one, path.other}
        grew = len(reached) > before
    for mass in network.masses:
        if mass.name not in reached:
            raise InputError(f"thermal network: {mass.name!r} reaches no boundary; its heat has nowhere to go")
