"""The new pack and the aged one side by side: the same plan run with more resistance and less capacity."""

from __future__ import annotations

from tideleg.decide.changes import with_aged_battery
from tideleg.errors import InputError, NoEquilibriumError
from tideleg.outcome import Outcome, PackAnswer
from tideleg.plan import Plan
from tideleg.registry import Registry
from tideleg.running import Progress, run


def both_packs(
    plan: Plan, outcome: Outcome, *, registry: Registry | None = None, progress: Progress | None = None
) -> tuple[PackAnswer, ...]:
    """Return the answer with the new pack, which `outcome` holds, and with the aged one, which is run here.

    An ideal battery, without resistance and capacity, does not age: nothing is returned.
    """
    battery = plan.battery
    if battery.capacity is None and not any(ohms > 0.0 for ohms in battery.resistance.value):
        return ()
    words = f"aged: resistance times {battery.aged_resistance:g}"
    if battery.capacity is not None:
        words += f", capacity {100.0 * battery.aged_capacity:g} %"
    try:
        aged = _answer(words, run(with_aged_battery(plan), registry=registry, progress=progress))
    except NoEquilibriumError:
        aged = _none(words, "no thermal equilibrium")
    except InputError as error:
        aged = _none(words, f"cannot operate: {error}")
    return _answer("new", outcome), aged


def _none(words: str, why: str) -> PackAnswer:
    return PackAnswer(words, False, why, None, None, None, None, None, {}, None)


def _answer(words: str, outcome: Outcome) -> PackAnswer:
    switches = {part.name for part in outcome.parts if part.kind == "switch"}
    energies = [mission.energy for mission in outcome.missions]
    requested = sum(e.requested_j for e in energies)
    throughput = sum(e.throughput_j for e in energies)
    ends = {m.name: m.battery.end_soc for m in outcome.missions}
    binding = outcome.binding
    return PackAnswer(
        pack=words,
        holds=outcome.holds,
        binding="" if binding is None else f"{binding.name} of {binding.part.replace('_', ' ')}",
        used=None if binding is None else binding.used,
        greatest_junction_degc=max((t.greatest_degc for t in outcome.thermal if t.part in switches), default=None),
        efficiency=outcome.efficiency,
        curtailed_share=sum(e.curtailed_j for e in energies) / requested if requested > 0.0 else 0.0,
        least_voltage_v=min(m.battery.least_voltage_v for m in outcome.missions),
        end_soc={name: soc for name, soc in ends.items() if soc is not None},
        battery_heat_share=sum(e.battery_heat_j for e in energies) / throughput if throughput > 0.0 else 0.0,
    )
