"""Envelope laws against published levels and closed forms."""

import math
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.periodic import PeriodicLaw
from wavegen.sources.carrier import Carrier


def test_complex_gaussian_levels():
    # S. O. Rice, "Mathematical analysis of random noise", BSTJ 23/24, 1944/45: exponential power.
    # Levels 10 log10(-ln q) to the three decimals printed in the tables of the trade.
    probability = [1e-1, 1e-2, 1e-3, 1e-4, 1e-5, 1e-6]
    expected = [3.622157, 6.632457, 8.393369, 9.642757, 10.61186, 11.40367]
    np.testing.assert_allclose(GaussianLaw().level_db(probability), expected, atol=1e-5)


def test_two_equal_tones_follow_the_arccosine():
    # Derivation: p = 1 + cos(2 pi t), so P(p > g) = arccos(g - 1) / pi (also Borwein, Straub,
    # Wan, Zudilin, Canad. J. Math. 64, 2012, for two steps). Tolerance: what laws promise.
    law = PeriodicLaw.of_harmonics(np.array([-1, 1]), np.array([1.0, 1.0j]))
    probability = np.geomspace(1e-9, 0.99, 100)
    expected = 10 * np.log10(1 + np.cos(np.pi * probability))
    np.testing.assert_allclose(law.level_db(probability), expected, atol=0.001)
    power = np.linspace(0.01, 1.999, 100)
    got = law.ccdf(10 * np.log10(power))
    np.testing.assert_allclose(got, np.arccos(power - 1) / np.pi, atol=1e-6)
    assert law.peak_db == pytest.approx(10 * math.log10(2), abs=1e-9)


@pytest.mark.parametrize(("depth", "expected"), [(1.0, 4.259687), (0.5, 3.010300), (0.3, 2.087704)])
def test_amplitude_modulation_by_a_sine(depth, expected):
    # Derivation: peak (1 + m)^2 over mean 1 + m^2 / 2. Tolerance: the printed decimals.
    sidebands = np.array([depth / 2, 1.0, depth / 2])
    law = PeriodicLaw.of_harmonics(np.array([-1, 0, 1]), sidebands)
    assert expected == pytest.approx(
        10 * math.log10((1 + depth) ** 2 / (1 + depth**2 / 2)), abs=1e-6
    )
    assert law.peak_db == pytest.approx(expected, abs=1e-6)
    # Envelope 1 + m cos: above (1 + m cos(pi q))^2 for a share q of the time.
    probability = np.array([0.5, 0.1, 1e-3, 1e-6])
    level = (1 + depth * np.cos(np.pi * probability)) ** 2 / (1 + depth**2 / 2)
    np.testing.assert_allclose(law.level_db(probability), 10 * np.log10(level), atol=0.001)


def test_unmodulated_carrier_reads_zero_on_every_sample():
    # Definition of the envelope's PAPR: 0 dB. Tolerance 1e-4 dB; float32 allows 1e-6 dB.
    here = Site(sample_rate_hz=Fraction(1000), n_samples=999, seed=1, label="a", path="signal")
    power = np.abs(samples_of(Carrier(phase_deg=12.3).build(here)).astype(np.complex128)) ** 2
    assert np.abs(10 * np.log10(power)).max() < 1e-4
    assert ConstantLaw().level_db(1e-4) == 0.0
