"""From a plan to what the march needs: the battery, the profiles, and the demand of each mission."""

from __future__ import annotations

import numpy as np

from tideleg.battery import ALWAYS, Battery
from tideleg.march import Demand
from tideleg.mission import ROLES, Layout, Profile, Vehicle, read_profile
from tideleg.plan import Curve, MissionTable, Plan
from tideleg.registry import Registry
from tideleg.sourced import sourced_profile
from tideleg.stage import Stage
from tideleg.waveform import FloatArray

REFERENCE_DEGC = 25.0
"""Temperature of parts without a thermal path where the plan gives no coolant either [degC]."""


def battery_of(plan: Plan, mission: MissionTable | None = None) -> Battery:
    """Return the battery that a plan describes, its curves on one common grid, as one mission starts with it."""
    table = plan.battery
    charge = table.resistance if table.resistance_charge is None else table.resistance_charge
    curves = (table.open_circuit_voltage, table.resistance, charge)
    grid = np.unique(np.concatenate([np.asarray(curve.soc, dtype=float) for curve in curves]))
    degc = tuple(float(t) for t in np.unique(np.concatenate([np.asarray(curve.degc, dtype=float) for curve in curves])))
    voltage, out, into = (_on_grid(grid, degc, curve) for curve in curves)
    low, high = table.soc_window
    return Battery(
        grid,
        voltage,
        out,
        into,
        capacity=np.inf if table.capacity is None else table.capacity,
        start_soc=_first_given(None if mission is None else mission.start_soc, table.start_soc, low),
        lowest_soc=low,
        highest_soc=high,
        pairs=tuple(table.rc_pairs),
        discharge_current_limit=_or_infinite(table.current_limit_discharge),
        charge_current_limit=_or_infinite(table.current_limit_charge),
        lowest_voltage=0.0 if table.voltage_min is None else table.voltage_min,
        highest_voltage=_or_infinite(table.voltage_max),
        degc=degc,
        discharge_degc=table.discharge_temperature or ALWAYS,
        charge_degc=table.charge_temperature or ALWAYS,
        ripple_inductance=table.ripple_inductance,
    )


def _on_grid(grid: FloatArray, degc: tuple[float, ...], curve: Curve) -> FloatArray:
    """Return the curve on the common grid: (G,), or a row for each temperature of any curve (K, G).

    A curve with fewer temperatures than another is straight between its own; `_battery_temperature` keeps the
    mission inside them.
    """
    own = {t: np.interp(grid, np.asarray(c.soc), np.asarray(c.value)) for t, c in curve.by_temperature().items()}
    if not degc:
        return np.asarray(own[None])
    if None in own:
        return np.tile(own[None], (len(degc), 1))
    rows = np.stack(list(own.values()))
    known = np.array([t for t in own if t is not None])
    return np.stack([np.interp(degc, known, rows[:, i]) for i in range(len(grid))], axis=1)


def _first_given(*values: float | None) -> float:
    return next(value for value in values if value is not None)


def _or_infinite(limit: float | None) -> float:
    return np.inf if limit is None else limit


def profile_of(plan: Plan, mission: MissionTable, registry: Registry | None = None) -> Profile:
    """Read the profile of one mission as the plan declares it, or have its source make it.

    Raises
    ------
    ProfileError
        If the file cannot be used; file, line and column are named.
    PlanError
        If the keys of the source cannot be used.
    """
    if mission.profile is None:
        return sourced_profile(plan, plan.mission.index(mission), registry)
    return read_profile(
        plan.folder / mission.profile,
        name=mission.label,
        terminals=mission.terminals,
        interpolation=mission.interpolation,
        positive=mission.sign,
        vehicle=vehicle_of(plan),
        layout=layout_of(mission),
    )


def layout_of(mission: MissionTable) -> Layout:
    """Return what a mission declares of its file."""
    table = mission.layout
    columns = {role: getattr(table, role) for role in ROLES if getattr(table, role) is not None}
    return Layout(
        columns=columns,
        unit=table.unit,
        encoding="utf-8-sig" if table.encoding is None else table.encoding,
        separator=table.separator,
        decimal=table.decimal,
        header_line=table.header_line,
        stamps=table.stamps,
        longest_gap_s=table.longest_gap,
        gap=table.gap,
        missing=table.missing,
    )


