"""Files as loggers, vehicle models and meters write them: rows FM-01 to FM-16, each with a hand-made file.

The rows list what was seen in stored logs of operators, cycle files and grid signals; what must happen with each is
common practice, no source. Every number here is invented.
"""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tideleg import InputError, ProfileError, plan_from_mapping, run
from tideleg.mission import Layout, Vehicle, read_profile

CAR = Vehicle(1500.0, f0_n=200.0, f1_n_per_m_s=0.0, f2_n_per_m_s2=0.4)


@pytest.fixture
def file(tmp_path):
    def write(text, encoding="utf-8"):
        path = tmp_path / "log.csv"
        path.write_bytes(text.encode(encoding))
        return path

    return write


def power(path, **declared):
    found = read_profile(path, layout=Layout(**declared))
    return found.power_w.tolist(), found.duration_s.tolist(), " | ".join(found.rules)


@pytest.mark.parametrize("separator", [",", ";", "\t"])
def test_fm_01_separators(file, separator):
    text = "time_s,power_w\n0,5\n2,7\n3,0\n".replace(",", separator)
    assert power(file(text))[:2] == ([5.0, 7.0], [2.0, 1.0])


def test_fm_01_a_decimal_comma_is_never_read_as_thousands(file):
    watts, seconds, rules = power(file("time_s;power_kw\n0;12,5\n0,5;-3,25\n1;0\n"))
    assert (watts, seconds) == ([12500.0, -3250.0], [0.5, 0.5])
    assert "decimal comma" in rules


def test_fm_02_mark_line_ends_quotes_and_blank_lines(file):
    assert power(file('\ufeff"time_s";"power_w"\r\n0;1\r\n1;2\r\n\r\n\r\n'))[0] == [1.0]


def test_fm_03_other_text_is_named_with_the_key_that_mends_it(file):
    path = file("Zeit °;x\ntime_s,power_w\n0,1\n1,2\n", "latin-1")
    with pytest.raises(ProfileError, match=r"line 1: the file is not UTF-8.*encoding = 'latin-1'"):
        power(path)
    assert power(path, encoding="latin-1")[0] == [1.0]
    with pytest.raises(ProfileError, match="encoding 'klingon'"):
        power(path, encoding="klingon")


def test_fm_04_titles_units_and_trailers(file):
    text = (
        "Depot log, no warranty\n\nTime [s];Power [kW];\n0;1,5;\n10;2,5;\n20;0,0;\n\n"
        "This log is for information only.;;\nEnd\n"
    )
    watts, _, rules = power(file(text))
    assert watts == [1500.0, 2500.0]
    assert "header stands in line 3" in rules
    units_below = "time;power\ns;kW\n0;1\n5;2\n6;0\n"
    assert power(file(units_below))[:2] == ([1000.0, 2000.0], [5.0, 1.0])
    with pytest.raises(ProfileError, match=r"line 4, power_w: found 'pause'"):
        power(file("time_s,power_w\n0,1\n1,2\n2,pause\n3,1\n4,0\n"))


@pytest.mark.parametrize(
    ("head", "watts"),
    [("power_w", 2.0), ("Power (kW)", 2e3), ("power_mw", 2e6), ("Power, W", 2.0), ("Power in MW", 2e6)],
)
def test_fm_05_units_of_power(file, head, watts):
    text = f"time_s;{head}\n0;2\n1;0\n"
    assert power(file(text))[0] == [watts]


def test_fm_05_a_missing_unit_is_asked_for(file):
    path = file("time_s,power\n0,2\n1,0\n")
    with pytest.raises(ProfileError, match=r"line 1: the unit of 'power' is not known: none is given.*unit = 'kW'"):
        power(path)
    assert power(path, unit="kW")[0] == [2000.0]
    with pytest.raises(ProfileError, match="read as power and has the unit 'mph', which is one of speed"):
        power(path, unit="mph")


@pytest.mark.parametrize(("head", "size"), [("speed_m_s", 1.0), ("Speed (km/h)", 1 / 3.6), ("speed_mph", 0.44704)])
def test_fm_06_units_of_speed(file, head, size):
    found = read_profile(file(f"time_s;{head}\n0;10\n1;10\n"), vehicle=CAR)
    assert found.speed_m_s[0] == pytest.approx(10 * size)


