"""Laws of pulse-shaped carriers: published levels, exact moments, and loops that were made."""

import math
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.dsp.pulses.linearised_gaussian import LinearisedGaussian
from wavegen.dsp.pulses.root_raised_cosine import RootRaisedCosine
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.rotation import Rotation
from wavegen.sources.single_carrier import SingleCarrier

RATE = Fraction(1_000_000)
PROBABILITY = (1e-1, 1e-2, 1e-3, 1e-4, 1e-5, 1e-6)

TABLE = {
    ("qpsk", 0.22, False): (1.99, 3.60, 4.46, 4.92, 5.16, 5.28, 5.66),
    ("qpsk", 0.35, False): (1.87, 2.99, 3.55, 3.76, 3.87, 3.95, 4.23),
    ("qpsk", 0.5, False): (1.84, 2.47, 2.90, 3.15, 3.26, 3.31, 3.47),
    ("16qam", 0.22, False): (3.00, 4.51, 5.60, 6.34, 6.84, 7.17, 8.22),
    ("16qam", 0.35, False): (2.98, 4.35, 5.09, 5.64, 5.97, 6.17, 6.79),
    ("64qam", 0.22, False): (3.06, 4.83, 5.86, 6.66, 7.24, 7.67, 9.34),
    ("64qam", 0.35, False): (3.04, 4.78, 5.57, 6.11, 6.55, 6.87, 7.91),
    ("256qam", 0.22, False): (3.08, 4.91, 5.94, 6.74, 7.34, 7.79, 9.89),
    ("qpsk", 0.22, True): (2.27, 3.43, 3.93, 4.20, 4.34, 4.43, 4.80),
    ("qpsk", 0.35, True): (2.01, 2.95, 3.27, 3.42, 3.53, 3.61, 3.88),
}


def carrier(constellation, roll_off=0.22, **fields):
    pulse = fields.pop("pulse", None) or RootRaisedCosine(roll_off=roll_off)
    return SingleCarrier(
        constellation=Constellation.parse(constellation),
        symbol_rate_hz=RATE,
        pulse=pulse,
        **fields,
    )


def site(ratio, n_symbols=1 << 16):
    return Site(
        sample_rate_hz=RATE * ratio,
        n_samples=int(n_symbols * ratio),
        seed=5,
        label="x",
        path="signal",
    )


@pytest.mark.parametrize(("constellation", "roll_off", "stagger"), TABLE)
def test_levels_of_root_raised_cosines(constellation, roll_off, stagger):
    """Exact method of M. Tanahashi, H. Ochiai, IEEE Trans. Wireless Commun., 2010, and I. Gutman,
    D. Wulich, 2012; a table computed apart, with a plain cut at +-32 symbols and 16 phases.

    Tolerance: its rounding, 0.005 dB, its grid and the taper of our pulse, 0.015 dB.
    """
    law = carrier(constellation, roll_off, stagger=stagger).law(site(16))
    want = TABLE[constellation, roll_off, stagger]
    np.testing.assert_allclose(law.level_db(PROBABILITY), want[:-1], atol=0.02)
    assert law.peak_db == pytest.approx(want[-1], abs=0.05)


def test_four_samples_a_symbol_have_a_curve_of_their_own():
    """QPSK, roll-off 0.5, at 1 %: 2.47 dB in continuous time, 2.57 at four samples a symbol."""
    four, eight = (carrier("qpsk", 0.5).law(site(n)).level_db(1e-2) for n in (4, 8))
    assert four == pytest.approx(2.566, abs=2e-3)
    assert four - eight == pytest.approx(0.12, abs=0.005)


def test_eight_phases():
    """8PSK, roll-off 0.22, at 0.01 %: 4.726 dB at four samples a symbol (simulation 4.722)."""
    assert carrier("8psk").law(site(4)).level_db(1e-4) == pytest.approx(4.726, abs=1e-3)


def test_pi4_dqpsk():
    """Roll-off 0.35: 2.98 dB at 0.1 %, 3.13 at 0.01 %, at most 3.55 (computed apart)."""
    law = carrier("qpsk", 0.35, rotation=Rotation(Fraction(1, 8)), differential=True).law(site(8))
    np.testing.assert_allclose(law.level_db([1e-3, 1e-4]), [2.98, 3.13], atol=0.02)
    assert law.peak_db == pytest.approx(3.55, abs=0.03)


