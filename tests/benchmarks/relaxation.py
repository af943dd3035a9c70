"""How fast the relaxation is: nanoseconds per step and candidate, beside two references run in the same minute.

    python tests/benchmarks/relaxation.py [steps]

The references do the same half-bridge arithmetic (battery, duty ratio, ripple, edge currents, channel, edges, dead
time, copper, eight thermal modes, repeated until temperatures stand) for one step after the other: (a) in plain Python,
(b) compiled into one fused loop by numba (extra `bench`; left out, and said so, where it is missing). Ratios matter,
not times. Nothing here asserts a time.
"""

from __future__ import annotations

import math
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np

from tideleg.demand import battery_of, demand_of, profile_of
from tideleg.march import march, start
from tideleg.plan import Plan, plan_from_mapping
from tideleg.stage import build_stage

E, R, LINK, L, F, DEAD = 400.0, 0.05, 750.0, 110e-6, 40e3, 250e-9
ON_R, SLOPE, E_ON, E_OFF, I_T, V_T, VF = 6e-3, 4e-3, 2e-3, 1.2e-3, 120.0, 800.0, 3.0
COPPER, PLATE_R, PLATE_C, COOLANT = 2.4e-3, 0.02, 2000.0, 65.0
CELLS = ((0.03, 0.002), (0.08, 0.05), (0.12, 0.4))
COIL = (0.4, 120.0)
TOLERANCE = 1e-5


def plan(folder: Path, steps: int) -> Plan:
    """Return the plan of the benchmark: one leg, a second a step, a seeded wandering power."""
    rng = np.random.default_rng(1)
    power = np.clip(np.cumsum(rng.normal(0.0, 4e3, steps)) % 80e3 - 40e3, -40e3, 40e3)
    rows = "\n".join(f"{k},{p:.3f}" for k, p in enumerate([*power, 0.0]))
    (folder / "p.csv").write_text(f"time_s,power_w\n{rows}\n", encoding="utf-8")
    switch = {
        "on_resistance": ON_R,
        "on_resistance_slope": SLOPE,
        "turn_on_energy": E_ON,
        "turn_off_energy": E_OFF,
        "test_current": I_T,
        "test_voltage": V_T,
        "diode_voltage": VF,
        "junction_to_plate": [list(cell) for cell in CELLS],
    }
    inductor = {
        "inductance": L,
        "winding_resistance": COPPER,
        "thermal_resistance": COIL[0],
        "thermal_time_constant": COIL[1],
    }
    return plan_from_mapping(
        {
            "title": "benchmark",
            "battery": {"open_circuit_voltage": E, "resistance": R},
            "link": {"voltage": LINK},
            "stage": {
                "topology": "half-bridge",
                "switching_frequency": F,
                "dead_time": DEAD,
                "switch": switch,
                "inductor": inductor,
            },
            "cooling": {"plate_resistance": PLATE_R, "plate_heat_capacity": PLATE_C},
            "mission": [{"profile": "p.csv", "coolant": COOLANT}],
        },
        folder=folder,
    )


