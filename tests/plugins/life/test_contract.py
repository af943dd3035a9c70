"""Every life model keeps every promise, and says no to data that cannot be meant."""

import numpy as np
import pytest

from tideleg.conformance import life_checks
from tideleg.conformance.life import stress_of
from tideleg_life.capacitor_life import life_model as capacitor
from tideleg_life.cips_2008 import life_model as cips
from tideleg_life.coffin_manson_arrhenius import life_model as coffin
from tideleg_life.norris_landzberg import life_model as norris
from tideleg_life.running_hours import life_model as running

CAPACITOR = {
    "rated_life": "5000 h", "rated_temperature": "105 degC", "rated_at": "core", "law": "ten-kelvin",
    "voltage_law": "none", "temperature_range": ["40 degC", "105 degC"], "spread": 0.3,
}  # fmt: skip
NORRIS = {
    "test_cycles": 1000, "test_swing": "165 K", "test_maximum": "125 degC", "test_cycles_per_day": 24,
    "constants": "sac-2005", "swing_range": ["20 K", "165 K"], "maximum_range": ["0 degC", "125 degC"],
    "cycles_per_day_range": [1, 100], "spread": 0.5,
}  # fmt: skip
CIPS = {
    "constants": "cips-2008", "blocking_voltage": "1200 V", "bond_current": "10 A", "bond_diameter": "400 um",
    "spread": 0.5,
}  # fmt: skip
OWN = {
    "factor": 1e14, "exponent": -4.5, "activation_energy": "0.1 eV", "swing_range": ["20 K", "120 K"],
    "mean_range": ["20 degC", "140 degC"], "spread": 0.4,
}  # fmt: skip
CASES = {
    "lesit": (coffin(), {"constants": "lesit-1997", "spread": 0.4}),
    "lesit older": (coffin(), {"constants": "lesit-older", "spread": 0.4}),
    "own constants": (coffin(), OWN),
    "norris": (norris(), NORRIS),
    "cips": (cips(), CIPS),
    "cips at the maximum": (cips(), {**CIPS, "temperature": "maximum"}),
    "capacitor": (capacitor(), CAPACITOR),
    "arrhenius and power law": (
        capacitor(),
        {**CAPACITOR, "law": "arrhenius", "activation_energy": "0.94 eV", "voltage_law": "power",
         "rated_voltage": "900 V", "voltage_exponent": 8},
    ),
    "linear law": (capacitor(), {**CAPACITOR, "voltage_law": "linear", "rated_voltage": "450 V"}),
    "hours": (running(), {"rated_hours": "40000 h", "runs": "always", "spread": 0.3}),
    "starts": (running(), {"rated_starts": 2e5, "runs": "switching", "spread": 0.3}),
}  # fmt: skip
EVERY = [(name, check) for name, (model, keys) in CASES.items() for check in life_checks(model, keys)]


@pytest.mark.parametrize(("name", "check"), EVERY, ids=str)
def test_contract(name, check):
    check()


@pytest.mark.parametrize(
    ("model", "keys", "words"),
    [
        (coffin(), {"constants": "lesit-1997"}, "spread"),
        (coffin(), {**OWN, "swing_range": ["120 K", "20 K"]}, "lower value first"),
        (coffin(), {**OWN, "activation_energy": "0.1 V"}, "give a energy"),
        (norris(), {**NORRIS, "swing_exponent": 2.0}, "belongs together"),
        (cips(), {**CIPS, "constants": "later"}, "cips-2008"),
        (capacitor(), {**CAPACITOR, "rated_at": "ambient"}, "core_rise is missing"),
        (capacitor(), {**CAPACITOR, "core_rise": "5 K"}, "does nothing without"),
        (capacitor(), {**CAPACITOR, "voltage_law": "power", "rated_voltage": "900 V"}, "voltage_exponent is missing"),
        (running(), {"runs": "always", "spread": 0.3}, "one of the two"),
        (running(), {"rated_hours": 1, "rated_starts": 1, "runs": "always", "spread": 0.3}, "one of the two"),
    ],
)
def test_refusals(model, keys, words):
    with pytest.raises(ValueError, match=words):
        model.settings.model_validate(keys)


def test_what_lies_outside_the_box_counts_and_is_marked():
    term = coffin().term(coffin().settings(constants="lesit-1997", spread=0.4))
    swing = np.array([10.0, 30.0, 80.0, 90.0])
    found = term.consumed(stress_of(swing, 80.0 - swing / 2))
    assert found.outside.tolist() == [True, False, False, True]
    assert np.all(found.damage > 0.0)
    hot = term.consumed(stress_of(np.array([40.0, 40.0]), np.array([60.0, 100.0])))
    assert hot.outside.tolist() == [False, True]


def test_a_build_outside_the_published_data_marks_every_cycle_and_says_so():
    term = cips().term(cips().settings(**{**CIPS, "bond_current": "40 A"}))
    assert term.consumed(stress_of(np.array([60.0]), np.array([40.0]), seconds=5.0)).outside.all()
    assert "lies outside" in term.box


def test_hours_and_starts():
    stress = stress_of(np.full(6, 1.0), np.full(6, 40.0), seconds=1800.0)
    stress = stress._replace(active=np.array([1.0, 1.0, 0.0, 0.0, 1.0, 0.0]))

    def damage(**keys):
        return running().term(running().settings(**keys, spread=0.3)).consumed(stress).damage.sum()

    assert damage(rated_hours="60 h", runs="always") == pytest.approx(0.1)
    assert damage(rated_hours="60 h", runs="switching") == pytest.approx(0.05)
    assert damage(rated_starts=100, runs="switching") == pytest.approx(0.02)
    assert damage(rated_starts=100, runs="always") == pytest.approx(0.01)


def test_a_voltage_above_the_rated_one_is_marked_and_kills():
    term = capacitor().term(capacitor().settings(**{**CAPACITOR, "voltage_law": "linear", "rated_voltage": "300 V"}))
    found = term.consumed(stress_of(np.array([1.0]), np.array([60.0])))  # at 400 V
    assert found.outside.all()
    assert found.damage[0] > 1.0
