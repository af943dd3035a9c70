"""How the flux density of a core follows its field: three laws, each with its slope. Pure functions, SI units.

`slope` is the differential permeability dB/dH [H/m], which a small ripple on a bias sees; `flux_density` is its
integral from zero field [T], which flux linkage needs. Both are even or odd in the field, as they should be.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from typing import Protocol

import numpy as np

from tideleg import FloatArray, InputError, Values
from tideleg_losses.dowell import VACUUM_PERMEABILITY

OERSTED = 1e3 / (4.0 * np.pi)
"""One oersted [A/m]."""

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(48)


class CoreLaw(Protocol):
    """A curve of flux density over field."""

    @property
    def permeability(self) -> float:
        """Relative, at zero field [-]."""
        ...

    def flux_density(self, field: Values) -> FloatArray:
        """Return B [T] at a field [A/m]."""
        ...

    def slope(self, field: Values) -> FloatArray:
        """Return dB/dH [H/m] at a field [A/m]."""
        ...


@dataclass(frozen=True)
class FerriteLaw:
    """B = mu0 H + J_s tanh(mu0 (mu_r - 1) H/J_s): saturates as a hyperbolic tangent, then rises as a vacuum does.

    The tangent as in the dc-bias law B0 tanh(H/H0) of the trade (IEEE abstract on inductance-core design under dc
    bias); the vacuum's share is ours, so that no slope vanishes.

    permeability : relative, at zero field, above 1 [-]
    saturation : flux density that the material alone adds at most, at the temperature of work [T]
    """

    permeability: float
    saturation: float

    def flux_density(self, field: Values) -> FloatArray:
        """Return B [T] at a field [A/m]."""
        h = np.asarray(field, dtype=np.float64)
        return np.asarray(VACUUM_PERMEABILITY * h + self.saturation * np.tanh(self._reduced(h)))

    def slope(self, field: Values) -> FloatArray:
        """Return dB/dH [H/m] at a field [A/m]."""
        h = np.asarray(field, dtype=np.float64)
        squared = 1.0 - np.tanh(self._reduced(h)) ** 2
        return np.asarray(VACUUM_PERMEABILITY * (1.0 + (self.permeability - 1.0) * squared))

    def _reduced(self, field: FloatArray) -> FloatArray:
        return VACUUM_PERMEABILITY * (self.permeability - 1.0) * field / self.saturation


@dataclass(frozen=True)
class PowderLaw:
    """Share of the initial permeability a/(1 + b |H|^c): the form in which makers of powder cores publish roll-off.

    Makers state H in oersted and the share in percent, 100/(1 + b H^c); give `factor` for H in A/m (`per_oersted`).

    permeability : relative, as published for zero bias [-]
    level : a [-], 1 where the curve begins at the published permeability
    factor : b [(m/A)^c]
    exponent : c [-]
    """

    permeability: float
    level: float
    factor: float
    exponent: float

    @classmethod
    def per_oersted(cls, permeability: float, level: float, factor: float, exponent: float) -> PowderLaw:
        """Return the law whose b is given for H in oersted."""
        return cls(permeability, level, factor / OERSTED**exponent, exponent)

    def share(self, field: Values) -> FloatArray:
        """Return the share of the published permeability that is left [-]."""
        return np.asarray(self.level / (1.0 + self.factor * np.abs(field) ** self.exponent))

    def slope(self, field: Values) -> FloatArray:
        """Return dB/dH [H/m] at a field [A/m]."""
        return np.asarray(VACUUM_PERMEABILITY * self.permeability * self.share(field))

    def flux_density(self, field: Values) -> FloatArray:
        """Return B [T] at a field [A/m]: Gauss's rule over sqrt(H), good to about 1e-9 down to a tenth of the slope."""
        h = np.asarray(field, dtype=np.float64)[..., None]
        root = 0.5 * (_NODES + 1.0)
        return np.asarray(np.sum(self.slope(h * root**2) * h * root * _WEIGHTS, axis=-1))


@dataclass(frozen=True)
class TableLaw:
    """Roll-off as points of field and share of the published permeability, straight between them.

    permeability : relative, at zero bias [-]
    fields : from zero, increasing [A/m]
    shares : at each, above zero and never rising [-]
    """

    permeability: float
    fields: tuple[float, ...]
    shares: tuple[float, ...]

    def __post_init__(self) -> None:
        if len(self.fields) < 2 or len(self.fields) != len(self.shares):
            raise InputError("roll-off: give two points or more, each a field and a share")
        if self.fields[0] != 0.0 or any(not a < b for a, b in pairwise(self.fields)):
            raise InputError("roll-off: the fields begin at 0 A/m and increase from point to point")
        if not all(0.0 < share <= 1.0 for share in self.shares) or any(a < b for a, b in pairwise(self.shares)):
            raise InputError("roll-off: shares lie above 0, up to 1, and do not rise with the field")

    def slope(self, field: Values) -> FloatArray:
        """Return dB/dH [H/m]; a field outside the table raises InputError."""
        h = np.abs(np.asarray(field, dtype=np.float64))
        if np.any(h > self.fields[-1]):
            raise InputError(
                f"roll-off: ends at {self.fields[-1]:.6g} A/m, and {float(np.max(h)):.6g} A/m is needed; nothing is"
                " extrapolated: add points"
            )
        return np.asarray(VACUUM_PERMEABILITY * self.permeability * np.interp(h, self.fields, self.shares))

    def flux_density(self, field: Values) -> FloatArray:
        """Return B [T], the exact integral of the straight pieces; a field outside the table raises InputError."""
        h = np.abs(np.asarray(field, dtype=np.float64))
        here = self.slope(h)
        fields, slopes = np.asarray(self.fields), self.slope(np.asarray(self.fields))
        corners = np.concatenate([[0.0], np.cumsum(0.5 * np.diff(fields) * (slopes[1:] + slopes[:-1]))])
        knot = np.clip(np.searchsorted(fields, h, side="right") - 1, 0, len(fields) - 1)
        within = 0.5 * (h - fields[knot]) * (slopes[knot] + here)
        return np.asarray(np.sign(field) * (corners[knot] + within))
