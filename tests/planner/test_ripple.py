"""Ripple that reaches the battery, against a time-domain solution of the divider (scipy), source: circuit law."""

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from tideleg import Exchange, Segment, Waveform
from tideleg.ripple import battery_ripple

F, FARAD = 80e3, 60e-6


def exchange(ripple):
    return Exchange(
        Waveform((Segment(0.0, 0.3, -ripple / 2, ripple / 2), Segment(0.3, 0.7, ripple / 2, -ripple / 2))), F, 400.0
    )


def triangle(t, ripple):
    x = np.mod(t * F, 1.0)
    return ripple * np.where(x < 0.3, x / 0.3 - 0.5, 0.5 - (x - 0.3) / 0.7)


@pytest.mark.parametrize("henry", [0.0, 2e-6])
@pytest.mark.parametrize("ohms", [0.02, 0.1])
def test_it_is_the_periodic_state_of_the_divider(ohms, henry):
    rms, swing = battery_ripple(exchange(40.0), FARAD, ohms, henry)

    # The capacitor's voltage v drives the battery branch: C v' = i_stage - i_b, L i_b' = v - R i_b (or i_b = v/R).
    def slope(t, state):
        v = state[0]
        through = state[1] if henry else v / ohms
        rise = [(triangle(t, 40.0) - through) / FARAD]
        return [*rise, (v - ohms * through) / henry] if henry else rise

    periods = 400
    end = periods / F
    instants = end - np.linspace(1.0, 0.0, 2001)[:-1] / F
    start = [0.0, 0.0] if henry else [0.0]
    solved = solve_ivp(slope, (0, end), start, t_eval=instants, rtol=1e-8, atol=1e-8, max_step=0.05 / F)
    through = solved.y[1] if henry else solved.y[0] / ohms
    assert float(rms) == pytest.approx(np.std(through), rel=5e-3)
    assert float(swing) == pytest.approx(np.ptp(through), rel=1e-2)


def test_without_a_stiff_capacitor_the_battery_takes_nearly_all_of_it():
    rms, _ = battery_ripple(exchange(40.0), 1e-12, 0.05, 0.0)
    assert float(rms) == pytest.approx(40.0 / np.sqrt(12.0), rel=1e-3)


def test_no_ripple_gives_none_and_arrays_keep_their_shape():
    rms, swing = battery_ripple(exchange(np.array([[0.0, 10.0, 20.0]])), FARAD, np.full((1, 3), 0.1), 0.0)
    assert rms.shape == swing.shape == (1, 3)
    assert rms[0, 0] == 0.0
    assert rms[0, 2] == pytest.approx(2 * rms[0, 1])
