from fractions import Fraction
from itertools import product

import numpy as np
import pytest
import scipy.special

from wavegen.core.errors import SignalError
from wavegen.dsp.pulses.root_raised_cosine import RootRaisedCosine
from wavegen.laws.angular import AngularSum, ListedEnvelope, PointGroup
from wavegen.laws.rails import Rail, RailPair

T = np.array([0.0, 0.3, 1.0, 4.0, 11.0])
TAPS = np.array([0.9, 0.35, -0.2, 0.02])
RING = np.exp(2j * np.pi * np.arange(8) / 8)
LEANING = np.array([1.0, 1j, -1.0, 0.2 - 0.5j])


def values(points, taps, turns):
    turned = [tap * np.exp(1j * turn) for tap, turn in zip(taps, turns, strict=True)]
    return np.array([np.dot(turned, one) for one in product(points, repeat=len(taps))])


def group(points, taps, turn=0.0, *, opposites=True):
    return PointGroup(points=points, taps=taps, has_opposites=opposites), turn


@pytest.mark.parametrize(
    ("points", "symmetry", "opposites"), [(RING, 8, True), (LEANING, 1, False)]
)
def test_the_function_is_the_mean_over_all_words(points, symmetry, opposites):
    parts = (
        group(points, TAPS[:2], opposites=opposites),
        group(points, TAPS[2:], np.pi / 8, opposites=opposites),
    )
    made = AngularSum(parts=parts, symmetry=symmetry, is_mirrored=False)
    words = values(points, TAPS, [0, 0, np.pi / 8, np.pi / 8])
    want = scipy.special.j0(np.outer(T, np.abs(words))).mean(axis=1)
    np.testing.assert_allclose(made.characteristic(T), want, atol=1e-13)
    angle = np.array([0.2, 2.0])
    along = np.real(words[:, None] * np.exp(-1j * angle))
    two = np.exp(1j * T[:, None, None] * along).mean(axis=1)
    np.testing.assert_allclose(made.directional(T, angle), two, atol=1e-13)
    assert made.peak == pytest.approx(np.abs(words).max(), rel=1e-6)
    assert made.peak >= np.abs(words).max() * (1 - 1e-12)


def test_mirrored_points_need_half_the_angles():
    shared = {"parts": (group(RING, TAPS),), "symmetry": 8}
    whole = AngularSum(**shared, is_mirrored=False).characteristic(T)
    half = AngularSum(**shared, is_mirrored=True).characteristic(T)
    np.testing.assert_allclose(half, whole, atol=1e-13)


def test_few_values_are_listed():
    made = AngularSum(parts=(group(RING, TAPS),), symmetry=8, is_mirrored=True)
    words = np.abs(values(RING, TAPS, [0] * 4))
    radius = np.array([0.2, 0.8, 1.2, 1.4])
    assert isinstance(made.tail, ListedEnvelope)
    want = (words > radius[:, None]).mean(axis=1)
    np.testing.assert_allclose(made.above(radius), want, atol=1e-12)


def test_many_values_go_through_the_series():
    """A root raised cosine of 8PSK a quarter symbol off, against a draw, within 5 sigma."""
    pulse = RootRaisedCosine(roll_off=0.22).design(Fraction(4))
    taps = pulse.values(0.25 - np.arange(-64, 66))
    made = AngularSum(parts=(group(RING, taps),), symmetry=8, is_mirrored=True)
    draw = np.random.default_rng(1).integers(0, 8, (50_000, taps.size))
    words = np.abs(RING[draw] @ taps)
    radius = np.array([0.5, 1.0, 1.3, 1.6])
    got = made.above(radius)
    for one, p in zip(radius, got, strict=True):
        assert (words > one).mean() == pytest.approx(p, abs=5 * np.sqrt(p / words.size))


def test_rails_take_part_turned():
    levels = np.array([-1.0, 1.0]) / np.sqrt(2)
    pair = RailPair(first=Rail(taps=TAPS, levels=levels), second=Rail(taps=TAPS, levels=levels))
    points = np.array([1 + 1j, -1 + 1j, -1 - 1j, 1 - 1j]) / np.sqrt(2)
    shared = {"symmetry": 4, "is_mirrored": False}
    made = AngularSum(parts=((pair, 0.3),), **shared)
    other = AngularSum(parts=(group(points, TAPS, 0.3),), **shared)
    angle = np.linspace(0, 3, 7)
    np.testing.assert_allclose(made.directional(T, angle), other.directional(T, angle), atol=1e-13)
    assert made.peak == pytest.approx(other.peak)
    listed = made.listed()
    assert listed is not None
    np.testing.assert_allclose(listed.above(np.array([1.0])), other.above(np.array([1.0])))


def test_too_sharp_an_envelope_says_so():
    """One large symbol and a haze of 1e-4 around it: no list, and no series of 4096 terms."""
    taps = np.concatenate([[1.0], np.full(20, 1e-5)])
    made = AngularSum(parts=(group(RING, taps),), symmetry=8, is_mirrored=True)
    assert made.tail is None
    with pytest.raises(SignalError):
        made.above(np.ones(1))