def vehicle_of(plan: Plan) -> Vehicle | None:
    """Return the vehicle of a plan, which turns a speed profile into power; None where the plan has none."""
    v = plan.vehicle
    if v is None:
        return None
    return Vehicle(
        mass_kg=v.mass,
        rotating_mass_factor=v.rotating_mass_factor,
        drag_area_m2=v.drag_area,
        rolling_coefficient=v.rolling_resistance,
        air_density_kg_m3=v.air_density,
        f0_n=v.f0,
        f1_n_per_m_s=v.f1,
        f2_n_per_m_s2=v.f2,
        drivetrain_efficiency=v.drivetrain_efficiency,
        regeneration_limit_w=v.regeneration_limit,
        regeneration_share=v.regeneration_share,
        regeneration_fade_m_s=v.regeneration_fade,
        auxiliary_power_w=v.auxiliary_power,
    )


def demand_of(plan: Plan, index: int, profile: Profile, stage: Stage) -> Demand:
    """Return what one mission asks of the stage, step by step.

    Raises
    ------
    PlanError
        If the cooling needs a boundary temperature that neither the plan nor the profile gives.
    """
    mission = plan.mission[index]
    steps = len(profile.power_w)
    given = {
        "coolant": _column(profile.coolant_degc, mission.coolant, steps),
        "ambient": _column(profile.ambient_degc, mission.ambient, steps),
    }
    names = () if stage.modes is None else stage.modes.boundaries
    for name in names:
        if given.get(name) is None:
            what = f"the cooling needs the {name} temperature; give {name} = '25 degC' or a column {name}_degc"
            raise plan.fault(f"mission.{index}.{name}", what)
    held = given["coolant"] if given["coolant"] is not None else np.full(steps, REFERENCE_DEGC)
    wanted = [column for column in (given[name] for name in names) if column is not None]
    boundary = np.stack(wanted) if wanted else np.zeros((0, steps))
    link = _column(profile.link_voltage_v, plan.link.voltage, steps)
    greatest = _column(profile.power_max_w, np.inf, steps)
    least = _column(profile.power_min_w, -np.inf, steps)
    assert link is not None
    assert greatest is not None
    assert least is not None
    degc = _battery_temperature(plan, index, profile, steps)
    return Demand(profile.power_w, profile.terminals, profile.duration_s, link, boundary, held, greatest, least, degc)


def _battery_temperature(plan: Plan, index: int, profile: Profile, steps: int) -> FloatArray | None:
    """Return the battery's temperature at each step, or None where nothing depends on it.

    Raises
    ------
    PlanError
        If it is needed and not given, or leaves the temperatures that a curve of the battery covers.
    """
    battery, mission = plan.battery, plan.mission[index]
    curves = {key: getattr(battery, key) for key in ("open_circuit_voltage", "resistance", "resistance_charge")}
    limits = (battery.discharge_temperature, battery.charge_temperature)
    if all(curve is None or not curve.degc for curve in curves.values()) and not any(limits):
        return None
    given = _column(profile.battery_degc, mission.battery_temperature, steps)
    key = f"mission.{index}.battery_temperature"
    if given is None:
        what = "the battery depends on its temperature; give battery_temperature = '25 degC' or a column battery_degc"
        raise plan.fault(key, what)
    for name, curve in curves.items():
        if curve is not None and curve.degc:
            low, high = curve.degc[0], curve.degc[-1]
            coldest, warmest = float(given.min()), float(given.max())
            if coldest < low or warmest > high:
                raise plan.fault(
                    key,
                    f"the battery is between {coldest:g} and {warmest:g} degC; battery.{name} covers {low:g} to"
                    f" {high:g} degC and nothing is extrapolated: add a curve",
                )
    return given


def _column(column: FloatArray | None, constant: float | None, steps: int) -> FloatArray | None:
    """Return the profile's column, or the plan's constant at every step, or None."""
    if column is not None:
        return column
    return None if constant is None else np.full(steps, float(constant))
