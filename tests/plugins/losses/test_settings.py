"""Data of a loss: left out it is not modelled, half given it is refused with the key that is missing."""

from __future__ import annotations

from typing import Any

import pytest
from pydantic import BaseModel, ValidationError

from tideleg_losses import busbar, channel, core, dead_time, gate, output_charge, recovery, standby
from tideleg_losses import switching as switching_plugin
from tideleg_losses import winding as winding_plugin

ch, dt = channel.ChannelSettings, dead_time.DeadTimeSettings
sw, rec = switching_plugin.SwitchingSettings, recovery.RecoverySettings
oc, wd = output_charge.OutputChargeSettings, winding_plugin.WindingSettings
POINT = {"test_current": 60.0, "test_voltage": 800.0}
FOIL = {"winding_layers": 2, "winding_conductor_thickness": 3e-4}
LITZ = {"winding_strands": 400, "winding_strand_diameter": 1e-4, "winding_width": 0.03}
STEINMETZ = {"core_k": 5.97, "core_alpha": 1.3, "core_beta": 2.5}

REFUSED: list[tuple[type[BaseModel], dict[str, Any], str]] = [
    (ch, {"on_resistance_slope": 0.004}, "on_resistance is missing"),
    (ch, {"on_resistance": 0.01, "on_resistance_slope": 0.02}, "vanishes at -60 degC"),
    (ch, {"on_resistance": 0.01, "on_resistance_curvature": -3e-5}, "must stay positive from -60 to 250"),
    (dt, {"diode_resistance": 0.01}, "diode_voltage is missing"),
    (dt, {"diode_voltage": 0.4, "diode_voltage_slope": -0.002}, "at 250 degC; it must not be negative"),
    (sw, {"turn_on_energy": 1e-3, "test_voltage": 800.0}, "test_current is missing"),
    (sw, {"turn_off_energy": 1e-3, "test_current": 60.0}, "test_voltage is missing"),
    (sw, {"turn_on_energy": 1e-3, "turn_on_time": 3e-8, **POINT}, "give one of them"),
    (
        sw,
        {"turn_off_time": 3e-8, "switching_voltage_exponent": 1.4},
        "turn_on_energy or turn_off_energy or turn_on_energy_curve",
    ),
    (sw, {"turn_off_energy": 1e-3, "turn_on_current_exponent": 1.1, **POINT}, "turn_on_energy is missing"),
    (sw, {"turn_on_energy": 1e-3, "switching_energy_slope": 0.02, **POINT}, "vanishes at -25 degC"),
    (sw, {"turn_on_energy": 1e-3, "switching_energy_slope": -0.005, **POINT}, "vanishes at 225 degC"),
    (rec, {"recovery_energy": 1e-4, "test_voltage": 800.0}, "test_current is missing"),
    (rec, {"recovery_charge": 1e-6, "test_current": 60.0}, "test_voltage is missing"),
    (rec, {"recovery_energy": 1e-4, "recovery_charge": 1e-6, **POINT}, "give one of them"),
    (rec, {"recovery_current_exponent": 0.5}, "recovery_energy or recovery_charge is missing"),
    (rec, {"recovery_in_turn_on": True, "recovery_energy": 1e-4, **POINT}, "turn_on_energy is missing"),
    (rec, {"recovery_energy": 1e-4, "turn_on_energy": 1e-3, **POINT}, "count it twice"),
    (oc, {"output_charge": 3e-7}, "test_voltage is missing"),
    (oc, {"output_charge_exponent": 0.4}, "output_charge or output_energy is missing"),
    (oc, {"output_charge_in_turn_on": True}, "turn_on_energy is missing"),
    (oc, {"output_charge": 3e-7, "test_voltage": 800.0, "turn_on_energy": 1e-3}, "count it twice"),
    (gate.GateSettings, {"gate_charge": 2e-7}, "gate_voltage is missing"),
    (gate.GateSettings, {"gate_voltage": 20.0}, "gate_charge is missing"),
    (wd, FOIL, "winding_resistance is missing"),
    (wd, {"winding_resistance": 0.01, "winding_layers": 2}, "winding_conductor_thickness is missing"),
    (wd, {"winding_resistance": 0.01, "winding_conductor": "foil"}, "winding_conductor alone does nothing"),
    (wd, {"winding_resistance": 0.01, "winding_porosity": 0.8}, "winding_conductor_thickness is missing"),
    (wd, {"winding_resistance": 0.01, **LITZ}, "litz goes with"),
    (wd, {"winding_resistance": 0.01, "winding_conductor": "litz", **FOIL}, "litz goes with"),
    (wd, {"winding_resistance": 0.01, "winding_conductor": "litz", **LITZ}, "turns is missing"),
    (wd, {"winding_resistance": 0.01, "ac_resistance_ratio": [[1e4, 1.1], [1e5, 2]], **FOIL}, "give one way"),
    (wd, {"winding_resistance": 0.01, "ac_resistance_ratio": [[1e5, 1.1], [1e4, 2]]}, "rising frequency"),
    (wd, {"winding_resistance": 0.01, "ac_resistance_ratio": [[1e5, 0.9], [1e6, 2]]}, "greater than or equal to 1"),
    (core.CoreSettings, {**STEINMETZ, "core_area": 1e-3, "turns": 16}, "core_volume is missing"),
    (core.CoreSettings, {"core_area": 1e-3}, "core_k is missing"),
    (busbar.BusbarSettings, {"battery_side_resistance": -1.0}, "greater than or equal to 0"),
    (standby.StandbySettings, {"standby_power": "18 V"}, "unit of voltage"),
]


