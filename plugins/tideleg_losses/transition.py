"""Times and energies of one switching transition from gate and diode data: pure functions, SI units."""

from __future__ import annotations

import numpy as np

from tideleg import FloatArray, Values


def clamped_inductive_energy(voltage: Values, current: Values, time: Values) -> Values:
    """Return V I t/2 [J]: one transition while the current of an inductor is clamped, as in any leg.

    ROHM, Calculation of Power Loss (Synchronous), AEK59-D1-0065-2. Textbooks also print V I t/6; that holds for a
    resistive load, where current and voltage move together, and is a third of this.
    """
    return 0.5 * voltage * current * time


def current_transition_time(
    gate_resistance: Values, input_capacitance: Values, drive: Values, threshold: Values, plateau: Values
) -> FloatArray:
    """Return R_g C_iss ln((V_g - V_th)/(V_g - V_pl)) [s], the rise of the current at turn-on.

    Infineon, PFC boost converter design guide, DN 2013-01, Eq. 18.
    """
    return np.asarray(gate_resistance * input_capacitance * np.log((drive - threshold) / (drive - plateau)))


def voltage_transition_time(gate_resistance: Values, gate_drain_charge: Values, drive_above_plateau: Values) -> Values:
    """Return R_g Q_gd/(V_g - V_pl) [s], the fall of the voltage at turn-on; at turn-off V_pl drives instead.

    Infineon, PFC boost converter design guide, DN 2013-01, Eq. 19; Vishay, AN608A, Eq. 18. `gate_drain_charge` is the
    part of Q_gd that the voltage step in use moves.
    """
    return gate_resistance * gate_drain_charge / drive_above_plateau


def triangular_recovery_charge(peak_current: Values, time: Values) -> Values:
    """Return I_rr t_rr/2 [C], the charge of a triangular recovery current."""
    return 0.5 * peak_current * time
