"""Numbers and labels as every page prints them."""

from __future__ import annotations

from tideleg.limits import LimitCheck
from tideleg.outcome import Change, Outcome
from tideleg.verdict import quantity_text

KWH = 3.6e6


def plain(name: str) -> str:
    """Return a slot or key as words."""
    return name.replace("_", " ")


def instant(check: LimitCheck) -> str:
    """Return when and in which mission a limit's value was met."""
    return "-" if check.time_s is None else f"{check.time_s:.6g} s, {check.mission}"


def limit_cells(check: LimitCheck) -> tuple[str, ...]:
    """Return one limit as cells: name, part, found, allowed, margin, share in use, instant, holds."""
    return (
        check.name,
        plain(check.part),
        quantity_text(check.value, check.unit),
        quantity_text(check.limit, check.unit),
        quantity_text(check.margin, "K" if check.unit == "degC" else check.unit),
        f"{100.0 * check.used:.0f} %",
        instant(check),
        "holds" if check.holds else "DOES NOT HOLD",
    )


LIMIT_HEADS = ("limit", "part", "found", "allowed", "margin", "in use", "at", "")


def change_cells(change: Change) -> tuple[str, ...]:
    """Return one change of the plan as cells: what, holds, binding, share in use, hottest junction, efficiency."""
    return (
        change.what,
        "holds" if change.holds else "DOES NOT HOLD",
        change.binding or "no limit stated",
        "-" if change.used is None else f"{100.0 * change.used:.0f} %",
        "-" if change.greatest_junction_degc is None else f"{change.greatest_junction_degc:.1f} degC",
        "-" if change.efficiency is None else f"{100.0 * change.efficiency:.2f} %",
    )


CHANGE_HEADS = ("change", "", "then binds", "in use", "hottest junction", "efficiency")


def energy_rows(outcome: Outcome) -> list[tuple[str, ...]]:
    """Return the energy accounts as rows, a column a mission."""
    accounts = [m.energy for m in outcome.missions]
    labels = {
        "delivered to the link": "link_out_j",
        "taken from the link": "link_in_j",
        "given by the battery": "battery_out_j",
        "taken by the battery": "battery_in_j",
        "lost in the stage": "loss_j",
        "lost in the battery": "battery_heat_j",
        "requested": "requested_j",
        "curtailed": "curtailed_j",
    }
    rows = [(label, *(f"{getattr(a, key) / KWH:.5g} kWh" for a in accounts)) for label, key in labels.items()]
    rows.append(("books: in - out - loss, of throughput", *(f"{a.residual:.1e}" for a in accounts)))
    rows.append(("books with losses computed anew", *(f"{a.recomputed_residual:.1e}" for a in accounts)))
    return rows


def sureness(outcome: Outcome) -> list[str]:
    """Return how sure the answer is: closures, what is not modelled, what a reader is warned of."""
    worst = max(max(m.energy.residual, m.energy.recomputed_residual) for m in outcome.missions)
    lines = [f"energy books close to {worst:.0e} of the throughput; the relaxation settled at every step"]
    lines.append(
        f"{len(outcome.not_modelled)} mechanisms or temperatures are not modelled for lack of data (listed below)"
        if outcome.not_modelled
        else "every mechanism that the installed plugins know has data"
    )
    lines += list(outcome.warnings)
    return lines