def test_edge():
    """3GPP TS 45.004, 8PSK turned by 3 pi/8: peak 3.2 dB over the mean as quoted; 3.2197 by
    enumeration of its symbols at 16 phases.
    """
    settings = carrier("8psk", pulse=LinearisedGaussian(), rotation=Rotation(Fraction(3, 16)))
    law = settings.law(site(16))
    assert law.peak_db == pytest.approx(3.2197, abs=1e-4)
    want = [2.741, 3.124, 3.195, 3.215]  # simulation of 200 000 symbols
    np.testing.assert_allclose(law.level_db([1e-1, 1e-2, 1e-3, 1e-4]), want, atol=0.01)


@pytest.mark.parametrize(
    ("constellation", "fields"),
    [
        ("qpsk", {}),
        ("16qam", {}),
        ("8psk", {}),
        ("16apsk 2/3", {}),
        ("qpsk", {"rotation": Rotation(Fraction(1, 8))}),
    ],
)
def test_moments_are_the_exact_identities(constellation, fields):
    """E x^2 = 2 <S2^2> + k4 <S4>, E x^3 = 6 <S2^3> + 9 k4 <S4 S2> + k6 <S6> for symbols of
    fourfold symmetry, ``S_m = sum h^m`` (derivation). Tolerance 1e-4: 2000 points of the curve.
    """
    settings = carrier(constellation, 0.35, **fields)
    law, term = settings.law(site(4)), settings.term(site(4))
    points = settings.constellation.points
    fourth, sixth = (float(np.mean(np.abs(points) ** m)) for m in (4, 6))
    k4, k6 = fourth - 2, sixth - 9 * fourth + 12
    s = np.array([[np.sum(term.taps(Fraction(n, 4)) ** m) for m in (2, 4, 6)] for n in range(4)])
    second = np.mean(2 * s[:, 0] ** 2 + k4 * s[:, 1])
    third = np.mean(6 * s[:, 0] ** 3 + 9 * k4 * s[:, 1] * s[:, 0] + k6 * s[:, 2])
    top = 10 ** (law.peak_db / 10)
    step = top / 2000
    x = step * (np.arange(2000) + 0.5)
    tail = law.ccdf(10 * np.log10(x))
    assert np.sum(tail) * step == pytest.approx(1, rel=1e-4)
    assert 2 * np.sum(x * tail) * step == pytest.approx(second, rel=1e-4)
    assert 3 * np.sum(x**2 * tail) * step == pytest.approx(third, rel=1e-4)


@pytest.mark.parametrize(
    ("constellation", "ratio", "fields"),
    [
        ("qpsk", 4, {}),
        ("qpsk", 4, {"stagger": True}),
        ("bpsk", 4, {}),
        ("bpsk", 4, {"rotation": Rotation(Fraction(1, 4))}),
        ("qpsk", Fraction(10, 3), {"rotation": Rotation(Fraction(1, 8)), "differential": True}),
        ("8psk", Fraction(5, 2), {"rotation": Rotation(Fraction(3, 16))}),
        ("16apsk 2/3", 3, {}),
    ],
)
def test_loops_follow_their_law(constellation, ratio, fields):
    """2^16 symbols made. Tolerance: 5 sigma of as many independent draws, at 10 % ... 0.1 %."""
    settings = carrier(constellation, 0.3, **fields)
    here = site(ratio, n_symbols=3 * (1 << 14) * 4 // 3 // 12 * 12)
    law = settings.law(here)
    samples = samples_of(settings.build(here)).astype(np.complex128)
    power = samples.real**2 + samples.imag**2
    probability = np.array([0.5, 0.1, 0.01, 1e-3])
    level = law.level_db(probability)
    measured = (power[:, None] > power.mean() * 10 ** (level / 10)).mean(axis=0)
    n = here.n_samples / ratio
    slack = 5 * np.sqrt(probability * (1 - probability) / float(n))
    assert np.all(np.abs(measured - probability) < slack)
    assert 10 * math.log10(power.max() / power.mean()) < law.peak_db + 0.02
