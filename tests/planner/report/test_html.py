"""The one-file report: whole, safe, self-contained, and readable without its pictures."""

import dataclasses
import re
from html.parser import HTMLParser
from itertools import pairwise

import pytest

from tideleg.report.drawing import Picture
from tideleg.report.html import danger_rows, render_html
from tideleg.worn import NO_WEAR

PNG = b"\x89PNG\r\n\x1a\n"


class Page(HTMLParser):
    """Reads a page strictly: every element closed in order, text and attributes kept."""

    def __init__(self, text):
        super().__init__()
        self.open, self.tags, self.words, self.faults = [], [], [], []
        self.feed(text)
        self.close()

    def handle_starttag(self, tag, attrs):
        self.tags.append((tag, dict(attrs)))
        if tag not in ("meta", "img", "br"):
            self.open.append(tag)

    def handle_endtag(self, tag):
        if not self.open or self.open.pop() != tag:
            self.faults.append(tag)

    def handle_data(self, data):
        if not self.open or self.open[-1] != "style":
            self.words.append(data)

    @property
    def text(self):
        return " ".join(" ".join(self.words).split())

    def all(self, tag):
        return [attrs for name, attrs in self.tags if name == tag]


def pictures_of(outcome):
    names = ["margins", "losses", "waveforms", "power", "temperatures"]
    return {name: (PNG, Picture(None, f"Caption of {name}.", f"Alt of {name} <&>")) for name in names}


@pytest.fixture
def page(outcome):
    return Page(render_html(outcome, pictures_of(outcome)))


def test_it_is_well_formed(page):
    assert page.faults == []
    assert page.open == []


def test_it_carries_the_whole_caution(outcome, page):
    for sentence in outcome.safety.sentences:
        assert sentence in page.text, sentence
    for note in outcome.safety.notes:
        assert note in page.text, note


def test_it_needs_nothing_from_outside(outcome):
    text = render_html(outcome, pictures_of(outcome))
    assert not re.search(r"https?:|<script|<link|url\(|@import|src=\"(?!data:)", text)


def test_title_and_words_of_the_person_are_escaped(truck):
    text = render_html(truck, pictures_of(truck))
    assert "<title>Municipal truck &lt;4 legs&gt; &amp; 750 V link [draft]</title>" in text
    assert "<4 legs>" not in text


def test_a_hostile_title_stays_text(truck):
    text = render_html(dataclasses.replace(truck, title='"><script>alert(1)</script>'), pictures_of(truck))
    assert "<script" not in text


def test_every_picture_has_its_words(outcome, page):
    images = page.all("img")
    assert {image["alt"] for image in images} >= {"Alt of power <&>", "Alt of waveforms <&>"}
    assert len(page.all("figcaption")) == len(images)


def test_headings_descend_in_order_and_tables_have_captions(page):
    levels = [int(tag[1]) for tag, _ in page.tags if re.fullmatch(r"h[1-6]", tag)]
    assert levels[0] == 1
    assert levels.count(1) == 1
    assert all(after - before <= 1 for before, after in pairwise(levels))
    assert len(page.all("caption")) == len(page.all("table"))
    assert all(head.get("scope") in ("col", "row") for head in page.all("th"))


def test_answers_come_before_the_caution_and_the_caution_before_the_figures_over_time(truck):
    text = Page(render_html(truck, pictures_of(truck))).text
    order = ["Holds all 8 limits", "With what margin?", "What binds, and when?", "What would change the answer?"]
    order += ["How sure is it?", "Every limit that was checked", "Not modelled", "This design's own numbers"]
    order += ["Caption of power.", "Caption of waveforms.", "Caption of losses.", "Rules and assumptions", "Inputs"]
    places = [text.index(word) for word in order]
    assert places == sorted(places)


def test_everything_that_was_found_is_on_it(outcome, page):
    for said in (*outcome.not_modelled, *outcome.warnings, *outcome.rules, *outcome.inputs.sha256.values()):
        assert said in page.text, said
    for part in outcome.parts:
        assert part.name.replace("_", " ") in page.text
    for mission in outcome.missions:
        assert all(entry.mechanism in page.text for entry in mission.losses)
    assert not {"nan", "None", "inf"} & {word.strip() for word in page.words}


def test_a_stage_that_fails_is_marked_by_shape_and_word(failing):
    page = Page(render_html(failing, pictures_of(failing)))
    assert "verdict fails" in [attrs.get("class") for attrs in page.all("div")]
    assert sum(attrs.get("class") == "broken" for attrs in page.all("tr")) == 4


def test_what_is_not_known_is_said_in_the_cautions_table(bare):
    rows = dict(danger_rows(bare))
    assert rows["energy stored in the link"] == "not known"
    assert rows["greatest resistor to 60 V in 5 s"] == "not known"
    assert rows["prospective link-short current"] == "not known"


def test_repeated_data_of_parts_are_referred_to(truck):
    upper = dataclasses.replace(truck.parts[0], name="upper_switch")
    both = dataclasses.replace(truck, parts=(truck.parts[0], upper))
    assert "as lower switch" in Page(render_html(both, {})).text


def test_wear_stands_in_tables_part_by_part(worn):
    page = Page(render_html(worn, pictures_of(worn)))
    for part in worn.wear.parts:
        assert part.model in page.text
    for said in (
        "no end",
        "P10 / P50 / P90",
        "Stretches of the missions that consume most",
        "31.5 K",
        "0-5 K: 6,500,000",
    ):
        assert said in page.text, said
    assert (
        "no life model" in Page(render_html(worn.__class__(**{**vars(worn), "wear": NO_WEAR}), pictures_of(worn))).text
    )
