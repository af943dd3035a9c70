"""Conduction of a diode on a die of its own: all reverse current of its place, dead times included."""

from __future__ import annotations

from dataclasses import dataclass

from pydantic import BaseModel

from tideleg import LossTerm, PartKind, Position, hookimpl
from tideleg_losses.knee import SOURCE, KneeSettings, knee_terms


@dataclass(frozen=True)
class Diode:
    """The model."""

    name: str = "diode"
    source: str = SOURCE
    reads: PartKind = "diode"
    mechanisms: tuple[str, ...] = ("diode conduction",)
    settings: type[BaseModel] = KneeSettings

    def terms(self, settings: KneeSettings) -> tuple[LossTerm[Position], ...]:
        """Return the term if a knee voltage or a curve is given."""
        return knee_terms(settings, "reverse", "diode conduction")


@hookimpl
def loss_model() -> Diode:
    """Offer the conduction of a diode."""
    return Diode()
