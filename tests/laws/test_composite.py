from fractions import Fraction

import numpy as np
import pytest
import scipy.special

from wavegen.dsp.pulses.root_raised_cosine import RootRaisedCosine
from wavegen.laws.composite import (
    ConstantEnvelopeTerm,
    LinesTerm,
    LineTerm,
    Placed,
    ProductTerm,
    TiedTerm,
    combine_terms,
)
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.inversion import law_of_term
from wavegen.laws.periodic import PeriodicLaw
from wavegen.laws.pulse_shaped import PulseShapedTerm
from wavegen.laws.term import BaseTerm, GaussianTerm, NoLaw, Scaled

N_SAMPLES = 8 * 38_400
FREE = 50_000
"""Cycles per loop in no simple ratio to it: 125/768 of the sample rate."""
T = np.array([0.0, 0.6, 1.7, 5.0])


class Clocked(BaseTerm):
    """``exp(-(1 + n mod clock) t^2)`` at index ``n``."""

    def characteristic(self, t, *, residue=0, modulus=1):
        numbers = range(residue, self.clock_samples, modulus)
        return np.mean([np.exp(-(1 + n) * t**2) for n in numbers], axis=0)


def qpsk(name, ratio=(4, 1), turns=Fraction(0)):
    points = np.array([1 + 1j, -1 + 1j, -1 - 1j, 1 - 1j]) / np.sqrt(2)
    return PulseShapedTerm.of(
        name=name,
        points=points,
        pulse=RootRaisedCosine(roll_off=0.22).design(Fraction(*ratio)),
        ratio=ratio,
        period_symbols=10_000,
        turns=turns,
        data=frozenset({name}),
    )


def combine(*parts):
    return combine_terms([Placed(**part) for part in parts], n_samples=N_SAMPLES)


def test_powers_peaks_and_names_add():
    made = combine(
        {"term": GaussianTerm(data=frozenset({"a"})), "gain": 2.0},
        {"term": ConstantEnvelopeTerm(name="msk", lowest_probability=1e-5)},
    )
    assert (made.mean_power, made.peak) == (5.0, np.inf)
    assert made.name == "complex Gaussian + msk"
    assert made.data == {"a"}
    assert made.lowest_probability == 1e-5
    want = np.exp(-(T**2)) * scipy.special.j0(T)
    np.testing.assert_allclose(made.characteristic(T), want, atol=1e-14)


@pytest.mark.parametrize("clocks", [(2, 2), (2, 3), (4, 6), (4, 6, 9), (12, 8, 6)])
def test_what_shares_a_clock_is_multiplied_at_each_index(clocks):
    """Against the mean over the whole common period."""
    parts = [{"term": Clocked(name="x", clock_samples=clock)} for clock in clocks]
    made = combine(*parts)
    period = np.lcm.reduce(clocks)
    assert made.clock_samples == period
    each = [
        np.prod([np.exp(-(1 + n % clock) * T**2) for clock in clocks], axis=0)
        for n in range(period)
    ]
    np.testing.assert_allclose(made.characteristic(T), np.mean(each, axis=0), atol=1e-14)
    got = made.characteristic(T, residue=1, modulus=2)
    np.testing.assert_allclose(got, np.mean(each[1::2], axis=0), atol=1e-14)


def test_shared_data_have_no_law():
    made = combine({"term": qpsk("a")}, {"term": qpsk("a"), "n_cycles": FREE})
    assert isinstance(made, NoLaw)
    assert made.reason == "shared data: two parts carry a"


def test_carriers_of_one_frequency_are_one():
    """1 at 0 degrees and 1 at 120: amplitude 1."""
    made = combine(
        {"term": LineTerm.of(1 + 0j), "n_cycles": 5},
        {"term": LineTerm.of(1 + 0j), "n_cycles": 5, "turn_rad": 2 * np.pi / 3},
    )
    assert made.peak == pytest.approx(1.0)
    assert isinstance(law_of_term(made), ConstantLaw)


