"""Built inductors, against numerical integration, root finding and differences of scipy and numpy."""

from __future__ import annotations

import dataclasses
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import quad
from scipy.optimize import brentq

from tideleg import InputError
from tideleg_losses.core import CoreSettings
from tideleg_losses.gap import fringing_factor
from tideleg_losses.inductor_build import InductorBuild
from tideleg_losses.inductor_build_catalogue import FOLDER, capacitors, cores, wires
from tideleg_losses.inductor_build_core import (
    effective_gap,
    flux_density_of_linkage,
    gap_for,
    inductance,
    magnetize,
    saturation_current,
)
from tideleg_losses.inductor_build_law import FerriteLaw, PowderLaw, TableLaw
from tideleg_losses.inductor_build_winding import (
    Wire,
    copper_mass,
    dc_resistance,
    fits,
    layers,
    turns_per_layer,
    winding_keys,
    window_fill,
)
from tideleg_losses.winding import WindingSettings

MU0 = 4e-7 * np.pi
CORES = {core.name: core for core in cores()}
FERRITE, POWDER = CORES["ferrite 100"], CORES["powder 102 mu 26"]
LAWS = [
    FerriteLaw(2200.0, 0.38),
    PowderLaw.per_oersted(60.0, 1.0, 6e-5, 1.85),
    PowderLaw(26.0, 0.98, 3e-8, 1.7),
    TableLaw(60.0, (0.0, 2e3, 1e4, 1e5), (1.0, 0.95, 0.5, 0.05)),
]


@pytest.mark.parametrize("law", LAWS, ids=lambda law: type(law).__name__)
@pytest.mark.parametrize("field", [0.5, 300.0, 4e3, 3e4])
def test_flux_is_the_integral_of_the_slope(law: Any, field: float) -> None:
    corners = [x for x in getattr(law, "fields", ()) if 0.0 < x < field] or None
    due, _ = quad(lambda h: float(law.slope(h)), 0.0, field, epsabs=0.0, epsrel=1e-11, limit=500, points=corners)
    assert float(law.flux_density(field)) == pytest.approx(due, rel=1e-7)
    assert float(law.flux_density(-field)) == pytest.approx(-due, rel=1e-7)
    assert float(law.slope(-field)) == float(law.slope(field))


@settings(max_examples=40, deadline=None)
@given(st.integers(3, 60), st.floats(0.1e-3, 8e-3), st.floats(-400.0, 400.0))
def test_a_gapped_core_obeys_amperes_law(turns: int, gap: float, current: float) -> None:
    found = magnetize(FERRITE, turns, gap, current)
    factor = float(fringing_factor(gap, FERRITE.area, FERRITE.window_height))

    def excess(field: float) -> float:
        flux = MU0 * field + 0.38 * np.tanh(MU0 * 2199.0 * field / 0.38)
        return float(field * FERRITE.path_length + flux / MU0 * gap / factor - turns * abs(current))

    field = brentq(excess, 0.0, turns * abs(current) / FERRITE.path_length + 1e-9, xtol=1e-12, rtol=1e-14)
    due = MU0 * field + 0.38 * np.tanh(MU0 * 2199.0 * field / 0.38)
    assert float(found.flux_density) == pytest.approx(np.sign(current) * due, rel=1e-8, abs=1e-12)
    assert float(flux_density_of_linkage(FERRITE, turns, found.linkage)) == pytest.approx(float(found.flux_density))


@settings(max_examples=40, deadline=None)
@given(st.sampled_from(sorted(CORES)), st.integers(3, 60), st.floats(0.2, 300.0))
def test_the_differential_inductance_is_the_slope_of_the_linkage(name: str, turns: int, current: float) -> None:
    core = CORES[name]
    gap = 2e-3 if core.may_be_gapped else 0.0
    step = 1e-4 * current
    low, high = (float(magnetize(core, turns, gap, current + s).linkage) for s in (-step, step))
    found = float(magnetize(core, turns, gap, current).differential_inductance)
    assert found == pytest.approx((high - low) / (2 * step), rel=1e-4)


