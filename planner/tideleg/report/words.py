"""Numbers, labels and answers as every page prints them: plain ASCII, so that any terminal shows them."""

from __future__ import annotations

from tideleg.coverage import flagged
from tideleg.limits import LimitCheck
from tideleg.outcome import Change, Coarser, CoolantLoss, GradeEntry, MissionResult, Outcome, PackAnswer
from tideleg.plan import GRADES
from tideleg.report.wear_words import life_answer
from tideleg.verdict import quantity_text

LIMIT_HEADS = ("limit", "found", "allowed", "margin", "in use", "at", "verdict")
PACK_HEADS = (
    "pack",
    "verdict",
    "then binds",
    "in use",
    "hottest junction",
    "efficiency",
    "curtailed",
    "least voltage",
    "state of charge at the end",
    "lost in the pack",
)
CHANGE_HEADS = ("change", "verdict", "then binds", "in use", "hottest junction", "efficiency", "damage")
BROKEN = "DOES NOT HOLD"

GUESS_MATTERS = 0.01
"""A guess on which more than this share of the loss rests stands on page one [-]."""

MOST_GUESSES = 6

MOST_NAMED = 4
"""How many tables page one names in a sentence; all stand in the warnings."""


def plain(name: str) -> str:
    """Return a slot or key as words."""
    return name.replace("_", " ")


def sentence(text: str) -> str:
    """Return the text with a capital and one full stop."""
    return f"{text[:1].upper()}{text[1:]}".rstrip(".") + "."


def time_text(seconds: float, mission: str) -> str:
    """Return an instant; to the millisecond, which is finer than profiles are logged."""
    return f"{round(seconds, 3):.12g} s of {mission}"


def limit_label(check: LimitCheck) -> str:
    """Return which limit of what, each word once: "link capacitor current" needs no "of link capacitor"."""
    if check.part == "mission" and check.mission is not None:
        return f"{check.name}, {check.mission}"
    part = plain(check.part)
    return check.name if part in check.name or part == "stage" else f"{check.name}, {part}"


def margin_text(check: LimitCheck) -> str:
    """Return the margin with its unit; a difference of temperatures is in K."""
    return quantity_text(check.margin, "K" if check.unit == "degC" else check.unit)


def instant(check: LimitCheck) -> str:
    """Return when and in which mission a limit's value was met; "-" where it is no matter of one instant."""
    return "-" if check.time_s is None or check.mission is None else time_text(check.time_s, check.mission)


def limit_cells(check: LimitCheck) -> tuple[str, ...]:
    """Return one limit as cells under `LIMIT_HEADS`."""
    return (
        limit_label(check),
        quantity_text(check.value, check.unit),
        quantity_text(check.limit, check.unit),
        margin_text(check),
        share_text(check.used),
        instant(check),
        "holds" if check.holds else BROKEN,
    )


def share_text(share: float | None) -> str:
    """Return a share of a limit in use as percent."""
    return "-" if share is None else f"{100.0 * share:.0f} %"


def change_cells(change: Change) -> tuple[str, ...]:
    """Return one change of the plan as cells under `CHANGE_HEADS`."""
    return (
        change.what,
        "holds" if change.holds else BROKEN,
        change.binding or "no limit stated",
        share_text(change.used),
        "-" if change.greatest_junction_degc is None else f"{change.greatest_junction_degc:.1f} degC",
        "-" if change.efficiency is None else efficiency_text(change.efficiency),
        "-" if change.damage is None else f"{change.damage:.3g} times",
    )


def pack_rows(outcome: Outcome) -> list[tuple[str, ...]]:
    """Return the new and the aged pack as columns beside the labels of `PACK_HEADS`."""
    columns = [_pack_cells(pack) for pack in outcome.packs]
    return list(zip(PACK_HEADS, *columns, strict=True))


def _pack_cells(pack: PackAnswer) -> tuple[str, ...]:
    ends = ", ".join(f"{name} {100.0 * soc:.1f} %" for name, soc in pack.end_soc.items())
    return (
        pack.pack,
        "holds" if pack.holds else BROKEN,
        pack.binding or "no limit stated",
        share_text(pack.used),
        "-" if pack.greatest_junction_degc is None else f"{pack.greatest_junction_degc:.1f} degC",
        "-" if pack.efficiency is None else efficiency_text(pack.efficiency),
        "-" if pack.curtailed_share is None else f"{100.0 * pack.curtailed_share:.3g} %",
        "-" if pack.least_voltage_v is None else f"{pack.least_voltage_v:.4g} V",
        ends or "-",
        "-" if pack.battery_heat_share is None else f"{100.0 * pack.battery_heat_share:.2f} % of its throughput",
    )


