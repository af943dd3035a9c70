"""The report as one HTML file that needs nothing else: pictures and style are inside."""

from __future__ import annotations

import base64
from collections.abc import Mapping
from typing import Any

import jinja2

from tideleg.outcome import Outcome
from tideleg.report.words import (
    CHANGE_HEADS,
    KWH,
    LIMIT_HEADS,
    change_cells,
    energy_rows,
    limit_cells,
    plain,
    sureness,
)


def render_html(outcome: Outcome, pictures: Mapping[str, tuple[bytes, str]]) -> str:
    """Return the report; `pictures` are (PNG bytes, caption) by name."""
    environment = jinja2.Environment(
        loader=jinja2.PackageLoader("tideleg.report", "."), autoescape=True, undefined=jinja2.StrictUndefined
    )
    shown = {
        name: {"png": base64.b64encode(png).decode("ascii"), "caption": caption}
        for name, (png, caption) in pictures.items()
    }
    return environment.get_template("page.html.jinja").render(outcome=outcome, pictures=shown, **_content(outcome))


def _content(outcome: Outcome) -> dict[str, Any]:
    return {
        "limit_heads": LIMIT_HEADS,
        "limits": [limit_cells(check) for check in outcome.limits],
        "change_heads": CHANGE_HEADS,
        "changes": [change_cells(change) for change in outcome.changes],
        "sure": sureness(outcome),
        "facts": list(outcome.stage_facts.items()),
        "worst_text": _worst(outcome),
        "losses": [(m.name, [_loss(entry) for entry in m.losses]) for m in outcome.missions],
        "energy_heads": ("", *(m.name for m in outcome.missions)),
        "energy": energy_rows(outcome),
        "efficiency": f"{100.0 * outcome.efficiency:.3f} %",
        "thermal": [_thermal(entry) for entry in outcome.thermal],
        "battery": [_battery(m) for m in outcome.missions],
        "parts": [_part(part) for part in outcome.parts],
        "rules": [*outcome.rules, *(f"{m.name}: {rule}" for m in outcome.missions for rule in m.rules)],
        "inputs": list(outcome.inputs.sha256.items()),
        "versions": ", ".join(f"{name} {version}" for name, version in outcome.inputs.versions.items()),
    }


def _worst(outcome: Outcome) -> str:
    worst = outcome.worst
    names = ("power_w", "battery_voltage_v", "battery_current_a", "link_voltage_v", "duty_ratio", "loss_w")
    values = ", ".join(f"{name} {worst.values[name]:.5g}" for name in names if name in worst.values)
    return f"{worst.why} at {worst.time_s:.6g} s of {worst.mission}: {values}."


def _loss(entry: Any) -> tuple[str, ...]:
    joules = (entry.discharge_j, entry.charge_j, entry.idle_j, entry.total_j)
    return plain(entry.part), entry.mechanism, *(f"{j / KWH:.4g} kWh" for j in joules)


def _thermal(entry: Any) -> tuple[str, ...]:
    return (
        plain(entry.part),
        f"{entry.greatest_degc:.1f} degC",
        f"{entry.time_s:.6g} s, {entry.mission}",
        f"{entry.mean_degc:.1f} degC",
        f"{entry.swing_k:.1f} K",
        f"{entry.loop_gain:.3f}",
    )


def _battery(mission: Any) -> tuple[str, ...]:
    b = mission.battery
    known = b.start_soc is not None
    return (
        mission.name,
        f"{100 * b.start_soc:.1f} to {100 * b.end_soc:.1f} %" if known else "not modelled",
        f"{100 * b.least_soc:.1f} to {100 * b.greatest_soc:.1f} %" if known else "-",
        f"{b.throughput_ah:.4g} Ah",
        "-" if b.equivalent_full_cycles is None else f"{b.equivalent_full_cycles:.3g}",
        f"{b.least_voltage_v:.4g} to {b.greatest_voltage_v:.4g} V",
        f"{b.greatest_discharge_a:.4g} / {b.greatest_charge_a:.4g} A",
    )


def _part(part: Any) -> tuple[str, ...]:
    number = f"{part.copies}" if part.in_parallel == 1 else f"{part.copies} places of {part.in_parallel} chips"
    return plain(part.name), number, "; ".join(f"{label} {value}" for label, value in part.facts.items())
