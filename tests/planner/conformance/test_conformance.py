"""The kit keeps first-party plugins honest, and names what is wrong with a broken one, with the numbers."""

import dataclasses
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

from tideleg import Line, Waveform
from tideleg.command import main
from tideleg.conformance import loss_checks, topology_checks
from tideleg.conformance.by_plan import plugin_checks, shipped_plan
from tideleg.errors import InputError
from tideleg.plan import LifeTable, load_plan
from tideleg.registry import installed
from tideleg.starter import KINDS, new_plugin

KERBSIDE = load_plan(Path(__file__).parents[3] / "profiles" / "kerbside" / "plan.toml")
LIVES = {
    "switch": [
        {"model": "coffin-manson-arrhenius", "constants": "lesit-1997", "spread": 0.5},
        {"model": "cips-2008", "constants": "cips-2008", "blocking_voltage": "1200 V", "bond_current": "10 A",
         "bond_diameter": "300 um", "spread": 0.5},
        {"model": "norris-landzberg", "constants": "sac-2005", "test_cycles": 2500, "test_swing": "125 K",
         "test_maximum": "125 degC", "test_cycles_per_day": 24, "swing_range": ["20 K", "165 K"],
         "maximum_range": ["25 degC", "150 degC"], "cycles_per_day_range": [1, 2000], "spread": 0.6},
    ],
    "capacitor": [
        {"model": "capacitor-life", "rated_life": "60000 h", "rated_temperature": "85 degC", "rated_at": "core",
         "law": "ten-kelvin", "voltage_law": "none", "temperature_range": [50, 105], "spread": 0.3},
        {"model": "running-hours", "rated_hours": "60000 h", "runs": "always", "spread": 0.35},
    ],
}  # fmt: skip
WORN = [
    {
        "part": part,
        "key": f"life.{part}",
        "model": one["model"],
        "settings": {k: v for k, v in one.items() if k != "model"},
    }
    for part, models in LIVES.items()
    for one in models
]
LIFE = {"life": LifeTable.model_validate({"parts": WORN})}
KERBSIDE = KERBSIDE.model_copy(update=LIFE)
NAMES = sorted({plugin.name for plugin in installed().plugins})
EVERY = [
    check
    for name in NAMES
    for check in plugin_checks(name, shipped_plan(name, installed()).model_copy(update=LIFE), installed())
]


@pytest.mark.parametrize("check", EVERY, ids=lambda c: f"{c.plugin}:{c}")
def test_first_party_plugins_keep_every_promise(check):
    check()


class Spoiled:
    """A half-bridge whose answer is spoiled by a function."""

    def __init__(self, spoil):
        self._good, self._spoil = installed().topology("half-bridge"), spoil

    def __getattr__(self, name):
        return getattr(self._good, name)

    def operate(self, point, settings, inductance):
        return self._spoil(self._good.operate(point, settings, inductance))


def other_winding(factor, offset):
    def spoil(operation):
        winding = operation.windings["inductor"]
        moved = Waveform(
            tuple(
                s._replace(start=s.start * factor + offset, end=s.end * factor + offset)
                for s in winding.current.segments
            )
        )
        return operation._replace(windings={"inductor": winding._replace(current=moved)})

    return spoil


def no_link_current(operation):
    link = operation.exchanges["link_capacitor"]
    gone = link._replace(current=link.current.scaled(0.5))
    return operation._replace(exchanges={**operation.exchanges, "link_capacitor": gone})


def nan_duty(operation):
    return operation._replace(duty_ratio=operation.duty_ratio * np.nan)


def high_block(operation):
    upper = operation.positions["upper_switch"]._replace(blocks=1e5)
    return operation._replace(positions={**operation.positions, "upper_switch": upper})


@pytest.mark.parametrize(
    ("spoil", "promise"),
    [
        (other_winding(2.0, 0.0), "volt-seconds balance"),
        (no_link_current, "power balances"),
        (nan_duty, "every number is finite"),
        (high_block, "block what the ports imply"),
        (lambda o: o._replace(reason=np.full_like(o.reason, 9)), "cannot operate"),
        (lambda o: o._replace(windings={}), "every slot has its waveform"),
    ],
)
def test_a_broken_topology_fails_with_the_promise_and_numbers(spoil, promise):
    checks = topology_checks(Spoiled(spoil), {"switching_frequency": "40 kHz"})
    said = []
    for check in checks:
        try:
            check()
        except (AssertionError, KeyError, IndexError, ValueError) as error:
            said.append(str(error))
    assert any(promise in text for text in said), said


