"""Built inductors: rows IN-02, IN-05, IN-07, IN-08, WD-04, WD-09, WD-10, PR-05, VM-01 to VM-04 and their traps.

Status beside each. Rows IN-01, IN-03, IN-04, IN-06, CL and the other WD stand in test_core_and_windings.py.
"""

import numpy as np
import pytest

from tideleg_losses.dowell import COPPER_RESISTIVITY_20, skin_depth
from tideleg_losses.gap import area_product, gapped_inductance
from tideleg_losses.inductor_build_catalogue import capacitors, cores
from tideleg_losses.inductor_build_core import CoreShape, gap_for, inductance, magnetize
from tideleg_losses.inductor_build_law import OERSTED, FerriteLaw, PowderLaw
from tideleg_losses.inductor_build_winding import gauge_diameter
from tideleg_losses.volume_proxy import capacitor_volume, cooler_power_density, cooling_index, magnetic_scaling

MU0 = 4e-7 * np.pi


def ferrite(saturation=1e6, permeability=2000.0, area=200e-6, path=0.1):
    law = FerriteLaw(permeability, saturation)
    return CoreShape("test", area, path, area * path, 3e-4, 0.02, 0.08, 4800.0, 0.3, law, (6.0, 1.3, 2.5), True)


def test_in_02_gapped_circuit():  # found inputs: course slides on gapped magnetic circuits; answers computed
    turns, flux, area, path, gap = 1000, 4e-4, 1e-4, 0.2, 3e-3
    induct = gapped_inductance(turns, area, gap / 1.5, path, 1000)  # fringing as a gap area of 1.5 cm²
    assert turns**2 / induct == pytest.approx(1.750704e7, rel=1e-6)
    assert induct == pytest.approx(0.05711987, rel=1e-6)
    current = flux * turns / induct
    assert current == pytest.approx(7.002817, rel=1e-6)
    in_core = 0.5 * flux**2 * path / (MU0 * 1000 * area)
    in_gap = 0.5 * flux**2 * gap / (MU0 * 1.5e-4)
    assert in_core == pytest.approx(0.127324, rel=1e-5)
    assert in_gap == pytest.approx(1.27324, rel=1e-5)
    assert in_gap / (0.5 * induct * current**2) == pytest.approx(0.91, abs=5e-3)


def test_in_04_and_in_05_a_build_counts_core_and_fringing():
    # IN-04 closed form: without fringing 98.77 uH. IN-05 from memory: McLyman ch. 8, F = 1 + (g/sqrt A) ln(2 G/g).
    core, gap = ferrite(), 4.0212e-3
    factor = 1.0 + gap / np.sqrt(200e-6) * np.log(2 * 0.02 / gap)
    due = MU0 * 40**2 * 200e-6 / (gap / factor + 0.1 / 2000)
    assert float(inductance(core, 40, gap)) == pytest.approx(due, rel=1e-9)
    # Trap: fringing left out, a gap cut to the simple formula gives half as much again.
    assert due > 1.5 * 98.77281e-6
    assert float(inductance(core, 40, gap_for(core, 40, 98.77281e-6))) == pytest.approx(98.77281e-6, rel=1e-12)


@pytest.mark.parametrize(("reduced", "ratio"), [(0.5, 0.7864477), (1.0, 0.4199743), (0.8813736, 0.5)])
def test_in_07_hyperbolic_bias(reduced, ratio):  # found inputs: IEEE abstract on inductance-core design under dc bias
    law = FerriteLaw(5001.0, 0.4)
    field = reduced * 0.4 / (MU0 * 5000.0)
    vacuum = float(law.slope(1e9))
    assert (float(law.slope(field)) - vacuum) / (float(law.slope(0.0)) - vacuum) == pytest.approx(ratio, rel=1e-6)


