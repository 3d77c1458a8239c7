from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.core.rng import stream_key
from wavegen.dsp.white_noise import WhiteNoise, gaussian_of


def test_extreme_words_give_finite_samples():
    words = np.array([0, 2**64 - 1, (1 << 24) - 1, ((1 << 40) - 1) << 24], dtype=np.uint64)
    out = np.empty(4, np.complex64)
    gaussian_of(words, out)
    # The lowest 40 bits stand for u = 2^-41, the highest for 1 - 2^-41.
    expected = [41 * np.log(2), 2.0**-41, 41 * np.log(2), 2.0**-41]
    np.testing.assert_allclose(np.abs(out) ** 2, expected, rtol=1e-5)


def test_samples_are_white_circular_and_of_unit_power():
    n = 1 << 16
    noise = WhiteNoise(sample_rate_hz=Fraction(1), n_samples=n, key=stream_key(1, "a"))
    x = samples_of(noise).astype(np.complex128)
    # Standard errors of these means are 1/sqrt(n) each: 5 of them.
    assert np.mean(np.abs(x) ** 2) == pytest.approx(1.0, abs=5 / np.sqrt(n))
    for mean in (x.mean(), np.mean(x**2), np.mean(x[1:] * x[:-1].conj())):
        assert abs(mean) < 5 / np.sqrt(n)
    assert np.mean(np.abs(x) ** 4) == pytest.approx(2.0, abs=5 * np.sqrt(20 / n))
