"""Series resistance of a port capacitor, with the stage's ripple and with the ripple of others on the port."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Any, Self

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, field_validator, model_validator

from tideleg import Exchange, FloatArray, Line, LossTerm, PartKind, Timing, Values, hookimpl, quantity
from tideleg_losses.capacitor_harmonics import TabledEsrTerm, TabledExternalTerm
from tideleg_losses.esr_table import EsrTable, read_esr_table
from tideleg_losses.shared_keys import refuse_keys_without, refuse_missing

Frequency = Annotated[quantity.Frequency, Field(gt=0.0)]
Current = Annotated[quantity.Current, Field(ge=0.0)]
_TABLE_SCHEMA = {
    "anyOf": [{"type": "array"}, {"type": "string"}],
    "description": "rows [frequency, temperature, esr] or [frequency, esr], or the name of a CSV file",
    "examples": [[["10 kHz", "25 degC", "2 mohm"], ["1 MHz", "25 degC", "4 mohm"]]],
}


class CapacitorSettings(BaseModel):
    """Keys of a capacitor: its series resistance in one of three forms, and the ripple that others on the port add.

    esr : one number for all frequencies and temperatures
    dissipation_factor : tan(delta) at dissipation_frequency, which with capacitance gives that number
    esr_table : over frequency and temperature
    external_ripple_current : rms; its frequency does not matter to a resistance that is one number
    external_ripple_spectrum : pairs [frequency, rms]
    """

    model_config = ConfigDict(extra="forbid", arbitrary_types_allowed=True)

    esr: Annotated[quantity.Resistance, Field(ge=0.0)] | None = None
    dissipation_factor: Annotated[quantity.Share, Field(ge=0.0)] | None = None
    dissipation_frequency: Frequency | None = None
    capacitance: Annotated[quantity.Capacitance, Field(gt=0.0)] | None = None
    esr_table: Annotated[Any, Field(json_schema_extra=_TABLE_SCHEMA)] = None
    external_ripple_current: Current | None = None
    external_ripple_spectrum: tuple[tuple[Frequency, Current], ...] = ()

    @field_validator("esr_table", mode="after")
    @classmethod
    def _table_is_sound(cls, given: object) -> EsrTable | None:
        return given if given is None or isinstance(given, EsrTable) else read_esr_table(given)

    @model_validator(mode="after")
    def _is_whole(self) -> Self:
        forms = ("esr", "dissipation_factor", "esr_table")
        given = [key for key in forms if getattr(self, key) is not None]
        if len(given) > 1:
            raise ValueError(f"found {' and '.join(given)}; give one of them")
        refuse_keys_without(self, ("dissipation_factor",), ("dissipation_frequency",))
        if self.dissipation_factor is not None:
            refuse_missing(self, ("dissipation_frequency", "capacitance"), "tan(delta) needs it to give a resistance")
        if self.external_ripple_current is not None and self.external_ripple_spectrum:
            raise ValueError("found external_ripple_current and external_ripple_spectrum; give one of them")
        if self.external_ripple_current and self.esr_table is not None:
            raise ValueError(
                "found external_ripple_current with an esr_table, where its frequency matters; give"
                " external_ripple_spectrum instead, such as [['300 Hz', '12 A']]"
            )
        return self

    def constant_esr(self) -> float | None:
        """Return the resistance that is one number [Ω], or None where a table or nothing is given."""
        if self.dissipation_factor is None:
            return self.esr
        assert self.dissipation_frequency is not None
        assert self.capacitance is not None
        return float(esr_from_dissipation(self.dissipation_factor, self.dissipation_frequency, self.capacitance))

    def external_mean_square(self) -> float | None:
        """Return the mean square of what others add [A²]: sines of different frequency add in squares."""
        if self.external_ripple_spectrum:
            return float(sum(rms * rms for _, rms in self.external_ripple_spectrum))
        return None if self.external_ripple_current is None else self.external_ripple_current**2


def esr_from_dissipation(dissipation_factor: Values, frequency: Values, capacitance: Values) -> Values:
    """Return tan(delta)/(2 pi f C) [Ω]: Infineon, PFC boost converter design guide, DN 2013-01, Eq. 32.

    `frequency` is the one at which tan(delta) was measured [Hz], often 100 or 120 Hz: not the switching frequency.
    """
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
    """ESR times the mean square of the ripple from outside: with no fixed phase to the stage's own it adds in squares.

    It flows while the stage idles, too.
    """

    esr: Values
    mean_square: Values
    mechanism: str = "capacitor ripple of others"
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Exchange, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss that others on the port cause in the capacitor [W]."""
        watts = self.esr * self.mean_square + np.zeros_like(temperature)
        return Line(watts, np.zeros_like(watts))


@dataclass(frozen=True)
class CapacitorEsr:
    """The model."""

    name: str = "capacitor-esr"
    source: str = (
        "ESR I_rms²: Infineon, PFC boost converter design guide, DN 2013-01, Eq. 34; harmonics: Parseval's theorem"
    )
    reads: PartKind = "capacitor"
    mechanisms: tuple[str, ...] = ("capacitor ESR", "capacitor ripple of others")
    settings: type[BaseModel] = CapacitorSettings

    def terms(self, settings: CapacitorSettings) -> tuple[LossTerm[Exchange], ...]:
        """Return the term of the stage if a series resistance is given, and that of others if their ripple is."""
        external = settings.external_mean_square()
        if isinstance(settings.esr_table, EsrTable):
            tabled = TabledEsrTerm(settings.esr_table)
            if external is None:
                return (tabled,)
            return (tabled, TabledExternalTerm(settings.esr_table, settings.external_ripple_spectrum))
        esr = settings.constant_esr()
        if esr is None:
            return ()
        own = EsrTerm(esr)
        return (own,) if external is None else (own, ExternalTerm(esr, external))


@hookimpl
def loss_model() -> CapacitorEsr:
    """Offer the capacitor's series resistance."""
    return CapacitorEsr()
