import numpy as np
import pytest

from wavegen.sources.mapping.cross_qam import cross_qam


@pytest.mark.parametrize("n_bits", [5, 7, 9])
def test_a_cross_is_a_square_without_corners(n_bits):
    s = 2 ** ((n_bits - 3) // 2)
    points = cross_qam(n_bits).points
    scale = np.min(np.abs(points.real))
    grid = {(round(p.real / scale), round(p.imag / scale)) for p in points}
    odd = range(1 - 3 * s, 3 * s, 2)
    wanted = {(x, y) for x in odd for y in odd if abs(x) <= 2 * s or abs(y) <= 2 * s}
    assert grid == wanted


@pytest.mark.parametrize("n_bits", [5, 7, 9])
def test_most_neighbours_differ_in_one_bit_and_none_in_more_than_two(n_bits):
    points = cross_qam(n_bits).points
    apart = np.abs(points[:, None] - points[None, :])
    nearest = apart[apart > 1e-9].min()
    a, b = np.nonzero((apart > 1e-9) & (apart < 1.01 * nearest))
    flips = [int(x ^ y).bit_count() for x, y in zip(a, b, strict=True)]
    assert max(flips) == 2
    assert np.mean(flips) < 1.16


@pytest.mark.parametrize("n_bits", [5, 7, 9])
def test_the_constellation_has_fourfold_symmetry(n_bits):
    points = cross_qam(n_bits).points.round(9)
    assert set(points + 0) == set((1j * points).round(9) + 0)
