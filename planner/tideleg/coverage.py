"""How much of a run asked the tables of points beyond what they cover: share of time and of energy, by term."""

from __future__ import annotations

from functools import partial

import numpy as np

from tideleg.march import Demand, Settled
from tideleg.outcome import OutsideEntry
from tideleg.registry import call_plugin
from tideleg.stage import BoundTerm, Stage, StagePart
from tideleg.waveform import FloatArray

FLAGGED = 0.01
"""A greater share than this of time or energy outside a table stands on page one [-]."""


def outside_entries(stage: Stage, demand: Demand, blocks: list[Settled]) -> tuple[OutsideEntry, ...]:
    """Return every term that asked beyond its table in one pass of a mission, the greatest share first.

    The terms are asked anew at the reported currents and temperatures, once all has settled.
    """
    begin = 0
    found: dict[tuple[str, str], FloatArray] = {}
    for block in blocks:
        shape = block.losses.total.shape
        here = slice(begin, begin + shape[-1])
        begin += shape[-1]
        degc = stage.by_name(block.mean, demand.held[here], shape)
        for part in stage.parts:
            for bound in part.terms:
                if hasattr(bound.term, "outside"):
                    key = (part.slot.name, bound.term.mechanism)
                    sums = _sums(stage, part, bound, block, degc[part.slot.name], demand.duration[here])
                    found[key] = found.get(key, np.zeros(4)) + sums
    entries = [
        OutsideEntry(part, mechanism, float(beyond / time), float(lost / energy) if energy > 0.0 else 0.0)
        for (part, mechanism), (beyond, time, lost, energy) in found.items()
        if beyond > 0.0
    ]
    return tuple(sorted(entries, key=lambda entry: -max(entry.energy_share, entry.time_share)))


def _sums(
    stage: Stage, part: StagePart, bound: BoundTerm, block: Settled, degc: FloatArray, seconds: FloatArray
) -> FloatArray:
    """Return time outside and in all [s], energy outside and in all [J], of one term in one block."""
    reading = stage.reading(part, block.checked.operation, block.point)
    term: object = bound.term
    ask = partial(term.outside, reading, block.checked.operation.timing, degc)  # type: ignore[attr-defined]
    watts = block.losses.by_term[part.slot.name, bound.term.mechanism][0]
    asked = np.broadcast_to(call_plugin(stage.registry, bound.model, ask), block.losses.total.shape)[0]
    beyond = asked & (watts > 0.0)
    joules = watts * seconds
    return np.array([seconds[beyond].sum(), seconds.sum(), joules[beyond].sum(), joules.sum()])


def outside_warnings(mission: str, entries: tuple[OutsideEntry, ...]) -> list[str]:
    """Return one sentence for each table that was asked beyond its points."""
    return [
        f"{mission}: {entry.mechanism} of {entry.part.replace('_', ' ')} was asked beyond its points in"
        f" {100.0 * entry.time_share:.2g} % of the time, with {100.0 * entry.energy_share:.2g} % of its energy; there"
        " its curve goes on straight or is held, whichever costs more"
        for entry in entries
    ]


def flagged(entries: tuple[OutsideEntry, ...]) -> tuple[OutsideEntry, ...]:
    """Return the entries that page one names."""
    return tuple(entry for entry in entries if max(entry.time_share, entry.energy_share) > FLAGGED)
