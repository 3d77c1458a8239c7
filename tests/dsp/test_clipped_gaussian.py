import numpy as np
import pytest

from wavegen.dsp.clipped_gaussian import clip_gaussian

TABLE = [
    (4, 0.95400, -0.367, 9.81, 10.43),
    (5, 0.97644, -0.188, 6.67, 6.93),
    (6, 0.98978, -0.082, 4.13, 4.21),
    (7, 0.99641, -0.029, 2.27, 2.29),
    (8, 0.99903, -0.008, 1.09, 1.09),
]
"""Clip ratio, dB; gain; power left, dB; error with the gain fitted and without, %.

Formulas as in Ochiai and Imai, IEEE Trans. Commun. 50(1), 2002; values from an earlier study, which
also simulated them."""


@pytest.mark.parametrize(("ratio_db", "gain", "power_db", "fitted", "unfitted"), TABLE)
def test_the_table(ratio_db, gain, power_db, fitted, unfitted):
    found = clip_gaussian(10 ** (ratio_db / 10))
    assert found.gain == pytest.approx(gain, abs=6e-6)
    assert 10 * np.log10(found.power) == pytest.approx(power_db, abs=6e-4)
    assert 100 * found.fitted_error == pytest.approx(fitted, abs=0.006)
    assert 100 * found.unfitted_error == pytest.approx(unfitted, abs=0.006)


@pytest.mark.parametrize("ratio", [0.3, 1.0, 2.5])
def test_samples_agree(ratio):
    """4e5 samples: their own power is off by 0.16 %; tolerance three of that."""
    rng = np.random.default_rng(1)
    x = (rng.normal(size=400_000) + 1j * rng.normal(size=400_000)) / np.sqrt(2)
    y = x * np.minimum(1, np.sqrt(ratio) / np.abs(x))
    found = clip_gaussian(ratio)
    assert np.vdot(x, y).real / np.vdot(x, x).real == pytest.approx(found.gain, rel=5e-3)
    assert np.mean(np.abs(y) ** 2) == pytest.approx(found.power, rel=5e-3)


def test_a_high_clip_does_nothing():
    found = clip_gaussian(1e3)
    assert (found.gain, found.power) == (1.0, 1.0)
    assert found.fitted_error == found.unfitted_error == 0.0
