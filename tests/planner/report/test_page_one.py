"""Page one on the terminal, at any width, coloured or piped."""

import io

import pytest
from rich.console import Console

from tideleg.report import print_page


def page(outcome, width=80, **console):
    out = io.StringIO()
    print_page(outcome, Console(file=out, width=width, **console))
    return out.getvalue()


def flat(text):
    return " ".join(text.split())


@pytest.mark.parametrize("width", [40, 80, 160])
def test_the_caution_is_whole_and_last_at_every_width(outcome, width):
    text = flat(page(outcome, width))
    _, _, caution = text.partition(" CAUTION ")
    assert caution == flat(" ".join(f"- {sentence}" for sentence in outcome.safety.sentences))


@pytest.mark.parametrize("width", [40, 80, 160])
def test_no_line_is_wider_than_asked_and_nothing_is_cut(outcome, width):
    text = page(outcome, width)
    assert max(len(line) for line in text.splitlines()) <= width
    assert "…" not in text


def test_the_verdict_comes_first(truck):
    text = flat(page(truck, 200))
    assert text.index("Holds all 8 limits") < text.index("With what margin?") < text.index("Limits, tightest first")


def test_every_answer_is_on_it(outcome):
    text = flat(page(outcome, 250))
    for said in (outcome.title, *outcome.not_modelled, *outcome.warnings, *outcome.rules):
        assert said in text, said
    for check in outcome.limits:
        assert check.name in text
    for change in outcome.changes:
        assert change.what in text
    for mission in outcome.missions:
        assert all(f"{mission.name}: {rule}" in text for rule in mission.rules)
    assert "closure" in text
    assert "nan" not in text


def test_titles_with_brackets_are_no_markup(truck):
    assert "Municipal truck <4 legs> & 750 V link [draft]" in page(truck, 120)


def test_what_does_not_hold_shows_without_colour(failing):
    assert page(failing, 160).count("DOES NOT HOLD") >= 4
    narrow = page(failing, 80)
    assert sum(line.rstrip().endswith(" NO") for line in narrow.splitlines()) == 2


def test_a_pipe_gets_no_escape_codes_and_an_ascii_terminal_no_other_letters(truck):
    assert "\x1b" not in page(truck)
    out = io.TextIOWrapper(io.BytesIO(), encoding="ascii")
    print_page(truck, Console(file=out, width=80))
    out.flush()
    assert b"HIGH VOLTAGE" in out.buffer.getvalue()


def test_the_greatest_losses_stand_and_their_sum_is_the_whole(truck):
    text = flat(page(truck, 120))
    whole = sum(truck.loss_by_mechanism().values())
    assert f"all together {whole:.4g} W" in text
