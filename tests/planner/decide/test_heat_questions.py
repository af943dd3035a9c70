"""Loss of coolant and derating, against closed forms of two chips on one plate (energy balance, Joule's law)."""

import json

import numpy as np
import pytest
from scipy.integrate import solve_ivp
from scipy.optimize import brentq

from tideleg import InputError, derate, plan_from_mapping, run
from tideleg.command import main
from tideleg.decide.coolant_loss import coolant_loss
from tideleg.decide.derating import NOT_LIMITED
from tideleg.heat import modes, transferred
from tideleg.network import Mass, Network, Path, Seat
from tideleg.report.derating_curve import draw_derating

OHM, PLATE, OWN, CAPACITY, VOLTS = 0.05, 0.05, 0.10, 800.0, 400.0
SLOPE_FROM_DEGC = 25.0


def plan(folder, rows="time_s,power_w\n0,20000\n600,0\n", limit="120 degC", slope=0.0):
    (folder / "p.csv").write_text(rows)
    return plan_from_mapping(
        {
            "title": "two warm chips",
            "battery": {"open_circuit_voltage": VOLTS},
            "link": {"voltage": 2 * VOLTS},
            "stage": {
                "topology": "half-bridge",
                "switching_frequency": "200 kHz",
                "inductor": {"inductance": "10 mH"},
                "switch": {
                    "on_resistance": OHM,
                    "on_resistance_slope": slope,
                    "junction_to_plate": [[OWN, 0.0]],
                },
            },
            "cooling": {"plate_resistance": PLATE, "plate_heat_capacity": CAPACITY},
            "limits": {"junction_temperature": limit} if limit else {},
            "mission": [{"profile": "p.csv", "coolant": "40 degC"}],
        },
        folder=folder,
    )


def losses(power, ohm=OHM):
    """Return (loss of both chips, loss of the hotter one) [W] at a discharge into the link.

    The battery has no resistance: P + R I² = V I. The hotter chip is the lower one, which conducts for 1 - D of the
    period with D = (V - I R)/(2 V).
    """
    current = (VOLTS - np.sqrt(VOLTS**2 - 4 * ohm * power)) / (2 * ohm)
    loss = ohm * current**2
    return loss, loss * (0.5 + current * ohm / (2 * VOLTS))


def test_without_coolant_the_plate_warms_by_its_loss_over_its_capacity(tmp_path):
    made = plan(tmp_path)
    found = coolant_loss(made, run(made))
    whole, hotter = losses(20000)
    rest = 40 + whole * PLATE + hotter * OWN
    assert found.part == "lower_switch"
    assert found.seconds == pytest.approx((120 - rest) * CAPACITY / whole, rel=2e-4)
    assert (found.time_s, found.mission, found.runs_away) == (600.0, "p", False)


def test_a_growing_resistance_shortens_the_time_as_its_ode_says(tmp_path):
    made = plan(tmp_path, slope=0.004)
    outcome = run(made)
    found = coolant_loss(made, outcome)

    def chips(plate):
        """Return (loss of both, temperature of the hotter one): each warms itself, so both are sought together."""
        upper = lower = plate
        for _ in range(80):
            ohms = OHM * (1 + 0.004 * (np.array([upper, lower]) - SLOPE_FROM_DEGC))
            duty = 0.5
            for _ in range(20):
                path = ohms[0] * duty + ohms[1] * (1 - duty)
                current = (VOLTS - np.sqrt(VOLTS**2 - 4 * path * 20000)) / (2 * path)
                duty = (VOLTS - current * path) / (2 * VOLTS)
            parts = ohms * current**2 * np.array([duty, 1 - duty])
            upper, lower = plate + parts * OWN
        return parts.sum(), lower

    def reaches(_, state):
        return chips(state[0])[1] - 120.0

    reaches.terminal = True
    begin = brentq(lambda plate: 40 + chips(plate)[0] * PLATE - plate, 40, 110)
    solved = solve_ivp(lambda t, y: [chips(y[0])[0] / CAPACITY], (0, 1e5), [begin], events=reaches, rtol=1e-8)
    assert found.seconds == pytest.approx(float(solved.t_events[0][0]), rel=3e-3)


def test_what_cannot_be_told_gives_nothing(tmp_path):
    unlimited = plan(tmp_path, limit=None)
    assert coolant_loss(unlimited, run(unlimited)) is None
    cool = plan(tmp_path, rows="time_s,power_w\n0,100\n5,0\n")
    assert coolant_loss(cool, run(cool)).seconds is None  # milliwatts against 800 J/K


