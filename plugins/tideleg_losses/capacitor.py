"""Series resistance of a port capacitor, with the stage's ripple and with the ripple of others on the port."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated

import numpy as np
from pydantic import BaseModel, ConfigDict, Field

from tideleg import Exchange, FloatArray, Line, LossTerm, PartKind, Timing, Values, hookimpl, quantity


class CapacitorSettings(BaseModel):
    """Keys of a capacitor: esr, taken as constant, and the ripple that others on the port add (rms)."""

    model_config = ConfigDict(extra="forbid")

    esr: Annotated[quantity.Resistance, Field(ge=0.0)] | None = None
    external_ripple_current: Annotated[quantity.Current, Field(ge=0.0)] | None = None


def esr_from_dissipation(dissipation_factor: Values, frequency: Values, capacitance: Values) -> Values:
    """Return tan(delta)/(2 pi f C) [Ω]: Infineon, PFC boost converter design guide, DN 2013-01, Eq. 32."""
    return dissipation_factor / (2.0 * np.pi * frequency * capacitance)


@dataclass(frozen=True)
class EsrTerm:
    """ESR times the mean square of the whole ac current of the stage, the source or load taking the mean."""

    esr: Values
    mechanism: str = "capacitor ESR"
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Exchange, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of the capacitor [W]; the resistance is taken as constant."""
        watts = self.esr * part.current.ac_mean_square() + np.zeros_like(temperature)
        return Line(watts, np.zeros_like(watts))


@dataclass(frozen=True)
class ExternalTerm:
    """ESR times the squared ripple from outside: it adds in squares, having no fixed phase to the stage's own.

    It flows while the stage idles, too.
    """

    esr: Values
    current: Values
    mechanism: str = "capacitor ripple of others"
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Exchange, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss that others on the port cause in the capacitor [W]."""
        watts = self.esr * self.current * self.current + np.zeros_like(temperature)
        return Line(watts, np.zeros_like(watts))


@dataclass(frozen=True)
class CapacitorEsr:
    """The model."""

    name: str = "capacitor-esr"
    source: str = "ESR I_rms²: Infineon, PFC boost converter design guide, DN 2013-01, Eq. 34"
    reads: PartKind = "capacitor"
    mechanisms: tuple[str, ...] = ("capacitor ESR", "capacitor ripple of others")
    settings: type[BaseModel] = CapacitorSettings

    def terms(self, settings: CapacitorSettings) -> tuple[LossTerm[Exchange], ...]:
        """Return the term of the stage if a series resistance is given, and that of others if their ripple is."""
        if settings.esr is None:
            return ()
        own = EsrTerm(settings.esr)
        external = settings.external_ripple_current
        return (own,) if external is None else (own, ExternalTerm(settings.esr, external))


@hookimpl
def loss_model() -> CapacitorEsr:
    """Offer the capacitor's series resistance."""
    return CapacitorEsr()
