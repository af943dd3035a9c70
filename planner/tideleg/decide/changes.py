"""Changing one thing of a plan: every function returns a new plan and leaves the old one as it was."""

from __future__ import annotations

from tideleg.plan import Plan
from tideleg.quantity import parse


def with_stage(plan: Plan, **settings: object) -> Plan:
    """Return the plan with keys of [stage] changed or added."""
    stage = plan.stage.model_copy(update={"settings": {**plan.stage.settings, **settings}})
    return plan.model_copy(update={"stage": stage})


def with_topology(plan: Plan, name: str) -> Plan:
    """Return the plan with another topology."""
    return plan.model_copy(update={"stage": plan.stage.model_copy(update={"topology": name})})


def without_stage_key(plan: Plan, key: str) -> Plan:
    """Return the plan without one key of [stage]."""
    settings = {name: value for name, value in plan.stage.settings.items() if name != key}
    return plan.model_copy(update={"stage": plan.stage.model_copy(update={"settings": settings})})


def with_part(plan: Plan, table: str, **keys: object) -> Plan:
    """Return the plan with keys of one part table changed or added."""
    parts = {**plan.stage.parts, table: {**plan.stage.parts.get(table, {}), **keys}}
    return plan.model_copy(update={"stage": plan.stage.model_copy(update={"parts": parts})})


def with_inductance(plan: Plan, henry: float | str) -> Plan:
    """Return the plan with another inductance; a curve over current keeps its shape and is scaled with it."""
    curve = plan.stage.parts.get("inductor", {}).get("inductance_curve")
    if curve is None:
        return with_part(plan, "inductor", inductance=henry)
    points = [(parse(ampere, "current"), parse(value, "inductance")) for ampere, value in curve]
    factor = parse(henry, "inductance") / points[0][1]
    scaled = [[ampere, factor * value] for ampere, value in points]
    return with_part(plan, "inductor", inductance=henry, inductance_curve=scaled)


def with_cooling(plan: Plan, **keys: object) -> Plan:
    """Return the plan with keys of [cooling] changed or added."""
    if plan.cooling is None:
        raise ValueError("the plan has no [cooling] to change")
    cooling = plan.cooling.model_copy(update={"settings": {**plan.cooling.settings, **keys}})
    return plan.model_copy(update={"cooling": cooling})


def with_warmer_coolant(plan: Plan, kelvin: float) -> Plan:
    """Return the plan with every constant coolant temperature raised [K]."""
    missions = tuple(
        m if m.coolant is None else m.model_copy(update={"coolant": m.coolant + kelvin}) for m in plan.mission
    )
    return plan.model_copy(update={"mission": missions})


def with_aged_battery(plan: Plan) -> Plan:
    """Return the plan with its aged pack: every resistance grown, RC pairs included, and the capacity shrunk."""
    battery = plan.battery
    factor = battery.aged_resistance
    update: dict[str, object] = {
        "resistance": battery.resistance.scaled(factor),
        "rc_pairs": tuple((factor * ohms, seconds) for ohms, seconds in battery.rc_pairs),
    }
    if battery.resistance_charge is not None:
        update["resistance_charge"] = battery.resistance_charge.scaled(factor)
    if battery.capacity is not None:
        update["capacity"] = battery.aged_capacity * battery.capacity
    return plan.model_copy(update={"battery": battery.model_copy(update=update)})


def with_charge_limit(plan: Plan, ampere: float) -> Plan:
    """Return the plan with the battery's charge current limited [A]; what is asked beyond is curtailed."""
    return plan.model_copy(update={"battery": plan.battery.model_copy(update={"current_limit_charge": ampere})})


def stage_number(plan: Plan, key: str, dimension: str) -> float | None:
    """Return a quantity directly under [stage] in its base unit, or None where it is not given."""
    given = plan.stage.settings.get(key)
    return None if given is None else parse(given, dimension)


def inductance_of(plan: Plan) -> float | None:
    """Return the inductance at zero current [H], from its key or its curve; None where neither is given."""
    keys = plan.stage.parts.get("inductor", {})
    curve = keys.get("inductance_curve")
    if "inductance" in keys or curve is None:
        return part_number(plan, "inductor", "inductance", "inductance")
    return parse(curve[0][1], "inductance")


def part_number(plan: Plan, table: str, key: str, dimension: str) -> float | None:
    """Return a quantity of a part table in its base unit, or None where it is not given."""
    given = plan.stage.parts.get(table, {}).get(key)
    return None if given is None else parse(given, dimension)
