"""Copper loss of an inductor winding: all current at the dc resistance, and the excess of its harmonics."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Literal, Self

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import FloatArray, Line, LossTerm, PartKind, Timing, Values, Winding, hookimpl, quantity
from tideleg_losses.dowell import COPPER_SLOPE_20, copper_factor, dowell_factor, round_wire_height, skin_depth

HARMONICS = 8
"""Harmonics taken one by one; what is left of the ac mean square is charged at the factor of twice the next."""


class WindingSettings(BaseModel):
    """Keys of [stage.inductor]: winding_resistance at 20 degC; layers and conductor for the ac excess."""

    model_config = ConfigDict(extra="forbid")

    winding_resistance: Annotated[quantity.Resistance, Field(gt=0.0)] | None = None
    winding_layers: Annotated[float, Field(ge=0.5)] | None = None
    winding_conductor: Literal["foil", "round"] = "round"
    winding_conductor_thickness: Annotated[quantity.Length, Field(gt=0.0)] | None = None
    winding_porosity: float = Field(default=1.0, gt=0.0, le=1.0)

    @model_validator(mode="after")
    def _whole(self) -> Self:
        ac = (self.winding_layers, self.winding_conductor_thickness)
        if any(v is None for v in ac) and any(v is not None for v in ac):
            raise ValueError("winding_layers and winding_conductor_thickness belong together; one is missing")
        if ac[0] is not None and self.winding_resistance is None:
            raise ValueError("winding_resistance is missing: the ac excess is a multiple of it")
        return self

    @property
    def conductor_height(self) -> float:
        """Height of the foil that the conductor stands for, times sqrt(porosity) [m]."""
        assert self.winding_conductor_thickness is not None
        thickness = self.winding_conductor_thickness
        height = float(round_wire_height(thickness)) if self.winding_conductor == "round" else thickness
        return float(height * np.sqrt(self.winding_porosity))


@dataclass(frozen=True)
class DcTerm:
    """R(T) times the mean square of the whole current: what the dc resistance costs, ripple included."""

    resistance: Values
    mechanism: str = "winding dc"
    ohmic: bool = True
    heats: bool = True

    def at(self, part: Winding, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one winding [W] and its slope [W/K]."""
        square = self.resistance * part.current.mean_square()
        return Line(square * copper_factor(temperature), COPPER_SLOPE_20 * square + np.zeros_like(temperature))


@dataclass(frozen=True)
class AcTerm:
    """R(T) (F_n - 1) I_n²/2 summed over harmonics, F after Dowell at each harmonic and temperature."""

    resistance: Values
    height: float
    layers: float
    mechanism: str = "winding ac"
    ohmic: bool = False
    heats: bool = True

    def at(self, part: Winding, timing: Timing, temperature: FloatArray) -> Line:
        """Return the excess of one winding [W] and its slope [W/K]."""
        depth = skin_depth(timing.frequency, temperature)
        phi = self.height / depth
        left = part.current.ac_mean_square()
        excess: FloatArray = np.zeros_like(temperature)
        slope: FloatArray = np.zeros_like(temperature)
        for order, amplitude in enumerate(part.current.harmonics(HARMONICS), start=1):
            square = 0.5 * np.abs(amplitude) ** 2
            left = left - square
            excess, slope = self._added(excess, slope, square, phi * np.sqrt(order))
        rest = np.maximum(left, 0.0)
        excess, slope = self._added(excess, slope, rest, phi * np.sqrt(2.0 * (HARMONICS + 1)))
        resistance = self.resistance * copper_factor(temperature)
        per_kelvin = COPPER_SLOPE_20 / copper_factor(temperature)
        # With x = phi: d(R (F - 1))/dT = R' (F - 1) + R F' dx/dT, and x falls as 1/sqrt(rho): dx/dT = -x rho'/(2 rho).
        return Line(resistance * excess, resistance * per_kelvin * (excess - 0.5 * slope))

    def _added(
        self, excess: FloatArray, slope: FloatArray, square: FloatArray, phi: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Add one harmonic's (F - 1) I² and phi F'(phi) I²."""
        factor = dowell_factor(phi, self.layers)
        nearby = 1e-4 * phi
        rise = (dowell_factor(phi + nearby, self.layers) - dowell_factor(phi - nearby, self.layers)) / 2e-4
        return excess + (factor - 1.0) * square, slope + rise * square


@dataclass(frozen=True)
class WindingLoss:
    """The model."""

    name: str = "winding"
    source: str = "Joule's law; copper after IEC 60028; P. L. Dowell, Proc. IEE 113(8), 1966, per harmonic"
    reads: PartKind = "inductor"
    mechanisms: tuple[str, ...] = ("winding dc", "winding ac")
    settings: type[BaseModel] = WindingSettings

    def terms(self, settings: WindingSettings) -> tuple[LossTerm[Winding], ...]:
        """Return the dc term if a resistance is given, and the ac term if the conductor is."""
        if settings.winding_resistance is None:
            return ()
        dc = DcTerm(settings.winding_resistance)
        if settings.winding_layers is None:
            return (dc,)
        return (dc, AcTerm(settings.winding_resistance, settings.conductor_height, settings.winding_layers))


@hookimpl
def loss_model() -> WindingLoss:
    """Offer the winding losses."""
    return WindingLoss()
