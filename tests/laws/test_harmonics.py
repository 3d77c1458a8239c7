import numpy as np
import pytest

from wavegen.laws.harmonics import REACH, PointHarmonics, harmonics_of

RING = np.exp(2j * np.pi * np.arange(8) / 8)
OUTER = np.exp(2j * np.pi * (np.arange(12) + 0.5) / 12)
APSK = np.concatenate([0.35 * np.exp(1j * np.pi * (np.arange(4) / 2 + 0.25)), OUTER])
CROSS = np.array(
    [x + 1j * y for x in range(-5, 6, 2) for y in range(-5, 6, 2) if x * x + y * y < 50]
)
LEANING = np.array([1.0, 0.3 + 0.8j, -1.0, -0.3 - 0.8j])
POINTS = {"8psk": RING, "16apsk": APSK, "32 cross": CROSS / abs(CROSS).max(), "leaning": LEANING}
ANGLE = np.linspace(-1.0, 2.5, 23)
# Largest radius 46: orders up to 100 and tables alike are used.
T = np.array([0.0, 0.01, 0.5, 3.0, 20.0, 40.0])
TAPS = np.array([1.15, -0.9, 0.4, 0.02])


@pytest.mark.parametrize("name", POINTS)
def test_products_are_those_of_the_means_over_points(name):
    points = POINTS[name]
    along = np.real(points[:, None] * np.exp(-1j * ANGLE))
    want = np.full((T.size, ANGLE.size), 0.7)
    for tap in TAPS:
        want *= np.exp(1j * tap * T[:, None, None] * along).mean(axis=1).real
    got = np.full((T.size, ANGLE.size), 0.7)
    harmonics_of(points).multiply(got, T, TAPS, ANGLE)
    # The table's bound is 1e-15 a tap; each product of orders rounds by a few 1e-16.
    np.testing.assert_allclose(got, want, rtol=0, atol=8e-15)


def test_only_multiples_of_the_symmetry_are_kept():
    orders = [order for order, _ in PointHarmonics(points=RING)._kept[0]]
    assert orders == list(range(0, int(REACH) + 56, 8))
    assert not any(is_sine for _, is_sine in PointHarmonics(points=RING)._kept[0])
    assert any(is_sine for _, is_sine in PointHarmonics(points=LEANING)._kept[0])


def test_equal_points_share_one_table():
    assert harmonics_of(RING.copy()) is harmonics_of(RING.copy())
    assert harmonics_of(RING) is not harmonics_of(LEANING)


def test_nothing_is_changed_where_there_are_no_taps():
    got = np.full((2, 3), 0.5)
    harmonics_of(RING).multiply(got, np.array([0.0, 1.0]), np.zeros(0), ANGLE[:3])
    assert np.all(got == 0.5)
