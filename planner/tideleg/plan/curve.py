"""A curve over the state of charge; one point means constant."""

from __future__ import annotations

from typing import NamedTuple


class Curve(NamedTuple):
    """soc : increasing, within 0 to 1 [-]; value : at each, in the unit of the key that holds it."""

    soc: tuple[float, ...]
    value: tuple[float, ...]

    def scaled(self, factor: float) -> Curve:
        """Return the curve with every value multiplied by `factor`."""
        return Curve(self.soc, tuple(factor * v for v in self.value))