@pytest.mark.parametrize("name", sorted(CORES))
def test_inductance_falls_with_current_from_that_at_zero(name: str) -> None:
    core = CORES[name]
    gap = 1.5e-3 if core.may_be_gapped else 0.0
    current = np.linspace(0.0, 800.0, 400)
    found = magnetize(core, 15, gap, current).differential_inductance
    assert found[0] == pytest.approx(float(inductance(core, 15, gap)), rel=1e-12)
    assert np.all(np.diff(found) <= 1e-9 * found[0])
    assert found[-1] < 0.7 * found[0]


@settings(max_examples=40)
@given(st.integers(5, 60), st.floats(0.0, 1.0))
def test_the_gap_gives_back_the_inductance(turns: int, share: float) -> None:
    least, most = (float(inductance(FERRITE, turns, g)) for g in (0.5 * FERRITE.window_height, 0.0))
    wanted = least * (most / least) ** share
    assert float(inductance(FERRITE, turns, gap_for(FERRITE, turns, wanted))) == pytest.approx(wanted, rel=1e-9)


def test_the_roll_off_current_leaves_its_share() -> None:
    for core, gap in ((FERRITE, 2e-3), (POWDER, 0.0)):
        current = saturation_current(core, 20, gap, 0.6)
        left = float(magnetize(core, 20, gap, current).differential_inductance)
        assert left == pytest.approx(0.6 * float(inductance(core, 20, gap)), rel=1e-9)


def test_what_has_no_meaning_is_refused_in_words() -> None:
    with pytest.raises(InputError, match="powder core takes none"):
        effective_gap(POWDER, 1e-3)
    with pytest.raises(InputError, match="found a gap of -1 mm"):
        effective_gap(FERRITE, -1e-3)
    with pytest.raises(InputError, match="half the height of the window"):
        effective_gap(FERRITE, FERRITE.window_height)
    with pytest.raises(InputError, match="uH \\(no gap\\), not 1e\\+06 uH"):
        gap_for(FERRITE, 10, 1.0)
    with pytest.raises(InputError, match="between 0 and 1"):
        saturation_current(FERRITE, 10, 1e-3, 1.0)
    with pytest.raises(InputError, match="not a table"):
        dataclasses.replace(FERRITE, law=LAWS[3])
    with pytest.raises(InputError, match="above zero"):
        dataclasses.replace(FERRITE, area=0.0)
    with pytest.raises(InputError, match="ends at 100000 A/m, and 200000 A/m"):
        LAWS[3].flux_density(2e5)
    with pytest.raises(InputError, match="do not fit the window"):
        InductorBuild(FERRITE, wires()[0], 100_000)
    with pytest.raises(InputError, match="from 1"):
        InductorBuild(FERRITE, wires()[0], 0)


@pytest.mark.parametrize(
    ("fields", "shares", "words"),
    [
        ((0.0,), (1.0,), "two points"),
        ((1.0, 2.0), (1.0, 0.5), "begin at 0"),
        ((0.0, 2.0, 2.0), (1.0, 0.5, 0.4), "increase"),
        ((0.0, 1.0), (0.5, 0.6), "do not rise"),
        ((0.0, 1.0), (1.0, 0.0), "above 0"),
    ],
)
def test_hostile_roll_off_tables_are_refused(fields: Any, shares: Any, words: str) -> None:
    with pytest.raises(InputError, match=words):
        TableLaw(60.0, fields, shares)


@pytest.mark.parametrize(
    ("keys", "words"),
    [
        (("x", "round", 1e-3, 1, 0.0, 0.5e-3), "do not fit in the outer size"),
        (("x", "foil", 1e-3, 2, 0.02, 1.1e-3), "a foil has one strand"),
        (("x", "round", 1e-3, 1, 0.02, 1.1e-3), "only a foil has a width"),
        (("x", "round", 0.0, 1, 0.0, 1.1e-3), "above zero"),
    ],
)
def test_wires_that_cannot_be_are_refused(keys: Any, words: str) -> None:
    with pytest.raises(InputError, match=words):
        Wire(*keys)


