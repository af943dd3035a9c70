"""Networks that cannot be are refused with what was found: nothing becomes NaN on the way."""

import pytest

from tideleg import InputError, Mass, Network, Path, Seat
from tideleg.heat import modes

PLATE = Network(("coolant",), (Mass("plate", 9.0),), (Path("plate", "coolant", 0.1),), (Seat("die", "plate"),))
INF, NAN = float("inf"), float("nan")


def test_the_sound_network_is_accepted():
    assert modes(PLATE).time_constants == pytest.approx([0.9])


@pytest.mark.parametrize(
    ("change", "said"),
    [
        ({"seats": (Seat("die", "plate"), Seat("die", "coolant"))}, "'die' stands twice; give every seated part"),
        ({"boundaries": ("coolant", "plate")}, "'plate' stands twice; give every place"),
        ({"seats": (Seat("die", "plate", (), 0),)}, "'die' has 0 copies"),
        ({"seats": (Seat("die", "plate", ((0.1, -1.0),)),)}, "0.1 K/W and -1 s"),
        ({"seats": (Seat("die", "plate", ((0.1, INF),)),)}, "both finite"),
        ({"seats": (Seat("die", "plate", ((NAN, 1.0),)),)}, "nan K/W"),
        ({"masses": (Mass("plate", INF),)}, "inf J/K"),
        ({"masses": (Mass("plate", NAN),)}, "nan J/K"),
        ({"masses": (Mass("plate", 1e-300),)}, "a place that follows at once has 0"),
        ({"seats": (Seat("die", "plate", ((0.1, 1e-300),)),)}, "a cell that follows at once has 0 s"),
        ({"paths": (Path("plate", "coolant", INF),)}, "inf K/W; it must be above zero and finite"),
        ({"paths": (Path("plate", "coolant", -0.1),)}, "-0.1 K/W"),
        ({"paths": (*PLATE.paths, Path("plate", "plate", 0.1))}, "must join two places"),
        ({"masses": (*PLATE.masses, Mass("joint", 0.0))}, "'joint' reaches no boundary"),
    ],
)
def test_a_network_that_cannot_be_is_refused(change, said):
    with pytest.raises(InputError, match=said):
        modes(PLATE._replace(**change))
