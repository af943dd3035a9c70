"""The report as one HTML file that needs nothing else: pictures and style are inside, no script, no link outwards."""

from __future__ import annotations

import base64
from collections.abc import Iterable, Mapping
from typing import Any

import jinja2

from tideleg.caution import ampere_text
from tideleg.outcome import LossEntry, MissionResult, Outcome, PartEntry, ThermalEntry
from tideleg.report import wear_words, words
from tideleg.report.drawing import Picture


def render_html(outcome: Outcome, pictures: Mapping[str, tuple[bytes, Picture]]) -> str:
    """Return the report; `pictures` are (PNG bytes, the picture with its words) by name."""
    environment = jinja2.Environment(
        loader=jinja2.PackageLoader("tideleg.report", "."),
        autoescape=True,
        undefined=jinja2.StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    shown = {
        name: {"png": base64.b64encode(png).decode("ascii"), "caption": picture.caption, "alt": picture.alt}
        for name, (png, picture) in pictures.items()
    }
    over_time = [name for name in shown if name.startswith(("power", "reach", "temperatures"))]
    content = _page_one(outcome) | _stage(outcome) | _books(outcome) | _wear(outcome)
    return environment.get_template("page.html.jinja").render(
        outcome=outcome, pictures=shown, over_time=over_time, broken=words.BROKEN, **content
    )


def _page_one(outcome: Outcome) -> dict[str, Any]:
    return {
        "verdict": words.sentence(outcome.verdict),
        "answers": words.answers(outcome),
        "limit_heads": words.LIMIT_HEADS,
        "limits": [words.limit_cells(check) for check in outcome.limits],
        "change_heads": words.CHANGE_HEADS,
        "pack_heads": ("", *(pack.pack for pack in outcome.packs)),
        "packs": words.pack_rows(outcome)[1:] if outcome.packs else [],
        "changes": [words.change_cells(change) for change in outcome.changes],
        "sure": words.sureness(outcome),
        "danger": danger_rows(outcome),
    }


def danger_rows(outcome: Outcome) -> list[tuple[str, str]]:
    """Return the caution's own numbers of this design, those not known said so."""
    s = outcome.safety
    low, seconds = s.discharge_to_v, s.discharge_within_s
    no_resistor = "none needed" if s.stored_energy_j is not None else "not known"
    return [
        ("highest voltage", f"{s.highest_voltage_v:.4g} V DC"),
        ("voltage class", s.voltage_class),
        ("energy stored in the link", _known(s.stored_energy_j, "J")),
        (
            f"greatest resistor to {low:g} V in {seconds:g} s",
            no_resistor
            if s.discharge_resistor_ohm is None
            else f"{s.discharge_resistor_ohm:.4g} ohm, {s.discharge_resistor_loss_w:.4g} W if always connected",
        ),
        (
            "prospective link-short current",
            "not known" if s.link_short_current_a is None else ampere_text(s.link_short_current_a),
        ),
        ("its first rise", f"{s.link_short_rise_a_per_us:.3g} A/us"),
        (
            "load dump to trip",
            _known(None if s.load_dump_time_to_trip_s is None else 1e3 * s.load_dump_time_to_trip_s, "ms"),
        ),
    ]


def _known(value: float | None, unit: str) -> str:
    return "not known" if value is None else f"{value:.4g} {unit}"


def _stage(outcome: Outcome) -> dict[str, Any]:
    return {
        "facts": list(outcome.stage_facts.items()),
        "parts": _parts(outcome.parts),
        "choices": words.choice_rows(outcome),
        "worst_text": _worst(outcome),
        "worst_values": [(words.plain(name), f"{value:.6g}") for name, value in outcome.worst.values.items()],
        "thermal": [_thermal(entry) for entry in outcome.thermal],
    }


def _books(outcome: Outcome) -> dict[str, Any]:
    size, unit = words.energy_scale(max((e.total_j for m in outcome.missions for e in m.losses), default=0.0))
    return {
        "losses": [(m.name, [_loss(entry, size, unit) for entry in m.losses]) for m in outcome.missions],
        "year_heads": words.YEAR_HEADS,
        "year": words.year_rows(outcome),
        "energy_heads": ("", *(m.name for m in outcome.missions)),
        "energy": words.energy_rows(outcome),
        "efficiency": words.efficiency_text(outcome.efficiency),
        "battery": [_battery(m) for m in outcome.missions],
        "depth_heads": DEPTH_HEADS,
        "depths": [(m.name, _depths(m)) for m in outcome.missions],
        "missions": [(m.name, f"{m.passes_per_year:g}", f"{len(m.steps)}", f"{m.passes}") for m in outcome.missions],
        "rules": words.all_rules(outcome),
        "inputs": list(outcome.inputs.sha256.items()),
        "versions": list(outcome.inputs.versions.items()),
        "seed": "none: nothing is left to chance" if outcome.inputs.seed is None else str(outcome.inputs.seed),
    }


def _wear(outcome: Outcome) -> dict[str, Any]:
    return {
        "heat_heads": wear_words.HEAT_HEADS,
        "heat": [wear_words.heat_cells(entry) for entry in outcome.wear.heat],
        "wear_heads": wear_words.WEAR_HEADS,
        "wear": [wear_words.wear_cells(part) for part in outcome.wear.parts],
        "consumer_heads": wear_words.CONSUMER_HEADS,
        "consumers": [wear_words.consumer_cells(one) for one in outcome.wear.consumers],
        "by_mission": wear_words.mission_rows(outcome),
        "residue": outcome.wear.residue,
    }


def _worst(outcome: Outcome) -> str:
    worst = outcome.worst
    return f"{words.time_text(worst.time_s, worst.mission)}: {worst.why}."


def _loss(entry: LossEntry, size: float, unit: str) -> tuple[str, ...]:
    joules = (entry.discharge_j, entry.charge_j, entry.idle_j, entry.total_j)
    return words.plain(entry.part), entry.mechanism, *(f"{j / size:.4g} {unit}" for j in joules)


def _thermal(entry: ThermalEntry) -> tuple[str, ...]:
    return (
        words.plain(entry.part),
        f"{entry.greatest_degc:.1f} degC",
        words.time_text(entry.time_s, entry.mission),
        f"{entry.mean_degc:.1f} degC",
        f"{entry.swing_k:.1f} K",
        f"{entry.loop_gain:.3f}",
    )


def _battery(mission: MissionResult) -> tuple[str, ...]:
    b = mission.battery
    return (
        mission.name,
        _span(b.start_soc, b.end_soc),
        _span(b.least_soc, b.greatest_soc),
        f"{b.throughput_ah:.4g} Ah, {b.throughput_wh / 1e3:.4g} kWh",
        "-" if b.equivalent_full_cycles is None else f"{b.equivalent_full_cycles:.3g}",
        f"{b.least_voltage_v:.4g} to {b.greatest_voltage_v:.4g} V",
        f"{b.greatest_discharge_a:.4g} A / {b.greatest_charge_a:.4g} A",
    )


DEPTH_HEADS = ("depth of the cycle", "cycles in one pass", "throughput of these, of the capacity")


def _depths(mission: MissionResult) -> list[tuple[str, ...]]:
    """Return the cycles of the state of charge by depth: what equal full cycles do not tell."""
    return [
        (f"{100.0 * low:g} to {100.0 * high:g} %", f"{count:g}", f"{100.0 * count * (low + high):.3g} %")
        for low, high, count in mission.battery.depth_cycles
    ]


def _span(begin: float | None, end: float | None) -> str:
    return "not modelled" if begin is None or end is None else f"{100 * begin:.1f} to {100 * end:.1f} %"


def _parts(parts: Iterable[PartEntry]) -> list[tuple[str, ...]]:
    """Return a row a part; data that repeat, as those of a leg's two switches do, are referred to."""
    rows: list[tuple[str, ...]] = []
    first: dict[str, str] = {}
    for part in parts:
        name, facts = words.plain(part.name), "; ".join(f"{label} {value}" for label, value in part.facts.items())
        told = f"as {first[facts]}" if facts in first else facts
        rows.append((name, part.kind, _number(part), told or "-"))
        if facts:
            first.setdefault(facts, name)
    return rows


def _number(part: PartEntry) -> str:
    if part.in_parallel == 1:
        return f"{part.copies}"
    chips = "a varying number of" if part.in_parallel == 0 else f"{part.in_parallel}"
    return f"{part.copies} places of {chips} chips"