def test_tones_alone_have_their_own_period():
    tones = LinesTerm.of([-1, 1], [0.5, 0.5], n_samples=N_SAMPLES)
    made = combine({"term": tones}, {"term": LineTerm.of(1 + 0j), "n_cycles": 3})
    law = law_of_term(made)
    assert isinstance(law, PeriodicLaw)
    assert law.holds == "every loop"
    assert law.name == "3 tones, own period"


def test_tones_are_known_at_each_sample():
    made = LinesTerm.of([10, 12, 20], [1, 2j, 0.5], n_samples=24)
    n = np.arange(12)
    wave = 1 + 2j * np.exp(2j * np.pi * n / 12) + 0.5 * np.exp(2j * np.pi * 5 * n / 12)
    assert made.clock_samples == 12
    for modulus, residue in ((1, 0), (3, 2)):
        want = scipy.special.j0(np.outer(T, np.abs(wave[residue::modulus]))).mean(axis=1)
        got = made.characteristic(T, residue=residue, modulus=modulus)
        np.testing.assert_allclose(got, want, atol=1e-13)


def test_long_periods_of_tones_are_gathered():
    """Against all 20000 envelopes; intervals of 1/2048 of the peak keep three moments: 1e-9."""
    rng = np.random.default_rng(3)
    bins = np.unique(rng.integers(0, 9000, 40))
    values = np.exp(2j * np.pi * rng.random(bins.size))
    made = LinesTerm.of(bins.tolist(), values.tolist(), n_samples=20_011)
    want = scipy.special.j0(np.outer(T, made.envelope)).mean(axis=1)
    np.testing.assert_allclose(made.characteristic(T), want, atol=1e-8)


def test_free_phases_multiply():
    made = combine({"term": qpsk("a")}, {"term": LineTerm.of(1 + 0j), "n_cycles": FREE})
    assert isinstance(made, ProductTerm)
    want = qpsk("a").characteristic(T) * scipy.special.j0(T)
    np.testing.assert_allclose(made.characteristic(T), want, atol=1e-13)


@pytest.mark.parametrize("turn", [0.0, np.pi / 4])
def test_one_frequency_multiplies_before_the_mean_over_the_angle(turn):
    made = combine({"term": qpsk("a")}, {"term": LineTerm.of(1 + 0j), "turn_rad": turn})
    angle = np.arange(512) * (2 * np.pi / 512)
    want = np.zeros(T.size)
    for n in range(4):
        two = qpsk("a").directional(T, angle, residue=n, modulus=4)
        two = two * np.exp(1j * np.outer(T, np.cos(angle - turn)))
        want += two.real.mean(axis=1) / 4
    np.testing.assert_allclose(made.characteristic(T), want, atol=1e-12)
    assert abs(made.characteristic(T)[-1] - qpsk("a").characteristic(T)[-1]) > 1e-3


def test_noise_beside_tied_parts_multiplies():
    tied = [{"term": qpsk("a")}, {"term": LineTerm.of(1 + 0j)}]
    made = combine(*tied, {"term": GaussianTerm(), "gain": 0.5})
    want = combine(*tied).characteristic(T) * np.exp(-(T**2) / 16)
    np.testing.assert_allclose(made.characteristic(T), want, atol=1e-13)
    assert made.mean_power == pytest.approx(2.25)


def test_an_offset_of_the_symbol_rate_is_enumerated():
    """At 1/4 of the sample rate and four samples a symbol the phases at an index never move."""
    offset = N_SAMPLES // 4
    made = combine({"term": qpsk("a")}, {"term": LineTerm.of(1 + 0j), "n_cycles": offset})
    angle = np.arange(512) * (2 * np.pi / 512)
    want = np.zeros(T.size)
    for n in range(4):
        two = qpsk("a").directional(T, angle, residue=n, modulus=4)
        two = two * np.exp(1j * np.outer(T, np.cos(angle - np.pi / 2 * n)))
        want += two.real.mean(axis=1) / 4
    np.testing.assert_allclose(made.characteristic(T), want, atol=1e-12)


class Known(BaseTerm):
    """Known values in turn."""

    values = np.array([1, 1j, 0.5, 2 - 1j])

    def directional(self, t, angle_rad, *, residue=0, modulus=1):
        assert modulus == self.clock_samples
        return np.exp(1j * np.outer(t, np.real(self.values[residue] * np.exp(-1j * angle_rad))))


