"""Thermal networks against textbook, course and closed-form values, through the solver itself.

Status of each row: "found" - value and inputs seen in the source; "found inputs" - inputs seen, value computed from the
exact formula; "closed form" - exact mathematics; "from memory" - a known value whose source was not at hand.
"""

from itertools import pairwise

import numpy as np
import pytest

from tideleg import Mass, Network, Path, Seat
from tideleg.heat import Propagator, cauer_to_foster, foster_to_cauer, modes

ILLUSTRATIVE = ((0.008, 0.001), (0.025, 0.02), (0.035, 0.2), (0.012, 1.0))


def chain(cells, base="coolant"):
    """One part on a Foster chain straight on a boundary."""
    return modes(Network(("coolant",), (), (), (Seat("die", base, tuple(cells)),)))


def temperatures(solved, power, seconds, boundary=0.0):
    """March powers [W] of one part, held for seconds [s], from rest at the boundary; end temperatures [degC]."""
    power = np.asarray(power, dtype=float)
    outside = np.full((1, len(power)), boundary)
    state = np.zeros((len(solved.time_constants), 1)) + solved.soaked(outside[:, 0])[:, None]
    response = Propagator(solved, np.asarray(seconds, dtype=float)).respond(state, power[None, None, :], outside)
    return response.end[0, 0]


def step_response(solved, time):
    return temperatures(solved, [1.0], [time])[0]


@pytest.mark.parametrize(
    ("row", "source", "resistances", "power", "ambient", "junction", "tolerance"),
    [
        # TH-01 found: Rashid, Power Electronics, 4th ed., Ex. 4.4 (companion): P_max 125 W at 150 degC from 25 degC.
        ("TH-01", "found", (0.4, 0.1, 0.5), 125.0, 25.0, 150.0, 1e-6),
        # TH-03 found: electronics lab heat-sink hand-out: case 76 degC (75.7), junction 88 degC (87.887); print rounding.
        ("TH-03", "found", (3.125, 13.0), 3.9, 25.0, 88.0, 4e-3),
        # TH-04 found: hobby course on heat sinks: Rth_ca 1.4 K/W holds 200 degC at 60 W; print rounding of 1 K.
        ("TH-04", "found", (1.5, 1.4), 60.0, 25.0, 200.0, 0.006),
        # ... and without the rounding 17/12 K/W, which is exact.
        ("TH-04", "closed form", (1.5, 17.0 / 12.0), 60.0, 25.0, 200.0, 1e-9),
    ],
)
def test_series_chain_at_rest(row, source, resistances, power, ambient, junction, tolerance):
    masses = tuple(Mass(f"m{i}", 1.0 + i) for i in range(len(resistances)))
    names = [*(m.name for m in masses), "coolant"]
    paths = tuple(Path(a, b, r) for a, b, r in zip(names, names[1:], resistances, strict=False))
    solved = modes(Network(("coolant",), masses, paths, (Seat("die", "m0"),)))
    at_rest = solved.steady(np.array([[power]]), np.array([[ambient]]))[0, 0]
    assert at_rest == pytest.approx(junction, rel=tolerance), (row, source)


def test_th_01_case_temperature():
    masses = (Mass("junction", 1.0), Mass("case", 1.0), Mass("sink", 1.0))
    paths = (Path("junction", "case", 0.4), Path("case", "sink", 0.1), Path("sink", "coolant", 0.5))
    solved = modes(Network(("coolant",), masses, paths, (Seat("die", "junction"), Seat("case_probe", "case"))))
    assert solved.steady(np.array([[125.0], [0.0]]), np.array([[25.0]]))[1, 0] == pytest.approx(100.0, rel=1e-6)


def test_th_02_two_devices_share_the_sink_and_only_the_sink():
    # Found: course slides "Two devices on a common heat sink": shared sink 1.5 K/W where one alone could have 3 K/W.
    seats = tuple(Seat(name, "sink", ((1.5, 0.1), (0.5, 0.1))) for name in ("one", "two"))
    shared = modes(Network(("coolant",), (Mass("sink", 10.0),), (Path("sink", "coolant", 1.5),), seats))
    np.testing.assert_allclose(shared.steady(np.full((2, 1), 20.0), np.array([[50.0]])), 150.0, rtol=1e-6)
    alone = modes(Network(("coolant",), (Mass("sink", 10.0),), (Path("sink", "coolant", 3.0),), seats[:1]))
    assert alone.steady(np.array([[20.0]]), np.array([[50.0]]))[0, 0] == pytest.approx(150.0, rel=1e-6)


