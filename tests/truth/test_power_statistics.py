"""The power meter against closed forms.

Sampling tolerances: at probability q over n independent samples the share beyond a level is
binomial, so that it lies within 5 sigma = 5 sqrt(q (1 - q) / n); a level is checked through the
law at the level read, widened by the meter's bin (0.0085 dB).
"""

from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import pytest
import scipy.fft
import scipy.special

from wavegen.core.signal import Samples, Signal
from wavegen.meters.peak import peak_between_samples
from wavegen.meters.power import measure_samples

N = 1_000_000
BIN_DB = 0.0085


@dataclass(frozen=True, eq=False, kw_only=True)
class Held(Signal):
    """Samples that are already there."""

    samples: Samples

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        return self.samples[start:stop].copy()


def held(samples):
    return Held(sample_rate_hz=Fraction(1), n_samples=samples.size, samples=samples)


def agrees(found, law, probabilities, n):
    """Whether the law at each level read lies within 5 sigma of the probability."""
    for probability in probabilities:
        level = float(found.level_db(probability))
        five_sigma = 5 * np.sqrt(probability * (1 - probability) / n)
        assert law(level + BIN_DB) <= probability + five_sigma, probability
        assert law(level - BIN_DB) >= probability - five_sigma, probability


def test_complex_gaussian():
    # P(p > g) = exp(-g): Rayleigh envelope; textbook, derivation.
    rng = np.random.default_rng(1)
    samples = (rng.standard_normal(N) + 1j * rng.standard_normal(N)).astype(np.complex64)
    found = measure_samples(samples)
    agrees(found, lambda level: np.exp(-(10 ** (level / 10))), [0.9, 0.5, 0.1, 1e-2, 1e-3, 1e-4], N)
    # Level at 0.1 %: 8.3934 dB; density exp(-g) there, 1 sigma = 0.02 dB for n = 1e6.
    assert found.level_db(1e-3) == pytest.approx(8.3934, abs=5 * 0.02)
    assert found.ccdf(0) == pytest.approx(np.exp(-1), abs=5 * 0.5e-3)
    # Mean 2, standard error 2 / sqrt(n).
    assert found.mean == pytest.approx(2, abs=5 * 2e-3)


def test_real_gaussian():
    # P(x^2 > g) = erfc(sqrt(g / 2)): chi-square with one degree of freedom; textbook, derivation.
    rng = np.random.default_rng(2)
    found = measure_samples(rng.standard_normal(N).astype(np.complex64))
    law = lambda level: scipy.special.erfc(np.sqrt(10 ** (level / 10) / 2))  # noqa: E731
    agrees(found, law, [0.5, 0.1, 1e-2, 1e-3, 1e-4], N)


@pytest.mark.parametrize("n_cycles", [1, 7919])
def test_two_equal_tones(n_cycles):
    # P(p > g) = arccos(g - 1) / pi; elementary, derivation. Phases are evenly spaced, so that
    # counts are off by two samples at most, and by what falls into one bin.
    phase = 2 * np.pi * n_cycles * (np.arange(N) + 0.5) / N
    found = measure_samples((np.exp(1j * phase) + np.exp(-1j * phase)).astype(np.complex64))
    assert found.papr_db == pytest.approx(10 * np.log10(2), abs=1e-5)
    assert found.mean == pytest.approx(2, rel=1e-6)
    for level in (-20.0, -10, -3, 0, 1, 2, 2.9, 3, 3.0102):
        gain = 10 ** (level / 10)
        in_bin = np.diff(np.arccos(np.array([gain / 1.002, gain]) - 1))[0] / np.pi
        expected = np.arccos(gain - 1) / np.pi
        assert found.ccdf(level) == pytest.approx(expected, abs=abs(in_bin) / 4 + 4 / N), level
    # Levels: g = 1 + cos(pi q).
    for probability in (0.9, 0.5, 0.1, 1e-2, 1e-3, 1e-4):
        expected = 10 * np.log10(1 + np.cos(np.pi * probability))
        assert found.level_db(probability) == pytest.approx(expected, abs=BIN_DB)


def test_sine_on_one_rail():
    # cos^2 has the same law as two equal tones: 3.01 dB, no rest of it on the other rail.
    samples = np.cos(2 * np.pi * 12345 * np.arange(N) / N).astype(np.complex64)
    found = measure_samples(samples)
    assert found.papr_db == pytest.approx(3.0103, abs=1e-4)
    assert found.level_db(0.5) == pytest.approx(0, abs=BIN_DB)


