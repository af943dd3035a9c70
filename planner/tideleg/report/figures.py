"""Every picture of an outcome, by the name of its file."""

from __future__ import annotations

import re

from tideleg.outcome import Outcome
from tideleg.report.bars import draw_losses, draw_margins
from tideleg.report.drawing import Picture
from tideleg.report.life_pictures import draw_cycles, draw_damage, draw_hours, draw_life
from tideleg.report.reach_map import draw_reach
from tideleg.report.traces import draw_power, draw_temperatures, draw_waveforms, has_waveforms


def draw_all(outcome: Outcome) -> dict[str, Picture]:
    """Return every picture that the outcome has data for; with several missions those over time once for each."""
    drawn: dict[str, Picture] = {}
    for mission, end in zip(outcome.missions, endings([m.name for m in outcome.missions]), strict=True):
        drawn[f"power{end}"] = draw_power(mission)
        if mission.reach is not None:
            drawn[f"reach{end}"] = draw_reach(mission.reach)
        if outcome.thermal:
            drawn[f"temperatures{end}"] = draw_temperatures(outcome, mission)
    if any(entry.total_j > 0.0 for mission in outcome.missions for entry in mission.losses):
        drawn["losses"] = draw_losses(outcome)
    if outcome.limits:
        drawn["margins"] = draw_margins(outcome)
    if has_waveforms(outcome):
        drawn["waveforms"] = draw_waveforms(outcome)
    return drawn | _wear(outcome)


def _wear(outcome: Outcome) -> dict[str, Picture]:
    """Return the pictures of wear that there are data for."""
    wear = outcome.wear
    drawn: dict[str, Picture] = {"hours": draw_hours(wear)} if wear.heat else {}
    cycled = [part for part in wear.parts if part.cycles is not None and part.damage_per_year > 0.0]
    if cycled:
        drawn["cycles"] = draw_cycles(cycled[0])
    worn = [part for part in wear.parts if part.damage_per_year > 0.0]
    if worn:
        drawn["damage"] = draw_damage(worn, outcome)
        heated = [part for part in worn if part.heated]
        drawn["life"] = draw_life((heated or worn)[0])
    return drawn


def endings(names: list[str]) -> list[str]:
    """Return what tells the missions apart in file names: safe on every system, and numbered so that none collide."""
    if len(names) == 1:
        return [""]
    return [f"-{i}-{re.sub(r'[^A-Za-z0-9]+', '-', name).strip('-')}".rstrip("-") for i, name in enumerate(names, 1)]