def test_winding_figures_by_hand() -> None:
    wire = Wire("w", "round", 2e-3, 2, 0.0, 2.2e-3)
    area = 2 * np.pi * 1e-6
    assert wire.copper_area == pytest.approx(area)
    assert float(dc_resistance(wire, 20, 0.1, 100.0)) == pytest.approx(1.7241e-8 * (1 + 0.00393 * 80) * 2.0 / area)
    assert float(copper_mass(wire, 20, 0.1)) == pytest.approx(8960.0 * 2.0 * area)
    per_layer = int(FERRITE.window_height / 4.4e-3)
    assert turns_per_layer(FERRITE, wire) == per_layer
    assert layers(FERRITE, wire, per_layer + 1) == 2
    assert float(window_fill(FERRITE, wire, 20)) == pytest.approx(20 * area / FERRITE.window_area)
    depth = FERRITE.window_area / FERRITE.window_height
    most = per_layer * int(depth / 2.2e-3)
    assert fits(FERRITE, wire, most)
    assert not fits(FERRITE, wire, most + 1)


def test_every_build_of_the_catalogue_gives_keys_that_the_losses_take() -> None:
    made = 0
    for core in cores():
        for wire in wires():
            try:
                build = InductorBuild(core, wire, 6, 1e-3 if core.may_be_gapped else 0.0)
            except InputError:
                continue
            keys = build.plan_keys()
            WindingSettings.model_validate({k: v for k, v in keys.items() if k in WindingSettings.model_fields})
            CoreSettings.model_validate({k: v for k, v in keys.items() if k in CoreSettings.model_fields})
            assert build.window_fill < 0.8
            assert build.mass > core.mass
            assert build.volume > core.volume
            made += 1
    assert made > 40


def test_porosity_of_a_full_layer_of_square_conductors_is_one() -> None:
    per_layer = 10
    foil = Wire("f", "foil", 0.3e-3, 1, FERRITE.window_height, 0.4e-3)
    keys = winding_keys(FERRITE, foil, 7)
    assert (keys["winding_layers"], keys["winding_porosity"]) == (7.0, 1.0)
    size = FERRITE.window_height / per_layer
    keys = winding_keys(FERRITE, Wire("r", "round", size, 1, 0.0, size), per_layer)
    assert keys["winding_porosity"] == pytest.approx(0.5 * np.sqrt(np.pi))  # equal area: side over diameter


def test_the_catalogue_says_that_it_is_a_placeholder_and_reads() -> None:
    for name in ("cores", "wires", "capacitors"):
        assert 'grade = "placeholder"' in (FOLDER / f"{name}.toml").read_text()
    assert {c.may_be_gapped for c in cores()} == {True, False}
    assert {w.kind for w in wires()} == {"round", "foil", "litz"}
    assert {c.kind for c in capacitors()} == {"film", "electrolytic"}
    for core in cores():
        assert core.volume == pytest.approx(core.area * core.path_length, rel=1e-2)


RECORD = '[[wire]]\nname = "a"\nkind = "round"\nthickness = "1 mm"\nouter = "1.1 mm"\n'
FAULTS = {
    "no grade": (RECORD, "grade: is missing"),
    "no record": ('grade = "g"\n', r"no \[\[wire\]\]"),
    "stranger": ('grade = "g"\ncolour = 3\n' + RECORD, "colour: this key is not known"),
    "twice": ('grade = "g"\n' + RECORD + RECORD, "'a' stands twice"),
    "unit": ('grade = "g"\n' + RECORD.replace("1 mm", "1 A"), "wire 1, thickness: .*unit of current"),
    "key": ('grade = "g"\n' + RECORD + "hue = 1\n", "wire 1, hue"),
    "syntax": ("grade = ", "not valid TOML"),
}


@pytest.mark.parametrize("case", FAULTS)
def test_hostile_catalogues_are_refused_by_file_record_and_key(case: str, tmp_path: Path) -> None:
    text, words = FAULTS[case]
    file = tmp_path / "own.toml"
    file.write_text(text)
    with pytest.raises(InputError, match=words) as caught:
        wires(file)
    assert "own.toml" in str(caught.value)


def test_a_missing_catalogue_is_named(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="no readable"):
        cores(tmp_path / "none.toml")


def test_a_capacitor_of_the_catalogue_goes_into_a_plan() -> None:
    from tideleg_losses.capacitor import CapacitorEsr, CapacitorSettings

    for record in capacitors():
        keys = {k: v for k, v in record.plan_keys().items() if k in CapacitorSettings.model_fields}
        assert len(CapacitorEsr().terms(CapacitorSettings.model_validate(keys))) == 1
