"""The waveform algebra against exact rational arithmetic.

Every float is a fraction, so the reference integrates each straight piece exactly and shares nothing with the product
but the definition of a segment. Tolerances of 1e-12 of the scale are for rounding alone.
"""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tideleg import Segment, Waveform

ROUNDING = 1e-12

currents = st.floats(-100.0, 100.0, allow_subnormal=False)
examples = settings(max_examples=60, deadline=None)


@st.composite
def waveforms(draw: st.DrawFn, most: int = 4) -> Waveform:
    """Segments in the order of time with gaps between some, zero widths among them, the whole wrapped anywhere."""
    count = draw(st.integers(1, most))
    shares = draw(st.lists(st.integers(0, 12), min_size=2 * count, max_size=2 * count))
    total = sum(shares) or 1
    place = draw(st.floats(0.0, 1.0, exclude_max=True))
    segments = []
    for index in range(count):
        place += shares[2 * index] / total
        width = min(shares[2 * index + 1] / total, 1.0)
        segments.append(Segment(place % 1.0, width, draw(currents), draw(currents)))
        place += width
    return Waveform(tuple(segments))


class Exact:
    """A periodic current in rational arithmetic, as a function of time; `copies` shifted ones are summed."""

    def __init__(self, waveform: Waveform, copies: int = 1) -> None:
        self.copies = copies
        self.segments = [tuple(Fraction(float(v)) for v in s) for s in waveform.segments]
        ends = [e for place, width, _, _ in self.segments for e in (place, place + width)]
        shifts = [Fraction(k, copies) for k in range(copies)]
        self.corners = sorted({Fraction(0), Fraction(1), *((e + shift) % 1 for e in ends for shift in shifts)})

    def at(self, time: Fraction) -> Fraction:
        total = Fraction(0)
        for place, width, start, end in self.segments:
            for copy in range(self.copies):
                since = (time - place - Fraction(copy, self.copies)) % 1
                if since < width:
                    total += start + (end - start) * since / width
        return total

    def pieces(self) -> list[tuple[Fraction, Fraction, Fraction]]:
        """Return (width, start, end) of every straight piece of one period, from two points inside it."""
        found = []
        for begin, end in zip(self.corners, self.corners[1:], strict=False):
            width = end - begin
            near, far = self.at(begin + width / 3), self.at(begin + 2 * width / 3)
            found.append((width, 2 * near - far, 2 * far - near))
        return found

    def mean(self) -> Fraction:
        return sum((w * (a + b) / 2 for w, a, b in self.pieces()), Fraction(0))

    def mean_square(self) -> Fraction:
        return sum((w * (a * a + a * b + b * b) / 3 for w, a, b in self.pieces()), Fraction(0))

    def mean_magnitude(self) -> Fraction:
        total = Fraction(0)
        for w, a, b in self.pieces():
            crossing = a / (a - b) if a * b < 0 else Fraction(0)
            total += w * (crossing * abs(a) + (1 - crossing) * abs(b)) / 2 if crossing else w * abs(a + b) / 2
        return total

    def extremes(self) -> tuple[Fraction, Fraction]:
        values = [v for w, a, b in self.pieces() if w > Fraction(1, 10**11) for v in (a, b)]
        return max(values), min(values)

    def charge_swing(self) -> Fraction:
        mean, charge = self.mean(), Fraction(0)
        seen = [charge]
        for w, a, b in self.pieces():
            before, after = a - mean, b - mean
            if before * after < 0:
                seen.append(charge + before * before * w / (before - after) / 2)
            charge += w * (before + after) / 2
            seen.append(charge)
        return max(seen) - min(seen)


@examples
@given(waveforms())
def test_integrals_equal_exact_ones(waveform: Waveform) -> None:
    exact = Exact(waveform)
    assert waveform.mean() == pytest.approx(float(exact.mean()), abs=100 * ROUNDING)
    assert waveform.mean_square() == pytest.approx(float(exact.mean_square()), abs=1e4 * ROUNDING)
    assert waveform.rms() == pytest.approx(float(exact.mean_square()) ** 0.5, rel=1e-9, abs=1e-6)
    assert waveform.mean_magnitude() == pytest.approx(float(exact.mean_magnitude()), abs=100 * ROUNDING)
    variance = exact.mean_square() - exact.mean() ** 2
    assert waveform.ac_mean_square() == pytest.approx(float(variance), abs=1e4 * ROUNDING)
    assert waveform.ac_rms() ** 2 == pytest.approx(float(variance), abs=1e4 * ROUNDING)


