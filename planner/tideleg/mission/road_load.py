"""Road load: from a speed trace to the power that a stage must give, interval by interval.

Form of UN GTR No. 15, Annex 7, section 5: mean speed and speed difference of each interval, rotating mass in the
acceleration term only. All here in SI: m/s, N, W.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from tideleg.waveform import FloatArray

GRAVITY = 9.81
"""[m/s²]"""


@dataclass(frozen=True)
class Vehicle:
    """A vehicle on a road.

    mass_kg, rotating_mass_factor : the factor multiplies the mass in the acceleration term only
    drag_area_m2, rolling_coefficient, air_density_kg_m3 : physical form, or
    f0_n, f1_n_per_m_s, f2_n_per_m_s2 : fitted form F = f0 + f1 v + f2 v², v in m/s
    drivetrain_efficiency : between stage and wheels, both ways
    regeneration_limit_w : greatest power taken back at the stage, None for no limit
    regeneration_share : share of the braking power at the wheels that the drive takes
    regeneration_fade_m_s : at or below the first speed the drive takes no braking power, at or above the second its
        whole share, straight between; None for no fade. The form is common practice, without a published source
    auxiliary_power_w : always drawn
    """

    mass_kg: float
    rotating_mass_factor: float = 1.03
    drag_area_m2: float | None = None
    rolling_coefficient: float | None = None
    air_density_kg_m3: float = 1.2
    f0_n: float | None = None
    f1_n_per_m_s: float | None = None
    f2_n_per_m_s2: float | None = None
    drivetrain_efficiency: float = 1.0
    regeneration_limit_w: float | None = None
    regeneration_share: float = 1.0
    auxiliary_power_w: float = 0.0
    regeneration_fade_m_s: tuple[float, float] | None = None

    def resistance_force(self, speed: FloatArray, grade: FloatArray | float = 0.0) -> FloatArray:
        """Return the force of air and rolling at a speed [N]; zero at standstill, where nothing rolls.

        On a grade (rise over run) the rolling part of the physical form goes with the cosine of the slope. The fitted
        form does not tell rolling from the rest and is taken as it was fitted, on the level.
        """
        if self.drag_area_m2 is not None and self.rolling_coefficient is not None:
            air = 0.5 * self.air_density_kg_m3 * self.drag_area_m2 * speed * speed
            force = air + self.mass_kg * GRAVITY * self.rolling_coefficient / np.hypot(1.0, grade)
        else:
            assert self.f0_n is not None
            assert self.f1_n_per_m_s is not None
            assert self.f2_n_per_m_s2 is not None
            force = self.f0_n + self.f1_n_per_m_s * speed + self.f2_n_per_m_s2 * speed * speed
        return np.where(speed > 0.0, force, 0.0)

    def grade_force(self, grade: FloatArray) -> FloatArray:
        """Return the part of the weight along the road [N], m g sin(slope); grade is rise over run, positive uphill."""
        return np.asarray(self.mass_kg * GRAVITY * grade / np.hypot(1.0, grade))

    def regenerated_share(self, speed: FloatArray) -> FloatArray:
        """Return the share of the braking power that the drive takes at a speed [m/s]."""
        if self.regeneration_fade_m_s is None:
            return np.full_like(speed, self.regeneration_share)
        return np.asarray(np.interp(speed, self.regeneration_fade_m_s, (0.0, self.regeneration_share)))


class Wheel(NamedTuple):
    """At the wheels, interval by interval: mean speed [m/s], force [N], power [W]."""

    speed: FloatArray
    force: FloatArray
    power: FloatArray


def at_wheels(vehicle: Vehicle, speed: FloatArray, duration: FloatArray, grade: FloatArray | None = None) -> Wheel:
    """Return force and power at the wheels between samples of speed.

    Parameters
    ----------
    vehicle : Vehicle
    speed : (S + 1,) samples [m/s]
    duration : (S,) between the samples [s]
    grade : (S,) rise over run of the road in each interval, positive uphill; level where None
    """
    mean = 0.5 * (speed[1:] + speed[:-1])
    acceleration = np.diff(speed) / duration
    inertia = vehicle.rotating_mass_factor * vehicle.mass_kg * acceleration
    slope = np.zeros_like(mean) if grade is None else grade
    force = vehicle.resistance_force(mean, slope) + vehicle.grade_force(slope) + inertia
    return Wheel(mean, force, force * mean)


class Demanded(NamedTuple):
    """Power that the stage must give [W], and braking energy left to friction [J]."""

    power: FloatArray
    friction_j: float


def stage_power(vehicle: Vehicle, wheel: Wheel, duration: FloatArray) -> Demanded:
    """Return the power at the stage: traction over the efficiency, braking times it within its limits, auxiliaries."""
    efficiency = vehicle.drivetrain_efficiency
    traction = np.maximum(wheel.power, 0.0) / efficiency
    braking = np.minimum(wheel.power, 0.0)
    taken = braking * vehicle.regenerated_share(wheel.speed) * efficiency
    if vehicle.regeneration_limit_w is not None:
        taken = np.maximum(taken, -vehicle.regeneration_limit_w)
    friction = float(np.sum((taken / efficiency - braking) * duration))
    return Demanded(traction + taken + vehicle.auxiliary_power_w, friction)
