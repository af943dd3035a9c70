"""Reverse recovery of a diode on a die of its own; the opposite switch's turn-on commutates it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Self

from pydantic import BaseModel, model_validator

from tideleg import LossTerm, PartKind, Position, hookimpl
from tideleg_losses.recovery import MECHANISM, RecoveryData, recovery_terms


class DiodeRecoverySettings(RecoveryData):
    """Keys of [stage.switch.diode]; recovery_in_turn_on must be said, for turn_on_energy stands in [stage.switch]."""

    @model_validator(mode="after")
    def _says_what_turn_on_holds(self) -> Self:
        if self.given() and self.recovery_in_turn_on is None:
            raise ValueError(
                "recovery_in_turn_on is missing: turn_on_energy of the switch may hold the diode's own loss as well,"
                " and both together would count it twice; say true (it is then not added) or false (it is: data sheets"
                " of modules mostly give the diode's loss apart)"
            )
        return self


@dataclass(frozen=True)
class DiodeRecovery:
    """The model."""

    name: str = "diode-recovery"
    source: str = (
        "E_rr scaled as switching energies, exponents 0.6: Semikron, Application Manual, 2nd ed., 2015 (from memory)"
    )
    reads: PartKind = "diode"
    mechanisms: tuple[str, ...] = (MECHANISM,)
    settings: type[BaseModel] = DiodeRecoverySettings

    def terms(self, settings: DiodeRecoverySettings) -> tuple[LossTerm[Position], ...]:
        """Return the term if recovery data are given."""
        return recovery_terms(settings)


@hookimpl
def loss_model() -> DiodeRecovery:
    """Offer the recovery of a diode."""
    return DiodeRecovery()
