"""Every first-party loss model keeps the promises of the contract, with each way of giving its data."""

from __future__ import annotations

import dataclasses
from typing import Any

import numpy as np
import pytest

from tideleg import LossModel, Point, Timing
from tideleg.conformance.losses import loss_checks, reading
from tideleg_losses import (
    busbar,
    capacitor,
    channel,
    core,
    dead_time,
    diode,
    diode_recovery,
    gate,
    knee,
    output_charge,
    recovery,
    standby,
    switching,
    winding,
)
from tideleg_topologies import half_bridge

TEST_POINT = {"test_current": "60 A", "test_voltage": "800 V"}
ENERGIES = [
    {
        "current": i,
        "temperature": t,
        "voltage": v,
        "energy": 1.1e-5 * i * (v / 800.0) ** 1.3 * (1 + 2e-3 * t) + 2e-8 * i**2,
    }
    for i in (20.0, 50.0, 110.0)
    for t in (20.0, 130.0, 175.0)
    for v in (500.0, 900.0)
]
RESISTANCES = [
    {"current": i, "temperature": t, "resistance": 0.012 + 2e-5 * i + 6e-7 * (t - 10.0) ** 2}
    for i in (15.0, 60.0, 140.0)
    for t in (-40.0, 0.0, 30.0, 120.0, 175.0)
]
CASES: dict[str, tuple[LossModel, dict[str, Any]]] = {
    "channel all keys": (
        channel.loss_model(),
        {
            "on_resistance": "13 mohm",
            "on_resistance_slope": "0.35 %/K",
            "on_resistance_current_slope": 4e-4,
            "reverse_on_resistance": "12.5 mohm",
            "diode_voltage": "3.1 V",
        },
    ),
    "channel with a body diode that takes over": (
        channel.loss_model(),
        {
            "on_resistance": "13 mohm",
            "on_resistance_slope": "0.4 %/K",
            "diode_voltage": "1.2 V",
            "diode_resistance": "2 mohm",
            "diode_voltage_slope": -2e-3,
        },
    ),
    "channel factor": (
        channel.loss_model(),
        {
            "on_resistance": "13 mohm",
            "on_resistance_factor": [[-40, 1.05], [0, 0.97], [25, 1.0], [100, 1.3], [175, 1.8]],
        },
    ),
    "channel polynomial": (
        channel.loss_model(),
        {"on_resistance": "13 mohm", "on_resistance_polynomial": [-2e-4, 3.2e-5, -4e-8]},
    ),
    "channel curve": (channel.loss_model(), {"on_resistance_curve": RESISTANCES}),
    "channel curve both ways": (
        channel.loss_model(),
        {
            "on_resistance_curve": RESISTANCES,
            "reverse_on_resistance_curve": [[-40, 0.012], [30, 0.011], [175, 0.017]],
            "diode_voltage": "3.1 V",
        },
    ),
    "knee": (
        knee.loss_model(),
        {
            "knee_voltage": "0.9 V",
            "knee_voltage_slope": -1e-3,
            "knee_resistance": "4 mohm",
            "knee_resistance_slope": "0.3 %/K",
        },
    ),
    "knee curve": (
        knee.loss_model(),
        {
            "forward_voltage_curve": [
                {"current": i, "temperature": t, "voltage": 0.8 - 1e-3 * t + (4e-3 + 1e-5 * t) * i}
                for i in (10.0, 60.0, 200.0)
                for t in (25.0, 125.0, 150.0)
            ]
        },
    ),
    "diode": (diode.loss_model(), {"knee_voltage": "1.1 V", "knee_resistance": "3 mohm"}),
    "diode recovery": (
        diode_recovery.loss_model(),
        {"recovery_energy": "2 mJ", "recovery_in_turn_on": False, **TEST_POINT},
    ),
    "switching curves": (switching.loss_model(), {"turn_on_energy_curve": ENERGIES, "turn_off_energy_curve": ENERGIES}),
    "switching curve that does not end at zero": (
        switching.loss_model(),
        {
            "turn_on_energy_curve": [[0, 2e-4], [50, 9e-4], [120, 2.4e-3]],
            "switching_energy_slope": "0.1 %/K",
            "output_charge": "260 nC",
            "test_voltage": "800 V",
        },
    ),
    "recovery curve": (recovery.loss_model(), {"recovery_energy_curve": ENERGIES}),
    "output charge curve": (
        output_charge.loss_model(),
        {"output_charge_curve": [[100, 1e-7], [400, 1.9e-7], [900, 2.7e-7]]},
    ),
    "output energy": (output_charge.loss_model(), {"output_energy": "60 uJ", "test_voltage": "800 V"}),
    "channel": (
        channel.loss_model(),
        {"on_resistance": "13 mohm", "on_resistance_slope": "0.35 %/K", "on_resistance_curvature": 8e-6},
    ),
    "channel less dead time": (channel.loss_model(), {"on_resistance": "13 mohm", "diode_voltage": "3.1 V"}),
    "dead time": (
        dead_time.loss_model(),
        {"diode_voltage": "3.1 V", "diode_resistance": "9 mohm", "diode_voltage_slope": -2e-3},
    ),
    "switching energies": (
        switching.loss_model(),
        {"turn_on_energy": "1 mJ", "turn_off_energy": "0.6 mJ", "switching_energy_slope": "0.3 %/K", **TEST_POINT},
    ),
    "switching times": (switching.loss_model(), {"turn_on_time": "30 ns", "turn_off_time": "40 ns"}),
    "recovery energy": (
        recovery.loss_model(),
        {
            "recovery_energy": "0.3 mJ",
            "recovery_energy_slope": "0.6 %/K",
            "test_temperature": "125 degC",
            **TEST_POINT,
        },
    ),
    "recovery charge": (recovery.loss_model(), {"recovery_charge": "1 uC", **TEST_POINT}),
    "recovery in turn-on": (recovery.loss_model(), {"recovery_in_turn_on": True, "turn_on_energy": "1 mJ"}),
    "gate": (gate.loss_model(), {"gate_charge": "230 nC", "gate_voltage": "22 V"}),
    "output charge": (output_charge.loss_model(), {"output_charge": "260 nC", "test_voltage": "800 V"}),
    "output charge in turn-on": (
        output_charge.loss_model(),
        {"output_charge_in_turn_on": True, "turn_on_energy": "1 mJ"},
    ),
    "winding dc": (winding.loss_model(), {"winding_resistance": "2.4 mohm"}),
    "winding foil": (
        winding.loss_model(),
        {
            "winding_resistance": "2.4 mohm",
            "winding_layers": 3,
            "winding_conductor": "foil",
            "winding_conductor_thickness": "0.5 mm",
        },
    ),
    "winding litz": (
        winding.loss_model(),
        {
            "winding_resistance": "2.4 mohm",
            "winding_conductor": "litz",
            "winding_strands": 400,
            "winding_strand_diameter": "0.1 mm",
            "winding_width": "30 mm",
            "turns": 16,
        },
    ),
    "winding table": (
        winding.loss_model(),
        {"winding_resistance": "2.4 mohm", "ac_resistance_ratio": [["10 kHz", 1.1], ["100 kHz", 3.0], ["1 MHz", 25]]},
    ),
    "core": (
        core.loss_model(),
        {
            "core_k": 5.97,
            "core_alpha": 1.3,
            "core_beta": 2.5,
            "core_area": "16 cm2",
            "core_volume": "420 cm3",
            "turns": 16,
        },
    ),
    "capacitor": (capacitor.loss_model(), {"esr": "2 mohm", "external_ripple_current": "20 A"}),
    "capacitor table": (
        capacitor.loss_model(),
        {
            "esr_table": [
                *([hz, -60.0, 4 * ohm] for hz, ohm in ((1e3, 3e-3), (1e5, 2e-3), (1e7, 5e-3))),
                *([hz, 220.0, ohm] for hz, ohm in ((1e3, 3e-3), (1e5, 2e-3), (1e7, 5e-3))),
            ],
            "external_ripple_spectrum": [["10 kHz", "12 A"]],
        },
    ),
    "busbar": (
        busbar.loss_model(),
        {"battery_side_resistance": "0.25 mohm", "link_side_resistance": "0.35 mohm"},
    ),
    "standby": (standby.loss_model(), {"standby_power": "18 W", "switching_power": "22 W"}),
}


