"""Write orchard.csv: an invented day of a battery beside a cold store.

At night the battery charges slowly, at noon it takes what the roof gives, in the evening it carries the store; each
start of a compressor and a few grid events come as bursts at 1 s steps, quiet hours run at up to 60 s. Seeded; all
numbers are invented for this demonstration. Positive power discharges the battery.
"""

from pathlib import Path

import numpy as np

SEED = 20240907
DAY_S = 86_400


def quiet_power(second: float, rng: np.random.Generator) -> float:
    """Return the slow part of the duty at a time of day [W]."""
    hour = second / 3600.0
    night = -70_000.0 if 0.5 <= hour < 5.0 else 0.0
    sun = -150_000.0 * max(0.0, np.sin(np.pi * (hour - 7.5) / 9.0)) if 7.5 < hour < 16.5 else 0.0
    evening = 175_000.0 if 17.5 <= hour < 21.0 else 0.0
    store = 22_000.0 if 5.0 <= hour < 23.0 else 9_000.0
    return night + sun + evening + store + float(rng.normal(0.0, 3_000.0))


def burst(second: float, rng: np.random.Generator) -> list[tuple[float, float]]:
    """Return a compressor start or a grid event as (step [s], extra power [W])."""
    if rng.random() < 0.75:
        length, height = int(rng.integers(20, 60)), rng.uniform(45_000.0, 75_000.0)
        return [(1.0, height * (0.35 + 0.65 * np.exp(-k / 6.0))) for k in range(length)]
    length, height = int(rng.integers(60, 240)), rng.choice([-1.0, 1.0]) * rng.uniform(40_000.0, 70_000.0)
    wobble = np.cumsum(rng.normal(0.0, 2_500.0, length))
    return [(1.0, height + w) for w in wobble]


def main() -> None:
    """Write the file beside this script."""
    rng = np.random.default_rng(SEED)
    time, rows = 0.0, []
    next_burst = 600.0
    while time < DAY_S:
        base = quiet_power(time, rng)
        if time >= next_burst:
            for step, extra in burst(time, rng):
                if time + step > DAY_S:
                    break
                rows.append((time, np.clip(base + extra, -250_000.0, 250_000.0)))
                time += step
            next_burst = time + rng.exponential(900.0) + 300.0
            continue
        step = min(60.0 if 5.0 < (time / 3600.0) % 24 < 23.0 or rng.random() < 0.8 else 20.0, DAY_S - time)
        step = min(step, max(next_burst - time, 1.0)) if next_burst > time else step
        step = max(1.0, float(np.floor(step)))
        rows.append((time, base))
        time += step
    lines = [f"{t:.0f},{p:.0f}" for t, p in rows] + [f"{time:.0f},0"]
    text = "time_s,power_w\n" + "\n".join(lines) + "\n"
    Path(__file__).with_name("orchard.csv").write_text(text, encoding="utf-8", newline="\n")


if __name__ == "__main__":
    main()