def test_fm_07_the_sign_is_said_and_can_be_turned(file):
    path = file("time_s,power_w\n0,5\n1,0\n")
    turned = read_profile(path, positive="charge")
    assert turned.power_w.tolist() == [-5.0]
    assert "positive in the file is discharge" in power(path)[2]


@pytest.mark.parametrize(
    ("stamps", "seconds"),
    [
        (("0", "0.5", "2"), [0.5, 1.5]),
        (("23:59:50", "23:59:58.5", "00:00:10"), [8.5, 11.5]),
        (("7:05", "7:06", "7:08"), [60.0, 120.0]),
        (("2026-03-29T01:30:00+01:00", "2026-03-29T03:30:00+02:00", "2026-03-29T03:31:00+02:00"), [3600.0, 60.0]),
        (("2026-10-25 00:30:00Z", "2026-10-25 01:30:00Z", "2026-10-25 02:00:00Z"), [3600.0, 1800.0]),
        (("25/10/2026 10:00", "25/10/2026 10:01", "26/10/2026 10:01"), [60.0, 86400.0]),
        (("25.10.2026 10:00:00", "25.10.2026 10:00:30", "25.10.2026 10:00:31,5"), [30.0, 1.5]),
        (("10/25/2026 23:59", "10/26/2026 00:01", "10/26/2026 00:02"), [120.0, 60.0]),
    ],
)
def test_fm_08_time_stamps(file, stamps, seconds):
    text = "time;power_kw\n" + "".join(f"{stamp};1\n" for stamp in stamps)
    found = read_profile(file(text))
    assert found.duration_s.tolist() == pytest.approx(seconds)


def test_fm_08_dates_that_may_be_either_are_asked_for(file):
    path = file("time;power_kw\n03/04/2026 10:00;1\n03/04/2026 10:01;2\n04/04/2026 10:01;0\n")
    with pytest.raises(ProfileError, match="declare layout = { stamps = 'day first' } or 'month first'"):
        power(path)
    assert power(path, stamps="day first")[1] == [60.0, 86400.0]
    assert power(path, stamps="month first")[1][1] == pytest.approx(31 * 86400.0 - 0.0, rel=0.2)


def test_fm_08_a_clock_change_without_offsets_is_refused_with_its_reason(file):
    rows = "2026-10-25T02:59:00;1\n2026-10-25T02:00:00;1\n2026-10-25T02:01:00;1\n"
    with pytest.raises(ProfileError, match=r"line 3, time: .*at a change of the clock, give the stamps their offset"):
        power(file("time;power_kw\n" + rows))
    with pytest.raises(ProfileError, match="some stamps carry an offset"):
        power(file("time;power_kw\n2026-10-25T02:59:00Z;1\n2026-10-25T03:00:00;1\n2026-10-25T03:01:00Z;1\n"))


def test_fm_09_unequal_steps_keep_their_energy(file):
    watts, seconds, _ = power(file("time_s,power_w\n0,100\n0.05,200\n900.05,300\n901.05,0\n"))
    assert np.dot(watts, seconds) == pytest.approx(100 * 0.05 + 200 * 900 + 300)


def test_fm_10_a_hole_is_refused_unless_a_rule_is_declared(file):
    path = file("time_s,power_w\n0,100\n1,200\n500,300\n501,0\n")
    with pytest.raises(ProfileError, match=r"line 3: nothing is logged for 499 s, more than longest_gap = 60 s"):
        power(path, longest_gap_s=60.0)
    watts, seconds, rules = power(path, longest_gap_s=60.0, gap="hold")
    assert (watts, seconds) == ([100.0, 200.0, 300.0], [1.0, 499.0, 1.0])
    assert "1 holes longer than 60 s" in rules
    watts, seconds, rules = power(path, longest_gap_s=60.0, gap="zero")
    assert (watts, seconds) == ([100.0, 200.0, 0.0, 300.0], [1.0, 60.0, 439.0, 1.0])
    assert "then no power flows" in rules


@pytest.mark.parametrize("second", ["1", "0.5", "1.0"])
def test_fm_11_time_that_does_not_rise_is_refused_with_its_line(file, second):
    with pytest.raises(ProfileError, match=r"line 4, time_s: "):
        power(file(f"time_s,power_w\n0,1\n1,2\n{second},3\n2,0\n"))


