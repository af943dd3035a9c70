"""Wear: from a temperature over time to cycles, and from damage to a life with its spread.

Read in this order: `turning` (the extremes of a history), `rainflow` (its cycles, in one go or block by block),
`attribution` (when in the mission the damage arises), `lifetime` (from damage a year to P10, P50 and P90).
"""

from tideleg.wear.attribution import cumulative_damage
from tideleg.wear.lifetime import Life, hours_above, hours_at_temperature, life_of, lifetime_quantile
from tideleg.wear.rainflow import RESIDUE_RULES, CycleCount, ResidueRule, count_cycles
from tideleg.wear.turning import turning_points

__all__ = [
    "RESIDUE_RULES",
    "CycleCount",
    "Life",
    "ResidueRule",
    "count_cycles",
    "cumulative_damage",
    "hours_above",
    "hours_at_temperature",
    "life_of",
    "lifetime_quantile",
    "turning_points",
]
