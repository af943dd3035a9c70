"""Dew point against published values, and what a plan is told of it.

Dew points of air at 20, 30 and 10 degC: psychrometric tables as in ASHRAE Handbook - Fundamentals (from memory), to
0.1 K.
"""

import pytest

from tideleg import InputError, plan_from_mapping, run
from tideleg.dew import dew_point


@pytest.mark.parametrize(
    ("air", "humidity", "dew"), [(20, 0.5, 9.3), (30, 0.6, 21.4), (30, 0.9, 28.2), (10, 0.5, 0.1), (25, 1.0, 25.0)]
)
def test_dew_points_of_tables(air, humidity, dew):
    assert float(dew_point(air, humidity)) == pytest.approx(dew, abs=0.1)


def outcome(folder, **mission):
    (folder / "p.csv").write_text("time_s,power_w,coolant_degc\n0,20000,30\n60,20000,15\n90,20000,30\n120,0,30\n")
    return run(
        plan_from_mapping(
            {
                "title": "damp",
                "battery": {"open_circuit_voltage": "400 V"},
                "link": {"voltage": "800 V"},
                "stage": {
                    "topology": "half-bridge",
                    "switching_frequency": "20 kHz",
                    "inductor": {"inductance": "500 uH"},
                    "switch": {"on_resistance": "10 mohm", "junction_to_plate": [["0.2 K/W", "50 ms"]]},
                },
                "cooling": {"plate_resistance": "20 K/kW"},
                "mission": [{"profile": "p.csv", **mission}],
            },
            folder=folder,
        )
    )


def test_a_coolant_below_the_dew_point_is_told_with_its_share_of_time(tmp_path):
    warnings = outcome(tmp_path, ambient="30 degC", humidity="60 %").warnings
    (said,) = [w for w in warnings if "dew point" in w]
    assert "21.4 degC for 25 % of the time (coldest 15 degC)" in said


def test_dry_air_says_nothing_and_missing_air_is_asked_for(tmp_path):
    assert not [w for w in outcome(tmp_path, ambient="30 degC", humidity="20 %").warnings if "dew" in w]
    with pytest.raises(InputError, match="dew point needs ambient"):
        outcome(tmp_path, humidity="60 %")
    with pytest.raises(InputError, match="known from -45 to 60 degC"):
        outcome(tmp_path, ambient="80 degC", humidity="60 %")
