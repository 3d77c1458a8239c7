"""Noise of a known law, and curves of it."""

from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import pytest
import scipy.fft

from wavegen.comparison.curves import SampledCurve, ScaleStatistics
from wavegen.comparison.measured_side import measured_side
from wavegen.comparison.side import SideSettings
from wavegen.core.signal import Signal
from wavegen.meters.batches import measure_batches
from wavegen.meters.intervals import SampledStatistics
from wavegen.production.subject import Subject


@pytest.fixture
def rng():
    return np.random.default_rng(6)


@pytest.fixture
def noise(rng):
    """Complex Gaussian noise over a quarter of the band, unit mean power in the limit."""

    def noise(n, over=4):
        spectrum = np.zeros(n, np.complex64)
        lines = n // over
        spectrum[:lines] = rng.standard_normal(2 * lines, dtype=np.float32).view(np.complex64)
        return scipy.fft.ifft(spectrum) * np.float32(n / np.sqrt(2 * lines))

    return noise


@pytest.fixture
def sampled():
    """The curve of an array as a recording, over its mean."""

    def sampled(samples):
        return SampledCurve(sampled=SampledStatistics.of(measure_batches(samples)))

    return sampled


@pytest.fixture
def on_scale():
    """The curve of an array as a recording, on the scale of its samples."""

    def on_scale(samples):
        found = measure_batches(np.asarray(samples, np.complex64))
        return SampledCurve(sampled=ScaleStatistics.of(found), shift_db=found.statistics.mean_db)

    return on_scale


@dataclass(frozen=True, eq=False, kw_only=True)
class Held(Signal):
    """Samples that are already there."""

    samples: np.ndarray

    def compute(self, start, stop, *arrays):
        return self.samples[start:stop].copy()


@pytest.fixture
def side():
    """An array as a side: a loop, exact, or a recording."""

    def side(samples, name="x", *, loops=True, rate_hz=10**6, level_dbm=None):
        samples = np.asarray(samples, np.complex64)
        signal = Held(
            sample_rate_hz=Fraction(rate_hz),
            n_samples=samples.size,
            mean_power=None,
            samples=samples,
        )
        subject = Subject(name=name, signal=signal, loops=loops, reference_level_dbm=level_dbm)
        return measured_side(subject, SideSettings(subject=name))

    return side


@pytest.fixture
def rapp():
    """Noise through a Rapp amplifier of unit saturation."""

    def rapp(samples, smoothness=2.0):
        ratio = np.abs(samples)
        return (samples / (1 + ratio ** (2 * smoothness)) ** (0.5 / smoothness)).astype(
            np.complex64
        )

    return rapp
