"""Finding the plugins, and naming the broken one.

Plugins are entry points of the group `tideleg`; each names a module that implements some of the hooks in
`contract.Hooks`. First-party plugins register exactly so. A plugin that cannot be loaded, or whose hook raises, is
kept as a fault with its distribution; the rest go on, and only work that needs it fails.
"""

from __future__ import annotations

import difflib
import functools
from collections.abc import Callable, Iterable
from importlib import metadata
from typing import Any, NamedTuple, TypeVar

import pluggy

from tideleg.contract import PROJECT, CoolingModel, Hooks, LossModel, Topology
from tideleg.errors import PluginError
from tideleg.source import ProfileSource
from tideleg.stress import LifeModel

KINDS: dict[str, type] = {
    "topology": Topology,
    "loss_model": LossModel,
    "cooling_model": CoolingModel,
    "life_model": LifeModel,
    "profile_source": ProfileSource,
}
"""Hook name -> what it must offer."""

KIND_WORDS = {
    "topology": "topology",
    "loss_model": "loss",
    "cooling_model": "cooling",
    "life_model": "life",
    "profile_source": "profile",
}

Offer = TypeVar("Offer")


class Plugin(NamedTuple):
    """One thing that a plugin offers.

    name : its own name, unique within its kind
    kind : "topology", "loss", "cooling", "life" or "profile"
    offer : the object itself
    module, distribution, version : where it came from
    """

    name: str
    kind: str
    offer: Any
    module: str
    distribution: str
    version: str


class Fault(NamedTuple):
    """A plugin that could not be used: entry-point name, where it came from, and what happened."""

    name: str
    module: str
    distribution: str
    version: str
    what: str

    def sentence(self) -> str:
        """Return the fault as one line for a person."""
        return f"plugin '{self.name}' ({self.module}, from {self.distribution} {self.version}) {self.what}"


class Registry:
    """All plugins that are installed, sorted by name, and the faults of those that are broken."""

    def __init__(self, plugins: Iterable[Plugin], faults: Iterable[Fault]) -> None:
        self.faults = tuple(faults)
        self.plugins = tuple(sorted(plugins, key=lambda p: (p.kind, p.name)))

    def topology(self, name: str) -> Topology:
        """Return the topology of that name.

        Raises
        ------
        PluginError
            If none is installed, with the names that are and the faults that may be why.
        """
        found: Topology = self._named("topology", name)
        return found

    def cooling(self, name: str) -> CoolingModel:
        """Return the cooling model of that name; raises PluginError as `topology` does."""
        found: CoolingModel = self._named("cooling", name)
        return found

    def life(self, name: str) -> LifeModel:
        """Return the life model of that name; raises PluginError as `topology` does."""
        found: LifeModel = self._named("life", name)
        return found

    def life_models(self) -> tuple[LifeModel, ...]:
        """Return every life model, by name."""
        return tuple(p.offer for p in self.plugins if p.kind == "life")

    def profile_source(self, name: str) -> ProfileSource:
        """Return the profile source of that name; raises PluginError as `topology` does."""
        found: ProfileSource = self._named("profile", name)
        return found

    def profile_sources(self) -> tuple[ProfileSource, ...]:
        """Return every profile source, by name."""
        return tuple(p.offer for p in self.plugins if p.kind == "profile")

    def topologies(self) -> tuple[Topology, ...]:
        """Return every topology, by name."""
        return tuple(p.offer for p in self.plugins if p.kind == "topology")

    def loss_models(self) -> tuple[LossModel, ...]:
        """Return every loss model, by name."""
        return tuple(p.offer for p in self.plugins if p.kind == "loss")

    def cooling_models(self) -> tuple[CoolingModel, ...]:
        """Return every cooling model, by name."""
        return tuple(p.offer for p in self.plugins if p.kind == "cooling")

    def _named(self, kind: str, name: str) -> Any:
        known = {p.name: p.offer for p in self.plugins if p.kind == kind}
        if name in known:
            return known[name]
        close = difflib.get_close_matches(name, known, n=1)
        hint = f" Did you mean {close[0]!r}?" if close else ""
        broken = "".join(f"\n  {fault.sentence()}" for fault in self.faults)
        broken = f"\nPlugins that could not be used:{broken}" if broken else ""
        installed = ", ".join(known) or "none"
        raise PluginError(
            f"no {kind} plugin named {name!r} is installed; installed: {installed}.{hint}"
            f" Install the distribution that brings it, or choose one of these.{broken}"
        )

    def owner(self, offer: object) -> str:
        """Return where an offer came from, for messages: name, module, distribution and version."""
        for p in self.plugins:
            if p.offer is offer:
                return f"{p.kind} plugin '{p.name}' ({p.module}, from {p.distribution} {p.version})"
        return f"plugin {offer!r}"


