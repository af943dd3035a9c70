"""Storage duty of published services, rows ST.

Rows ST-08 to ST-11 are sums over records that this project does not ship and are left out. ST-12 only says that a
protocol exists; ST-14 describes a signal that is not shipped.
"""

import numpy as np
import pytest

from tideleg_profiles.frequency_response import FrequencyResponseSettings, request
from tideleg_profiles.peak_shaving import PeakShavingSettings, shave
from tideleg_profiles.series import Series

# ST-01: regelleistung.net, pages on FCR and technical aspects (found). ST-02: Regulation (EU) 2017/1485, Annex V
# (from memory): full power at 200 mHz.
CONTAINMENT = FrequencyResponseSettings(frequency="-", rated_power=1e6, dead_band="10 mHz", full_deviation="200 mHz")
# ST-04: National Grid ESO service page; neso.energy requirements table (found).
DYNAMIC = FrequencyResponseSettings(frequency="-", rated_power=1e6, curve=[(0.015, 0.0), (0.2, 0.05), (0.5, 1.0)])


def asked(keys, *frequency):
    return request(np.array(frequency) - 50.0, keys)


def test_st_01_dead_band():
    assert asked(CONTAINMENT, 49.99, 50.0, 50.01).tolist() == [0.0, 0.0, 0.0]
    assert np.all(asked(CONTAINMENT, 49.989, 50.011) != 0.0)


def test_st_02_full_power():
    assert asked(CONTAINMENT, 49.8, 50.2, 49.0, 51.0) == pytest.approx([1.0, -1.0, 1.0, -1.0], abs=1e-9)
    assert abs(asked(CONTAINMENT, 49.801)[0]) < 1.0


def test_st_02_as_a_droop_of_0_4_percent():  # definition: 0.2 Hz of 50 Hz
    droop = FrequencyResponseSettings(frequency="-", rated_power=1e6, dead_band="10 mHz", droop="0.4 %")
    sweep = np.linspace(49.5, 50.5, 1001)
    assert asked(droop, *sweep) == pytest.approx(asked(CONTAINMENT, *sweep), abs=1e-12)


def test_st_03_outside_the_dead_band_the_line_runs_through_nominal():  # computed from ST-01, ST-02
    assert asked(CONTAINMENT, 49.95, 50.02) == pytest.approx([0.25, -0.10], abs=1e-9)


def test_st_04_dynamic_containment():
    wanted = [0.0, 0.05, -0.05, 1.0, -1.0]
    assert asked(DYNAMIC, 49.985, 49.8, 50.2, 49.5, 50.5) == pytest.approx(wanted, abs=1e-9)
    assert asked(DYNAMIC, 50.015)[0] == 0.0


def test_st_05_dynamic_containment_between():  # computed: straight lines
    assert asked(DYNAMIC, 49.9, 49.65) == pytest.approx([0.022973, 0.525], abs=1e-6)


# ST-13: duty cycle protocol PNNL-22010 Rev. 2 / SAND2016-3078 R, 2016 (from memory): charge 12 h, float, discharge
# 6, 4 or 2 h, float 3, 4 or 5 h on each side.
@pytest.mark.parametrize(("discharge", "rest"), [(6, 3), (4, 4), (2, 5)])
def test_st_13_peak_shaving_cycle(discharge, rest):
    hours = [12, rest, discharge, rest]
    duration = 3600.0 * np.ones(24)
    load = np.repeat([0.0, 50e3, 50e3 + 120e3 / discharge, 50e3], hours)
    keys = PeakShavingSettings(
        load="-", threshold=50e3, storage_energy="120 kWh", start_share=0.0, discharge_limit=1e6, charge_limit=10e3
    )
    power, energy = shave(Series(np.cumsum(duration) - duration, duration, load), keys)
    assert sum(hours) == 24
    assert [int(np.sum(power < 0)), int(np.sum(power > 0)), int(np.sum(power == 0))] == [12, discharge, 2 * rest]
    assert energy[11] == pytest.approx(120 * 3.6e6)
    assert energy[-1] == pytest.approx(0.0, abs=1e-3)


def test_trap_a_request_is_not_energy_neutral():
    low = asked(CONTAINMENT, *np.full(10, 49.95))
    assert low.sum() > 2.0
