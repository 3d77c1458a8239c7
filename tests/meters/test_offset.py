import numpy as np

from wavegen.core.render import samples_of
from wavegen.meters.offset import WithoutOffset


def test_a_constant_is_taken_off(held):
    samples = (np.arange(50) + 1j * np.arange(50)[::-1]).astype(np.complex64)
    signal = WithoutOffset.of(held(samples), 2 - 3j)
    np.testing.assert_array_equal(samples_of(signal), samples - np.complex64(2 - 3j))
    np.testing.assert_array_equal(samples_of(signal, 7, 9), samples_of(signal)[7:9])
    assert (signal.n_samples, signal.mean_power) == (50, None)
