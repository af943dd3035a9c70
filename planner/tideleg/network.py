"""The description of a thermal network: what a cooling plugin states and `heat` solves.

Heat of one part enters through its seat. A seat may carry a Foster chain (a curve fit from junction to base, whose
inner nodes are no real places); the heat of all `copies` equal parts arrives at the base at once, as a Foster fit
demands. Bases are masses, or boundaries whose temperature is given.
"""

from __future__ import annotations

from typing import NamedTuple


class Mass(NamedTuple):
    """A place with one temperature.

    name : unique among masses and boundaries
    heat_capacity : [J/K]; zero makes it a joint that follows at once
    """

    name: str
    heat_capacity: float


class Path(NamedTuple):
    """A way for heat between two places, each a mass or a boundary.

    one, other : names of the places
    resistance : [K/W], above zero
    """

    one: str
    other: str
    resistance: float


class Seat(NamedTuple):
    """Where the heat of one part goes in, and the chain above that place.

    part : name of the part, as in the stage's slots
    base : mass or boundary that the chain stands on
    cells : Foster cells (resistance [K/W], time constant [s]); empty: the part is as warm as its base
    copies : how many equal parts stand on the base; the base receives `copies` times the loss of one
    """

    part: str
    base: str
    cells: tuple[tuple[float, float], ...] = ()
    copies: int = 1


class Network(NamedTuple):
    """A whole thermal network.

    boundaries : names of the places whose temperature is given at each step ("coolant", "ambient")
    masses, paths, seats : see their classes; every mass must reach a boundary through paths
    """

    boundaries: tuple[str, ...]
    masses: tuple[Mass, ...]
    paths: tuple[Path, ...]
    seats: tuple[Seat, ...]
