import math
from fractions import Fraction
from itertools import product

import mpmath
import numpy as np
import pytest
import scipy.optimize

from wavegen.dsp.pulses.root_raised_cosine import RootRaisedCosine
from wavegen.laws.inversion import law_of_characteristic
from wavegen.laws.radial import RadialLaw
from wavegen.laws.rails import Rail, RailPair

T = np.array([0.0, 0.1, 1.0, 3.0, 10.0, 40.0])
QPSK = np.array([-1.0, 1.0]) / math.sqrt(2)
PAM4 = np.array([-3.0, -1.0, 1.0, 3.0]) / math.sqrt(10)


def taps(roll_off, phase, span):
    pulse = RootRaisedCosine(roll_off=roll_off, span_symbols=span).design(Fraction(4))
    return pulse.values(phase - np.arange(-span, span + 2))


def rail(levels, roll_off=0.22, phase=0.25, span=64):
    return Rail(taps=taps(roll_off, phase, span), levels=levels)


@pytest.mark.parametrize("levels", [QPSK, PAM4])
def test_the_product_over_the_taps(levels):
    made = rail(levels)
    factors = np.cos(T[:, None, None] * made.taps[:, None] * levels).mean(axis=2)
    np.testing.assert_allclose(made.characteristic(T), factors.prod(axis=1), atol=2e-14)
    np.testing.assert_allclose(made.looked_up(T), factors.prod(axis=1), atol=1e-13)


@pytest.mark.parametrize("levels", [QPSK, PAM4])
def test_a_tail_at_1e_9_in_thirty_digits(levels):
    """The same Fourier series on twice the support, in mpmath, where the rail reaches 1e-9."""
    made = rail(levels, span=32)
    x = scipy.optimize.brentq(lambda x: made.outside(np.array([x]))[0] - 1e-9, 0, made.peak)
    with mpmath.workdps(30):
        reach = mpmath.mpf(1.02) * made.peak
        total, n = mpmath.mpf(x) / (2 * reach), 1
        while True:
            t = n * mpmath.pi / reach
            phi = mpmath.mpf(1)
            for tap in made.taps:
                if not tap:
                    continue
                cosines = [mpmath.cos(t * float(tap) * float(a)) for a in levels if a > 0]
                phi *= sum(cosines) / len(cosines)
                if abs(phi) < mpmath.mpf(10) ** -20:
                    break
            total += phi * mpmath.sin(t * x) / t / reach
            if n > (900 if levels is QPSK else 300):
                break  # beyond, the function is below 1e-13 (measured)
            n += 1
        tail = float(1 - 2 * total)
    assert tail == pytest.approx(1e-9, rel=2e-3)  # 0.001 dB is 0.5 % of a probability or more


def test_few_values_are_listed():
    made = Rail(taps=np.array([1.0, -0.5, 0.0]), levels=np.array([-1.0, 1.0]))
    assert made.is_listed
    values, weights = made.atoms
    np.testing.assert_allclose(values, [-1.5, -0.5, 0.5, 1.5])
    np.testing.assert_allclose(weights, 0.25)
    assert made.outside(np.array([0.0, 0.5, 1.0, 1.5])).tolist() == [1, 0.5, 0.5, 0]


def test_a_listed_pair_counts_its_points():
    taps_ = np.array([1.0, 0.3, -0.2])
    levels = np.array([-1.0, 1.0])
    pair = RailPair(first=Rail(taps=taps_, levels=levels), second=Rail(taps=taps_, levels=levels))
    rails = np.array([np.dot(taps_, signs) for signs in product(levels, repeat=3)])
    envelope = np.abs(np.add.outer(rails, 1j * rails)).ravel()
    radius = np.array([0.0, 0.6, 1.0, 1.2, 1.7, 2.1])
    want = (envelope > radius[:, None] * (1 + 1e-12)).mean(axis=1)
    np.testing.assert_allclose(pair.above(radius), want, atol=1e-12)
    assert pair.peak == pytest.approx(envelope.max())


@pytest.mark.parametrize(("levels", "roll_off"), [(QPSK, 0.22), (PAM4, 0.35), (QPSK, 0.8)])
def test_density_and_series_agree(levels, roll_off):
    """Two roads to one law, to 1e-9: the integral over one rail, and the Fourier-Bessel series."""
    pair = RailPair(first=rail(levels, roll_off), second=rail(levels, roll_off))
    shared = {"name": "x", "holds": "over seeds", "peak": pair.peak}
    power = float(np.sum(pair.first.taps**2))
    one = RadialLaw(**shared, mean_power=power, radius=pair.peak, tail=pair)
    other = law_of_characteristic(pair.characteristic, mean_power=power, **shared)
    p = np.array([0.9, 0.1, 1e-2, 1e-4, 1e-6, 1e-9])
    np.testing.assert_allclose(one.level_db(p), other.level_db(p), atol=1e-4)


def test_the_function_is_the_mean_over_the_angle():
    pair = RailPair(first=rail(QPSK), second=rail(PAM4, phase=0.5))
    angle = (np.arange(400) + 0.5) * (np.pi / 800)
    want = pair.directional(T, angle).real.mean(axis=1)
    np.testing.assert_allclose(pair.characteristic(T), want, atol=2e-12)


def test_a_silent_rail_leaves_the_other():
    silent = Rail(taps=np.zeros(1), levels=np.array([-1.0, 1.0]))
    pair = RailPair(first=rail(QPSK), second=silent)
    radius = np.linspace(0, 1, 5)
    np.testing.assert_allclose(pair.above(radius), pair.first.outside(radius))
    angle = (np.arange(400) + 0.5) * (np.pi / 800)
    want = pair.first.characteristic(np.outer(T, np.cos(angle))).mean(axis=1)
    np.testing.assert_allclose(pair.characteristic(T), want, atol=1e-11)


def test_no_probability_stands_above_the_reach():
    pair = RailPair(first=rail(QPSK), second=rail(QPSK))
    assert pair.reach(np.array([np.pi / 4]))[0] == pytest.approx(pair.peak)
    assert pair.above(np.array([pair.peak]))[0] == pytest.approx(0, abs=1e-12)


def test_both_ways_to_the_characteristic_function_agree(monkeypatch):
    """By radii, and by angles where densities are too sharp for radii."""
    t = np.linspace(0.0, 40.0, 50)
    taps = np.array([0.9, 0.31, -0.22, 0.17, 0.11, -0.09, 0.05, 0.04, 0.03, 0.02])
    levels = np.array([-3.0, -1, 1, 3]) / np.sqrt(10)

    def pair():
        return RailPair(first=Rail(taps=taps, levels=levels), second=Rail(taps=taps, levels=levels))

    by_radii = pair().characteristic(t)
    monkeypatch.setattr("wavegen.laws.rails.MOST_NODES", 0)
    monkeypatch.setattr(RailPair, "_radial", None)
    np.testing.assert_allclose(pair().characteristic(t), by_radii, atol=1e-11)
