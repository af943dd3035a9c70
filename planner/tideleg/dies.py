"""Which dies stand in one place for a switch: the switch, its separate diode, and the chip that takes the most.

A topology states one current for a position. What carries it is a matter of the part: a table [stage.switch.diode]
puts a diode on a die of its own beside the switch; a sharing spread sets the chip that takes more than its share apart
from the others. Each die has its own losses, seat and columns, and reads the position of its place, scaled to one chip.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from typing import Any, NamedTuple

from tideleg.contract import LossModel, Slot
from tideleg.errors import InputError
from tideleg.waveform import Values

DIODE = "diode"
"""Name of the table in a switch's table that gives a diode of its own, and the end of that part's name."""


class Die(NamedTuple):
    """One sort of chip in a place.

    slot : name, kind and table of the part
    chips : how many such chips share the place
    share : current of one of them over that of the place [-]
    decides : False for the chips that carry less than their share: the other one is hotter and binds
    """

    slot: Slot
    chips: int
    share: Values
    decides: bool = True


class Placed(NamedTuple):
    """A sort of part and where it stands.

    slot : of the topology, or made for a diode beside a switch
    place : name of the topology's slot whose current it carries
    has_diode : whether it is a switch with a diode of its own beside it
    """

    slot: Slot
    place: str
    has_diode: bool


def with_diodes(slots: tuple[Slot, ...], parts: Mapping[str, Mapping[str, Any]]) -> Iterator[Placed]:
    """Yield every slot of a topology; the diode that its table gives follows a switch."""
    for slot in slots:
        has_diode = slot.kind == "switch" and isinstance(parts.get(slot.table, {}).get(DIODE), Mapping)
        yield Placed(slot, slot.name, has_diode)
        if has_diode:
            diode = Slot(f"{slot.name}_{DIODE}", "diode", f"{slot.table}.{DIODE}", slot.copies)
            yield Placed(diode, slot.name, False)


def dies_of(slot: Slot, chips: int, spread: float) -> tuple[Die, ...]:
    """Return the dies of one slot.

    Parameters
    ----------
    chips : in parallel in one place
    spread : by how much of the equal share one chip carries more [-]; the others carry what is left, alike
    """
    if chips > 1 and spread > 0.0:
        most = (1.0 + spread) / chips
        others = Die(slot._replace(name=f"{slot.name}_others"), chips - 1, (1.0 - most) / (chips - 1), decides=False)
        return Die(slot, 1, most), others
    return (Die(slot, chips, 1.0 / chips),)


def refuse_wrong_ways(slot: Slot, models: Iterable[LossModel], has_diode: bool) -> None:
    """Raise InputError where reverse current would be carried by two dies, or by none.

    models : those that offer a term for the switch
    """
    for model in models:
        carries = getattr(model, "carries", None)
        what = " and ".join(model.mechanisms)
        if carries == "forward" and not has_diode:
            raise InputError(
                f"[stage.{slot.table}.{DIODE}] is missing: {what} of {slot.name} (loss {model.name}) carries forward"
                " current alone, so the reverse current needs a diode of its own; give that table"
            )
        if carries in ("reverse", "both") and has_diode:
            raise InputError(
                f"{what} of {slot.name} (loss {model.name}) counts reverse current, which"
                f" [stage.{slot.table}.{DIODE}] counts as well; move those keys to that table, or drop it"
            )


def leaves_to_diode(model: LossModel) -> bool:
    """Whether a mechanism of a switch is no matter of the switch's own die once it has a diode beside it."""
    return getattr(model, "carries", None) == "reverse"
