"""Phase pulses: integrals of their frequency pulses, from 0 to 1/2."""

import numpy as np
import pytest
import scipy.integrate

from wavegen.dsp import phase_pulses
from wavegen.dsp.phase_pulses import (
    PhasePulse,
    four_level_frequency_pulse,
    four_level_phase,
    gaussian_frequency_pulse,
    gaussian_phase,
    rectangular_phase,
    soqpsk_tg_frequency_pulse,
    soqpsk_tg_phase,
)

PULSES = {
    "rectangular": rectangular_phase(),
    "early": rectangular_phase(-0.5),
    "gaussian 0.1": gaussian_phase(0.1),
    "gaussian 0.3": gaussian_phase(0.3),
    "gaussian 10": gaussian_phase(10.0),
    "soqpsk": soqpsk_tg_phase(),
    "four level": four_level_phase(),
}


@pytest.mark.parametrize("name", PULSES)
def test_zero_before_a_half_after_and_no_step(name):
    pulse = PULSES[name]
    low, high = pulse.first_symbols, pulse.last_symbols
    assert pulse.n_near == high - low
    outside = pulse.values(np.array([-1e9, low - 1.0, low, high, high + 1.0, 1e9]))
    assert outside.tolist() == [0.0, 0.0, 0.0, 0.5, 0.5, 0.5]
    t = np.linspace(low - 0.5, high + 0.5, 1 + 4096 * (high - low + 1))
    # the steepest is the four-level pulse: 0.586 in its middle
    assert np.max(np.abs(np.diff(pulse.values(t)))) < 0.6 / 4096
    centre = getattr(pulse, "centre_symbols", 0.0)
    assert pulse.values(centre + t) + pulse.values(centre - t) == pytest.approx(0.5, abs=1e-9)


@pytest.mark.parametrize(("bt", "half"), [(0.1, 8), (0.3, 3), (0.5, 2), (10.0, 1)])
def test_gaussian_support_and_integral(bt, half):
    # what is cut is below 1e-9; the quadrature is good to 1e-11
    pulse = gaussian_phase(bt)
    assert (pulse.first_symbols, pulse.last_symbols) == (-half, half)
    for t in (-1.3, -0.5, 0.0, 0.2, 0.75):
        area, _ = scipy.integrate.quad(
            gaussian_frequency_pulse, -40, t, args=(bt,), points=[-0.5, t - 0.5], limit=400
        )
        assert pulse.values(np.array(t)) == pytest.approx(area, abs=2e-9)


@pytest.mark.parametrize(
    ("pulse", "density"),
    [(soqpsk_tg_phase(), soqpsk_tg_frequency_pulse), (four_level_phase(), None)],
)
def test_integrated_pulses_have_the_slope_of_their_density(pulse, density):
    # a central difference over h = 1e-4 errs by g'' h^2 / 6, below 1e-7
    t = np.arange(pulse.first_symbols, pulse.last_symbols, 0.37) + 0.01
    slope = (pulse.values(t + 1e-4) - pulse.values(t - 1e-4)) / 2e-4
    shape = (density or pulse.density)(t)
    scale = 0.5 / scipy.integrate.trapezoid(
        pulse.density(fine := np.linspace(pulse.first_symbols, pulse.last_symbols, 400_001)), fine
    )
    assert slope == pytest.approx(shape * scale, abs=1e-6)


def test_the_pole_of_the_soqpsk_pulse():
    # 1 - 4 x^2 = 0 at t = 1 / (rho B) bits
    t = 1 / (phase_pulses.SOQPSK_RHO * phase_pulses.SOQPSK_B)
    around = soqpsk_tg_frequency_pulse(np.array([t - 1e-6, t, t + 1e-6]))
    assert around[1] == pytest.approx((around[0] + around[2]) / 2, abs=1e-9)


def test_four_level_pulse_has_area_one_and_its_spectrum():
    # 16 points a symbol hold a band of 0.6 symbol rates; its lobes 60 symbols out are 1e-5 high
    t = np.arange(-960, 961) / 16
    pulse = four_level_frequency_pulse(t)
    for f, want in ((0.0, 1.0), (0.3, 1 / np.sinc(0.3)), (0.5, 0.5 / np.sinc(0.5)), (0.65, 0.0)):
        assert np.sum(pulse * np.cos(2 * np.pi * f * t)) / 16 == pytest.approx(want, abs=5e-5)


def test_the_base_only_describes():
    with pytest.raises(TypeError):
        PhasePulse(first_symbols=0, last_symbols=1).values(np.array([0.5]))
