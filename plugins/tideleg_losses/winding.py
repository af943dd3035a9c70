"""Copper loss of an inductor winding: all of its current at the dc resistance, and the excess of its harmonics."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from typing import Annotated, Literal, Self

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import FloatArray, Line, LossTerm, PartKind, Timing, Values, Winding, hookimpl, quantity
from tideleg_losses.dowell import COPPER_SLOPE_20, copper_factor, round_wire_height
from tideleg_losses.shared_keys import refuse_keys_without, refuse_missing
from tideleg_losses.winding_ac import DowellTerm, LitzTerm, RatioTerm

_LAYERED = ("winding_layers", "winding_conductor_thickness")
_LITZ = ("winding_strands", "winding_strand_diameter", "winding_width")
_TABLE = ("ac_resistance_ratio",)


class WindingSettings(BaseModel):
    """Keys of [stage.inductor]: winding_resistance at 20 degC, and one of three ways to know the ac resistance.

    Layers of foil or round wire (winding_conductor_thickness is the foil's height or the wire's diameter), litz, or a
    measured table ac_resistance_ratio = [[Hz, R_ac/R_dc], ...].
    """

    model_config = ConfigDict(extra="forbid")

    winding_resistance: Annotated[quantity.Resistance, Field(gt=0.0)] | None = None
    winding_conductor: Literal["foil", "round", "litz"] = "round"
    winding_layers: float | None = Field(default=None, ge=0.5, le=100.0)
    winding_conductor_thickness: Annotated[quantity.Length, Field(gt=0.0)] | None = None
    winding_porosity: float = Field(default=1.0, gt=0.0, le=1.0)
    winding_strands: float | None = Field(default=None, ge=1.0)
    winding_strand_diameter: Annotated[quantity.Length, Field(gt=0.0)] | None = None
    winding_width: Annotated[quantity.Length, Field(gt=0.0)] | None = None
    turns: Annotated[float, Field(gt=0.0)] | None = None
    ac_resistance_ratio: tuple[tuple[quantity.Frequency, Annotated[float, Field(ge=1.0)]], ...] | None = None

    @model_validator(mode="after")
    def _knows_one_ac_resistance(self) -> Self:
        ways = {"layers": _LAYERED, "litz": _LITZ, "a table": _TABLE}
        given = {way: [key for key in keys if getattr(self, key) is not None] for way, keys in ways.items()}
        used = [way for way, keys in given.items() if keys]
        if len(used) > 1:
            found = ", ".join(key for way in used for key in given[way])
            raise ValueError(f"found {found}; give one way to know the ac resistance: {', '.join(ways)}")
        refuse_keys_without(self, ("winding_conductor_thickness",), ("winding_porosity",))
        refuse_keys_without(self, (*_LAYERED, *_LITZ), ("winding_conductor",))
        if not used:
            return self
        refuse_missing(self, ("winding_resistance",), "the ac excess is a multiple of it")
        is_litz = self.winding_conductor == "litz"
        if used != ["a table"] and (used == ["litz"]) != is_litz:
            raise ValueError(
                f"winding_conductor: found {self.winding_conductor!r} with {', '.join(given[used[0]])}; litz goes with"
                f" {', '.join(_LITZ)}, foil and round go with {', '.join(_LAYERED)}"
            )
        refuse_missing(self, ways[used[0]], f"the ac resistance from {used[0]} needs {', '.join(ways[used[0]])}")
        if is_litz:
            refuse_missing(self, ("turns",), "the field in a litz winding grows with its turns")
        self._refuse_unordered_table()
        return self

    def _refuse_unordered_table(self) -> None:
        table = self.ac_resistance_ratio
        if table is not None and (len(table) < 2 or any(a[0] >= b[0] for a, b in pairwise(table))):
            raise ValueError("ac_resistance_ratio: give two or more points [Hz, ratio] with rising frequency")

    @property
    def conductor_height(self) -> float:
        """Height of the foil that the conductor stands for, times sqrt(porosity) [m]."""
        assert self.winding_conductor_thickness is not None
        thickness = self.winding_conductor_thickness
        height = float(round_wire_height(thickness)) if self.winding_conductor == "round" else thickness
        return float(height * np.sqrt(self.winding_porosity))


@dataclass(frozen=True)
class DcTerm:
    """R(T) times the mean square of the whole current: what the dc resistance costs, ripple included.

    What the ripple costs above that is "winding ac"; without data for it the ripple still costs this much.
    """

    resistance: Values
    mechanism: str = "winding dc"
    ohmic: bool = True
    heats: bool = True

    def at(self, part: Winding, timing: Timing, temperature: FloatArray) -> Line:
        """Return the loss of one winding [W] and its slope [W/K]."""
        cold = self.resistance * part.current.mean_square()
        return Line(cold * copper_factor(temperature), COPPER_SLOPE_20 * cold + np.zeros_like(temperature))


@dataclass(frozen=True)
class WindingLoss:
    """The model."""

    name: str = "winding"
    source: str = (
        "Joule's law; copper after IEC 60028; P. L. Dowell, Proc. IEE 113(8), 1966, per harmonic;"
        " litz: C. R. Sullivan, IEEE Trans. Power Electronics 14(2), 1999"
    )
    reads: PartKind = "inductor"
    mechanisms: tuple[str, ...] = ("winding dc", "winding ac")
    settings: type[BaseModel] = WindingSettings

    def terms(self, settings: WindingSettings) -> tuple[LossTerm[Winding], ...]:
        """Return the dc term if a resistance is given, and the ac term if its resistance is known in some way."""
        if settings.winding_resistance is None:
            return ()
        ac = ac_term(settings, settings.winding_resistance)
        dc = DcTerm(settings.winding_resistance)
        return (dc,) if ac is None else (dc, ac)


def ac_term(settings: WindingSettings, resistance: float) -> LossTerm[Winding] | None:
    """Return the term of the harmonics' excess in the way that the data support, or None."""
    s = settings
    if s.ac_resistance_ratio is not None:
        frequencies, ratios = zip(*s.ac_resistance_ratio, strict=True)
        return RatioTerm(resistance, frequencies, ratios)
    if s.winding_strands is not None:
        assert s.turns is not None
        assert s.winding_strand_diameter is not None
        assert s.winding_width is not None
        return LitzTerm(resistance, s.turns, s.winding_strands, s.winding_strand_diameter, s.winding_width)
    return None if s.winding_layers is None else DowellTerm(resistance, s.conductor_height, s.winding_layers)


@hookimpl
def loss_model() -> WindingLoss:
    """Offer the winding losses."""
    return WindingLoss()
