from fractions import Fraction

import numpy as np
import pytest

from wavegen.dsp.interpolation import PASSBAND, Interpolator, delay_taps, interpolation_kernel


@pytest.mark.parametrize("fraction", [-0.5, -0.21, 0.1, 0.37, 0.5])
def test_a_delay_is_flat_in_amplitude_and_phase(fraction):
    taps = delay_taps(fraction)
    lag = np.arange(taps.size) - taps.size // 2
    frequency = np.linspace(-PASSBAND / 2, PASSBAND / 2, 301)
    response = np.exp(-2j * np.pi * frequency[:, None] * lag) @ taps
    ideal = np.exp(-2j * np.pi * frequency * fraction)
    assert np.abs(response - ideal).max() < 1e-6  # 120 dB


def test_no_fraction_is_one_tap():
    taps = delay_taps(0.0)
    assert taps[taps.size // 2] == pytest.approx(1, abs=1e-15)
    assert np.abs(np.delete(taps, taps.size // 2)).max() < 1e-15


@pytest.mark.parametrize("ratio", [Fraction(1), Fraction(3, 2), Fraction(1, 2), Fraction(5, 16)])
def test_the_kernel_is_a_lowpass_of_the_lower_rate(ratio):
    kernel = Interpolator.between(ratio)
    lower = float(min(ratio, Fraction(1)))
    density = 16
    values = kernel.on_lattice(density) / density
    time = (np.arange(values.size) - values.size // 2) / density
    for frequency, want, error in (
        (np.linspace(0, PASSBAND / 2, 101), 1.0, 1e-6),
        (np.array([0.5]), 0.5, 1e-4),
        (np.linspace(1 - PASSBAND / 2, 3, 301), 0.0, 1e-6),
    ):
        response = np.exp(-2j * np.pi * lower * frequency[:, None] * time) @ values
        assert np.abs(response - want).max() < error


def test_zero_outside_its_span():
    kernel = Interpolator.between(Fraction(1, 3))
    span = kernel.span_symbols
    outside = np.array([-1e9, -span - 0.1, -span, span, span + 0.5])
    assert not kernel.values(outside).any()
    assert interpolation_kernel(np.zeros(1), lower=1 / 3)[0] == pytest.approx(1 / 3)