def one_after_the_other(power: np.ndarray, seconds: float, out: np.ndarray) -> int:
    """March step by step in scalars; `out` receives the three end temperatures. Return the passes taken."""
    upper = np.zeros(3)
    lower = np.zeros(3)
    resistances = np.array([0.03, 0.08, 0.12])
    decays = np.exp(-seconds / np.array([0.002, 0.05, 0.4]))
    means = (1.0 - decays) / (seconds / np.array([0.002, 0.05, 0.4]))
    coil, coil_decay = 0.0, math.exp(-seconds / COIL[1])
    coil_mean = (1.0 - coil_decay) * COIL[1] / seconds
    plate, plate_decay = 0.0, math.exp(-seconds / (PLATE_R * PLATE_C))
    plate_mean = (1.0 - plate_decay) * PLATE_R * PLATE_C / seconds
    tu, tl, tc = COOLANT, COOLANT, COOLANT
    passes = 0
    for k in range(len(power)):
        loss, path = 0.0, 0.0
        while True:
            passes += 1
            p = power[k] + loss
            current = 2.0 * p / (E + math.sqrt(E * E - 4.0 * R * p))
            volts = E - R * current
            duty = (volts - current * path) / LINK
            ripple = LINK * duty * (1.0 - duty) / (L * F)
            low, high = current - 0.5 * ripple, current + 0.5 * ripple
            square = current * current + ripple * ripple / 12.0
            ru, rl = ON_R * (1.0 + SLOPE * (tu - 25.0)), ON_R * (1.0 + SLOPE * (tl - 25.0))
            rc = COPPER * (1.0 + 0.00393 * (tc - 20.0))
            # lower position: begins at `low`, ends at `high`; upper: begins at -high, ends at -low
            d_lower = (max(-low, 0.0) ** 2 + max(-high, 0.0) ** 2) * DEAD * F
            d_upper = (max(high, 0.0) ** 2 + max(low, 0.0) ** 2) * DEAD * F
            s_lower, s_upper = max((1.0 - duty) * square - d_lower, 0.0), max(duty * square - d_upper, 0.0)
            volt_share = (LINK / V_T) ** 1.3
            e_lower = F * volt_share * (E_ON * max(low, 0.0) + E_OFF * max(high, 0.0)) / I_T
            e_upper = F * volt_share * (E_ON * max(-high, 0.0) + E_OFF * max(-low, 0.0)) / I_T
            f_lower = VF * (max(-low, 0.0) + max(-high, 0.0)) * DEAD * F
            f_upper = VF * (max(high, 0.0) + max(low, 0.0)) * DEAD * F
            p_lower, p_upper, p_coil = rl * s_lower + e_lower + f_lower, ru * s_upper + e_upper + f_upper, rc * square
            whole = p_lower + p_upper + p_coil
            path = (rl * s_lower + ru * s_upper + p_coil) / square
            base = PLATE_R * whole + (plate - PLATE_R * whole) * plate_mean
            mu, ml = COOLANT + base, COOLANT + base
            for i in range(3):
                mu += resistances[i] * p_upper + (upper[i] - resistances[i] * p_upper) * means[i]
                ml += resistances[i] * p_lower + (lower[i] - resistances[i] * p_lower) * means[i]
            mc = COOLANT + base + COIL[0] * p_coil + (coil - COIL[0] * p_coil) * coil_mean
            moved = max(abs(mu - tu), abs(ml - tl), abs(mc - tc))
            settled = moved < TOLERANCE and abs(whole - loss) <= 1e-10 * abs(p) + 1e-7
            tu, tl, tc, loss = mu, ml, mc, whole
            if settled:
                break
        plate = PLATE_R * whole + (plate - PLATE_R * whole) * plate_decay
        out[k, 0] = out[k, 1] = COOLANT + plate
        for i in range(3):
            upper[i] = resistances[i] * p_upper + (upper[i] - resistances[i] * p_upper) * decays[i]
            lower[i] = resistances[i] * p_lower + (lower[i] - resistances[i] * p_lower) * decays[i]
            out[k, 0] += upper[i]
            out[k, 1] += lower[i]
        coil = COIL[0] * p_coil + (coil - COIL[0] * p_coil) * coil_decay
        out[k, 2] = COOLANT + plate + coil
    return passes


def clocked(work: Callable[[], object], repeats: int) -> float:
    """Return the least of several times [s]."""
    times = []
    for _ in range(repeats):
        begin = time.perf_counter()
        work()
        times.append(time.perf_counter() - begin)
    return min(times)


def main() -> None:
    """Run all three and print nanoseconds and ratios."""
    steps = int(sys.argv[1]) if len(sys.argv) > 1 else 16_384
    with tempfile.TemporaryDirectory() as folder:
        made = plan(Path(folder), steps)
        stage, battery = build_stage(made), battery_of(made)
        demand = demand_of(made, 0, profile_of(made, made.mission[0]), stage)
    few = demand.power[: min(steps, 1024)]

    def ours(candidates: int = 1) -> list[object]:
        return list(march(stage, battery, demand, start(stage, battery, demand, None, candidates)))

    blocks = ours()
    own = clocked(ours, 5) / steps
    four = clocked(lambda: ours(4), 3) / (4 * steps)
    out = np.zeros((len(few), 3))
    plain = clocked(lambda: one_after_the_other(few, 1.0, out), 1) / len(few)
    ends = np.concatenate([b.end[:, 0] for b in blocks], axis=1)  # type: ignore[attr-defined]
    names = [stage.seated.index(n) for n in ("upper_switch", "lower_switch", "inductor")]
    apart = float(np.max(np.abs(ends[names, : len(few)].T - out)))
    print(f"{steps} steps of 1 s, one leg, {len(stage.modes.time_constants) if stage.modes else 0} thermal modes")
    print(f"temperatures of the reference differ by at most {apart:.1e} K")
    print(f"tideleg, 1 candidate    {1e9 * own:10.0f} ns a step  ({[b.passes for b in blocks]} passes)")  # type: ignore[attr-defined]
    print(f"tideleg, 4 candidates   {1e9 * four:10.0f} ns a step and candidate")
    print(f"(a) plain Python loop   {1e9 * plain:10.0f} ns a step   {plain / own:8.1f} times ours")
    try:
        import numba
    except ImportError:
        print("(b) compiled loop: numba is not installed (extra `bench`)")
        return
    fused = numba.njit(one_after_the_other)
    whole = np.zeros((steps, 3))
    fused(demand.power, 1.0, whole)
    compiled = clocked(lambda: fused(demand.power, 1.0, whole), 5) / steps
    print(f"(b) compiled loop       {1e9 * compiled:10.0f} ns a step   {compiled / own:8.2f} times ours")


if __name__ == "__main__":
    main()
