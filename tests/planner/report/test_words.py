"""Answers and cells: what a reviewer reads first."""

import dataclasses

import pytest

from tideleg.report import words


def answer(outcome, question):
    return dict(words.answers(outcome))[question]


def test_a_stage_that_holds_says_with_what_margin_and_what_would_break_it(truck):
    assert answer(truck, "Does it do the mission?").startswith("Holds all 8 limits")
    assert answer(truck, "With what margin?") == "5.8 % left: 69.2 % of 75 %, 92 % of the limit in use."
    told = answer(truck, "What would change the answer?")
    assert told.startswith("2 of the 3 changes that were tried would break it: inductance 30 % lower")
    assert "no thermal equilibrium" in told


def test_a_stage_that_fails_names_part_instant_and_every_other_broken_limit(failing):
    assert "145 % missing" in answer(failing, "With what margin?")
    told = answer(failing, "What binds, and when?")
    assert told == "Ripple ratio, inductor, at 412 s of kerbside; also junction temperature, lower switch at 125 %."
    assert "1 of the 3 changes that were tried would mend it: coolant" in answer(
        failing, "What would change the answer?"
    )


def test_the_worst_instant_stands_even_where_the_binding_limit_has_none(truck):
    assert truck.binding.time_s is None
    assert "no matter of one instant. Worst instant: 412 s of kerbside" in answer(truck, "What binds, and when?")


def test_no_limit_and_no_rerun_are_said(bare):
    assert "states no limit" in answer(bare, "With what margin?")
    assert "Not asked" in answer(bare, "What would change the answer?")
    assert words.efficiency_text(bare.efficiency).startswith("not defined")


def test_where_nothing_breaks_it_the_nearest_change_is_named(truck):
    calm = dataclasses.replace(truck, changes=truck.changes[:1])
    told = answer(calm, "What would change the answer?")
    assert told == "None of the 1 changes that were tried; the nearest to it is: coolant 10 K warmer (92 % in use)."


def test_closure_counts_by_magnitude(truck):
    # a negative residual of 1e-6 is worse than a positive one of 3.2e-12
    energy = dataclasses.replace(truck.missions[0].energy, residual=-1e-6)
    mission = dataclasses.replace(truck.missions[0], energy=energy)
    assert words.closure(dataclasses.replace(truck, missions=(mission,))) == 1e-6
    assert words.closure(truck) == pytest.approx(3.2e-12)


def test_a_limit_is_named_once_and_a_mission_by_its_name(truck):
    labels = [words.limit_label(check) for check in truck.limits]
    assert "link capacitor current" in labels
    assert "curtailed energy, kerbside" in labels
    assert "junction temperature, lower switch" in labels


@pytest.mark.parametrize(("joule", "unit"), [(1.0, "J"), (3.6e3, "Wh"), (3.6e6, "kWh"), (0.0, "J")])
def test_energies_stand_in_a_unit_that_suits_them(joule, unit):
    assert words.energy_scale(joule)[1] == unit


def test_instants_of_a_long_schedule_keep_their_digits():
    assert words.time_text(31_535_999.5, "year") == "31535999.5 s of year"


@pytest.mark.parametrize("given", ["holds", "holds.", "Holds."])
def test_a_sentence_has_one_capital_and_one_stop(given):
    assert words.sentence(given) == "Holds."


def test_how_long_it_lasts_is_a_spread_with_its_margin_and_never_one_number(worn, bare):
    told = answer(worn, "How long does it last?")
    assert told.startswith("Coolant pump limits it (running-hours): P10 / P50 / P90 ")
    assert "more than the target of 12 years" in told
    assert "Lower switch is what temperature wears most (coffin-manson-arrhenius, first of 8)" in told
    assert "90 % of its damage lies outside the data" in told
    assert "Damage at least halves with: 3 chips in parallel instead of 2 (0.054 times)." in told
    assert "no life model" in answer(bare, "How long does it last?")


def test_a_missed_target_and_a_change_that_breaks_limits_are_said(worn):
    short = dataclasses.replace(worn.wear.parts[0], life_at_target_years=7.0, margin_years=-5.0)
    changes = (dataclasses.replace(worn.changes[0], damage=0.3, holds=False),)
    wear = dataclasses.replace(worn.wear, parts=(short,))
    told = answer(dataclasses.replace(worn, wear=wear, changes=changes), "How long does it last?")
    assert "7 years at 10 % failed, 5 SHORT of the target of 12 years" in told
    assert "(0.3 times, but limits break)" in told


def test_a_profile_too_coarse_for_the_damage_is_told_even_where_currents_stand_still(worn):
    fine, coarse = words.sureness(worn)[-3:-1] if worn.warnings else words.sureness(worn)[-2:]
    assert "damage by temperature by -5 %: the profile resolves this answer" in fine
    assert "damage by temperature by -19 %: the profile's own steps limit this answer" in coarse
