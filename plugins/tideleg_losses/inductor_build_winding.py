"""A winding in a window: copper area, resistance, layers, fill, mass, and the keys of the winding loss."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np

from tideleg import FloatArray, InputError, Values
from tideleg_losses.dowell import COPPER_RESISTIVITY_20, copper_factor
from tideleg_losses.inductor_build_core import CoreShape

COPPER_DENSITY = 8960.0
"""[kg/m³], handbook value (from memory); the resistance standard IEC 60028 says 8890."""


@dataclass(frozen=True)
class Wire:
    """A conductor.

    name : [-]
    kind : "round", "foil" or "litz"
    thickness : diameter of a round wire, height of a foil, diameter of ONE litz strand, bare [m]
    strands : of a litz bundle; wires in hand of a round one; 1 for foil [-]
    width : of a foil along the window; 0 for the others [m]
    outer : diameter of the whole insulated conductor, or height of a foil with its insulation [m]
    """

    name: str
    kind: Literal["round", "foil", "litz"]
    thickness: float
    strands: int
    width: float
    outer: float

    def __post_init__(self) -> None:
        if self.thickness <= 0.0 or self.strands < 1 or (self.kind == "foil") != (self.width > 0.0):
            raise InputError(f"{self.name}: thickness is above zero, strands count from 1, and only a foil has a width")
        if self.kind == "foil" and self.strands != 1:
            raise InputError(f"{self.name}: a foil has one strand, found {self.strands}")
        if self.footprint < self.copper_area:
            raise InputError(
                f"{self.name}: {1e6 * self.copper_area:.4g} mm2 of copper do not fit in the outer size, which gives"
                f" {1e6 * self.footprint:.4g} mm2"
            )

    @property
    def copper_area(self) -> float:
        """Cross-section of the copper [m²]."""
        if self.kind == "foil":
            return self.thickness * self.width
        return float(self.strands * 0.25 * np.pi * self.thickness**2)

    @property
    def footprint(self) -> float:
        """What one turn takes of the window, insulation included [m²]: the square around a round one."""
        return self.outer * self.width if self.kind == "foil" else self.outer**2 * self.in_hand

    @property
    def in_hand(self) -> int:
        """How many wires lie beside each other for one turn; a litz bundle is one [-]."""
        return self.strands if self.kind == "round" else 1


def gauge_diameter(gauge: Values) -> FloatArray:
    """Return the bare diameter of a wire of American gauge [m]: 0.127 mm 92^((36 - n)/39)."""
    return np.asarray(0.127e-3 * 92.0 ** ((36.0 - np.asarray(gauge, dtype=np.float64)) / 39.0))


def dc_resistance(wire: Wire, turns: Values, mean_turn_length: Values, degc: Values) -> FloatArray:
    """Return rho(T) N l/A [Ω]; copper after IEC 60028."""
    cold = COPPER_RESISTIVITY_20 * turns * mean_turn_length / wire.copper_area
    return np.asarray(cold * copper_factor(degc))


def copper_mass(wire: Wire, turns: Values, mean_turn_length: Values) -> FloatArray:
    """Return the mass of the copper [kg]."""
    return np.asarray(COPPER_DENSITY * turns * mean_turn_length * wire.copper_area)


def turns_per_layer(core: CoreShape, wire: Wire) -> int:
    """Return how many turns lie side by side along the window; a foil turn fills a layer.

    Raises
    ------
    InputError
        If not even one fits.
    """
    size = wire.width if wire.kind == "foil" else wire.outer * wire.in_hand
    fit = int(np.floor(core.window_height / size * (1.0 + 1e-12)))
    if fit < 1:
        raise InputError(
            f"{wire.name} is {1e3 * size:.4g} mm wide, the window of {core.name} {1e3 * core.window_height:.4g} mm high"
        )
    return 1 if wire.kind == "foil" else fit


def layers(core: CoreShape, wire: Wire, turns: int) -> int:
    """Return how many whole layers so many turns take [-]."""
    return -(-turns // turns_per_layer(core, wire))


def window_fill(core: CoreShape, wire: Wire, turns: Values) -> FloatArray:
    """Return the share of the window that is copper [-]; common practice allows 0.3 to 0.5, litz less."""
    return np.asarray(turns * wire.copper_area / core.window_area)


def fits(core: CoreShape, wire: Wire, turns: int) -> bool:
    """Return whether the insulated layers fit the depth of the window (its area over its height)."""
    depth = core.window_area / core.window_height
    return bool(layers(core, wire, turns) * wire.outer <= depth * (1.0 + 1e-12))


def winding_keys(core: CoreShape, wire: Wire, turns: int) -> dict[str, float | str]:
    """Return the keys of [stage.inductor] that the winding loss reads: resistance at 20 degC, and Dowell's or litz's.

    For layers, porosity is the copper's share of a layer's length: turns in it times the (square) conductor's width
    over the height of the window. The turns spread evenly over the layers.
    """
    keys: dict[str, float | str] = {
        "winding_resistance": float(dc_resistance(wire, turns, core.mean_turn_length, 20.0)),
        "winding_conductor": wire.kind,
        "turns": float(turns),
    }
    if wire.kind == "litz":
        bundle = {"winding_strands": float(wire.strands), "winding_strand_diameter": wire.thickness}
        return {**keys, **bundle, "winding_width": core.window_height}
    count = layers(core, wire, turns)
    side = wire.width if wire.kind == "foil" else 0.5 * np.sqrt(np.pi) * wire.thickness * wire.in_hand
    porosity = float(turns / count * side / core.window_height)
    layered = {"winding_layers": float(count), "winding_conductor_thickness": wire.thickness}
    return {**keys, **layered, "winding_porosity": min(porosity, 1.0)}
