"""Pictures: none loses a peak, none shares state, each tells in words what it shows."""

import dataclasses
import sys

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from matplotlib.backends.backend_agg import FigureCanvasAgg

from tideleg.report.bars import loss_by_direction
from tideleg.report.drawing import COLUMNS, envelope, time_scale
from tideleg.report.figures import draw_all
from tideleg.report.traces import draw_power, draw_temperatures, draw_waveforms, step_edges


def texts_in_conflict(figure):
    """Return overlapping pairs of texts, and texts outside the picture, after the layout is done."""
    canvas = FigureCanvasAgg(figure)
    canvas.draw()
    renderer = canvas.get_renderer()
    boxes = []
    for axes in figure.axes:
        words = [*axes.texts, axes.title, axes._left_title, axes.xaxis.label, axes.yaxis.label]
        words += [t for t in [*axes.get_xticklabels(), *axes.get_yticklabels()] if t.get_visible()]
        words += axes.get_legend().get_texts() if axes.get_legend() else []
        boxes += [(t.get_text(), t.get_window_extent(renderer)) for t in words if t.get_text().strip()]
    width, height = figure.bbox.width, figure.bbox.height
    outside = [w for w, b in boxes if b.x0 < -1 or b.y0 < -1 or b.x1 > width + 1 or b.y1 > height + 1]
    pairs = [(a, b) for i, (a, x) in enumerate(boxes) for b, y in boxes[i + 1 :] if x.overlaps(y)]
    return pairs, outside


def test_every_picture_has_words_and_no_text_overlaps_or_leaves_it(outcome):
    pictures = draw_all(outcome)
    assert "margins" in pictures or not outcome.limits
    for name, picture in pictures.items():
        pairs, outside = texts_in_conflict(picture.figure)
        # tick labels outside the view are laid out but not drawn; matplotlib keeps at most one beyond each end
        assert not [p for p in pairs if not all(_is_number(word) for word in p)], (name, pairs)
        assert not [word for word in outside if not _is_number(word)], (name, outside)
        assert len(picture.alt) > 30
        assert picture.caption.rstrip().endswith(".")


def _is_number(word):
    return word.replace("\u2212", "-").lstrip("-").replace(".", "").isdigit()


def test_every_axis_is_labelled_with_its_unit(truck):
    for name, picture in draw_all(truck).items():
        axes = picture.figure.axes
        assert any(" in " in a.get_xlabel() for a in axes), name
        labels = [a.get_ylabel() for a in axes] + [picture.figure.get_supylabel()]
        assert name in ("losses", "margins") or any(labels), name


def test_long_profiles_are_drawn_by_envelope_and_say_so(two_missions):
    pictures = draw_all(two_missions)
    assert "Envelope of 5000 steps" in pictures["power-2-depot-night-day"].caption
    assert "Envelope of 2000 steps" in pictures["power-1-kerbside"].caption
    assert "All 400 steps." in draw_power(_first(two_missions, 400)).caption


def _first(outcome, count):
    mission = outcome.missions[0]
    return dataclasses.replace(mission, steps=mission.steps.iloc[:count])


def test_mission_names_make_safe_and_distinct_file_names(two_missions):
    names = list(draw_all(two_missions))
    assert len(names) == len(set(names))
    assert all(set(name) <= set("abcdefghijklmnopqrstuvwxyz0123456789-") for name in names)


@settings(max_examples=25)
@given(seed=st.integers(0, 2**31), count=st.integers(2 * COLUMNS + 1, 6000))
def test_no_peak_is_lost_in_an_envelope(seed, count):
    chance = np.random.default_rng(seed)
    edges = np.concatenate([[0.0], np.cumsum(chance.exponential(1.0, count) + 1e-9)])
    held = chance.standard_cauchy(count)
    band = envelope(edges, held)
    assert band.greatest.max() == held.max()
    assert band.least.min() == held.min()
    column = np.searchsorted(band.begin, edges[:-1], side="right") - 1
    assert np.all(band.least[column] <= held)
    assert np.all(held <= band.greatest[column])
    # neighbours touch: what holds over the border is in both, so that no vertical edge is left white
    assert np.all(band.least[1:] <= band.greatest[:-1])
    assert np.all(band.greatest[1:] >= band.least[:-1])