@pytest.mark.parametrize("cell", ["", "N/A", "nan", "inf", "-", "1e999", "0x10", "1_000", "True"])
def test_fm_12_a_cell_without_a_number_is_refused_or_dropped_by_rule(file, cell):
    path = file(f"time_s,power_w\n0,1\n1,{cell}\n3,2\n4,0\n")
    with pytest.raises(ProfileError, match=r"line 3, power_w: "):
        power(path)
    watts, seconds, rules = power(path, missing="drop")
    assert (watts, seconds) == ([1.0, 2.0], [3.0, 1.0])
    assert "1 rows with a missing or non-finite cell are left out, the first in line 3" in rules


def test_fm_13_thousands(file):
    assert power(file('time_s,power_w\n0,"1,234.5"\n1,"12,000.0"\n2,0\n'))[0] == [1234.5, 12000.0]
    assert power(file("time_s;power_w\n0;1.234,5\n1;12.000,0\n2;0,0\n"))[0] == [1234.5, 12000.0]
    path = file("time_s;power_w\n0;1,234\n1;12,000\n2;0\n")
    with pytest.raises(
        ProfileError, match=r"line 2: found '1,234': the comma may be a decimal comma or part thousands"
    ):
        power(path)
    assert power(path, decimal=",")[0] == [1.234, 12.0]
    assert power(path, decimal=".")[0] == [1234.0, 12000.0]


@pytest.mark.parametrize("text", ["", "\n\n", "time_s,power_w\n", "time_s,power_w\n0,1\n", "only a title\n"])
def test_fm_14_nothing_to_run_is_refused(file, text):
    with pytest.raises(ProfileError):
        power(file(text))


@pytest.mark.parametrize("chunk", [1, 7, 1000])
def test_fm_15_the_result_does_not_depend_on_the_pieces(file, chunk):
    rng = np.random.default_rng(4)
    rows = "".join(f"{k};{p:.3f}\n".replace(".", ",") for k, p in enumerate(rng.uniform(-9e3, 9e3, 500)))
    path = file("title\ntime_s;power_w\n" + rows + "end of log\n")
    whole, pieces = read_profile(path), read_profile(path, chunk_rows=chunk)
    np.testing.assert_array_equal(whole.power_w, pieces.power_w)
    np.testing.assert_array_equal(whole.duration_s, pieces.duration_s)
    assert whole.rules == pieces.rules


def test_fm_16_steps_longer_than_a_thermal_time_constant_are_told(tmp_path):
    (tmp_path / "p.csv").write_text("time_s,power_w\n0,20000\n60,0\n")
    plan = {
        "title": "slow log",
        "battery": {"open_circuit_voltage": "400 V"},
        "link": {"voltage": "800 V"},
        "stage": {
            "topology": "half-bridge",
            "switching_frequency": "20 kHz",
            "inductor": {"inductance": "500 uH"},
            "switch": {"on_resistance": "10 mohm", "junction_to_plate": [["0.2 K/W", "50 ms"]]},
        },
        "cooling": {"plate_resistance": "20 K/kW"},
        "mission": [{"profile": "p.csv", "coolant": "40 degC"}],
    }
    assert any("peaks inside a step are not seen" in w for w in run(plan_from_mapping(plan, folder=tmp_path)).warnings)


def test_columns_are_named_where_they_are_not_certain(file):
    path = file("Zeit;P Netz (kW);P Batterie (kW);Text\n0;1;2;a\n1;1;3;b\n2;0;0;c\n")
    with pytest.raises(ProfileError, match=r"line 1: the column time_s is missing; found 'Zeit'"):
        power(path)
    watts, _, rules = power(path, columns={"time": "Zeit", "power": "P Batterie (kW)"})
    assert watts == [2000.0, 3000.0]
    assert "2 other columns are left unread" in rules
    assert "'P Batterie (kW)' is read as power in kw" in rules
    with pytest.raises(ProfileError, match="declared column power = 'P' is missing"):
        power(path, columns={"time": "Zeit", "power": "P"})


