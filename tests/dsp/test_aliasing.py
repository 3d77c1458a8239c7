from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.signal import Signal
from wavegen.dsp.aliasing import FACTOR, folded_share


@dataclass(frozen=True, eq=False, kw_only=True)
class TwoTones(Signal):
    """Two equal tones at plus and minus a frequency."""

    cycles: int

    def compute(self, start, stop, *arrays):
        n = np.arange(start, stop)
        return np.cos(2 * np.pi * self.cycles * n / self.n_samples).astype(np.complex64)


def tones(frequency, n_samples=10_000):
    return TwoTones(
        sample_rate_hz=Fraction(1), n_samples=n_samples, cycles=round(frequency * n_samples)
    )


def cubic(samples):
    return samples * (1 - 0.2 * np.abs(samples) ** 2)


@pytest.mark.parametrize(("frequency", "is_beyond"), [(0.1, False), (0.16, False), (0.2, True)])
def test_third_order_products_of_two_tones(frequency, is_beyond):
    """cos^3 = 3/4 cos + 1/4 cos(3 .): the products at 3 f have 0.05^2 over the whole."""
    whole = 0.85**2 + 0.05**2
    share = folded_share(tones(frequency), cubic)
    # Side lobes of the window and the interpolation lie 120 dB down.
    assert share == pytest.approx(0.05**2 / whole if is_beyond else 0.0, rel=1e-4, abs=1e-11)


def test_a_linear_step_folds_nothing():
    assert folded_share(tones(0.3), lambda samples: 2 * samples) < 1e-11


def test_a_step_with_memory_gets_its_halo():
    def delayed(samples):
        n_out = samples.size - 2 * FACTOR * 3
        return samples[2 * FACTOR : 2 * FACTOR + n_out]

    assert folded_share(tones(0.2), delayed, halo=3) < 1e-11


def test_silence():
    assert folded_share(tones(0.1), lambda samples: 0 * samples) == 0.0
