"""Write kerbside.csv: an invented working hour of a municipal truck that stops at every kerb.

Seeded and simple: a speed trace of launches, short runs and stops, a fixed road load of an 18 t truck, a compactor that
works while the truck stands, and auxiliaries. Steps are 0.1 s while the truck moves off or brakes, 1 s otherwise.
All numbers are invented for this demonstration.
"""

from pathlib import Path

import numpy as np

SEED = 20240518
MASS_KG, ROTATING = 18_000.0, 1.06
ROLL_N, DRAG = 18_000.0 * 9.81 * 0.009, 0.5 * 1.2 * 5.6
EFFICIENCY = 0.89
AUXILIARIES_W, COMPACTOR_W = 6_500.0, 21_000.0
LARGEST_W, LARGEST_BRAKING_W = 164_000.0, 116_000.0


def speed_between_stops(rng: np.random.Generator) -> np.ndarray:
    """Return one hop at 0.1 s: pull away, a short run, brake to rest [m/s]."""
    top = rng.choice([rng.uniform(2.5, 6.5), rng.uniform(7.0, 11.5)], p=[0.75, 0.25])
    pull, brake = rng.uniform(0.75, 1.15), rng.uniform(0.8, 1.25)
    run = rng.uniform(2.0, 9.0) if top < 7.0 else rng.uniform(12.0, 34.0)
    up = np.arange(0.0, top, pull * 0.1)
    level = top + 0.12 * np.cumsum(rng.normal(0.0, 0.06, int(run / 0.1)))
    down = np.arange(level[-1] if len(level) else top, 0.0, -brake * 0.1)
    return np.maximum(np.concatenate([up, level, down, [0.0]]), 0.0)


def power_at_link(speed: np.ndarray) -> np.ndarray:
    """Return the link power of the drive at 0.1 s from the mean speed of each interval [W]."""
    mean, rate = 0.5 * (speed[1:] + speed[:-1]), np.diff(speed) / 0.1
    force = np.where(mean > 0.0, ROLL_N + DRAG * mean**2, 0.0) + MASS_KG * ROTATING * rate
    wheel = force * mean
    drive = np.where(wheel > 0.0, wheel / EFFICIENCY, wheel * EFFICIENCY)
    return np.clip(drive + AUXILIARIES_W, -LARGEST_BRAKING_W, LARGEST_W)


def hop(rng: np.random.Generator) -> list[tuple[float, float]]:
    """Return one hop and the stop after it as (step [s], power [W])."""
    speed = speed_between_stops(rng)
    power = power_at_link(speed)
    rows: list[tuple[float, float]] = []
    i = 0
    while i < len(power):
        piece = power[i : i + 10]
        if len(piece) == 10 and np.ptp(piece) < 6_000.0:
            rows.append((1.0, float(piece.mean())))
            i += 10
        else:
            rows.append((0.1, float(power[i])))
            i += 1
    stand = int(rng.integers(4, 14))
    compacts = rng.random() < 0.4
    for second in range(stand):
        working = compacts and 1 <= second < stand - 1
        rows.append((1.0, AUXILIARIES_W + (COMPACTOR_W if working else 0.0)))
    return rows


def main() -> None:
    """Write the file beside this script."""
    rng = np.random.default_rng(SEED)
    rows: list[tuple[float, float]] = []
    while sum(step for step, _ in rows) < 2400.0:
        rows += hop(rng)
    time = np.concatenate([[0.0], np.cumsum([step for step, _ in rows])])
    lines = [f"{t:.1f},{p:.0f}" for t, (_, p) in zip(time, rows, strict=False)]
    lines.append(f"{time[-1]:.1f},0")
    text = "time_s,power_w\n" + "\n".join(lines) + "\n"
    Path(__file__).with_name("kerbside.csv").write_text(text, encoding="utf-8", newline="\n")


if __name__ == "__main__":
    main()
