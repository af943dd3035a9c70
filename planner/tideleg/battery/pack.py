"""The pack as the planner sees it: curves over state of charge and temperature, limits, and why a step is curtailed."""

from __future__ import annotations

from dataclasses import dataclass
from enum import IntEnum

import numpy as np
from numpy.typing import NDArray

from tideleg.waveform import FloatArray


class Cause(IntEnum):
    """Why a step was curtailed; the words are in `CAUSE_WORDS`."""

    NONE = 0
    PROFILE = 1
    DISCHARGE_CURRENT = 2
    CHARGE_CURRENT = 3
    VOLTAGE_LOW = 4
    VOLTAGE_HIGH = 5
    GREATEST_POWER = 6
    SOC_LOW = 7
    SOC_HIGH = 8
    TEMPERATURE = 9


CAUSE_WORDS = (
    "",
    "power limit in the profile",
    "discharge current limit",
    "charge current limit",
    "lowest battery voltage",
    "highest battery voltage",
    "greatest power of the battery",
    "lowest state of charge",
    "highest state of charge",
    "battery temperature",
)

ALWAYS = (-np.inf, np.inf)


@dataclass(frozen=True)
class Battery:
    """A pack as the planner sees it.

    soc : (G,) grid of the state of charge, increasing, 0 to 1 [-]; one point means constant
    open_circuit_voltage, discharge_resistance, charge_resistance : on that grid (G,), or one row for each temperature
        (K, G) [V], [Ω], [Ω]
    capacity : [C]; infinite for an ideal source whose state of charge is not modelled
    start_soc, lowest_soc, highest_soc : [-]
    pairs : (resistance [Ω], time constant [s]) of each RC pair
    discharge_current_limit, charge_current_limit : magnitudes [A], infinite where not limited
    lowest_voltage, highest_voltage : at the terminals [V]; 0 and infinite where not limited
    degc : (K,) temperatures of the rows, increasing [degC]; empty where nothing depends on temperature
    ripple_inductance : of the way to it, for the ripple that reaches it [H]
    discharge_degc, charge_degc : temperatures between which it may give and take current [degC]
    """

    soc: FloatArray
    open_circuit_voltage: FloatArray
    discharge_resistance: FloatArray
    charge_resistance: FloatArray
    capacity: float
    start_soc: float
    lowest_soc: float = 0.0
    highest_soc: float = 1.0
    pairs: tuple[tuple[float, float], ...] = ()
    discharge_current_limit: float = np.inf
    charge_current_limit: float = np.inf
    lowest_voltage: float = 0.0
    highest_voltage: float = np.inf
    degc: tuple[float, ...] = ()
    discharge_degc: tuple[float, float] = ALWAYS
    charge_degc: tuple[float, float] = ALWAYS
    ripple_inductance: float = 0.0

    @property
    def tracks_charge(self) -> bool:
        """Whether the state of charge is modelled."""
        return bool(np.isfinite(self.capacity))

    @property
    def needs_temperature(self) -> bool:
        """Whether its temperature must be known at each step."""
        return bool(self.degc) or self.discharge_degc != ALWAYS or self.charge_degc != ALWAYS

    def source(
        self, soc: FloatArray, discharging: NDArray[np.bool_], degc: FloatArray | None = None
    ) -> tuple[FloatArray, FloatArray]:
        """Return (open-circuit voltage [V], resistance [Ω]) at a state of charge, a direction and a temperature.

        Between grid points and between temperatures the curves are straight. A temperature outside the given ones is
        the caller's to refuse: here the nearest row holds.
        """
        voltage = self._at(self.open_circuit_voltage, soc, degc)
        out = self._at(self.discharge_resistance, soc, degc)
        into = self._at(self.charge_resistance, soc, degc)
        return voltage, np.where(discharging, out, into)

    def _at(self, rows: FloatArray, soc: FloatArray, degc: FloatArray | None) -> FloatArray:
        if not self.degc:
            return np.interp(soc, self.soc, rows)
        if degc is None:
            raise ValueError("this battery depends on temperature: give it for each step")
        total = np.zeros(np.broadcast_shapes(np.shape(soc), np.shape(degc)))
        for row, weight in zip(rows, np.eye(len(self.degc)), strict=True):
            total = total + np.interp(degc, self.degc, weight) * np.interp(soc, self.soc, row)
        return total