@examples
@given(waveforms())
def test_extremes_equal_exact_ones(waveform: Waveform) -> None:
    peak, valley = Exact(waveform).extremes()
    assert waveform.peak() == pytest.approx(float(peak), abs=1e-9)
    assert waveform.valley() == pytest.approx(float(valley), abs=1e-9)
    assert waveform.peak_to_peak() == pytest.approx(float(peak - valley), abs=1e-9)


@examples
@given(waveforms())
def test_charge_swing_equals_the_exact_one(waveform: Waveform) -> None:
    assert waveform.charge_swing() == pytest.approx(float(Exact(waveform).charge_swing()), abs=100 * ROUNDING)


@pytest.mark.parametrize("copies", range(1, 7))
@settings(max_examples=15, deadline=None)
@given(waveform=waveforms(3))
def test_fold_equals_the_exact_sum_of_shifted_copies(copies: int, waveform: Waveform) -> None:
    folded, exact = waveform.fold(copies), Exact(waveform, copies)
    scale = 100.0 * copies
    assert folded.width() == pytest.approx(1.0, abs=ROUNDING)
    assert folded.mean() == pytest.approx(float(exact.mean()), abs=scale * ROUNDING)
    assert folded.mean_square() == pytest.approx(float(exact.mean_square()), abs=scale**2 * ROUNDING)
    # the period of the folded waveform is 1/copies of that of the exact one, and so is its charge
    swing = float(exact.charge_swing()) * copies
    assert folded.charge_swing() == pytest.approx(swing, abs=scale * 1e-11)
    for tile in folded.segments:
        if tile.width > 1e-9:
            for share in (0.25, 0.75):
                time = Fraction(float((tile.place + share * tile.width) / copies))
                assert tile.start + share * (tile.end - tile.start) == pytest.approx(
                    float(exact.at(time)), abs=scale * 1e-9
                )


@examples
@given(waveforms(3), waveforms(3), waveforms(2))
def test_overlay_equals_the_sum_at_every_time(one: Waveform, other: Waveform, third: Waveform) -> None:
    total, parts = one.overlay(other, third), [Exact(w) for w in (one, other, third)]
    assert total.width() == pytest.approx(1.0, abs=ROUNDING)
    assert total.mean() == pytest.approx(float(sum(p.mean() for p in parts)), abs=300 * ROUNDING)
    for tile in total.segments:
        if tile.width > 1e-9:
            time = Fraction(float(tile.place + 0.4 * tile.width))
            here = tile.start + 0.4 * (tile.end - tile.start)
            assert here == pytest.approx(float(sum(p.at(time) for p in parts)), abs=1e-6)


@examples
@given(waveforms(), st.floats(-2.0, 2.0), st.floats(-3.0, 3.0))
def test_shift_and_scale_do_what_they_say(waveform: Waveform, delay: float, factor: float) -> None:
    changed, exact = waveform.shifted(delay).scaled(factor), Exact(waveform)
    assert changed.mean() == pytest.approx(factor * float(exact.mean()), abs=300 * ROUNDING)
    assert changed.mean_square() == pytest.approx(factor**2 * float(exact.mean_square()), abs=1e5 * ROUNDING)
    for before, after in zip(waveform.segments, changed.segments, strict=True):
        turns = before.place + delay - after.place
        assert turns == pytest.approx(math.floor(turns + 0.5), abs=1e-12)
        assert 0.0 <= after.place <= 1.0


def test_shift_by_a_whole_period_is_no_shift() -> None:
    wrapped = Waveform((Segment(0.8, 0.4, 1.0, 5.0),))
    assert Exact(wrapped.shifted(0.5)).at(Fraction(1, 2)) == pytest.approx(3.0)
    assert Exact(wrapped).at(Fraction(0)) == pytest.approx(3.0)
    assert wrapped.shifted(3.0).segments[0] == pytest.approx(wrapped.segments[0], abs=1e-12)


@settings(max_examples=25, deadline=None)
@given(waveforms(3), st.integers(1, 9))
def test_harmonics_equal_exact_integrals(waveform: Waveform, order: int) -> None:
    # Over a straight piece the Fourier integral by parts, with the exact line of the reference.
    total = 0.0 + 0.0j
    exact = Exact(waveform)
    angle = 2.0 * np.pi * order
    for begin, (width, start, end) in zip(exact.corners, exact.pieces(), strict=False):
        a, b, w, t = float(start), float(end), float(width), float(begin)
        first, last = np.exp(-1j * angle * t), np.exp(-1j * angle * (t + w))
        total += 1j * (b * last - a * first) / angle + (b - a) / w * (last - first) / angle**2
    # The reference divides by narrow widths; 1e-9 of the scale covers its own rounding.
    assert waveform.harmonic(order) == pytest.approx(2.0 * total, abs=1e-7)


