import numpy as np

from wavegen.dsp.power_bins import BINS_PER_OCTAVE, LOWEST_OCTAVE, N_BINS, bin_edges, bin_of


def test_edges_are_at_most_0_0085_db_apart():
    edges = bin_edges(0, N_BINS)
    width = 10 * np.diff(np.log10(edges))
    assert np.all(width > 0)
    assert width.max() <= 10 * np.log10(1 + 1 / BINS_PER_OCTAVE) + 1e-9 < 0.0085
    assert edges[0] < 2.0**-298  # the square of the least float32
    assert edges[-1] > 2.0**257  # both parts at the greatest
    assert bin_of(1.0) == -LOWEST_OCTAVE * BINS_PER_OCTAVE


def test_bin_of_is_the_inverse_of_edges():
    for number in (900, 100000, -LOWEST_OCTAVE * BINS_PER_OCTAVE, 280000):
        low, high = bin_edges(number, 1)
        assert bin_of(low) == number
        assert bin_of(np.nextafter(high, 0)) == number
        assert bin_of(high) == number + 1


def test_round_powers_stand_clear_of_edges():
    for power in (0.25, 0.5, 1.0, 2.0):
        assert bin_of(np.float32(power) * (1 - 2e-7)) == bin_of(power) == bin_of(power * (1 + 2e-7))
