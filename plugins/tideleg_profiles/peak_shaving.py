"""Peak shaving: the storage gives what the load takes above a threshold, and is filled below another.

P = min(load - threshold, discharge limit) above the threshold; P = -min(recharge threshold - load, charge limit)
below the recharge threshold; between them nothing. The stored energy is a running sum between empty and full:
dE = -P dt/eta in discharge, -P eta dt in charge. In the step in which it meets a wall the power is the mean that the
wall leaves.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Annotated, NamedTuple, Self

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, model_validator

from tideleg import FloatArray, MadeProfile, hookimpl, quantity
from tideleg_profiles.series import HOLDING, Series, columns_of, read_series
from tideleg_profiles.walls import Step, run_between_walls


class PeakShavingSettings(BaseModel):
    """Keys of [mission.source_settings].

    load : CSV with time_s and load_w, load_kw or load_mw
    threshold : what the supply gives at most
    recharge_threshold : up to where the supply also fills the storage; the threshold if left out
    storage_energy, start_share : usable energy, and the share of it that is there at the start
    one_way_efficiency : between the terminals and the stored energy, each way
    """

    model_config = ConfigDict(extra="forbid", frozen=True)

    load: str
    threshold: quantity.Power
    recharge_threshold: quantity.Power | None = None
    storage_energy: Annotated[quantity.Energy, Field(gt=0.0)]
    start_share: Annotated[quantity.Share, Field(ge=0.0, le=1.0)] = 1.0
    discharge_limit: Annotated[quantity.Power, Field(gt=0.0)]
    charge_limit: Annotated[quantity.Power, Field(ge=0.0)]
    one_way_efficiency: Annotated[quantity.Share, Field(gt=0.0, le=1.0)] = 1.0

    @model_validator(mode="after")
    def _fills_below(self) -> Self:
        if self.recharge_threshold is not None and self.recharge_threshold > self.threshold:
            raise ValueError(
                f"recharge_threshold: found {self.recharge_threshold:g} W, above threshold {self.threshold:g} W"
            )
        return self


class Shaved(NamedTuple):
    """Power of the storage [W], positive in discharge, and the stored energy after each step [J]; arrays (S,)."""

    power: FloatArray
    energy: FloatArray


def shave(load: Series, keys: PeakShavingSettings) -> Shaved:
    """Return what the storage gives at each step."""
    fill_to = keys.threshold if keys.recharge_threshold is None else keys.recharge_threshold
    give = np.clip(load.value - keys.threshold, 0.0, keys.discharge_limit)
    take = np.clip(fill_to - load.value, 0.0, keys.charge_limit)
    efficiency = keys.one_way_efficiency
    added = (take * efficiency - give / efficiency) * load.duration
    same = np.ones_like(added)
    start = keys.start_share * keys.storage_energy
    energy = run_between_walls(start, Step(same, added, 0.0 * same, keys.storage_energy * same))
    change = np.diff(energy, prepend=start)
    # A step that meets no wall keeps its own power to the last digit.
    whole = np.abs(change - added) <= 1e-12 * keys.storage_energy
    left = np.where(change < 0.0, -change * efficiency, -change / efficiency) / load.duration
    return Shaved(np.where(whole, give - take, left), energy)


@dataclass(frozen=True)
class PeakShaving:
    """The source."""

    name: str = "peak-shaving"
    source: str = "load above a threshold from the storage; stored energy is the running sum between its bounds"
    settings: type[BaseModel] = PeakShavingSettings
    file_keys: tuple[str, ...] = ("load",)

    def example(self, folder: Path) -> Mapping[str, object]:
        """Write the files of a small example and return its keys."""
        (folder / "load.csv").write_text("time_s,load_kw\n0,50\n60,90\n120,55\n300,0\n", encoding="utf-8")
        limits = {"discharge_limit": "50 kW", "charge_limit": "20 kW"}
        return {"load": "load.csv", "threshold": "60 kW", "storage_energy": "2 kWh", **limits}

    def make(self, settings: PeakShavingSettings, folder: Path) -> MadeProfile:
        """Return the storage's power over the load series."""
        path = folder / settings.load
        load = read_series(path, columns_of("load"))
        power, energy = shave(load, settings)
        return MadeProfile(load.time, load.duration, power, _rules(load, power, energy, settings), (path,))


def _rules(load: Series, power: FloatArray, energy: FloatArray, keys: PeakShavingSettings) -> tuple[str, ...]:
    supply = load.value - power
    over = supply > keys.threshold * (1.0 + 1e-9) + 1e-9
    kept = "the supply stays at or below the threshold in every step"
    if np.any(over):
        at = int(np.argmax(supply))
        kept = (
            f"the supply passes the threshold in {int(over.sum())} of {len(over)} steps, most at {load.time[at]:g} s by"
            f" {supply[at] - keys.threshold:.6g} W: the storage is empty or at its power limit"
        )
    first = keys.start_share * keys.storage_energy
    return (
        HOLDING,
        "power is load less threshold within the limits of the storage; where the storage runs empty or full inside a"
        " step, the step carries the mean of what is left",
        kept,
        f"stored energy starts at {first / 3.6e6:.6g} kWh, ends at {energy[-1] / 3.6e6:.6g} kWh, least"
        f" {min(first, float(energy.min())) / 3.6e6:.6g} kWh",
    )


@hookimpl
def profile_source() -> PeakShaving:
    """Offer peak shaving."""
    return PeakShaving()
