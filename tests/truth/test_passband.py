"""Envelope and radio frequency: levels of the squared voltage at a random carrier phase."""

from fractions import Fraction

import numpy as np
import pytest
from scipy import special

from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.meters.passband import PassbandStatistics
from wavegen.meters.power import measure_samples
from wavegen.sources.noise import Noise


@pytest.fixture(scope="module")
def exact():
    """An envelope whose CCDF is exp(-x), by equal shares: no sampling error."""
    n = 1_000_000
    power = -np.log((np.arange(n) + 0.5) / n)
    statistics = measure_samples(np.sqrt(power).astype(np.complex64))
    return PassbandStatistics(envelope=statistics)


@pytest.mark.parametrize(
    ("probability", "level_db", "rise_db"),
    [(1e-1, 4.323, 0.70), (1e-2, 8.218, 1.59), (1e-3, 10.345, 1.95), (1e-4, 11.800, 2.16)],
)
def test_complex_gaussian(exact, probability, level_db, rise_db):
    # erfc(sqrt(x/2)), textbook; figures given to three (two) decimals. Shares of 1e-6 at 1e-4:
    # 0.5 % of it, 0.002 dB.
    assert float(exact.level_db(probability)) == pytest.approx(level_db, abs=0.003)
    assert float(exact.over_envelope_db(probability)) == pytest.approx(rise_db, abs=0.01)


def test_the_whole_curve_is_the_error_function(exact):
    power = np.array([0.05, 0.5, 1.0, 3.0, 8.0, 12.0])
    want = special.erfc(np.sqrt(power / 2))
    assert exact.ccdf(10 * np.log10(power)) == pytest.approx(want, rel=2e-3)


def test_only_the_peak_rises_by_three_decibels(exact):
    assert exact.papr_db - exact.envelope.papr_db == pytest.approx(3.0103, abs=1e-4)
    assert np.all(exact.over_envelope_db([0.1, 0.01, 1e-3, 1e-4]) < 2.3)


def test_generated_noise():
    # 2^19 samples of white noise: 4 sigma at 0.1 %, where the curve falls by 1.05 a dB (ln):
    # 4 / sqrt(524) / 1.2 ... 0.15 dB; a tenth of it at 10 %.
    site = Site(sample_rate_hz=Fraction(10**6), n_samples=1 << 19, seed=2, label="a", path="s")
    noise = samples_of(Noise(bandwidth_hz=Fraction(10**6)).build(site))
    rf = PassbandStatistics(envelope=measure_samples(noise))
    assert float(rf.level_db(0.1)) == pytest.approx(4.323, abs=0.02)
    assert float(rf.level_db(1e-3)) == pytest.approx(10.345, abs=0.15)