def test_th_05_cold_plate_refers_to_the_coolant_outlet():
    # Found: Boyd, Selecting a Liquid Cold Plate Technology, 2020: 500 W over 8 in2, 20 degC inlet, 55 degC surface,
    # 0.5 US gal/min of water: coolant rise 4 K read off a graph (3.7951 K exact, 6 %); theta to the OUTLET 0.062 K/W.
    flow = 0.5 * 3.785411784e-3 / 60.0
    rise = 500.0 / (998.2 * 4184.0 * flow)
    assert rise == pytest.approx(4.0, rel=0.06)
    assert pytest.approx(0.062, rel=1e-6) == (55.0 - 20.0 - 4.0) / 500.0
    assert pytest.approx(0.496, rel=0.01) == 0.062 * 8.0
    seats = (Seat("die", "plate"),)
    masses = (Mass("plate", 0.0), Mass("outlet", 0.0))
    paths = (Path("plate", "outlet", 0.062), Path("outlet", "coolant", 4.0 / 500.0))
    solved = modes(Network(("coolant",), masses, paths, seats))
    assert solved.steady(np.array([[500.0]]), np.array([[20.0]]))[0, 0] == pytest.approx(55.0, rel=1e-9)


# TH-06 closed form: sum of R (1 - exp(-t/tau)). Tolerance: the printed digits.
@pytest.mark.parametrize(
    ("time", "impedance"),
    [(1e-3, 0.006462786), (1e-2, 0.01966274), (0.1, 0.04774493), (1.0, 0.07534962), (1e9, 0.08)],
)
def test_th_06_foster_step(time, impedance):
    assert step_response(chain(ILLUSTRATIVE), time) == pytest.approx(impedance, rel=1e-6 if time < 1e6 else 1e-9)


# TH-07 found inputs: seven cells, thermal impedance course notebooks, 2023.
SEVEN_R = (0.002748817, 0.005715661, 0.04153561, 0.05616478, 0.3286516, 1.016057, 0.130071)
SEVEN_C = (2.916343e-05, 0.0001725521, 0.0002092143, 0.001786133, 0.002129755, 0.008451135, 0.0863404)


@pytest.mark.parametrize(
    ("time", "impedance"), [(1e-4, 0.142108), (1e-3, 0.4788391), (1e-2, 1.210487), (1e9, 1.580944)]
)
def test_th_07_seven_cells(time, impedance):
    cells = tuple((r, r * c) for r, c in zip(SEVEN_R, SEVEN_C, strict=True))
    assert step_response(chain(cells), time) == pytest.approx(impedance, rel=1e-4)


def test_th_08_pulse_train_and_its_mean_lies_between():
    # Found inputs: Fernandez, Perez, Bernal, Electronica de Potencia (course notes): R 1, tau 10 ms, 2 ms of 10 ms.
    solved = chain(((1.0, 0.01),))
    ends = temperatures(solved, [1.0, 0.0] * 300, [0.002, 0.008] * 300)
    assert ends[-2] == pytest.approx(0.2867637, rel=1e-6)
    assert ends[-1] == pytest.approx(0.1288512, rel=1e-6)
    assert ends[-1] < 0.2 < ends[-2]


def test_th_09_pulses_superpose():
    # Closed form: 800 W from 0 to 50 ms, 1200 W from 100 to 200 ms.
    ends = temperatures(chain(ILLUSTRATIVE), [800.0, 0.0, 1200.0], [0.05, 0.05, 0.1])
    np.testing.assert_allclose(ends, [31.42008, 6.775868, 60.63269], rtol=1e-6)


def test_th_10_one_point_of_the_square_root_law():
    # Found: Rashid 4th ed., Ex. 17.1, first point: 800 W for 1 ms at Zth 0.035 K/W.
    cells = square_root_cells(0.035, 1e-3)
    assert temperatures(chain(cells), [800.0], [1e-3])[0] == pytest.approx(28.0, rel=2e-3)


def square_root_cells(impedance, time, lowest=1e-7, highest=10.0, per_decade=6):
    """Foster cells that follow Zth = impedance sqrt(t/time) between the ends: tau evenly in log, R as sqrt(tau)."""
    tau = np.logspace(np.log10(lowest), np.log10(highest), int(per_decade * np.log10(highest / lowest)) + 1)
    shape = np.sqrt(tau)
    probe = np.sum(shape * -np.expm1(-time / tau))
    return tuple(zip(shape * impedance / probe, tau, strict=True))


def test_th_11_pulse_pattern_and_the_trap_of_the_printed_shortcut():
    # Found inputs: pattern of Rashid Ex. 17.1 with the square-root law its two points imply; exact superposition.
    # A chain follows the law to about 0.2 %. The printed shortcut (8, 50, 20, 41, 26 K) is far outside that.
    power = [800.0, 0.0, 1200.0, 0.0, 600.0, 0.0]
    seconds = [1e-3, 0.5e-3, 1e-3, 0.5e-3, 1e-3, 0.5e-3]
    ends = temperatures(chain(square_root_cells(0.035, 1e-3)), power, seconds)
    exact = [14.49387, 51.97903, 30.64024, 43.47112, 31.23333]
    np.testing.assert_allclose(ends[1:], exact, rtol=1e-2)
    assert np.all(np.abs(ends[1:] - [8.0, 50.0, 20.0, 41.0, 26.0]) > 1.0)