def test_short_traces_are_drawn_whole():
    assert envelope(np.arange(2 * COLUMNS + 1.0), np.zeros(2 * COLUMNS)) is None


@pytest.mark.parametrize(("seconds", "unit"), [(10.0, "s"), (1800.0, "min"), (86400.0, "h"), (3 * 3600.0, "min")])
def test_time_stands_in_the_unit_that_fits(seconds, unit):
    assert time_scale(seconds)[1] == unit


def test_the_last_step_is_drawn_to_its_end(truck):
    mission = _first(truck, 100)
    edges, unit = step_edges(mission)
    assert (edges[-1], unit) == (100.0, "s")
    assert draw_power(mission).figure.axes[0].get_xlim() == (0.0, 100.0)


def test_curtailed_steps_are_marked_and_counted(truck):
    count = int((truck.missions[0].steps["curtailed_w"] != 0.0).sum())
    assert count > 0
    picture = draw_power(truck.missions[0])
    assert f"marks {count} curtailed steps" in picture.caption
    assert "curtailed" in [t.get_text() for t in picture.figure.axes[0].get_legend().get_texts()]


def test_temperatures_show_the_limit_of_their_own_part(truck):
    picture = draw_temperatures(truck, truck.missions[0])
    titles = [axes.get_title(loc="left") for axes in picture.figure.axes]
    assert [title.rpartition(", ")[2] for title in titles] == ["limit 150 degC", "limit 150 degC", "limit 140 degC"]


def test_folded_currents_are_repeated_to_fill_the_period(truck):
    last = draw_waveforms(truck).figure.axes[-1]
    time, ampere = last.lines[1].get_data()
    assert last.get_xlim() == (0.0, 25.0)
    assert time.min() <= 0.0
    assert time.max() >= 25.0
    inside = (time > 0.1) & (time < 24.9)
    assert int(np.sum(ampere[inside] == 60.0)) == 4


def test_losses_by_direction_add_up_to_the_losses_by_mechanism(outcome):
    split = loss_by_direction(outcome)
    for mechanism, watts in outcome.loss_by_mechanism().items():
        assert split[mechanism].sum() == pytest.approx(watts, rel=1e-12)


def test_nothing_goes_through_the_shared_state_of_pyplot(truck):
    draw_all(truck)
    assert "matplotlib.pyplot" not in sys.modules


def test_wear_has_its_pictures_and_the_shares_of_the_matrix_are_those_of_the_damage(worn):
    pictures = draw_all(worn)
    assert {"hours", "cycles", "damage", "life"} <= set(pictures)
    written = [int(text.get_text()) for text in pictures["cycles"].figure.axes[0].texts]
    assert 80 <= sum(written) <= 101
    assert "swing 30 to 80 K" in pictures["cycles"].caption


def test_the_curves_of_life_pass_through_what_is_written(worn):
    axes = draw_all(worn)["life"].figure.axes[0]
    curve, dots = axes.get_lines()[:2]
    life = worn.wear.worst_heated.life
    assert list(dots.get_xdata()) == [life.p10, life.p50, life.p90]
    np.testing.assert_allclose(
        np.interp([10, 50, 90], curve.get_ydata(), curve.get_xdata()), dots.get_xdata(), rtol=1e-6
    )


def test_damage_along_time_ends_at_the_whole_of_one_mission(worn):
    axes = draw_all(worn)["damage"].figure.axes[0]
    assert all(line.get_ydata()[-1] == pytest.approx(100.0) for line in axes.get_lines())