def test_in_08_oersted():  # closed form: 1 Oe = 79.577 A/m
    assert pytest.approx(100.531, rel=1e-5) == 40 * 20.0 / 0.1 / OERSTED
    per_oersted = PowderLaw.per_oersted(60, 1.0, 1e-4, 1.8)
    assert float(per_oersted.share(40 * 20.0 / 0.1)) == pytest.approx(1.0 / (1.0 + 1e-4 * 100.531**1.8), rel=1e-5)
    # Trap: ampere per metre put where the curve wants oersted.
    assert float(PowderLaw(60, 1.0, 1e-4, 1.8).share(8000.0)) < 0.1 * float(per_oersted.share(8000.0))


def test_wd_04_skin_depth():  # found: Sullivan, IEMDC 2013 plenary slides, rounded to 8.5 and 4.7 mm
    assert 1e3 * float(skin_depth(60.0, 20.0)) == pytest.approx(8.5, rel=5e-3)
    assert 1e3 * float(skin_depth(200.0, 20.0)) == pytest.approx(4.7, rel=7e-3)


@pytest.mark.parametrize(("gauge", "millimetre", "tolerance"), [(18, 1.0236, 5e-4), (22, 0.635, 1.5e-2)])
def test_wd_09_wire_gauge(gauge, millimetre, tolerance):  # found: mailing-list example; textbook note (22 is 25 mil)
    assert 1e3 * float(gauge_diameter(gauge)) == pytest.approx(millimetre, rel=tolerance)


def test_wd_10_mass_resistivity():  # found: International Annealed Copper Standard history
    assert pytest.approx(COPPER_RESISTIVITY_20, rel=1e-3) == 0.15328 / 8.89e6


def test_vm_01_and_vm_02_cooler_density():  # from memory: Drofenik, Laimer, Kolar, PCIM 2005
    index = cooling_index(0.1, 0.5e-3)
    assert index == pytest.approx(20e3)
    assert cooler_power_density(0.95, 50.0, index) == pytest.approx(19e6)
    # Trap: the loss alone over the cooler's volume, without eta/(1 - eta), is 1 kW/dm³.
    assert 50.0 * index == pytest.approx(1e6)


def test_vm_03_capacitor_volume():  # closed form; the energy density is illustrative
    assert capacitor_volume(500e-6, 800.0, 0.25e6) == pytest.approx(640e-6)


def test_vm_04_scaling_by_area_product():  # from memory: McLyman
    assert [float(x) for x in magnetic_scaling(2.0)] == pytest.approx([1.681793, 1.414214, 1.681793], rel=1e-6)
    for scale in (1.5, 3.0):  # similar cores: lengths as Ap^0.25
        small, large = 2e-4 * 3e-4, (2e-4 * scale**2) * (3e-4 * scale**2)
        assert [float(x) for x in magnetic_scaling(large / small)] == pytest.approx([scale**3, scale**2, scale**3])


def test_trap_the_area_product_takes_peak_and_rms_current_once_each():
    # IN-06: 110 A peak and 100 A rms give 220 cm4; peak twice would give 242, rms twice 200.
    assert 1e8 * area_product(1e-4, 110.0, 100.0, 0.25, 5e6, 0.4) == pytest.approx(220.0)


def test_pr_05_film_of_the_catalogue_keeps_to_105_degc():  # common practice, no source
    films = [c for c in capacitors() if c.kind == "film"]
    assert films
    assert max(c.hot_spot_limit for c in films) <= 105.0


def test_ferrites_of_the_catalogue_keep_to_the_habit_of_the_trade():  # 0.25 to 0.30 T at 100 degC, common practice
    assert all(0.25 <= c.flux_limit <= 0.30 for c in cores() if c.may_be_gapped)


def test_trap_the_flux_of_a_saturating_core_is_not_l_times_i():
    core = ferrite(saturation=0.38)
    gap = gap_for(core, 40, 100e-6)
    hard = magnetize(core, 40, gap, 60.0)
    by_formula = float(inductance(core, 40, gap)) * 60.0
    assert float(hard.linkage) < 0.9 * by_formula
    assert float(hard.differential_inductance) < 0.5 * 100e-6
