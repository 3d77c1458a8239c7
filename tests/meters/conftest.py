"""An array as a signal, and band-limited noise to try meters on."""

from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import pytest
import scipy.fft

from wavegen.core.signal import Samples, Signal


@dataclass(frozen=True, eq=False, kw_only=True)
class Held(Signal):
    """Samples that are already there."""

    samples: Samples

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        return self.samples[start:stop].copy()


@pytest.fixture
def held():
    def make(samples):
        samples = np.asarray(samples, np.complex64)
        return Held(
            sample_rate_hz=Fraction(10**6), n_samples=samples.size, samples=samples, mean_power=None
        )

    return make


@pytest.fixture
def band_noise():
    """Complex Gaussian noise of unit power, cyclic, filling a fraction of the rate."""

    def make(seed, n, fraction):
        rng = np.random.default_rng(seed)
        spectrum = np.zeros(n, np.complex128)
        half = int(n * fraction / 2)
        lines = np.arange(-half, half + 1)
        spectrum[lines] = rng.standard_normal(lines.size) + 1j * rng.standard_normal(lines.size)
        samples = scipy.fft.ifft(spectrum)
        return (samples / np.sqrt(np.mean(np.abs(samples) ** 2))).astype(np.complex64)

    return make