def ladder(resistances, capacities):
    """Cauer ladder: the die sits on the first mass, the last resistance ends at the coolant."""
    masses = tuple(Mass(f"m{i}", c) for i, c in enumerate(capacities))
    names = [*(m.name for m in masses), "coolant"]
    paths = tuple(Path(a, b, r) for a, b, r in zip(names, names[1:], resistances, strict=False))
    return modes(Network(("coolant",), masses, paths, (Seat("die", "m0"),)))


def test_th_12_foster_and_cauer_of_two_cells_are_one_network():
    # Found inputs, converted by exact continued fraction: Foster 0.7/0.3 K/W, 1/10 J/K.
    foster = chain(((0.7, 0.7), (0.3, 3.0)))
    cauer = ladder((0.8276873, 0.1723127), (0.9090909, 16.19677))
    for time in (0.01, 0.3, 2.0, 30.0):
        assert step_response(cauer, time) == pytest.approx(step_response(foster, time), rel=1e-6)
    np.testing.assert_allclose(np.sort(cauer.time_constants), [0.7, 3.0], rtol=1e-6)
    converted = foster_to_cauer([(0.7, 0.7), (0.3, 3.0)])
    np.testing.assert_allclose(converted, [(0.8276873, 0.9090909), (0.1723127, 16.19677)], rtol=1e-6)


def test_th_13_cauer_to_foster_by_its_modes():
    # Found inputs: ladder 0.1/0.5/1.2 K/W, 0.3/0.8/2 J/K; Foster values by eigen-decomposition.
    solved = ladder((0.1, 0.5, 1.2), (0.3, 0.8, 2.0))
    order = np.argsort(solved.time_constants)
    np.testing.assert_allclose(solved.time_constants[order], [0.02147802, 0.3405026, 3.938019], rtol=1e-6)
    resistances = (solved.output[0] * solved.gain[:, 0])[order]
    np.testing.assert_allclose(resistances, [0.05040605, 0.2020887, 1.547505], rtol=1e-6)
    cells = cauer_to_foster([(0.1, 0.3), (0.5, 0.8), (1.2, 2.0)])
    np.testing.assert_allclose(cells, np.column_stack([resistances, solved.time_constants[order]]), rtol=1e-12)


def test_th_14_electro_thermal_fixed_point_and_runaway():
    # Closed form: Tj = (Ta + g (1 - 25 a))/(1 - g a), g = Rth I² R25; no solution from g a = 1 on.
    solved = chain(((0.3, 0.1),))

    def junction(current):
        degc = 65.0
        for _ in range(4000):
            watts = current**2 * 0.008 * (1.0 + 0.006 * (degc - 25.0))
            degc = float(solved.steady(np.array([[watts]]), np.array([[65.0]]))[0, 0])
            if degc > 1e6:
                return np.inf, watts
        return degc, watts

    degc, watts = junction(100.0)
    assert degc == pytest.approx(99.76636, rel=1e-6)
    assert watts == pytest.approx(115.8879, rel=1e-6)
    assert np.isfinite(junction(263.5231 * 0.99)[0])
    assert np.isinf(junction(263.5231 * 1.01)[0])


def test_th_15_a_ladder_of_silicon_follows_the_half_space():
    # From memory: Carslaw & Jaeger, semi-infinite solid under constant flux: 1 MW/m², 1 ms, silicon: 2.268127 K.
    # 300 slices of 4 µm are a half space for 1 ms; the slice in front costs 0.3 %.
    k, rho_cp, slice_m, count = 150.0, 1.65e6, 4e-6, 300
    masses = tuple(Mass(f"s{i}", rho_cp * slice_m) for i in range(count))
    names = [*(m.name for m in masses), "coolant"]
    paths = tuple(Path(a, b, slice_m / k) for a, b in pairwise(names))
    solved = modes(Network(("coolant",), masses, paths, (Seat("die", "s0"),)))
    surface = 1e6 * (step_response(solved, 1e-3) + 0.5 * slice_m / k)
    assert surface == pytest.approx(2.268127, rel=5e-3)


def test_th_16_shared_plate():
    # Closed form: Tj = Tcool + Rplate sum(P) + Rjc P.
    seats = (Seat("one", "plate", ((0.2, 0.1),)), Seat("two", "plate", ((0.3, 0.1),)))
    solved = modes(Network(("coolant",), (Mass("plate", 50.0),), (Path("plate", "coolant", 0.05),), seats))
    at_rest = solved.steady(np.array([[200.0], [120.0]]), np.array([[65.0]]))[:, 0]
    np.testing.assert_allclose(at_rest, [121.0, 117.0], rtol=1e-9)