@pytest.mark.parametrize(("model", "keys", "words"), REFUSED, ids=[f"{m.__name__}-{w}" for m, _, w in REFUSED])
def test_refused_with_words(model: type[BaseModel], keys: dict[str, Any], words: str) -> None:
    with pytest.raises(ValidationError) as caught:
        model.model_validate(keys)
    assert words in str(caught.value)


@pytest.mark.parametrize("model", sorted({m for m, _, _ in REFUSED}, key=lambda m: m.__name__))
def test_an_unknown_key_is_refused(model: type[BaseModel]) -> None:
    with pytest.raises(ValidationError, match="Extra inputs are not permitted"):
        model.model_validate({"on_resistence": 1.0})


def test_models_of_one_table_give_a_shared_key_one_meaning() -> None:
    """A key that two models read has the same type, bounds and default in both."""
    for group in ([ch, dt, sw, rec, oc, gate.GateSettings], [wd, core.CoreSettings]):
        seen: dict[str, str] = {}
        for model in group:
            for key, field in model.model_fields.items():
                assert seen.setdefault(key, repr(field)) == repr(field), key


OFFERED: list[tuple[Any, dict[str, Any], list[str]]] = [
    (switching_plugin, {"turn_off_energy": 1e-3, **POINT}, ["turn-off"]),
    (switching_plugin, {"turn_on_time": 3e-8}, ["turn-on"]),
    (switching_plugin, POINT, []),
    (recovery, {"turn_on_energy": 1e-3, "recovery_in_turn_on": False, **POINT}, []),
    (recovery, {"turn_on_energy": 1e-3, "recovery_in_turn_on": True, **POINT}, ["recovery"]),
    (output_charge, {"turn_on_energy": 1e-3, "output_charge_in_turn_on": True, **POINT}, ["output charge"]),
    (winding_plugin, {"winding_resistance": 0.01, "turns": 16}, ["winding dc"]),
    (winding_plugin, {"winding_resistance": 0.01, **FOIL}, ["winding dc", "winding ac"]),
    (core, {"turns": 16}, []),
    (busbar, {"link_side_resistance": 1e-4}, ["busbar link side"]),
    (standby, {"standby_power": 18.0}, ["standby"]),
]


@pytest.mark.parametrize(("plugin", "keys", "mechanisms"), OFFERED)
def test_terms_follow_the_data(plugin: Any, keys: dict[str, Any], mechanisms: list[str]) -> None:
    """What is not offered here is what a report lists as not modelled."""
    model = plugin.loss_model()
    bound = model.settings.model_validate({k: v for k, v in keys.items() if k in model.settings.model_fields})
    assert [term.mechanism for term in model.terms(bound)] == mechanisms
