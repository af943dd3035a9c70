"""Plugins are found by entry point, sorted by name, and the broken one is named while the rest go on."""

import sys
import types
from importlib import metadata

import pytest

from tideleg.errors import InputError, PluginError
from tideleg.registry import call_plugin, collect, installed


class Distribution:
    """Stands in for an installed distribution: the registry reads only its name and version."""

    name, version = "stranger", "2.1"


class Entry(metadata.EntryPoint):
    """An entry point of that distribution."""

    dist = Distribution()


@pytest.fixture
def module(monkeypatch):
    """Make an importable module from source text."""

    def make(name, text):
        made = types.ModuleType(name)
        exec(text, made.__dict__)
        monkeypatch.setitem(sys.modules, name, made)
        return Entry(name, name, "tideleg")

    return make


GOOD = """
from tideleg import hookimpl
from tideleg_topologies import half_bridge

class Renamed:
    def __init__(self, name): self.name = name
    def __getattr__(self, key): return getattr(half_bridge.topology(), key)

@hookimpl
def topology(): return Renamed("{name}")
"""


def test_first_party_plugins_register_as_a_strangers_would():
    kinds = {(p.kind, p.name) for p in installed().plugins}
    assert {("topology", "half-bridge"), ("topology", "interleaved"), ("cooling", "plate")} <= kinds
    assert installed().faults == ()
    assert all(p.distribution == "tideleg" for p in installed().plugins)


def test_order_is_by_name_whatever_the_order_of_installation(module):
    entries = [module("zeta", GOOD.format(name="zeta")), module("alpha", GOOD.format(name="alpha"))]
    assert [p.name for p in collect(entries).plugins] == ["alpha", "zeta"]
    assert [p.name for p in collect(reversed(entries)).plugins] == ["alpha", "zeta"]


def test_a_plugin_that_cannot_be_imported_is_named_and_the_rest_go_on(module):
    good = module("alpha", GOOD.format(name="alpha"))
    registry = collect([Entry("lost", "no_such_module", "tideleg"), good])
    assert [p.name for p in registry.plugins] == ["alpha"]
    sentence = registry.faults[0].sentence()
    assert "plugin 'lost' (no_such_module, from stranger 2.1) could not be loaded: ModuleNotFoundError" in sentence


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("from tideleg import hookimpl\n@hookimpl\ndef topology(): raise RuntimeError('boom')", "RuntimeError: boom"),
        ("from tideleg import hookimpl\n@hookimpl\ndef topolgy(): return 1", "unknown hook 'topolgy'"),
        ("x = 1", "implements no hook"),
        ("from tideleg import hookimpl\n@hookimpl\ndef topology(): return object()", "lacks"),
    ],
)
def test_each_way_to_be_broken_is_said_with_its_origin(module, text, said):
    registry = collect([module("bad", text)])
    assert registry.plugins == ()
    assert any(said in fault.sentence() and "from stranger 2.1" in fault.sentence() for fault in registry.faults)


def test_two_plugins_of_one_name_are_refused_not_picked_from(module):
    registry = collect([module("first", GOOD.format(name="twin")), module("second", GOOD.format(name="twin"))])
    assert registry.plugins == ()
    assert {fault.module for fault in registry.faults} == {"first", "second"}
    with pytest.raises(PluginError, match="shares the topology name 'twin'"):
        registry.topology("twin")


def test_a_missing_plugin_is_bad_input_with_the_installed_names_and_the_nearest():
    with pytest.raises(InputError, match=r"no topology plugin named 'half-brige'.*half-bridge.*Did you mean"):
        installed().topology("half-brige")


def test_what_plugin_code_raises_names_the_plugin():
    topology = installed().topology("half-bridge")

    def fail():
        raise ZeroDivisionError("float division")

    with pytest.raises(PluginError, match=r"'half-bridge' \(tideleg_topologies.half_bridge, from .*ZeroDivision"):
        call_plugin(installed(), topology, fail)