def test_phases_turn_with_the_index():
    """A line an eighth of a turn a sample beside four known values: eight sums in turn."""
    known = Known(name="known", clock_samples=4, symmetry=1)
    made = TiedTerm(
        name="x",
        peak=4.0,
        clock_samples=4,
        symmetry=1,
        factors=(known, LineTerm.of(1 + 0j)),
        steps=(0, 1),
        turns=(1, 8),
    )
    n = np.arange(8)
    sums = np.abs(Known.values[n % 4] + np.exp(2j * np.pi * n / 8))
    want = scipy.special.j0(np.outer(T, sums))
    np.testing.assert_allclose(made.characteristic(T), want.mean(axis=1), atol=1e-13)
    got = made.characteristic(T, residue=1, modulus=4)
    np.testing.assert_allclose(got, want[:, 1::4].mean(axis=1), atol=1e-13)


def test_even_distances_of_three_carriers_are_not_free():
    """Harmonics 4, -8, 4 hold still: the three phases move as one."""
    parts = [{"term": qpsk(name), "n_cycles": k * FREE} for k, name in enumerate("abc", -1)]
    made = combine(*parts)
    free = np.mean([qpsk("a").characteristic(T, residue=n, modulus=4) ** 3 for n in range(4)], 0)
    got = made.characteristic(T)
    assert got[0] == pytest.approx(1)
    np.testing.assert_allclose(got, free, atol=2e-2)
    assert abs(got[2] - free[2]) > 1e-9


@pytest.mark.parametrize(
    ("other", "words"),
    [
        ({"term": qpsk("b", turns=Fraction(1, 8))}, "tied to its phase"),
        ({"term": ConstantEnvelopeTerm(name="msk")}, "msk beside a part tied to its phase"),
        (
            {"term": LinesTerm.of([-1, 1], [1, 1], n_samples=N_SAMPLES)},
            "tones in a simple ratio to a modulated part",
        ),
        ({"term": qpsk("b", ratio=(100, 1))}, "offsets in a simple ratio"),
    ],
)
def test_what_is_tied_and_not_followed_has_no_law_by_name(other, words):
    made = combine({"term": qpsk("a")}, other)
    assert isinstance(made, NoLaw)
    assert words in made.reason


def test_a_sum_in_a_sum_is_flattened():
    parts = [{"term": qpsk("a")}, {"term": LineTerm.of(1 + 0j), "turn_rad": 0.4}]
    inner = combine(*parts, {"term": GaussianTerm()})
    outer = combine(
        {"term": inner, "gain": 2.0, "turn_rad": 1.0, "n_cycles": 7},
        {"term": LineTerm.of(1 + 0j), "n_cycles": 7, "turn_rad": 2.0},
    )
    flat = combine(
        {"term": qpsk("a"), "gain": 2.0, "turn_rad": 1.0},
        {"term": LineTerm.of(1 + 0j), "gain": 2.0, "turn_rad": 1.4},
        {"term": LineTerm.of(1 + 0j), "turn_rad": 2.0},
        {"term": GaussianTerm(), "gain": 2.0},
    )
    np.testing.assert_allclose(outer.characteristic(T), flat.characteristic(T), atol=1e-13)


def test_constant_envelopes_at_free_phases_are_phasors():
    """Two: the arcsine law, 3.0103 dB at most."""
    made = combine(
        {"term": ConstantEnvelopeTerm(name="msk", data=frozenset("a"))},
        {"term": ConstantEnvelopeTerm(name="msk", data=frozenset("b")), "n_cycles": FREE},
    )
    assert law_of_term(made).level_db([0.1, 1e-9]) == pytest.approx([2.9027, 3.0103], abs=1e-4)


def test_a_part_alone_keeps_its_law():
    made = combine({"term": qpsk("a"), "gain": 3.0, "n_cycles": 5})
    assert isinstance(made, Scaled)
    p = [0.1, 1e-6]
    np.testing.assert_allclose(law_of_term(made).level_db(p), qpsk("a").law().level_db(p))