def efficiency_text(efficiency: float) -> str:
    """Return an efficiency as percent, or why there is none."""
    defined = efficiency == efficiency  # noqa: PLR0124  (nan is the only number unlike itself)
    return f"{100.0 * efficiency:.3f} %" if defined else "not defined: no energy is moved"


def answers(outcome: Outcome) -> list[tuple[str, str]]:
    """Return what a reviewer asks and what this run answers, in the order of asking."""
    return [
        ("Does it do the mission?", sentence(outcome.verdict)),
        ("With what margin?", _margin_answer(outcome)),
        ("What binds, and when?", _binding_answer(outcome)),
        ("How long does it last?", life_answer(outcome)),
        ("What would change the answer?", _change_answer(outcome)),
        ("How sure is it?", _sure_answer(outcome)),
    ]


def _margin_answer(outcome: Outcome) -> str:
    binding = outcome.binding
    if binding is None:
        return "None can be given: the plan states no limit that could be checked."
    left = "left" if binding.holds else "missing"
    found = f"{quantity_text(binding.value, binding.unit)} of {quantity_text(binding.limit, binding.unit)}"
    size = quantity_text(abs(binding.margin), "K" if binding.unit == "degC" else binding.unit)
    return f"{size} {left}: {found}, {share_text(binding.used)} of the limit in use."


def _binding_answer(outcome: Outcome) -> str:
    binding = outcome.binding
    worst = f"Worst instant: {time_text(outcome.worst.time_s, outcome.worst.mission)} ({outcome.worst.why})."
    if binding is None:
        return worst
    others = [check for check in outcome.limits if not check.holds and check is not binding]
    more = "".join(f"; also {limit_label(c)} at {share_text(c.used)}" for c in others)
    if binding.time_s is None:
        return f"{sentence(limit_label(binding) + ', no matter of one instant' + more)} {worst}"
    return sentence(f"{limit_label(binding)}, at {instant(binding)}{more}")


def _change_answer(outcome: Outcome) -> str:
    if not outcome.changes:
        return "Not asked in this run: it was made without re-runs."
    differing = [c for c in outcome.changes if c.holds != outcome.holds]
    count = len(outcome.changes)
    if not differing:
        worst = max(outcome.changes, key=lambda c: -1.0 if c.used is None else c.used)
        close = "" if worst.used is None else f"; the nearest to it is: {worst.what} ({share_text(worst.used)} in use)"
        return f"None of the {count} changes that were tried{close}."
    words = "; ".join(f"{c.what} ({c.binding}{'' if c.used is None else ', ' + share_text(c.used)})" for c in differing)
    verb = "would break" if outcome.holds else "would mend"
    return f"{len(differing)} of the {count} changes that were tried {verb} it: {words}."


def _sure_answer(outcome: Outcome) -> str:
    absent, warned = len(outcome.not_modelled), len(outcome.warnings)
    missing = "every mechanism known has data" if absent == 0 else f"{absent} things are not modelled for lack of data"
    warning = "no warnings" if warned == 0 else f"{warned} warning{'s' if warned > 1 else ''}"
    told = f"energy closes to {closure(outcome):.0e} of the throughput; {missing}; {warning} (listed below)"
    return sentence(f"{told}{_placeholder_words(outcome)}{_outside_words(outcome)}")


def _placeholder_words(outcome: Outcome) -> str:
    """Return how many parts are invented; "" where none is."""
    count = len(outcome.placeholders)
    return (
        f"; {count} part{'s are PLACEHOLDERS' if count > 1 else ' is a PLACEHOLDER'} with invented numbers"
        if count
        else ""
    )


def _outside_words(outcome: Outcome) -> str:
    """Return which tables of points were asked beyond what they cover by more than a hundredth; "" where none was."""
    beyond = [(m.name, entry) for m in outcome.missions for entry in flagged(m.outside)]
    named = ", ".join(
        f"{e.mechanism} of {plain(e.part)} ({100.0 * e.time_share:.2g} % of the time, {100.0 * e.energy_share:.2g} % of"
        f" its energy, {mission})"
        for mission, e in beyond[:MOST_NAMED]
    )
    more = f" and {len(beyond) - MOST_NAMED} more" if len(beyond) > MOST_NAMED else ""
    return f"; EXTRAPOLATED beyond the points given: {named}{more}" if beyond else ""


