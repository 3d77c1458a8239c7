"""The table against the law that it is made of."""

import math
from dataclasses import replace
from fractions import Fraction
from itertools import pairwise

import numpy as np
import pytest

from wavegen.dsp.pulses.rectangular import Rectangular
from wavegen.dsp.pulses.root_raised_cosine import RootRaisedCosine
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.inversion import law_of_characteristic
from wavegen.laws.law import from_db
from wavegen.laws.phasors import phasor_law
from wavegen.laws.pulse_shaped import PulseShapedTerm
from wavegen.laws.radial import RadialLaw
from wavegen.laws.tabulated import TabulatedLaw, falling_slopes, tabulated

QPSK = np.array([1 + 1j, -1 + 1j, -1 - 1j, 1 - 1j]) / np.sqrt(2)
GRID = np.add.outer(1j * np.arange(-3, 4, 2), np.arange(-3, 4, 2)).ravel() / np.sqrt(10)
PROBABILITIES = np.concatenate([1 - np.logspace(-5, -0.4, 25), np.logspace(-0.3, -9, 60)])


def carrier(points=QPSK, pulse=None, ratio=(4, 1)):
    pulse = pulse or RootRaisedCosine(roll_off=0.22)
    return PulseShapedTerm.of(
        name="x",
        points=points,
        pulse=pulse.design(Fraction(*ratio)),
        ratio=ratio,
        period_symbols=10_000,
    )


LAWS = {
    "exponential": GaussianLaw(),
    "inverted": law_of_characteristic(
        lambda t: np.exp(-(t**2) / 4), name="x", holds="over seeds", mean_power=1.0
    ),
    "qpsk": carrier().law(),
    "16qam, many instants": carrier(GRID, ratio=(125, 32)).law(),
    "offset minimum": carrier(QPSK, RootRaisedCosine(roll_off=0.6), ratio=(8, 1)).law(),
    "six phasors": phasor_law(np.array([1, 1, 1, 0.5, 0.5, 0.25]), name="x"),
}


@pytest.fixture(scope="module")
def tables():
    return {name: tabulated(law) for name, law in LAWS.items()}


@pytest.mark.parametrize("name", LAWS)
def test_levels_are_those_of_the_law(tables, name):
    law, table = LAWS[name], tables[name]
    assert isinstance(table, TabulatedLaw)
    asked = PROBABILITIES
    assert np.max(np.abs(table.level_db(asked) - law.level_db(asked))) < 0.001
    # Between knots chosen by the table itself there could be places it never looked at.
    some = np.random.default_rng(1).uniform(table.level[0], table.level[-1], 500)
    found = table.ccdf(some)
    room = 1e-7 * found * (1 - found) + 3e-12  # where the law is flat, a level says nothing
    assert np.all(found <= law.ccdf(some - 0.001) + room)
    assert np.all(found >= law.ccdf(some + 0.001) - room)


@pytest.mark.parametrize("name", LAWS)
def test_ccdf_falls_and_is_undone_by_levels(tables, name):
    table = tables[name]
    level = np.linspace(table.level[0] - 1, table.level[-1] + 0.1, 20_000)
    assert np.all(np.diff(table.ccdf(level)) <= 1e-12)
    back = table.ccdf(table.level_db(PROBABILITIES))
    np.testing.assert_allclose(back, PROBABILITIES, rtol=1e-7)
    assert table.ccdf([[3.0], [1.0]]).shape == (2, 1)


def test_beyond_the_table_the_law_itself_is_asked(tables):
    law, table = LAWS["exponential"], tables["exponential"]
    np.testing.assert_array_equal(table.ccdf([-70.0, 14.5]), law.ccdf([-70.0, 14.5]))
    np.testing.assert_array_equal(table.level_db([0, 1e-12, 1]), law.level_db([0, 1e-12, 1]))
    bounded = tables["qpsk"]
    assert bounded.ccdf(bounded.peak_db) == 0
    assert bounded.level_db(0.0) == bounded.peak_db


def test_what_the_law_says_of_itself_stays():
    law = replace(LAWS["qpsk"], lowest_probability=1e-5)
    table = tabulated(law)
    assert (table.name, table.holds, table.peak_db) == (law.name, law.holds, law.peak_db)
    assert table.lowest_probability == 1e-5


class TwoSteps:
    def above(self, radius):
        return np.where(radius < 1, 1.0, np.where(radius < 2, 0.5, 0.0))