def test_constant_envelope():
    # Definition: an unmodulated or phase-modulated carrier reads 0 dB at every probability.
    phase = np.cumsum(np.random.default_rng(3).standard_normal(100_000))
    found = measure_samples((0.7 * np.exp(1j * phase)).astype(np.complex64))
    np.testing.assert_allclose(found.level_db([0, 1e-6, 1e-3, 0.5, 0.99]), 0, atol=1e-4)
    assert found.mean_db == pytest.approx(20 * np.log10(0.7), abs=1e-5)


@pytest.mark.parametrize(("depth", "papr_db"), [(1, 4.260), (0.5, 3.010), (0.3, 2.088)])
def test_amplitude_modulation_by_a_sine(depth, papr_db):
    # (1 + m)^2 / (1 + m^2 / 2); elementary, derivation.
    tone = 1 + depth * np.cos(2 * np.pi * np.arange(100_000) / 1000)
    assert measure_samples(tone.astype(np.complex64)).papr_db == pytest.approx(papr_db, abs=6e-4)


@pytest.mark.parametrize(("duty", "shift_db"), [(0.5, 3.0103), (0.25, 6.0206), (0.125, 9.0309)])
def test_burst_shifts_levels_by_its_duty(duty, shift_db):
    # Elementary: the mean over all time falls by the duty cycle, the peak does not.
    samples = np.zeros(80_000, np.complex64)
    samples[: int(80_000 * duty)] = 1
    found = measure_samples(samples)
    assert found.papr_db == pytest.approx(shift_db, abs=1e-4)
    assert found.level_db(duty * 0.99) == pytest.approx(shift_db, abs=1e-4)
    assert found.n_zeros == 80_000 - int(80_000 * duty)


def test_hard_clipped_gaussian():
    # Clipping at ceiling c over the mean before: mean after = 1 - exp(-c), share at the wall
    # exp(-c); derivation (integral of the exponential law).
    rng = np.random.default_rng(4)
    samples = (rng.standard_normal(N) + 1j * rng.standard_normal(N)) * np.sqrt(0.5)
    ceiling = 10**0.6  # 6 dB
    clipped = samples / np.maximum(np.abs(samples) / np.sqrt(ceiling), 1)
    found = measure_samples(clipped.astype(np.complex64))
    mean = 1 - np.exp(-ceiling)
    share = np.exp(-ceiling)  # 1.87 %
    assert found.mean == pytest.approx(mean, abs=5 / np.sqrt(N))
    wall = 10 * np.log10(ceiling / found.mean)
    np.testing.assert_allclose(found.level_db([1e-6, 1e-3, 0.9 * share]), wall, atol=1e-4)
    assert found.ccdf(wall - 1e-4) == pytest.approx(share, abs=5 * np.sqrt(share / N))


@pytest.mark.parametrize(("oversampling", "bound_db"), [(2, 3.0103), (4, 0.6877), (8, 0.1685)])
def test_band_edge_pair_attains_the_bound_between_samples(oversampling, bound_db):
    # Peak <= largest sample / cos(pi / 2L): Sharif, Gharavi-Alkhansari, Khalaj, IEEE Trans.
    # Commun. 51(1), 2003, 72-78 (abstract read; values re-computed). Two tones at +-fs / 2L,
    # sampled symmetrically about their crest, attain it.
    n = np.arange(16_384)
    samples = (2 * np.cos(np.pi * (n + 0.5) / oversampling)).astype(np.complex64)
    found = peak_between_samples(held(samples), measure_samples(samples))
    assert -20 * np.log10(np.cos(np.pi / 2 / oversampling)) == pytest.approx(bound_db, abs=5e-5)
    assert found.gained_db == pytest.approx(bound_db, abs=2e-4)
    assert found.power == pytest.approx(4, rel=2e-5)
    assert found.position_samples % oversampling == oversampling - 0.5


@pytest.mark.parametrize("oversampling", [1.25, 2, 4, 8])
def test_bound_between_samples_is_never_exceeded(oversampling):
    # The same bound, over random signals of that oversampling.
    bound_db = -20 * np.log10(np.cos(np.pi / 2 / oversampling))
    rng = np.random.default_rng(5)
    for _ in range(15):
        spectrum = np.zeros(4096, np.complex128)
        half = int(2048 / oversampling) - 1
        spectrum[np.arange(-half, half + 1)] = rng.choice([1, 1j, -1, -1j], 2 * half + 1)
        samples = scipy.fft.ifft(spectrum).astype(np.complex64)
        found = peak_between_samples(held(samples), measure_samples(samples))
        assert 0 <= found.gained_db <= bound_db + 1e-4
