"""Noise of a known law, and curves of it."""

import numpy as np
import pytest
import scipy.fft

from wavegen.comparison.curves import SampledCurve, ScaleStatistics
from wavegen.meters.batches import measure_batches
from wavegen.meters.intervals import SampledStatistics


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
