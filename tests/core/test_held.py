"""Samples in memory."""

from fractions import Fraction

import numpy as np

from wavegen.core.held import Held


def test_ranges_are_copies():
    samples = np.arange(10).astype(np.complex64)
    signal = Held(sample_rate_hz=Fraction(1), n_samples=10, samples=samples, mean_power=None)
    part = signal.compute(3, 6)
    assert part.tolist() == [3, 4, 5]
    part *= 0
    assert samples[3] == 3
