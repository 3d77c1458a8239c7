import mpmath
import numpy as np
import pytest

from wavegen.laws.constant import ConstantLaw
from wavegen.laws.inversion import law_of_characteristic
from wavegen.laws.phasors import phasor_characteristic, phasor_law, share_above

LEVELS = np.array([-20.0, -6.0, 0.3, 1.0, 2.2, 3.3])


def test_one_phasor_is_constant():
    assert isinstance(phasor_law(np.array([2.0]), name="x"), ConstantLaw)


def test_two_phasors_follow_the_arcsine():
    law = phasor_law(np.array([1.0, 0.5]), name="x")
    power = 10 ** (LEVELS[1:3] / 10) * 1.25
    np.testing.assert_allclose(law.ccdf(LEVELS[1:3]), np.arccos(power - 1.25) / np.pi, atol=1e-14)
    assert law.peak_db == pytest.approx(10 * np.log10(2.25 / 1.25))


def test_a_wall_keeps_its_digits():
    """Two equal phasors near their peak: ``P`` is about ``2 sqrt(1 - r^2/4) / pi``."""
    r = 2 * (1 - 1e-14)
    want = float(2 * mpmath.acos(mpmath.mpf(r) / 2) / mpmath.pi)
    assert share_above(np.array([r]), np.float64(1.0), 1.0)[0] == pytest.approx(want, rel=1e-2)


@pytest.mark.parametrize("sizes", [(1, 1, 1), (1, 0.7, 0.3), (1, 1, 1, 1), (1, 0.9, 0.5, 0.3)])
def test_three_and_four_against_the_series(sizes):
    """Its blur is 2e-5 of the mean's amplitude at most; the densities are below 10 off peaks."""
    sizes = np.array(sizes, float)
    series = law_of_characteristic(
        lambda t: phasor_characteristic(sizes, t),
        name="x",
        holds="over seeds",
        mean_power=float(np.sum(sizes**2)),
        peak=float(sizes.sum()),
        most_terms=1 << 19,
    )
    law = phasor_law(sizes, name="x")
    np.testing.assert_allclose(law.ccdf(LEVELS), series.ccdf(LEVELS), atol=1e-6)


def test_three_phasors_in_twenty_digits():
    """The mean of the arcsine law over the third phase, by mpmath, at half the peak."""
    r = mpmath.mpf("1.5")

    def share(angle):
        pair = 2 * mpmath.cos(angle / 2)
        x = (r**2 - pair**2 - 1) / (2 * pair)
        return mpmath.mpf(0) if x >= 1 else mpmath.mpf(1) if x <= -1 else mpmath.acos(x) / mpmath.pi

    edge = 2 * mpmath.acos(mpmath.mpf(1) / 4)  # the pair is 1/2 long: x = 1
    want = float(mpmath.quad(share, [0, edge, mpmath.pi - mpmath.mpf("1e-9")]) / mpmath.pi)
    got = phasor_law(np.ones(3), name="x").ccdf(10 * np.log10(1.5**2 / 3))
    assert float(got) == pytest.approx(want, abs=1e-8)


def test_the_characteristic_is_the_product():
    t = np.array([0.0, 1.3])
    sizes = np.array([1.0, 1.0, 0.5])
    want = [float(mpmath.besselj(0, x) ** 2 * mpmath.besselj(0, x / 2)) for x in t]
    np.testing.assert_allclose(phasor_characteristic(sizes, t), want, rtol=1e-14)