@dataclasses.dataclass(frozen=True)
class Term:
    """A loss term that breaks one promise."""

    watts: object
    slope: object = staticmethod(lambda current: 0.0 * current)
    mechanism: str = "bad"
    ohmic: bool = False
    heats: bool = True

    def at(self, part, timing, temperature):
        current = part.current.segments[0].start + 0.0 * temperature
        return Line(self.watts(current), self.slope(current))


@pytest.mark.parametrize(
    ("term", "promise"),
    [
        (Term(lambda i: -np.abs(i)), "never negative"),
        (Term(lambda i: np.where(i > 0, 5.0, 0.0)), "no jump"),
        (Term(np.abs, np.abs), "slope in temperature"),
    ],
)
def test_a_broken_loss_fails_with_the_promise(term, promise):
    good = next(m for m in installed().loss_models() if m.name == "channel")
    bad = type("Bad", (), {"name": "bad", "reads": "switch", "mechanisms": ("bad",), "settings": good.settings})()
    bad.terms = lambda settings: (term,) if settings.on_resistance else ()
    said = []
    for check in loss_checks(bad, {"on_resistance": "5 mohm"}):
        try:
            check()
        except AssertionError as error:
            said.append(str(error))
    assert any(promise in text for text in said), said


@pytest.mark.parametrize("kind", KINDS)
def test_a_new_plugin_passes_its_own_test_as_written(kind, tmp_path):
    new_plugin(kind, "first-try", tmp_path / "p")
    command = [sys.executable, "-m", "pytest", "-q", "-p", "no:cacheprovider", str(tmp_path / "p" / "tests")]
    done = subprocess.run(
        command,
        capture_output=True,
        text=True,
        check=False,
        cwd=tmp_path,
        env={"PYTHONPATH": str(tmp_path / "p" / "src")},
    )
    assert done.returncode == 0, done.stdout + done.stderr


@pytest.mark.parametrize(
    ("kind", "name", "said"),
    [("fan", "x", "found the kind 'fan'"), ("loss", "Bad Name", "lower-case words"), ("loss", "import", "lower-case")],
)
def test_what_is_no_plugin_name_is_refused(kind, name, said, tmp_path):
    with pytest.raises(InputError, match=said):
        new_plugin(kind, name, tmp_path / "p")


def test_from_the_command_line(capsys, tmp_path):
    assert main(["plugins", "check", "half-bridge"]) == 0
    assert "every promise kept" in capsys.readouterr().out
    assert main(["plugins", "check", "half-brige"]) == 2
    assert main(["plugins", "new", "loss", "my-loss", str(tmp_path / "n")]) == 0
    assert main(["plugins", "new", "loss", "my-loss", str(tmp_path / "n")]) == 2


class Extrapolating:
    """A term of a loss model that says wrongly where it was asked beyond its table."""

    mechanism, ohmic, heats = "made up", False, True

    def __init__(self, outside):
        self.outside = outside

    def at(self, part, timing, temperature):
        watts = np.zeros_like(temperature)
        return Line(watts, watts)


@pytest.mark.parametrize(
    "outside",
    [
        lambda part, timing, temperature: np.zeros(np.shape(temperature)),
        lambda part, timing, temperature: np.zeros((7, 3), dtype=bool),
    ],
    ids=["numbers", "another shape"],
)
def test_a_mask_of_what_lies_outside_that_is_none_is_named(outside):
    model = dataclasses.replace(installed().loss_models()[0])

    class Model:
        name, mechanisms, reads = "made-up", ("made up",), "switch"
        settings = model.settings

        @staticmethod
        def terms(settings):
            return (Extrapolating(outside),)

    (check,) = [c for c in loss_checks(Model(), {}) if "tells-where" in str(c)]
    with pytest.raises(AssertionError, match="beyond its table"):
        check()
