"""Band-limited noise: its law, its band, its moments."""

from fractions import Fraction

import numpy as np
import pytest
import scipy.signal

from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.laws.gaussian import GaussianLaw
from wavegen.sources.noise import Noise

RATE = Fraction(1_000_000)
N = 1 << 21

# Variance inflation of a CCDF estimate for a flat band at a quarter of the rate, from the
# bivariate Rayleigh tail: V = 1 + 2 sum_k (P2(k) - p^2) / (p (1 - p)). Derivation; 1 if white.
INFLATION = {1e-1: 2.98, 1e-2: 2.39, 1e-3: 1.99, 1e-4: 1.75}


def noise(bandwidth_hz: int, seed: int = 1, n: int = N):
    here = Site(sample_rate_hz=RATE, n_samples=n, seed=seed, label="a", path="signal")
    return samples_of(Noise(bandwidth_hz=Fraction(bandwidth_hz)).build(here))


@pytest.mark.parametrize("bandwidth_hz", [1_000_000, 250_000])
def test_noise_follows_the_exponential_law(bandwidth_hz):
    # Rice 1944/45: P(p > x) = exp(-x), about the nominal mean 1. Tolerance: 4 standard deviations
    # of a share of n samples with variance inflation V: sqrt(V p (1 - p) / n); 4 % at 1e-3.
    power = np.abs(noise(bandwidth_hz)) ** 2
    for probability, inflation in INFLATION.items():
        v = inflation if bandwidth_hz < RATE else 1.0
        threshold = 10 ** (GaussianLaw().level_db(probability) / 10)
        share = float(np.mean(power > threshold))
        sigma = np.sqrt(v * probability * (1 - probability) / N)
        assert abs(share - probability) < 4 * sigma


def test_moments_of_the_power_are_factorials():
    # Exponential power: E x^2 = 2, E x^3 = 6 (derivation). Standard deviations of the means over
    # n independent samples: sqrt(24 - 4), sqrt(720 - 36) over sqrt(n); 4 of them.
    power = np.abs(noise(1_000_000).astype(np.complex128)) ** 2
    assert abs(power.mean() - 1) < 4 / np.sqrt(N)
    assert abs(np.mean(power**2) - 2) < 4 * np.sqrt(20 / N)
    assert abs(np.mean(power**3) - 6) < 4 * np.sqrt(684 / N)


def test_rails_are_gaussian_and_independent():
    # Real Gaussian rails of variance 1/2: fourth moment 3/4, and no correlation between them or
    # with the square of the complex sample (circularity). 4 standard deviations: the variance of
    # r^4 is (105 - 9) / 16, those of I Q and of (I^2 - Q^2) / 2 are 1/4.
    samples = noise(1_000_000).astype(np.complex128)
    for rail in (samples.real, samples.imag):
        assert abs(np.mean(rail**4) - 0.75) < 4 * np.sqrt(6 / N)
    square = np.mean(samples**2) / 2
    assert abs(square.real) < 4 * np.sqrt(0.25 / N)
    assert abs(square.imag) < 4 * np.sqrt(0.25 / N)
    # White: the correlation at every lag has standard deviation 1 / sqrt(n).
    for lag in (1, 2, 3, 1000):
        assert abs(np.vdot(samples[lag:], samples[:-lag])) / N < 4 / np.sqrt(N)


@pytest.mark.parametrize(("bandwidth_hz", "edge"), [(250_000, 0.05), (600_000, 0.1)])
def test_band_is_flat_inside_and_at_the_floor_outside(bandwidth_hz, edge):
    # Settings' promise: half amplitude at half the bandwidth, flat to the inner end of the edge,
    # 100 dB down beyond its outer end. The window's own sidelobes lie below 140 dB. Averages of
    # whole stretches of the band: 2^21 samples hold 3e5 independent ones, so 0.1 dB is 10 sigma.
    here = Site(sample_rate_hz=RATE, n_samples=N, seed=3, label="a", path="signal")
    made = Noise(bandwidth_hz=Fraction(bandwidth_hz), edge_fraction=edge).build(here)
    frequency, density = scipy.signal.welch(
        samples_of(made).astype(np.complex128),
        fs=float(RATE),
        window=("kaiser", 20.0),
        nperseg=4096,
        return_onesided=False,
        detrend=False,
    )
    away = np.abs(frequency)
    leak = 4e-3 * float(RATE)  # main lobe of the window: 16 of 4096 lines
    outer = bandwidth_hz / 2 * (1 + edge) + leak
    inner = bandwidth_hz / 2 * (1 - edge) - leak
    assert np.max(density[away > outer]) * bandwidth_hz < 1e-10
    bands = np.array_split(np.sort(np.flatnonzero(away < inner)), 8)
    for band in bands:
        # Unit power over the bandwidth, less what the edges lose: between 0 and edge / 2.
        level = 10 * np.log10(density[band].mean() * bandwidth_hz)
        assert -0.05 < level < 0.1 + 10 * np.log10(1 + edge / 2)
    flat = 10 * np.log10([density[band].mean() for band in bands])
    assert np.ptp(flat) < 0.1
    middle = density[np.abs(away - bandwidth_hz / 2) < float(RATE) / 4096].mean()
    assert 10 * np.log10(middle) - flat.mean() == pytest.approx(-6.02, abs=0.5)


def test_seam_is_like_any_other_place():
    # A cut through band-limited noise leaks at -25 dB and worse; a loop must not leak at all.
    twice = np.tile(noise(250_000, n=1 << 14), 2)
    spectrum = np.abs(np.fft.fft(np.roll(twice, 1 << 13).astype(np.complex128))) ** 2
    frequency = np.abs(np.fft.fftfreq(twice.size))
    assert spectrum[frequency > 0.135].mean() / spectrum[frequency < 0.115].mean() < 1e-10
