import numpy as np
import pytest
import scipy.special

from wavegen.laws.mixture import KnownAmplitudes, MixedTail, mean_bessel


def test_known_amplitudes_are_counted():
    tail = KnownAmplitudes(amplitudes=np.array([0.0, 1.0, 1.0, 2.0]))
    assert tail.above(np.array([0.0, 0.5, 1.0, 2.0])).tolist() == [0.75, 0.75, 0.25, 0.0]


def test_weights_may_leave_silence():
    steps = KnownAmplitudes(amplitudes=np.array([1.0]))
    tail = MixedTail(weights=(0.5, 0.25), tails=(steps, steps), radii=(9.0, 0.5))
    # The second is cut at its radius.
    assert tail.above(np.array([0.0, 0.7, 1.0])).tolist() == [0.75, 0.5, 0.0]


@pytest.mark.parametrize("n", [100, 5000, 50_000])
def test_binned_amplitudes_keep_the_mean_of_the_wave(n):
    amplitudes = np.abs(np.random.default_rng(2).normal(size=n)) * 3
    t = np.linspace(0, 12, 60)
    want = scipy.special.j0(np.multiply.outer(t, amplitudes)).mean(axis=1)
    # Bins of 1/4096 of the largest: t d^2 / 24 s with d = 0.003, and s down to d itself.
    assert mean_bessel(amplitudes, t) == pytest.approx(want, abs=1e-14 if n < 4096 else 4e-6)