def test_a_plan_declares_the_layout_of_its_file(tmp_path):
    (tmp_path / "log.csv").write_bytes("Logger °C\nZeit;P;T Bat\n0;20;25,5\n60;-10;26\n120;0;26\n".encode("latin-1"))
    plan = {
        "title": "a log",
        "battery": {
            "open_circuit_voltage": [[0.5, "390 V", 0], [0.5, "400 V", 50]],
            "capacity": "50 Ah",
            "start_soc": 0.5,
        },
        "link": {"voltage": "800 V"},
        "stage": {"topology": "half-bridge", "switching_frequency": "20 kHz", "inductor": {"inductance": "500 uH"}},
        "mission": [
            {
                "profile": "log.csv",
                "layout": {
                    "time": "Zeit",
                    "power": "P",
                    "battery_temperature": "T Bat",
                    "unit": "kW",
                    "encoding": "latin-1",
                    "longest_gap": "2 min",
                },
            }
        ],
    }
    outcome = run(plan_from_mapping(plan, folder=tmp_path))
    assert outcome.steps["power_requested_w"].tolist() == [20000.0, -10000.0]
    assert outcome.steps["battery_voltage_v"].tolist() == pytest.approx([395.1, 395.2])
    plan["mission"][0]["layout"]["gap"] = "zero"
    del plan["mission"][0]["layout"]["longest_gap"]
    with pytest.raises(InputError, match="longest_gap is missing"):
        plan_from_mapping(plan, folder=tmp_path)


def test_parquet_needs_its_reader_and_says_so(tmp_path):
    path = tmp_path / "log.parquet"
    path.write_bytes(b"PAR1")
    try:
        import pyarrow  # noqa: F401
    except ImportError:
        with pytest.raises(ProfileError, match="needs the package pyarrow"):
            read_profile(path)
        return
    import pandas as pd

    pd.DataFrame({"time_s": [0.0, 2.0, 3.0], "power_kw": [1.0, -2.0, 0.0]}).to_parquet(path)
    found = read_profile(path)
    assert (found.power_w.tolist(), found.duration_s.tolist()) == ([1000.0, -2000.0], [2.0, 1.0])


# --- nasty files -----------------------------------------------------------------------------------------------------

CELLS = st.one_of(
    st.floats(-1e5, 1e5).map(lambda x: f"{x:.3f}"),
    st.sampled_from(["", "N/A", "nan", "inf", "1,5", "1.234,5", '"7', "7;8", "x", "--3", "0", " 4 ", "\u00a05"]),
)
ROW = st.tuples(st.floats(0.0, 900.0).map(lambda x: f"{x:.2f}"), CELLS)


@settings(max_examples=200, deadline=None)
@given(
    rows=st.lists(ROW, max_size=30),
    separator=st.sampled_from([",", ";", "\t", "|"]),
    header=st.sampled_from(["time_s{0}power_w", "Time [s]{0}Power [kW]", "time{0}power", "t{0}p", "{0}", "time_s"]),
    before=st.sampled_from(["", "title\n", "a,b;c\td\n\n", "\ufeff"]),
    after=st.sampled_from(["", "\n\n", "end\n", "1\n", "# done,\n"]),
    end=st.sampled_from(["\n", "\r\n"]),
    encoding=st.sampled_from(["utf-8", "latin-1", "utf-16"]),
    nasty=st.booleans(),
)
def test_every_nasty_file_is_read_right_or_refused_with_its_place(
    tmp_path_factory, rows, separator, header, before, after, end, encoding, nasty
):
    rows = rows if nasty else [(t, p) for t, p in rows if p.replace(".", "").lstrip("-").isdigit()]
    stamps = np.cumsum([float(t) for t, _ in rows]) if rows else []
    body = "".join(f"{s:.2f}{separator}{p}{end}" for s, (_, p) in zip(stamps, rows, strict=True))
    text = before + header.format(separator) + end + body + after
    path = tmp_path_factory.mktemp("nasty") / "n.csv"
    path.write_bytes(text.encode(encoding, errors="replace"))
    found, refused = None, ""
    try:
        found = read_profile(path)
    except InputError as error:  # nothing else may escape
        refused = str(error)
    assert (found is None) == ("n.csv" in refused)
    if found is None:
        return
    assert np.all(np.isfinite(found.power_w))
    assert np.all(found.duration_s > 0.0)
    size = 1e3 if "kW" in header else 1.0
    written = [float(p.strip().strip("\u00a0").replace(",", ".")) for _, p in rows if _is_plain(p)]
    if len(written) == len(rows):  # every cell is one that a person would read the same way
        due = sum(p * d for p, d in zip(written[:-1], np.diff(np.round(stamps, 2)), strict=True)) * size
        assert np.dot(found.power_w, found.duration_s) == pytest.approx(due, rel=1e-6, abs=1e-6)


def _is_plain(cell):
    try:
        return bool(np.isfinite(float(cell.strip())))
    except ValueError:
        return False