def closure(outcome: Outcome) -> float:
    """Return the greatest residual of the energy books over all missions, by magnitude [-]."""
    energies = [m.energy for m in outcome.missions]
    return max(max(abs(e.residual), abs(e.recomputed_residual)) for e in energies)


RESOLVED_SHARE, RESOLVED_K, RESOLVED_DAMAGE = 0.01, 1.0, 0.1
"""A merged profile that moves the answer by more than this share or this many kelvin was needed as fine as it is."""


def sureness(outcome: Outcome) -> list[str]:
    """Return how sure the answer is: closures, passes of the relaxation, loop gain, what a reader is warned of."""
    passes = max(m.passes for m in outcome.missions)
    lines = [
        f"energy in, out and lost closes to {closure(outcome):.0e} of the throughput, losses computed anew included",
        f"currents, losses and temperatures settled together in {passes} pass{'es' if passes > 1 else ''} at most",
    ]
    if outcome.thermal:
        hot = max(outcome.thermal, key=lambda entry: entry.loop_gain)
        lines.append(
            f"greatest thermal loop gain: {hot.loop_gain:.3f} ({plain(hot.part)}); at 1 no steady temperature exists"
        )
    else:
        lines.append("no temperature is modelled")
    if outcome.coolant_loss is not None:
        lines.append(_without_coolant(outcome.coolant_loss))
    lines += [_resolution(one) for one in outcome.coarser]
    lines += [*outcome.placeholders, *_grades(outcome)]
    lines += [f"warning: {warning}" for warning in outcome.warnings]
    return lines


def _without_coolant(loss: CoolantLoss) -> str:
    """Return what follows from a loss of coolant in words: how long a monitor has to act."""
    origin = f"if the coolant stops at {time_text(loss.time_s, loss.mission)} and {loss.power_w / 1e3:.4g} kW are held"
    part = plain(loss.part)
    if loss.seconds is None:
        return f"{origin}, no limit is reached within two hours; {part} comes nearest"
    if loss.runs_away:
        return f"{origin}, {part} finds no steady temperature after {loss.seconds:.3g} s"
    return f"{origin}, {part} reaches its {loss.limit_degc:g} degC after {loss.seconds:.3g} s"


def _grades(outcome: Outcome) -> list[str]:
    """Return how many numbers of parts are worth what, and the guesses that the most of the loss rests on."""
    if not outcome.grades:
        return []
    counts = {grade: sum(e.grade == grade for e in outcome.grades) for grade in GRADES}
    told = ", ".join(f"{count} {grade}" for grade, count in counts.items() if count)
    heavy = [e for e in outcome.grades if e.grade == "guess" and (e.loss_share or 0.0) > GUESS_MATTERS]
    warm = [e for e in outcome.grades if e.grade == "guess" and e.loss_share is None and e.touches]
    lines = [f"numbers of parts by what they are worth: {told}; the others are not graded"]
    lines += [f"guess: {_guess(entry)}" for entry in (*heavy[:MOST_GUESSES], *warm[:MOST_GUESSES])]
    rest = counts["guess"] - len(heavy[:MOST_GUESSES]) - len(warm[:MOST_GUESSES])
    return [*lines, f"{rest} more guesses stand in summary.json"] if rest > 0 else lines


def _guess(entry: GradeEntry) -> str:
    """Return one guess in words: key, share of the loss that rests on it, and what that is."""
    by_what: dict[str, list[str]] = {}
    for touched in entry.touches:
        what, _, part = touched.partition(" of ")
        by_what.setdefault(part, []).append(what)
    told = "; ".join(f"{', '.join(whats)} of {part}" for part, whats in by_what.items())
    if entry.loss_share is None:
        return f"{entry.key} sets the {told}"
    return f"{entry.key}: {100.0 * entry.loss_share:.2g} % of the loss rests on it ({told})"


LEAST_MERGED = 2
"""Where an error grows with the step, doubling the step moves the answer by about the error that is already there."""


def _resolution(one: Coarser) -> str:
    """Return one resolution test in words; a profile that still moves the answer is too coarse to be the last word."""
    moves = [f"the mean square battery current moves by {100.0 * one.mean_square_change:+.2f} %"]
    strong = abs(one.mean_square_change) > RESOLVED_SHARE
    if one.greatest_junction_change_k is not None:
        moves.append(f"the hottest junction by {one.greatest_junction_change_k:+.2f} K")
        strong = strong or abs(one.greatest_junction_change_k) > RESOLVED_K
    if one.damage_change is not None:
        moves.append(f"the damage by temperature by {100.0 * one.damage_change:+.0f} %")
        strong = strong or abs(one.damage_change) > RESOLVED_DAMAGE
    verdict = "the profile's own steps limit this answer" if strong else "the profile resolves this answer"
    told = f"{', '.join(moves[:-1])} and {moves[-1]}" if len(moves) > 1 else moves[0]
    trend = ""
    if strong and one.merged == LEAST_MERGED:
        trend = "; if the trend goes on below them, they hide about as much again, the other way round"
    return f"with every {one.merged} steps merged {told}: {verdict}{trend}"


