import itertools

import numpy as np
import pytest

from wavegen.sources.mapping.square_qam import axis_levels, split_bits, square_points


def test_bits_are_dealt_to_the_axes_in_turn_first_bit_most_significant():
    in_phase, quadrature = split_bits(4)
    assert in_phase[0b1001].tolist() == [1, 0]
    assert quadrature[0b1001].tolist() == [0, 1]


@pytest.mark.parametrize("n_bits", [1, 2, 3, 4, 5, 6])
def test_axis_levels_are_the_odd_numbers_gray_labelled(n_bits):
    numbers = np.arange(1 << n_bits)
    bits = (numbers[:, None] >> np.arange(n_bits - 1, -1, -1)) & 1
    levels = axis_levels(bits)
    order = np.argsort(levels)
    assert levels[order].tolist() == list(range(1 - (1 << n_bits), 1 << n_bits, 2))
    assert all(int(a ^ b).bit_count() == 1 for a, b in itertools.pairwise(order))


def test_power_is_one():
    assert np.mean(np.abs(square_points(12)) ** 2) == pytest.approx(1.0, abs=1e-12)