def call_plugin(registry: Registry, offer: object, work: Callable[[], Offer]) -> Offer:
    """Run plugin code; whatever it raises becomes a PluginError that names the plugin.

    Errors of tideleg itself and of pydantic pass as they are: they speak about the person's input, not the plugin.
    """
    from pydantic import ValidationError

    from tideleg.errors import TidelegError

    try:
        return work()
    except (TidelegError, ValidationError):
        raise
    except Exception as error:
        raise PluginError(f"{registry.owner(offer)} raised {type(error).__name__}: {error}") from error


def collect(entries: Iterable[metadata.EntryPoint]) -> Registry:
    """Load plugins from entry points; sorted by name, so that the order never depends on installation."""
    manager = pluggy.PluginManager(PROJECT)
    manager.add_hookspecs(Hooks)
    plugins: list[Plugin] = []
    faults: list[Fault] = []
    for entry in sorted(entries, key=lambda e: (e.name, e.value)):
        origin = _origin(entry)
        try:
            module = entry.load()
            manager.register(module, name=f"{entry.name} ({origin.distribution})")
        except Exception as error:
            faults.append(origin.fault(f"could not be loaded: {type(error).__name__}: {error}"))
            continue
        implemented = {caller.name for caller in manager.get_hookcallers(module) or ()}
        _gather(module, implemented, origin, plugins, faults)
    return _without_twins(plugins, faults)


class _Origin(NamedTuple):
    name: str
    module: str
    distribution: str
    version: str

    def fault(self, what: str) -> Fault:
        return Fault(*self, what)


def _gather(module: Any, implemented: set[str], origin: _Origin, plugins: list[Plugin], faults: list[Fault]) -> None:
    """Call every hook that one plugin implements and keep what it offers, or its fault."""
    hooks = ", ".join(KINDS)
    unknown = sorted(implemented - set(KINDS))
    faults += [origin.fault(f"implements the unknown hook {name!r}; hooks are {hooks}") for name in unknown]
    if not implemented:
        faults.append(origin.fault(f"implements no hook; hooks are {hooks}"))
    for hook, protocol in KINDS.items():
        if hook not in implemented:
            continue
        try:
            offer: Any = getattr(module, hook)()
        except Exception as error:
            faults.append(origin.fault(f"raised in hook {hook!r}: {type(error).__name__}: {error}"))
            continue
        lacking = [name for name in _members(protocol) if not hasattr(offer, name)]
        if lacking:
            faults.append(origin.fault(f"offered no {KIND_WORDS[hook]} model in hook {hook!r}: it lacks {lacking}"))
        else:
            plugins.append(Plugin(offer.name, KIND_WORDS[hook], offer, *origin[1:]))


def _members(protocol: type) -> list[str]:
    return sorted(name for name in vars(protocol) if not name.startswith("_"))


def _without_twins(plugins: list[Plugin], faults: list[Fault]) -> Registry:
    """Refuse two plugins of one kind and name: neither is picked, both are named."""
    seen: dict[tuple[str, str], list[Plugin]] = {}
    for plugin in plugins:
        seen.setdefault((plugin.kind, plugin.name), []).append(plugin)
    single = [group[0] for group in seen.values() if len(group) == 1]
    for group in seen.values():
        for plugin in group if len(group) > 1 else ():
            others = ", ".join(f"{p.module} from {p.distribution}" for p in group if p is not plugin)
            what = f"shares the {plugin.kind} name {plugin.name!r} with {others}; neither is used, remove one"
            faults.append(Fault(plugin.name, plugin.module, plugin.distribution, plugin.version, what))
    return Registry(single, faults)


def _origin(entry: metadata.EntryPoint) -> _Origin:
    distribution = entry.dist
    if distribution is None:
        return _Origin(entry.name, entry.value, "an unnamed distribution", "?")
    return _Origin(entry.name, entry.value, distribution.name, distribution.version)


@functools.cache
def installed() -> Registry:
    """Return the registry of everything installed; read once in a process."""
    return collect(tuple(metadata.entry_points(group=PROJECT)))
