import numpy as np
import pytest

from wavegen.sources.mapping.psk import bpsk, psk8, qpsk


@pytest.mark.parametrize(("made", "order"), [(bpsk(), 2), (qpsk(), 4), (psk8(), 8)])
def test_points_lie_on_the_unit_circle_and_differ(made, order):
    assert made.points.shape == (order,)
    assert np.allclose(np.abs(made.points), 1.0, atol=1e-15)
    assert len(set(np.round(made.points, 9))) == order


def test_neighbours_of_8psk_differ_in_one_bit():
    around = np.argsort(np.angle(psk8().points))
    flips = around ^ np.roll(around, 1)
    assert all(int(flip).bit_count() == 1 for flip in flips)