@pytest.mark.parametrize(
    "check",
    [
        pytest.param(check, id=f"{case}-{check}")
        for case, (model, settings) in CASES.items()
        for check in loss_checks(model, settings)
    ],
)
def test_promise(check: Any) -> None:
    check()


def terms() -> list[Any]:
    return [
        pytest.param(model.reads, term, id=f"{case}-{term.mechanism}".replace(" ", "-"))
        for case, (model, settings) in CASES.items()
        for term in model.terms(model.settings.model_validate(settings))
    ]


CURRENT = np.array([[-180.0, -9.0, 3.0, 60.0, 210.0]])


@pytest.mark.parametrize(("kind", "term"), terms())
def test_one_step_alone_is_the_same_as_among_many(kind: Any, term: Any) -> None:
    degc = np.linspace(20.0, 120.0, CURRENT.size)[None, :]
    many = term.at(reading(kind, CURRENT), Timing(40e3, 200e-9), degc)
    for i in range(CURRENT.size):
        here = slice(i, i + 1)
        alone = term.at(reading(kind, CURRENT[:, here]), Timing(40e3, 200e-9), degc[:, here])
        np.testing.assert_allclose(alone.watts, np.broadcast_to(many.watts, CURRENT.shape)[:, here], rtol=1e-13)


