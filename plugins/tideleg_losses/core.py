"""Core loss by the improved generalized Steinmetz equation, segment by segment."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Annotated, Literal, Self

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import FloatArray, Line, LossTerm, PartKind, Timing, Values, Winding, hookimpl, quantity


class CoreSettings(BaseModel):
    """Keys of [stage.inductor]: Steinmetz P_v = k f^alpha B^beta with B half the swing, area, volume, turns."""

    model_config = ConfigDict(extra="forbid")

    core_k: Annotated[float, Field(gt=0.0)] | None = None
    core_alpha: Annotated[float, Field(ge=1.0, le=2.5)] | None = None
    core_beta: Annotated[float, Field(ge=1.0, le=4.0)] | None = None
    core_units: Literal["W/m3, Hz, T", "mW/cm3, kHz, mT"] = "W/m3, Hz, T"
    core_area: Annotated[quantity.Area, Field(gt=0.0)] | None = None
    core_volume: Annotated[quantity.Volume, Field(gt=0.0)] | None = None
    turns: Annotated[float, Field(gt=0.0)] | None = None

    @model_validator(mode="after")
    def _whole(self) -> Self:
        needed = ("core_k", "core_alpha", "core_beta", "core_area", "core_volume", "turns")
        missing = [key for key in needed if getattr(self, key) is None]
        # turns alone may serve other models of the same table
        if 0 < len(missing) < len(needed) and missing != [key for key in needed if key != "turns"]:
            raise ValueError(f"{missing[0]} is missing: core loss needs {', '.join(needed)}")
        return self


def k_in_si(k: float, alpha: float, beta: float, units: str) -> float:
    """Return k in W/m³, Hz, T: 1 mW/cm³ = 1 kW/m³, 1 Hz = 1e-3 kHz, 1 T = 1e3 mT."""
    scale: float = 1.0 if units == "W/m3, Hz, T" else 10.0 ** (3.0 - 3.0 * alpha + 3.0 * beta)
    return k * scale


def cosine_integral(alpha: float) -> float:
    """Return the integral of |cos|^alpha over a turn: 2 sqrt(pi) Gamma((alpha + 1)/2)/Gamma(alpha/2 + 1)."""
    return 2.0 * math.sqrt(math.pi) * math.gamma((alpha + 1.0) / 2.0) / math.gamma(alpha / 2.0 + 1.0)


def igse_k(k: float, alpha: float, beta: float) -> float:
    """Return k_i = k/((2 pi)^(alpha - 1) 2^(beta - alpha) I(alpha)).

    K. Venkatachalam, C. R. Sullivan, T. Abdallah, H. Tacca, IEEE Workshop on Computers in Power Electronics, 2002.
    """
    return float(k / ((2.0 * math.pi) ** (alpha - 1.0) * 2.0 ** (beta - alpha) * cosine_integral(alpha)))


def flux_swing(widths: list[Values], rates: list[Values], frequency: Values) -> FloatArray:
    """Return the full swing of the flux density [T] from rates dB/dt [T/s] held for fractions of the period."""
    level: FloatArray = np.zeros(())
    highest: FloatArray = level
    lowest: FloatArray = level
    for width, rate in zip(widths, rates, strict=True):
        level = np.asarray(level + rate * width / frequency)
        highest, lowest = np.maximum(highest, level), np.minimum(lowest, level)
    return np.asarray(highest - lowest)


def igse_density(
    widths: list[Values], rates: list[Values], frequency: Values, k_i: float, alpha: float, beta: float
) -> FloatArray:
    """Return the core loss per volume [W/m³]: k_i swing^(beta - alpha) times the mean of |dB/dt|^alpha."""
    swing = flux_swing(widths, rates, frequency)
    mean = sum(width * np.abs(rate) ** alpha for width, rate in zip(widths, rates, strict=True))
    present = swing > 0.0
    return np.where(present, k_i * np.where(present, swing, 1.0) ** (beta - alpha) * mean, 0.0)


@dataclass(frozen=True)
class CoreTerm:
    """iGSE over the winding's voltage segments; no dc-bias and no relaxation term."""

    k_i: float
    alpha: float
    beta: float
    area: Values
    volume: Values
    turns: Values
    mechanism: str = "core"
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Winding, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one core [W]; its Steinmetz data hold at one temperature, so the slope is zero."""
        widths = [segment.width for segment in part.current.segments]
        rates: list[Values] = [voltage / (self.turns * self.area) for voltage in part.voltages]
        density = igse_density(widths, rates, timing.frequency, self.k_i, self.alpha, self.beta)
        watts = density * self.volume + np.zeros_like(temperature)
        return Line(watts, np.zeros_like(watts))


@dataclass(frozen=True)
class Core:
    """The model."""

    name: str = "core"
    source: str = "iGSE: Venkatachalam, Sullivan, Abdallah, Tacca, IEEE Computers in Power Electronics, 2002"
    reads: PartKind = "inductor"
    mechanisms: tuple[str, ...] = ("core",)
    settings: type[BaseModel] = CoreSettings

    def terms(self, settings: CoreSettings) -> tuple[LossTerm[Winding], ...]:
        """Return the term if the core is given."""
        s = settings
        if s.core_k is None or s.core_alpha is None or s.core_beta is None:
            return ()
        assert s.core_area is not None
        assert s.core_volume is not None
        assert s.turns is not None
        k_i = igse_k(k_in_si(s.core_k, s.core_alpha, s.core_beta, s.core_units), s.core_alpha, s.core_beta)
        return (CoreTerm(k_i, s.core_alpha, s.core_beta, s.core_area, s.core_volume, s.turns),)


@hookimpl
def loss_model() -> Core:
    """Offer the core loss."""
    return Core()
