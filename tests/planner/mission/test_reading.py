"""A profile is taken as it stands, or refused with file, line and column."""

import numpy as np
import pytest

from tideleg import ProfileError
from tideleg.mission import Vehicle, read_profile

CAR = Vehicle(1500.0, f0_n=200.0, f1_n_per_m_s=0.0, f2_n_per_m_s2=0.4)


@pytest.fixture
def csv(tmp_path):
    def write(text, name="p.csv", encoding="utf-8"):
        path = tmp_path / name
        path.write_bytes(text.encode(encoding))
        return path

    return write


def test_a_row_holds_to_the_next_and_the_last_one_closes(csv):
    found = read_profile(csv("time_s,power_kw\n10,5\n12,-3\n12.5,99\n"))
    assert found.power_w.tolist() == [5000.0, -3000.0]
    assert found.duration_s.tolist() == [2.0, 0.5]
    assert found.time_s.tolist() == [0.0, 2.0]
    assert any("last row only closes" in rule for rule in found.rules)
    assert any("positive in the file is discharge" in rule for rule in found.rules)


def test_the_sign_can_be_turned_and_is_said(csv):
    found = read_profile(csv("time_s,power_w\n0,5\n1,0\n"), positive="charge", terminals="battery")
    assert found.power_w.tolist() == [-5.0]
    assert any("battery terminals; positive in the file is charge" in rule for rule in found.rules)


def test_linear_carries_the_mean_and_keeps_the_energy(csv):
    path = csv("time_s,power_w\n0,0\n4,8\n6,2\n")
    found = read_profile(path, interpolation="linear")
    assert found.power_w.tolist() == [4.0, 5.0]
    assert np.sum(found.power_w * found.duration_s) == np.trapezoid([0, 8, 2], [0, 4, 6])
    assert any("peaks inside are averaged" in rule for rule in found.rules)


def test_a_declared_duration_lets_one_row_stand_alone(csv):
    found = read_profile(csv("time_s,duration_s,power_w\n0,3600,5\n"))
    assert found.duration_s.tolist() == [3600.0]


def test_bom_crlf_quotes_and_blank_last_lines_are_accepted(csv):
    found = read_profile(csv('\ufeff"time_s","power_w"\r\n0,1\r\n1,2\r\n\r\n'))
    assert found.power_w.tolist() == [1.0]


def test_overrides_come_along_and_speed_becomes_power(csv):
    text = "time_s,power_w,link_voltage_v,coolant_degc,power_max_w\n0,1,700,60,5\n1,2,710,61,5\n"
    found = read_profile(csv(text))
    assert (found.link_voltage_v.tolist(), found.coolant_degc.tolist()) == ([700.0], [60.0])
    moving = read_profile(csv("time_s,speed_km_h\n0,0\n1,3.6\n2,3.6\n"), vehicle=CAR)
    assert moving.speed_m_s.tolist() == [0.5, 1.0]
    assert moving.power_w[1] == pytest.approx(200.4)
    assert any("road load" in rule for rule in moving.rules)


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("", "is empty"),
        ("   \n", "is empty"),
        ("time_s,power_w\n", "no rows"),
        ("time_s,power_w\n0,1\n", "one row"),
        ("time_s,power_w\n0,1\n1,2\n1,3\n", r"line 4, time_s: 1 s repeats"),
        ("time_s,power_w\n0,1\n5,2\n3,3\n", r"line 4, time_s: 3 s goes back from 5 s"),
        ("time_s,power_w\n0,1\n1,\n2,3\n", r"line 3, power_w: the value is missing"),
        ("time_s,power_w\n0,1\n\n1,nan\n2,3\n", r"line 4, power_w: found 'nan'"),
        ("time_s,power_w\n0,1\n1,inf\n2,3\n", r"line 3, power_w: found 'inf'"),
        ("time_s,power_w\n0,1\n1,N/A\n2,3\n", r"line 3, power_w: found 'N/A'"),
        ("time_s,powr_w\n0,1\n1,1\n", r"line 1: a column of power or speed is missing; found 'time_s', 'powr_w'"),
        ("time_s,power_w,coolan_degc\n0,1,4\n1,1,4\n", r"line 1: found the column 'coolan_degc'; allowed are"),
        ("t,power_w\n0,1\n1,1\n", "'t'"),
        ("power_w\n1\n1\n", "time_s is missing"),
        ("time_s,power_w,power_kw\n0,1,1\n1,1,1\n", "one column of power or speed"),
        ("time_s,time_s,power_w\n0,0,1\n1,1,1\n", "stands twice"),
        ("time_s,speed_km_h\n0,0\n1,1\n", "needs .vehicle."),
        ("time_s,duration_s,power_w\n0,2,1\n1,1,1\n", r"line 2, duration_s: found 2 s; the stamps say 1 s"),
        ("time_s,duration_s,power_w\n0,1,1\n1,0,1\n", r"line 3, duration_s: found 0 s"),
        ("time_s,power_w,link_voltage_v\n0,1,-5\n1,1,5\n", r"line 2, link_voltage_v: found -5 V"),
        ("time_s,power_w,power_min_w,power_max_w\n0,1,5,4\n1,1,0,1\n", "power_min_w is above power_max_w"),
        ("time_s,power_w\n0,1,7\n1,2\n", "do not fit the header"),
        ("time_s,power_w\n0,1\n1,2,7\n2,2\n", "do not fit the header"),
        ("time_s,power_w\n0,1\n1\n2,2\n", r"line 3, power_w: the value is missing"),
        ('time_s,power_w\n0,"1,5"\n1,2\n', r"line 2, power_w: found '1,5'"),
    ],
)
def test_what_cannot_be_trusted_is_refused_with_its_place(csv, text, said):
    with pytest.raises(ProfileError, match=said) as caught:
        read_profile(csv(text))
    assert "p.csv" in str(caught.value)


def test_missing_file_and_other_encodings(csv, tmp_path):
    with pytest.raises(ProfileError, match="does not exist"):
        read_profile(tmp_path / "none.csv")
    with pytest.raises(ProfileError, match="line 2: the file is not UTF-8"):
        read_profile(csv("time_s,power_w\n0,1°\n", encoding="latin-1"))


def test_half_a_million_rows_are_read_whole(csv):
    rows = "\n".join(f"{k},{k % 977}" for k in range(500_001))
    found = read_profile(csv("time_s,power_w\n" + rows + "\n"))
    assert len(found.power_w) == 500_000
    assert found.power_w.sum() == sum(k % 977 for k in range(500_000))
