from fractions import Fraction

import numpy as np
import pytest

from wavegen.dsp.pulse import Pulse
from wavegen.dsp.pulses.rectangular import Rectangular
from wavegen.dsp.pulses.root_raised_cosine import RootRaisedCosine
from wavegen.laws.angular import AngularSum
from wavegen.laws.pulse_shaped import PulseShapedTerm, symmetry_of
from wavegen.laws.rails import RailPair
from wavegen.laws.term import NoLaw

QPSK = np.array([1 + 1j, -1 + 1j, -1 - 1j, 1 - 1j]) / np.sqrt(2)
RING = np.exp(2j * np.pi * np.arange(8) / 8)
T = np.array([0.0, 0.7, 2.0, 6.0])


def term(points=QPSK, ratio=(4, 1), pulse=None, **other):
    pulse = pulse or RootRaisedCosine(roll_off=0.22)
    other = {"period_symbols": 10_000} | other
    return PulseShapedTerm.of(
        name="x", points=points, pulse=pulse.design(Fraction(*ratio)), ratio=ratio, **other
    )


@pytest.mark.parametrize(
    ("points", "fold"),
    [
        (QPSK, 4),
        (RING, 8),
        (QPSK * np.exp(0.3j), 4),
        (np.array([1, -1]), 2),
        (np.array([1, 1j, -1, 0.5]), 1),
    ],
)
def test_symmetry(points, fold):
    assert symmetry_of(points) == fold


@pytest.mark.parametrize(
    ("ratio", "n_instants"), [((4, 1), 3), ((8, 1), 5), ((8, 3), 5), ((5, 2), 3), ((120, 13), 33)]
)
def test_only_instants_that_samples_fall_on_count(ratio, n_instants):
    """The pulse is even, so that phases tau and 1 - tau are one."""
    instants = term(ratio=ratio).instants(0, 1)
    assert len(instants) == n_instants
    assert sum(share for _, share in instants) == pytest.approx(1)


def test_a_residue_is_an_instant():
    made = term(ratio=(8, 3))
    whole = made.characteristic(T)
    each = [made.characteristic(T, residue=n, modulus=8) for n in range(8)]
    np.testing.assert_allclose(np.mean(each, axis=0), whole, atol=1e-13)
    # Sample 3 stands at 9/8 symbols, an eighth after one; sample 5 at 15/8, an eighth before.
    np.testing.assert_allclose(each[3], each[5])
    assert made.kind(3) == made.kind(5) != made.kind(1)
    halves = [made.characteristic(T, residue=n, modulus=2) for n in range(2)]
    np.testing.assert_allclose(halves[1], np.mean(each[1::2], axis=0), atol=1e-13)


def test_mean_power_is_one_and_the_pulse_meets_itself_in_a_short_loop():
    short = term(period_symbols=12)
    for made in (term(), short):
        energy = [np.sum(made.taps(Fraction(n, 4)) ** 2) for n in range(4)]
        assert np.mean(energy) == pytest.approx(1)
    assert short.taps(Fraction(1, 4)).size == 12


def test_rails_are_found_whatever_the_tilt():
    """A turned constellation has the same envelope."""
    levels = [1e-1, 1e-3, 1e-6]
    want = term().law().level_db(levels)
    for tilt in (np.pi / 4, 0.3):
        made = term(points=QPSK * np.exp(1j * tilt))
        assert isinstance(made.instants(0, 1)[0][0].value, RailPair)
        np.testing.assert_allclose(made.law().level_db(levels), want, atol=1e-9)
        angle = np.array([0.1, 0.9])
        turned = made.directional(T, angle + tilt)
        np.testing.assert_allclose(turned, term().directional(T, angle), atol=1e-12)


def test_a_quarter_turn_changes_nothing_for_four_points():
    turned = term(turns=Fraction(1, 4))
    np.testing.assert_allclose(turned.characteristic(T), term().characteristic(T), atol=1e-13)
    assert turned.clock_samples == 4


def test_an_eighth_of_a_turn_lengthens_the_clock():
    made = term(turns=Fraction(1, 8))
    assert made.clock_samples == 8
    assert made.directional(T, np.zeros(1)) is None
    assert isinstance(made.instants(0, 1)[0][0].value, AngularSum)
    assert len(made.instants(0, 1)) == 3
    np.testing.assert_allclose(
        made.characteristic(T, residue=5, modulus=8), made.characteristic(T, residue=1, modulus=4)
    )


def test_two_phases_turned_by_a_quarter_use_both_rails():
    """pi/2-BPSK: even symbols on I, odd ones on Q."""
    made = term(points=np.array([1.0, -1.0]) + 0j, turns=Fraction(1, 4))
    value = made.instants(0, 1)[0][0].value
    assert isinstance(value, RailPair)
    assert value.first.taps.size + value.second.taps.size == 130
    assert made.law().peak_db < term(points=np.array([1.0, -1.0]) + 0j).law().peak_db


def test_held_symbols_have_the_law_of_their_points():
    law = term(points=RING, pulse=Rectangular()).law()
    assert law.ccdf([-0.01, 0.01]).tolist() == [1.0, 0.0]
    grid = np.add.outer(np.arange(-3, 4, 2), 1j * np.arange(-3, 4, 2)).ravel() / np.sqrt(10)
    law = term(points=grid, pulse=Rectangular()).law()
    # Powers 0.2, 1, 1.8 with shares 1/4, 1/2, 1/4.
    np.testing.assert_allclose(law.ccdf([-8.0, -1.0, 1.0, 3.0]), [1, 0.75, 0.25, 0])


def test_staggered_rails_are_half_a_symbol_apart():
    made = term(is_staggered=True, ratio=(8, 1))
    value = made.instants(3, 8)[0][0].value
    assert isinstance(value, RailPair)
    np.testing.assert_allclose(value.first.taps, made.taps(Fraction(3, 8)))
    np.testing.assert_allclose(value.second.taps, made.taps(Fraction(-1, 8)))
    assert made.law().peak_db < term(ratio=(8, 1)).law().peak_db - 0.5


class Haze(Pulse):
    """One at its own instant, next to nothing at others."""

    def values(self, t):
        return np.where(t == 0, 1.0, 1e-5)


def test_a_nearly_discrete_envelope_has_no_law():
    made = PulseShapedTerm.of(
        name="x", points=RING, pulse=Haze(span_symbols=12), ratio=(1, 1), period_symbols=1000
    ).law()
    assert isinstance(made, NoLaw)
    assert "nearly discrete" in made.reason
