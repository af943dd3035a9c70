"""An inductor as it is built: core, turns, gap and wire; all its figures, and the keys of a plan that follow."""

from __future__ import annotations

from dataclasses import dataclass

from tideleg import FloatArray, InputError, Values
from tideleg_losses.inductor_build_core import (
    CoreShape,
    Magnetized,
    effective_gap,
    inductance,
    magnetize,
    saturation_current,
)
from tideleg_losses.inductor_build_winding import Wire, copper_mass, dc_resistance, fits, winding_keys, window_fill


@dataclass(frozen=True)
class InductorBuild:
    """One built inductor.

    core : geometry and material
    wire : the conductor of every turn
    turns : whole number from 1 [-]
    gap : total length of the gap in the flux's way, 0 for powder [m]
    """

    core: CoreShape
    wire: Wire
    turns: int
    gap: float = 0.0

    def __post_init__(self) -> None:
        if self.turns < 1:
            raise InputError(f"turns: found {self.turns}; give a whole number from 1")
        effective_gap(self.core, self.gap)  # refuses a gap that the core cannot have
        if not fits(self.core, self.wire, self.turns):
            raise InputError(f"{self.turns} turns of {self.wire.name} do not fit the window of {self.core.name}")

    @property
    def inductance(self) -> float:
        """At zero current [H]."""
        return float(inductance(self.core, self.turns, self.gap))

    def at(self, current: Values) -> Magnetized:
        """Return flux density, linkage and differential inductance at currents [A]."""
        return magnetize(self.core, self.turns, self.gap, current)

    def resistance(self, degc: Values) -> FloatArray:
        """Return the dc resistance at a temperature [Ω]."""
        return dc_resistance(self.wire, self.turns, self.core.mean_turn_length, degc)

    def roll_off_current(self, share: float = 0.7) -> float:
        """Return the current that leaves a share of the inductance [A]."""
        return saturation_current(self.core, self.turns, self.gap, share)

    @property
    def window_fill(self) -> float:
        """Share of the window that is copper [-]."""
        return float(window_fill(self.core, self.wire, self.turns))

    @property
    def mass(self) -> float:
        """Of core and copper [kg]; bobbin, potting and leads are left out."""
        return self.core.mass + float(copper_mass(self.wire, self.turns, self.core.mean_turn_length))

    @property
    def volume(self) -> float:
        """Of the core and the winding with its insulation [m³]."""
        return self.core.volume + self.turns * self.core.mean_turn_length * self.wire.footprint

    def plan_keys(self) -> dict[str, float | str]:
        """Return the keys of [stage.inductor] that this build gives: inductance, winding and core loss, saturation."""
        k, alpha, beta = self.core.steinmetz
        return {
            "inductance": self.inductance,
            "saturation_current": self.roll_off_current(),
            **winding_keys(self.core, self.wire, self.turns),
            "core_k": k,
            "core_alpha": alpha,
            "core_beta": beta,
            "core_area": self.core.area,
            "core_volume": self.core.volume,
        }