def test_power_held_for_good_is_that_of_the_closed_form(tmp_path):
    found = derate(
        plan(tmp_path, rows="time_s,power_w\n0,40000\n10,-40000\n20,0\n"), coolant_degc=[40, 80, 119, 120, 130]
    )
    step = 40000 / 16**3  # three grids of 17 powers leave so much
    for point in found.points[:3]:

        def over(power, degc=point.coolant_degc):
            whole, hotter = losses(power)
            return degc + whole * PLATE + hotter * OWN - 120

        give = brentq(over, 0, 700e3)
        # Charge mirrors it: P = V I + R I² into the battery asks more of the link at the same current.
        current = (VOLTS - np.sqrt(VOLTS**2 - 4 * OHM * give)) / (2 * OHM)
        take = VOLTS * current + OHM * current**2
        for wanted, stated, binds in (
            (give, point.discharge_w, point.discharge_binds),
            (take, point.charge_w, point.charge_binds),
        ):
            assert min(wanted, 40000) - step - 1 <= stated <= min(wanted, 40000) + 1
            assert (binds == NOT_LIMITED) == (wanted >= 40000)
    assert [p.discharge_w for p in found.points[3:]] == [0.0, 0.0]
    assert found.points[4].lost_share["p"] == 1.0
    shares = [p.lost_share["p"] for p in found.points]
    assert shares == sorted(shares)


def test_a_runaway_is_the_border_not_a_fault(tmp_path):
    made = plan(tmp_path, rows="time_s,power_w\n0,150000\n10,0\n", limit="900 degC", slope=0.011)
    (point,) = derate(made, coolant_degc=[40]).points
    assert 0.0 < point.discharge_w < 150000
    assert point.discharge_binds in ("no thermal equilibrium", "lower switch")


def test_it_needs_a_limit_that_the_coolant_decides(tmp_path):
    with pytest.raises(InputError, match="derating needs a limited temperature"):
        derate(plan(tmp_path, limit=None))


def test_the_command_prints_draws_and_carries_the_caution(tmp_path, capsys):
    plan(tmp_path)
    (tmp_path / "plan.toml").write_text(
        'title = "t"\n[battery]\nopen_circuit_voltage = 400.0\n[link]\nvoltage = 800.0\n[stage]\ntopology = "half-bridge"\n'
        'switching_frequency = "200 kHz"\n[stage.inductor]\ninductance = "10 mH"\n'
        "[stage.switch]\non_resistance = 0.05\njunction_to_plate = [[0.1, 0.0]]\n[cooling]\nplate_resistance = 0.05\nplate_heat_capacity = 800.0\n"
        '[limits]\njunction_temperature = "120 degC"\n[[mission]]\nprofile = "p.csv"\ncoolant = "40 degC"\n'
    )
    assert main(["derate", str(tmp_path / "plan.toml"), "--coolant", "40", "100"]) == 0
    shown = capsys.readouterr().out
    assert "HIGH VOLTAGE" in shown
    assert (tmp_path / "derating.png").stat().st_size > 5000
    assert main(["derate", str(tmp_path / "plan.toml"), "--json"]) == 0
    told = json.loads(capsys.readouterr().out)
    assert len(told["points"]) == 9
    assert draw_derating(derate(tmp_path / "plan.toml")).alt.startswith("Derating from 40 to 120 degC")


def test_a_state_keeps_every_temperature_in_the_changed_network():
    def network(ohms):
        return Network(
            ("coolant", "ambient"),
            (Mass("plate", 300.0), Mass("case", 20.0)),
            (Path("plate", "coolant", ohms), Path("case", "plate", 0.1), Path("case", "ambient", 2.0)),
            (Seat("chip", "case", ((0.2, 0.01), (0.1, 0.3)), 3), Seat("coil", "plate")),
        )

    before, after = modes(network(0.05)), modes(network(1e6))
    rng = np.random.default_rng(5)
    state = rng.uniform(-20, 80, (len(before.time_constants), 1))
    moved = transferred(state, before, after)
    assert after.mass_output @ moved == pytest.approx(before.mass_output @ state, rel=1e-9)
    # What the parts see of the modes is the same too: chains stand on the same places.
    assert after.output @ moved == pytest.approx(before.output @ state, rel=1e-9)
    with pytest.raises(InputError, match="same parts"):
        transferred(state, before, modes(Network(("coolant",), (), (), (Seat("chip", "coolant"),))))
