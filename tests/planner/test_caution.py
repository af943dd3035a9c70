"""The caution: what it must say, what it must not claim, and what it says it does not know."""

import dataclasses
import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tideleg.caution import SafetyFacts, safety, voltage_class
from tideleg.errors import InputError

TRUCK = SafetyFacts(830.0, 453.0, 750.0, 830.0, 900e-6, 220e-6, 453.0, 0.055, 0.0006, 110e-6, 4, 165e3)


def changed(**facts):
    return safety(dataclasses.replace(TRUCK, **facts))


def text(found):
    return " ".join(found.sentences)


def test_it_carries_this_designs_own_numbers():
    found = safety(TRUCK)
    for said in ("830 V DC", "310 J", "900 uF: the whole bus", "2115 ohm", "266 W", "1.62 J", "8147 A", "16.5 A/us"):
        assert said in text(found), said
    assert "from 750 V to its trip voltage of 830 V in 0.345 ms" in text(found)
    assert found.unknown == ()


@pytest.mark.parametrize(
    "duty",
    [
        "licensed or qualified persons",
        "local code",
        "upper diodes",
        "cannot interrupt it: a fuse and a contactor",
        "measure both ports before touching",
        "once the battery is disconnected",
        "planning estimates",
        "no statement of compliance",
    ],
)
def test_every_duty_is_named_whatever_is_missing(duty):
    bare = changed(
        bus_capacitance_f=None, stage_link_capacitance_f=None, trip_voltage_v=None, battery_resistance_ohm=0.0
    )
    assert duty in text(safety(TRUCK))
    # without a capacitance no resistor is advised, so nothing is said of when it would act
    assert duty in text(bare) or duty == "once the battery is disconnected"


def test_rules_stand_with_their_figures_because_they_differ():
    said = text(safety(TRUCK))
    for figure, rule in (("1 s", "FMVSS 305"), ("5 s", "IEC 60204-1"), ("10 s", "ISO 6469-4:2015"), ("60 s", "UN R94")):
        assert figure in said, figure
        assert rule in said, rule
    assert "0.2 J" in said
    assert "45, 50 or 60 uC" in said


def test_what_is_missing_is_said_and_not_guessed():
    found = changed(
        bus_capacitance_f=None, stage_link_capacitance_f=None, battery_resistance_ohm=0.0, path_resistance_ohm=0.0
    )
    nothing = (found.capacitance_f, found.stored_energy_j, found.discharge_resistor_ohm, found.load_dump_time_to_trip_s)
    assert nothing == (None,) * 4
    assert found.link_short_current_a is None
    assert "Stored energy of the link is not known: no bus capacitance is given" in text(found)
    assert "do not bound" in text(found)
    assert len(found.unknown) == 3


def test_the_stages_own_capacitor_is_used_and_named_where_the_bus_is_not_given():
    found = changed(bus_capacitance_f=None)
    assert found.capacitance_f == 220e-6
    assert "own link capacitor only" in text(found)
    assert "with the stage's own capacitor alone" in text(found)


@pytest.mark.parametrize(
    ("facts", "reason"),
    [
        ({"trip_voltage_v": None}, "no trip voltage is given"),
        ({"trip_voltage_v": 750.0}, "does not lie above the link voltage"),
        ({"greatest_discharge_w": 0.0}, "never discharge"),
        ({"bus_capacitance_f": None, "stage_link_capacitance_f": None}, "no link capacitance is given"),
    ],
)
def test_an_unknown_load_dump_names_its_reason(facts, reason):
    found = changed(**facts)
    assert found.load_dump_time_to_trip_s is None
    assert reason in text(found)
    assert any(reason in line for line in found.unknown)


def test_a_short_bounded_by_the_battery_alone_says_so():
    assert "battery's resistance alone" in text(changed(path_resistance_ohm=0.0))
    assert "battery's resistance alone" not in text(safety(TRUCK))


def test_voltage_and_seconds_are_the_persons_choice():
    found = changed(discharge_to_v=50.0, discharge_within_s=1.0)
    assert found.discharge_resistor_ohm == pytest.approx(1.0 / (900e-6 * math.log(830.0 / 50.0)))
    assert "brings it to 50 V in 1 s" in text(found)


def test_low_voltage_still_cautions_and_needs_no_resistor():
    found = changed(
        highest_link_voltage_v=58.0, highest_battery_voltage_v=50.0, link_voltage_v=54.0, trip_voltage_v=58.0
    )
    assert found.voltage_class.startswith("A")
    assert found.sentences[0].startswith("CAUTION: up to 58 V DC")
    assert found.discharge_resistor_ohm is None
    assert "never stands above 60 V" in text(found)


def test_the_class_follows_the_greater_port():
    assert changed(highest_battery_voltage_v=1600.0).voltage_class.startswith("above")
    assert changed(highest_battery_voltage_v=1600.0).sentences[0].startswith("HIGH VOLTAGE: up to 1600 V DC")
    assert "clause 4" in " ".join(safety(TRUCK).notes)


@pytest.mark.parametrize(
    ("field", "value"),
    [
        ("highest_link_voltage_v", math.nan),
        ("link_voltage_v", 0.0),
        ("bus_capacitance_f", -1e-6),
        ("inductance_per_leg_h", 0.0),
        ("battery_resistance_ohm", -0.1),
        ("greatest_discharge_w", math.inf),
        ("discharge_within_s", 0.0),
    ],
)
def test_a_number_that_means_nothing_is_refused_by_name(field, value):
    with pytest.raises(InputError, match=field):
        changed(**{field: value})


sizes = st.floats(1e-6, 1e-2)


@settings(max_examples=60)
@given(
    top=st.floats(1.0, 3000.0),
    farad=st.one_of(st.none(), sizes),
    ohm=st.floats(0.0, 1.0),
    watt=st.floats(0.0, 1e6),
    trip=st.one_of(st.none(), st.floats(1.0, 3000.0)),
)
def test_it_never_claims_compliance_and_never_prints_nan(top, farad, ohm, watt, trip):
    found = changed(
        highest_link_voltage_v=top,
        link_voltage_v=top,
        bus_capacitance_f=farad,
        stage_link_capacitance_f=None,
        battery_resistance_ohm=ohm,
        greatest_discharge_w=watt,
        trip_voltage_v=trip,
    )
    said = text(found).lower()
    assert not any(word in said for word in ("complies", "compliant", "certified", "safe to touch", "nan", "none "))
    assert len(found.sentences) == 8
    numbers = [v for v in vars(found).values() if isinstance(v, float)]
    assert all(math.isfinite(v) for v in numbers)


@settings(max_examples=40)
@given(low=st.floats(0.0, 3000.0), more=st.floats(0.0, 3000.0))
def test_a_higher_voltage_is_never_in_a_lower_class(low, more):
    order = ["A", "B", "a"]
    assert order.index(voltage_class(low + more)[0]) >= order.index(voltage_class(low)[0])