class StepAndSlope:
    """A tenth of the time at 0.7, else even on a disc."""

    def above(self, radius):
        return 0.1 * (radius < 0.7) + 0.9 * (1 - radius**2)


class Gap:
    """Half of the time even between 0 and 1, half between 10 and 11 (powers)."""

    def above(self, radius):
        return 0.5 * np.clip(1 - radius**2, 0, 1) + 0.5 * np.clip(11 - radius**2, 0, 1)


def radial(tail, peak, power):
    return RadialLaw(
        name="x", holds="over seeds", mean_power=power, peak=peak, radius=peak, tail=tail
    )


@pytest.mark.parametrize(
    "law",
    [
        ConstantLaw(),
        radial(TwoSteps(), 2.0, 2.5),
        radial(StepAndSlope(), 1.0, 0.5),
        carrier(GRID, Rectangular()).law(),
        phasor_law(np.array([1, 0.3]), name="x"),
    ],
    ids=["constant", "steps", "step and slope", "unfiltered 16qam", "two phasors"],
)
def test_a_law_that_jumps_or_ends_too_sharply_stays_itself(law):
    assert tabulated(law) is law


def test_a_stretch_without_probability_is_kept_flat():
    law = radial(Gap(), math.sqrt(11), 5.5)
    table = tabulated(law)
    edges = 10 * np.log10(np.array([1.0, 10.0]) / 5.5)
    level = np.linspace(edges[0] + 0.01, edges[1] - 0.01, 50)
    np.testing.assert_allclose(table.ccdf(level), 0.5, atol=1e-6)
    assert table.level_db(0.4) == pytest.approx(10 * math.log10(10.2 / 5.5), abs=1e-3)
    assert table.level_db(0.6) == pytest.approx(10 * math.log10(0.8 / 5.5), abs=1e-3)


@pytest.mark.parametrize("name", ["exponential", "inverted"])
def test_moments_of_noise(tables, name):
    assert tables[name].moment(2) == pytest.approx(2, rel=2e-5)
    assert tables[name].moment(3) == pytest.approx(6, rel=5e-5)


@pytest.mark.parametrize(
    ("name", "points", "ratio"), [("qpsk", QPSK, (4, 1)), ("16qam, many instants", GRID, (125, 32))]
)
def test_moments_of_linear_modulation(tables, name, points, ratio):
    """E x^2 = 2 <S2^2> + k4 <S4>; E x^3 = 6 <S2^3> + 9 k4 <S4 S2> + k6 <S6> (derivation).

    For symbols of fourfold symmetry; S_m = sum h^m at an instant, k4 = E|a|^4 - 2,
    k6 = E|a|^6 - 9 E|a|^4 + 12, < > over the instants.
    """
    made = carrier(points, ratio=ratio)
    taps = np.stack([made.taps(Fraction(n, ratio[0])) for n in range(ratio[0])])
    s2, s4, s6 = (np.sum(taps**m, axis=1) for m in (2, 4, 6))
    fourth, sixth = (np.mean(np.abs(points) ** m) for m in (4, 6))
    k4, k6 = fourth - 2, sixth - 9 * fourth + 12
    second = np.mean(2 * s2**2 + k4 * s4)
    third = np.mean(6 * s2**3 + 9 * k4 * s4 * s2 + k6 * s6)
    # 0.0002 dB of a level are 5e-5 of a power.
    assert tables[name].moment(2) == pytest.approx(second, rel=1e-4)
    assert tables[name].moment(3) == pytest.approx(third, rel=1.5e-4)


def test_slopes_never_let_a_cubic_rise():
    rng = np.random.default_rng(3)
    x = np.cumsum(rng.uniform(0.1, 2, 50))
    y = -np.cumsum(rng.choice([0, 0.01, 1, 30], 50))
    slopes = falling_slopes(x, y)
    secants = np.diff(y) / np.diff(x)
    for k, (left, right) in enumerate(pairwise(slopes)):
        assert 3 * secants[k] - 1e-12 <= left <= 0
        assert 3 * secants[k] - 1e-12 <= right <= 0


def test_a_parabola_is_met_exactly():
    x = np.array([0.0, 0.3, 1.0, 1.2])
    np.testing.assert_allclose(falling_slopes(x, -(x**2) - x), -2 * x - 1, atol=1e-12)
    table = TabulatedLaw(source=GaussianLaw(), level=x, logit=-(x**2) - x)
    odds = from_db(-10 * (0.64 + 0.8) / math.log(10))
    assert table.ccdf(0.8) == pytest.approx(odds / (1 + odds), rel=1e-12)
