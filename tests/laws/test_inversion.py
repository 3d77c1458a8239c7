import math

import mpmath
import numpy as np
import pytest
import scipy.special
import scipy.stats

from wavegen.laws.composite import ConstantEnvelopeTerm
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.inversion import bessel_zeros, law_of_characteristic, law_of_term
from wavegen.laws.law import from_db
from wavegen.laws.phasors import phasor_law
from wavegen.laws.term import BaseTerm, GaussianTerm, NoLaw, Scaled

DEPTHS = np.array([0.9, 0.1, 1e-2, 1e-3, 1e-4, 1e-6, 1e-8, 1e-9])


def invert(function, power, peak=math.inf, **other):
    return law_of_characteristic(
        function, name="x", holds="over seeds", mean_power=power, peak=peak, **other
    )


def test_zeros_of_j0():
    np.testing.assert_allclose(bessel_zeros(500), scipy.special.jn_zeros(0, 500), rtol=1e-13)


def test_noise_keeps_a_thousandth_of_a_db_down_to_1e_9():
    """``exp(-x)`` exactly; 1e-4 dB asked of the 0.001 dB allowed."""
    law = invert(lambda t: np.exp(-0.25 * t**2), 1.0)
    np.testing.assert_allclose(law.level_db(DEPTHS), 10 * np.log10(-np.log(DEPTHS)), atol=1e-4)
    assert law.peak_db == math.inf


@pytest.mark.parametrize("ratio_db", [-10, 0, 10, 20])
def test_carrier_and_noise_are_ricean(ratio_db):
    """Rice 1944/45: ``ncx2.sf(2 (1 + K) x, 2, 2 K)``, good to 1e-12 in relative terms there."""
    k = 10 ** (ratio_db / 10)
    a, s = math.sqrt(k / (1 + k)), 1 / (1 + k)
    law = invert(lambda t: scipy.special.j0(a * t) * np.exp(-0.25 * s * t**2), 1.0)
    power = scipy.stats.ncx2.isf(DEPTHS, 2, 2 * k) / (2 * (1 + k))
    np.testing.assert_allclose(law.level_db(DEPTHS), 10 * np.log10(power), atol=2e-4)


def test_a_rice_tail_against_marcum_q_in_thirty_digits():
    """K = 10: the probability at the level that the law gives for 1e-9, by mpmath quadrature."""
    k = 10.0
    a, s = math.sqrt(k / (1 + k)), 1 / (1 + k)
    law = invert(lambda t: scipy.special.j0(a * t) * np.exp(-0.25 * s * t**2), 1.0)
    x = float(from_db(law.level_db(1e-9)))
    with mpmath.workdps(30):
        tail = mpmath.quad(
            lambda y: (
                (1 + k)
                * mpmath.exp(-k - (1 + k) * y)
                * mpmath.besseli(0, 2 * mpmath.sqrt(k * (1 + k) * y))
            ),
            [x, x + 1, x + 6],
        )
    assert float(tail) == pytest.approx(1e-9, rel=1e-3)  # 0.5 % is 0.001 dB


@pytest.mark.parametrize("n_tones", [7, 8, 12])
def test_eight_phasors_against_the_series_in_forty_digits(n_tones):
    """The same series summed by mpmath with 40 digits at the level given for 1e-7."""
    amplitude = 1 / math.sqrt(n_tones)
    peak = math.sqrt(n_tones)
    law = invert(lambda t: scipy.special.j0(amplitude * t) ** n_tones, 1.0, peak)
    r = math.sqrt(float(from_db(law.level_db(1e-7))))
    total = mpmath.mpf(0)
    with mpmath.workdps(25):
        for zero in bessel_zeros(400):
            a = zero + mpmath.besselj(0, zero) / mpmath.besselj(1, zero)
            phi = mpmath.besselj(0, amplitude * a / peak) ** n_tones
            total += phi / (a * mpmath.besselj(1, a) ** 2) * mpmath.besselj(1, a * r / peak)
        tail = 1 - 2 * r / peak * total
    # The series is cut at 400 terms: for 7 phasors the rest is below 1e-9 (measured).
    assert float(tail) == pytest.approx(1e-7, rel=1e-2 if n_tones == 7 else 1e-3)


def test_a_long_tail_widens_the_radius():
    """A mixture: 1 % of the time 20 dB more noise."""
    power = 0.99 + 1.0
    law = invert(lambda t: 0.99 * np.exp(-0.25 * t**2) + 0.01 * np.exp(-25 * t**2), power)
    x = from_db(np.array([0.0, 10.0, 20.0])) * power
    np.testing.assert_allclose(
        law.ccdf([0.0, 10.0, 20.0]), 0.99 * np.exp(-x) + 0.01 * np.exp(-x / 100), rtol=1e-8
    )


def test_an_endless_series_is_refused_by_name():
    made = invert(scipy.special.j0, 1.0, 1.0, most_terms=1024)
    assert isinstance(made, NoLaw)
    assert "1024 terms" in made.reason


def test_slow_functions_are_blurred_within_bounds():
    """Three phasors, against their own quadrature; allowed 4.5 deviations of 2e-4 dB."""
    sizes = np.array([1.0, 0.9, 0.8])
    law = invert(
        lambda t: np.prod(scipy.special.j0(sizes[:, None] * t), axis=0),
        2.45,
        2.7,
        most_terms=1 << 19,
    )
    want = phasor_law(sizes, name="x").level_db(DEPTHS[1:])
    assert np.all(law.ccdf(want - 1e-3) >= DEPTHS[1:])
    assert np.all(law.ccdf(want + 1e-3) <= DEPTHS[1:])


def test_the_law_of_a_term_does_not_know_its_level():
    loud = law_of_term(Scaled.of(GaussianTerm(), gain=7.0))
    np.testing.assert_allclose(loud.level_db([0.1, 1e-6]), [3.62216, 11.40367], atol=1e-4)
    assert isinstance(law_of_term(ConstantEnvelopeTerm(name="msk")), ConstantLaw)


def test_a_term_hands_on_what_it_serves():
    class Ring(BaseTerm):
        def characteristic(self, t, *, residue=0, modulus=1):
            return np.exp(-0.25 * t**2)

    assert law_of_term(Ring(name="ring", lowest_probability=1e-4)).lowest_probability == 1e-4
