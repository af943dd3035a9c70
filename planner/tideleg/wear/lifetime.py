"""From damage a year to a life with its spread, and hours at temperature."""

from __future__ import annotations

import math
from dataclasses import dataclass
from statistics import NormalDist

import numpy as np

from tideleg.waveform import FloatArray

YEAR_S = 365.25 * 86400.0
"""A Julian year [s]."""


@dataclass(frozen=True)
class Life:
    """Years until a share of the parts has failed; infinite where nothing wears.

    p10, p50, p90 : years until 10, 50 and 90 % of the parts have failed
    """

    p10: float
    p50: float
    p90: float


def life_of(damage_per_year: float, spread: float, among: int = 1, load_spread: float = 0.0) -> Life:
    """Return P10, P50 and P90 of the life that a yearly damage leaves; see `lifetime_quantile`."""
    return Life(*(lifetime_quantile(damage_per_year, spread, share, among, load_spread) for share in (0.1, 0.5, 0.9)))


def lifetime_quantile(
    damage_per_year: float, spread: float, failed: float, among: int = 1, load_spread: float = 0.0
) -> float:
    """Return the years until a share of the stages has lost a part.

    Parameters
    ----------
    damage_per_year : sum of n/N over a year with the median life of the part [-]
    spread : standard deviation of ln(life) between equal parts, each on its own [-]
    failed : share of stages [-]
    among : equal parts of one stage, of which the first to fail counts
    load_spread : standard deviation of ln(life) between stages by how they are used, alike for all their parts [-]

    Notes
    -----
    A lognormal factor on every N is the same factor on the life. Of one part the spreads add in squares,
    t = exp(s Φ⁻¹(failed)) / damage; the first of n has failed with 1 - (1 - F)^n. With several parts and a common load
    the two do not commute: the share failed is then a Gauss-Hermite sum over the load and is solved for t. No chance.

    Raises
    ------
    ValueError
        If damage or a spread is negative, or the share does not lie between 0 and 1.

    Examples
    --------
    >>> lifetime_quantile(0.1, 0.0, 0.1), round(lifetime_quantile(0.1, 0.5, 0.1), 3)
    (10.0, 5.269)
    """
    if min(damage_per_year, spread, load_spread) < 0.0 or not 0.0 < failed < 1.0 or among < 1:
        raise ValueError("damage and spreads are not below zero, the share failed lies between 0 and 1, parts from 1")
    if damage_per_year == 0.0:
        return math.inf
    normal = NormalDist()
    if among == 1 or spread == 0.0:
        return math.exp(math.hypot(spread, load_spread) * normal.inv_cdf(failed)) / damage_per_year
    one = -math.expm1(math.log1p(-failed) / among)
    alone = spread * normal.inv_cdf(one)
    if load_spread == 0.0:
        return math.exp(alone) / damage_per_year
    return math.exp(_under_common_load(spread, load_spread, failed, among)) / damage_per_year


NODES = 128
"""Points of the sum over the load: more change the life by less than 1e-9."""


def _under_common_load(spread: float, load_spread: float, failed: float, among: int) -> float:
    """Return ln(life x damage) at which a share of stages has lost the first of its parts."""
    load, weight = np.polynomial.hermite_e.hermegauss(NODES)
    weight = weight / weight.sum()
    normal = NormalDist()

    def share(log_life: float) -> float:
        each = [-normal.cdf((log_life - load_spread * x) / spread) for x in load]
        return float(
            sum(-w * math.expm1(among * math.log1p(max(f, -1.0 + 1e-16))) for w, f in zip(weight, each, strict=True))
        )

    low, high = -40.0 * (spread + load_spread), 40.0 * (spread + load_spread)
    while high - low > 1e-12 * (1.0 + abs(low)):
        middle = 0.5 * (low + high)
        if middle in (low, high):
            break
        low, high = (middle, high) if share(middle) < failed else (low, middle)
    return 0.5 * (low + high)


def hours_at_temperature(
    temperature: FloatArray, duration: FloatArray, band: float = 10.0
) -> tuple[FloatArray, FloatArray]:
    """Return (edges [degC], hours in each band) of a temperature held step by step [degC], [s]."""
    low = math.floor(float(temperature.min()) / band)
    high = max(math.floor(float(temperature.max()) / band) + 1, low + 1)
    edges = band * np.arange(low, high + 1, dtype=np.float64)
    hours, _ = np.histogram(temperature, edges, weights=duration / 3600.0)
    return edges, np.asarray(hours)


def hours_above(limit: float, temperature: FloatArray, duration: FloatArray) -> float:
    """Return the hours of the steps above a temperature [degC]; (S,) temperatures [degC] and durations [s]."""
    return float(np.sum(duration[temperature > limit])) / 3600.0