def test_harmonics_of_a_narrow_segment_do_not_cancel() -> None:
    # A spike of width w and height h is nearly h w at every low order: 2 h w, to (pi n w)²/6.
    spike = Waveform((Segment(0.3, 1e-6, 10.0, 10.0),))
    assert abs(spike.harmonic(3)) == pytest.approx(2.0 * 10.0 * 1e-6, rel=1e-9)
    tilted = Waveform((Segment(0.3, 1e-6, 0.0, 20.0),))
    assert abs(tilted.harmonic(3)) == pytest.approx(2.0 * 10.0 * 1e-6, rel=1e-9)


@pytest.mark.parametrize("width", [1e-5, 1e-3, 3e-3, 4e-3])
def test_harmonics_of_a_narrow_tilt_are_exact(width: float) -> None:
    # A ramp from -h to h about the place 0: only its odd part counts, -2j h times the integral of u sin(x u) over
    # u = -1..1, times w/2, with x = pi n w; by its power series, which these small x end after a few terms.
    x = 2.0 * np.pi * width
    series = sum((-1.0) ** k * x ** (2 * k + 1) / (math.factorial(2 * k + 1) * (2 * k + 3)) for k in range(5))
    ramp = Waveform((Segment(1.0 - 0.5 * width, width, -10.0, 10.0),))
    assert ramp.harmonic(2) == pytest.approx(-2j * 10.0 * width * series, rel=1e-9, abs=1e-15)


def test_harmonics_sum_to_the_ac_mean_square() -> None:
    # Parseval. A current without jumps falls as 1/n², so its tail beyond N is below (ripple)²/N³: 1e-8 here.
    triangle = Waveform((Segment(0.1, 0.3, -2.0, 4.0), Segment(0.4, 0.7, 4.0, -2.0)))
    total = sum(0.5 * abs(triangle.harmonic(n)) ** 2 for n in range(1, 400))
    assert total == pytest.approx(float(triangle.ac_mean_square()), rel=1e-7)
    # One with jumps falls as 1/n: the tail is about (sum of squared jumps)/(2 π² N).
    block = Waveform((Segment(0.2, 0.35, 5.0, 8.0),))
    total = sum(0.5 * abs(block.harmonic(n)) ** 2 for n in range(1, 4000))
    tail = (5.0**2 + 8.0**2) / (2.0 * np.pi**2 * 4000.0)
    assert total + tail == pytest.approx(float(block.ac_mean_square()), rel=1e-5)


@pytest.mark.parametrize("order", [0, -1])
def test_harmonic_refuses_an_order_below_one(order: int) -> None:
    with pytest.raises(ValueError, match=f"1 or more, not {order}"):
        Waveform((Segment(0.0, 1.0, 1.0, 1.0),)).harmonic(order)


def test_harmonic_of_folded_legs_keeps_only_multiples() -> None:
    leg = Waveform((Segment(0.0, 0.37, 3.0, 9.0), Segment(0.37, 0.63, 9.0, 3.0)))
    folded = leg.fold(3)
    for order in (1, 2, 3):
        # 3 copies add in phase at harmonics 3, 6, 9 and cancel elsewhere
        assert abs(folded.harmonic(order)) == pytest.approx(3.0 * abs(leg.harmonic(3 * order)), rel=1e-9)


def test_ripple_null_is_flat() -> None:
    # E-C02 in the algebra itself: N legs at D = k/N have no total ripple.
    for legs in range(2, 7):
        for k in range(1, legs):
            d = k / legs
            leg = Waveform((Segment(0.0, 1.0 - d, 10.0, 20.0), Segment(1.0 - d, d, 20.0, 10.0)))
            folded = leg.fold(legs)
            assert folded.peak_to_peak() == pytest.approx(0.0, abs=1e-9)
            assert folded.ac_rms() == pytest.approx(0.0, abs=1e-6)
            assert folded.mean() == pytest.approx(15.0 * legs, rel=1e-12)


def test_zero_width_segments_weigh_nothing() -> None:
    plain = Waveform((Segment(0.2, 0.5, 1.0, 3.0),))
    padded = Waveform((Segment(0.2, 0.0, 90.0, -70.0), Segment(0.2, 0.5, 1.0, 3.0), Segment(0.7, 0.0, 3.0, 55.0)))
    for name in ("mean", "mean_square", "mean_magnitude", "peak", "valley", "charge_swing", "width", "ac_rms"):
        assert getattr(padded, name)() == pytest.approx(float(getattr(plain, name)()), abs=1e-12), name
    assert padded.harmonic(2) == pytest.approx(complex(plain.harmonic(2)), abs=1e-12)
    for copies in (1, 2, 5):
        folded = padded.fold(copies)
        assert folded.peak() == pytest.approx(float(plain.fold(copies).peak()), abs=1e-9)
        assert folded.mean_square() == pytest.approx(float(plain.fold(copies).mean_square()), rel=1e-12)