def all_rules(outcome: Outcome) -> list[str]:
    """Return the rules of the page and of every mission's profile."""
    return [*outcome.rules, *(f"{m.name}: {rule}" for m in outcome.missions for rule in m.rules)]


YEAR_HEADS = ("a year", "passes", "hours", "through the battery", "lost in the stage", "share of the loss")


def year_rows(outcome: Outcome) -> list[tuple[str, ...]]:
    """Return the year as rows under `YEAR_HEADS`: every mission, standby, and what is left."""
    year = outcome.year
    if year is None:
        return []
    rows: list[tuple[str, ...]] = [
        (
            m.mission,
            f"{m.passes:g}",
            f"{m.hours:.5g} h",
            f"{m.throughput_kwh:.5g} kWh",
            f"{m.loss_kwh:.4g} kWh",
            f"{100.0 * m.loss_share:.3g} %",
        )
        for m in year.missions
    ]
    standing = (
        f"{year.standby_hours:.5g} h",
        "-",
        f"{year.standby_kwh:.4g} kWh",
        f"{100.0 * year.standby_share:.3g} %",
    )
    rows.append(("standing by", "-", *standing))
    return [*rows, ("parked, nothing drawn", "-", f"{year.parked_hours:.5g} h", "-", "-", "-")]


def choice_rows(outcome: Outcome) -> list[tuple[str, str]]:
    """Return what the topology chose in each mission, and what that was worth."""
    rows = []
    for mission in outcome.missions:
        choice = mission.choice
        if choice is None:
            continue
        shares = ", ".join(f"{word}: {100.0 * share:.1f} %" for word, share in choice.share_of_time.items())
        rows.append((f"{plain(choice.name)}, share of time, {mission.name}", shares))
        rows.append((f"changes an hour, {mission.name}", f"{choice.changes_per_hour:.4g}"))
        if choice.saved_j is not None:
            size, unit = energy_scale(abs(choice.saved_j))
            loss = mission.energy.loss_j
            share = f" ({100.0 * choice.saved_j / (loss + choice.saved_j):.2f} % of that loss)" if loss > 0.0 else ""
            rows.append(
                (
                    f"saved against {plain(choice.name)} {choice.plain} always, {mission.name}",
                    f"{choice.saved_j / size:.4g} {unit} a pass{share}, at the same temperatures",
                )
            )
    return rows


def energy_scale(greatest_j: float) -> tuple[float, str]:
    """Return the unit of energy that suits the greatest of a table, as (size [J], symbol)."""
    if greatest_j >= 3.6e6:
        return 3.6e6, "kWh"
    return (3.6e3, "Wh") if greatest_j >= 3.6e3 else (1.0, "J")


def _charge_moved(mission: MissionResult) -> str:
    """Return how far the state of charge moved, which stands beside every efficiency: energy left in the battery."""
    begin, end = mission.battery.start_soc, mission.battery.end_soc
    return "not modelled" if begin is None or end is None else f"{100.0 * (end - begin):+.2f} % of the capacity"


def energy_rows(outcome: Outcome) -> list[tuple[str, ...]]:
    """Return the energy accounts as rows, a column a mission."""
    accounts = [m.energy for m in outcome.missions]
    size, unit = energy_scale(max(max(a.throughput_j, a.requested_j) for a in accounts))
    labels = {
        "requested": "requested_j",
        "curtailed": "curtailed_j",
        "delivered to the link": "link_out_j",
        "taken from the link": "link_in_j",
        "given by the battery": "battery_out_j",
        "taken by the battery": "battery_in_j",
        "lost in the stage": "loss_j",
        "lost in the battery": "battery_heat_j",
    }
    rows = [(label, *(f"{getattr(a, key) / size:.5g} {unit}" for a in accounts)) for label, key in labels.items()]
    rows.append(("charge moved by one pass", *(_charge_moved(m) for m in outcome.missions)))
    rows.append(("closure: battery - link - loss, of throughput", *(f"{a.residual:.1e}" for a in accounts)))
    rows.append(("closure with losses computed anew", *(f"{a.recomputed_residual:.1e}" for a in accounts)))
    return rows
