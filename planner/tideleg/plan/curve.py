"""A curve over the state of charge, for one or several temperatures; one point means constant."""

from __future__ import annotations

from typing import NamedTuple


class Curve(NamedTuple):
    """Points of a curve.

    soc : within 0 to 1, increasing within each temperature [-]
    value : at each, in the unit of the key that holds it
    degc : temperature of each point, increasing; empty where nothing depends on it [degC]
    """

    soc: tuple[float, ...]
    value: tuple[float, ...]
    degc: tuple[float, ...] = ()

    def scaled(self, factor: float) -> Curve:
        """Return the curve with every value multiplied by `factor`."""
        return self._replace(value=tuple(factor * v for v in self.value))

    def by_temperature(self) -> dict[float | None, Curve]:
        """Return one curve for each temperature, in their order; the key is None where there is only one."""
        if not self.degc:
            return {None: self}
        rows = list(zip(self.soc, self.value, self.degc, strict=True))
        found: dict[float | None, Curve] = {}
        for wanted in dict.fromkeys(self.degc):
            mine = [(soc, value) for soc, value, degc in rows if degc == wanted]
            found[wanted] = Curve(tuple(soc for soc, _ in mine), tuple(value for _, value in mine))
        return found