@pytest.mark.parametrize(("kind", "term"), terms())
def test_a_number_of_the_data_may_differ_by_candidate(kind: Any, term: Any) -> None:
    """A size search gives arrays (C, 1): each candidate then loses what it would alone."""
    target = term.law if hasattr(term, "law") else term
    names = ("scale", "resistance", "energy", "charge", "volume", "esr", "power", "voltage")
    name = next((n for n in names if hasattr(target, n)), None)
    if hasattr(target, "table"):
        return  # a table of resistances is one for all candidates; their shapes stand in test_capacitor_table.py
    if name is None:
        assert not np.any(term.at(reading(kind, CURRENT), Timing(40e3, 200e-9), np.full_like(CURRENT, 80.0)).watts)
        return

    def with_factor(factor: Any) -> Any:
        changed = dataclasses.replace(target, **{name: getattr(target, name) * factor})
        watts = (dataclasses.replace(term, law=changed) if target is not term else changed).at(
            reading(kind, CURRENT), Timing(40e3, 200e-9), np.full_like(CURRENT, 80.0)
        )
        return np.broadcast_to(watts.watts, (np.size(factor), CURRENT.size))

    together = with_factor(np.array([[0.5], [1.0], [3.0]]))
    for row, factor in zip(together, (0.5, 1.0, 3.0), strict=True):
        np.testing.assert_allclose(row, with_factor(factor)[0], rtol=1e-13)


@pytest.mark.parametrize(("kind", "term"), terms())
def test_the_slope_is_true_from_cold_to_hot(kind: Any, term: Any) -> None:
    # Central difference over 0.02 K; what it leaves is the table of Dowell's factor, whose slope is good to 1e-4.
    degc = np.linspace(-35.0, 200.0, CURRENT.size)[None, :]
    part = reading(kind, CURRENT)
    low, here, high = (term.at(part, Timing(40e3, 200e-9), degc + shift) for shift in (-0.01, 0.0, 0.01))
    found = np.broadcast_to(here.watts_per_kelvin, CURRENT.shape)
    due = np.broadcast_to((high.watts - low.watts) / 0.02, CURRENT.shape)
    np.testing.assert_allclose(found, due, rtol=2e-4, atol=1e-9 + 1e-9 * np.max(np.abs(here.watts)))


EDGES = {"switching energies", "switching times", "recovery energy", "gate", "dead time"}


@pytest.mark.parametrize("case", sorted(EDGES))
def test_what_comes_at_every_edge_grows_with_the_frequency(case: str) -> None:
    model, settings = CASES[case]
    degc = np.full_like(CURRENT, 80.0)
    for term in model.terms(model.settings.model_validate(settings)):
        once, thrice = (term.at(reading("switch", CURRENT), Timing(f, 200e-9), degc) for f in (20e3, 60e3))
        np.testing.assert_allclose(thrice.watts, 3.0 * once.watts, rtol=1e-13)


def test_what_shifts_the_duty_ratio_and_what_heats_elsewhere() -> None:
    """Only what lies in the way of the leg's current as a resistance is ohmic; only gate heat stays in the driver."""
    offered = [t for model, data in CASES.values() for t in model.terms(model.settings.model_validate(data))]
    ohmic = {"channel conduction", "diode conduction", "winding dc"}
    assert {term.mechanism for term in offered if term.ohmic} == ohmic
    assert {term.mechanism for term in offered if not term.heats} == {"gate"}


@pytest.mark.parametrize("modulation", ["synchronous", "diode"])
def test_a_stage_at_rest_loses_nothing_in_its_parts(modulation: str) -> None:
    topology = half_bridge.topology()
    keys = {"switching_frequency": 40e3, "dead_time": 200e-9, "idle": "off", "modulation": modulation}
    one = np.ones((1, 2))
    point = Point(400.0 * one, 750.0 * one, 0.0 * one, 0.01, np.zeros((1, 2), dtype=bool))
    operation = topology.operate(point, topology.settings.model_validate(keys), {"inductor": 110e-6})
    parts = {"switch": operation.positions, "inductor": operation.windings, "capacitor": operation.exchanges}
    for model, data in CASES.values():
        without_others = {key: value for key, value in data.items() if not key.startswith("external_ripple")}
        for term in model.terms(model.settings.model_validate(without_others)):
            for part in parts.get(model.reads, {}).values():
                assert not np.any(term.at(part, operation.timing, 80.0 * one).watts), term.mechanism