def test_empty_period_is_zero_in_every_reading() -> None:
    nothing = Waveform((Segment(0.0, 0.0, 0.0, 0.0), Segment(0.0, 0.0, 0.0, 0.0)))
    for waveform in (nothing, nothing.fold(3)):
        for name in ("mean", "rms", "ac_rms", "peak", "valley", "peak_to_peak", "charge_swing", "mean_magnitude"):
            assert float(getattr(waveform, name)()) == 0.0, name


def random_batch(seed: int, shape: tuple[int, ...]) -> Waveform:
    random = np.random.default_rng(seed)
    first, gap, second = random.uniform(0.05, 0.3, (3, *shape))
    place = random.uniform(0.0, 1.0, shape)
    a, b, c, d = random.uniform(-50.0, 50.0, (4, *shape))
    return Waveform((Segment(place, first, a, b), Segment(np.mod(place + first + gap, 1.0), second, c, d)))


def one_of(waveform: Waveform, index: tuple[int, ...]) -> Waveform:
    return Waveform(tuple(Segment(*(np.asarray(v)[index] for v in s)) for s in waveform.segments))


def test_copies_may_differ_from_step_to_step() -> None:
    batch = random_batch(3, (2, 40))
    copies = np.random.default_rng(4).integers(1, 7, (2, 40)).astype(float)
    folded = batch.fold(copies)
    for index in np.ndindex(2, 40):
        alone = one_of(batch, index).fold(float(copies[index]))
        for name in ("mean", "mean_square", "peak", "valley", "charge_swing"):
            among = getattr(folded, name)()[index]
            assert among == pytest.approx(float(getattr(alone, name)()), rel=1e-12, abs=1e-12), name


def test_one_step_alone_equals_the_same_among_many() -> None:
    batch = random_batch(5, (3, 25))
    readings = ("mean", "mean_square", "mean_magnitude", "peak", "valley", "width", "charge_swing", "ac_rms")
    for index in np.ndindex(3, 25):
        alone = one_of(batch, index)
        for name in readings:
            assert getattr(batch, name)()[index] == float(getattr(alone, name)()), name
        assert batch.harmonic(4)[index] == pytest.approx(complex(alone.harmonic(4)), rel=1e-12)


def test_fields_broadcast_candidates_against_steps() -> None:
    width, peak = np.array([[0.2], [0.6]]), np.array([1.0, 2.0, 4.0])
    waveform = Waveform((Segment(0.0, width, 0.0, peak),))
    assert waveform.mean() == pytest.approx(width * peak / 2.0)
    assert waveform.mean_square() == pytest.approx(width * peak**2 / 3.0)
    assert waveform.fold(2).mean() == pytest.approx(width * peak)
    assert waveform.peak().shape == waveform.charge_swing().shape == waveform.harmonic(1).shape == (2, 3)


@examples
@given(waveforms())
def test_trace_draws_the_current(waveform: Waveform) -> None:
    fractions, values = waveform.trace()
    exact = Exact(waveform)
    assert np.all(np.diff(fractions) >= -ROUNDING)
    assert np.sum(np.diff(fractions)[::2]) == pytest.approx(1.0, abs=1e-9)
    pairs = zip(fractions[::2], fractions[1::2], values[::2], values[1::2], strict=True)
    for begin, end, start, stop in pairs:
        if end - begin > 1e-9:
            middle = Fraction(float(0.5 * (begin + end)))
            assert 0.5 * (start + stop) == pytest.approx(float(exact.at(middle)), abs=1e-9)


def test_trace_reads_one_step_of_many() -> None:
    batch = random_batch(6, (2, 5))
    fractions, values = batch.trace((1, 3))
    alone_fractions, alone_values = one_of(batch, (1, 3)).trace()
    assert fractions == pytest.approx(alone_fractions, abs=1e-12)
    assert values == pytest.approx(alone_values, abs=1e-9)


def test_many_segments_overlay_as_few_do() -> None:
    # More corners than are sorted by exchanges: the other way of sorting gives the same sum.
    steps = np.arange(12)
    comb = Waveform(tuple(Segment(k / 12.0, 1.0 / 24.0, float(k), float(k + 1)) for k in steps))
    assert comb.fold(1).mean_square() == pytest.approx(float(comb.mean_square()), rel=1e-12)
    assert comb.fold(12).mean() == pytest.approx(12.0 * float(comb.mean()), rel=1e-12)
    assert comb.fold(12).peak() == pytest.approx(sum(steps + 1.0), rel=1e-12)
