import numpy as np
import pytest

from wavegen.laws.constant import ConstantLaw
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.inversion import law_of_term
from wavegen.laws.mapped import clip_law
from wavegen.laws.operations import (
    DelayedTerm,
    EnvelopeTerm,
    GatedTerm,
    filtered_law,
    filtered_term,
)
from wavegen.laws.term import BaseTerm, GaussianTerm, NoLaw

T = np.linspace(0, 8, 40)
GAUSSIAN = GaussianTerm(name="noise")


class Alternating(BaseTerm):
    """Gaussian, with power 2 and 0 at even and odd indices."""

    def characteristic(self, t, *, residue=0, modulus=1):
        loud = np.exp(-0.5 * t**2)
        if modulus % 2:
            return 0.5 + 0.5 * loud
        return loud if residue % 2 == 0 else np.ones(t.size)


ALTERNATING = Alternating(name="alternating", clock_samples=2)


def test_a_filter_leaves_gaussian_signals_alone_and_no_law_of_others():
    assert filtered_law(GaussianLaw()) == GaussianLaw()
    assert filtered_term(GAUSSIAN) is GAUSSIAN
    clipped = filtered_law(clip_law(GaussianLaw(), 6.0))
    assert clipped == NoLaw(reason="complex Gaussian, clipped, filtered, has no law")
    assert isinstance(filtered_law(ConstantLaw(), how="resampled"), NoLaw)
    assert isinstance(filtered_term(ALTERNATING), NoLaw)


def test_a_delay_moves_the_clock():
    late = DelayedTerm.of(ALTERNATING, 3)
    for residue in (0, 1):
        assert late.characteristic(T, residue=residue, modulus=2) == pytest.approx(
            ALTERNATING.characteristic(T, residue=1 - residue, modulus=2)
        )
    assert late.characteristic(T) == pytest.approx(ALTERNATING.characteristic(T))


def test_a_gate_mixes_with_silence():
    gains = np.array([0.0, 0.5, 1.0, 1.0])
    gated = GatedTerm.of(GAUSSIAN, gains)
    want = np.mean([np.exp(-0.25 * (g * T) ** 2) for g in gains], axis=0)
    assert gated.characteristic(T) == pytest.approx(want, rel=1e-14)
    assert gated.clock_samples == 4
    assert gated.mean_power == pytest.approx(2.25 / 4)
    assert gated.characteristic(T, residue=1, modulus=4) == pytest.approx(
        np.exp(-0.25 * (0.5 * T) ** 2)
    )
    assert gated.characteristic(T, residue=0, modulus=2) == pytest.approx(
        (1 + np.exp(-0.25 * T**2)) / 2
    )


def test_a_gate_that_keeps_time_with_its_input():
    # On at even indices only, where the input is loud.
    gated = GatedTerm.of(ALTERNATING, np.array([1.0, 0.0]))
    assert gated.characteristic(T) == pytest.approx(0.5 + 0.5 * np.exp(-0.5 * T**2))
    other = GatedTerm.of(ALTERNATING, np.array([0.0, 1.0, 0.0]))
    assert other.clock_samples == 6
    # Open at 1 and 4 of 6: once loud.
    assert other.characteristic(T) == pytest.approx((5 + np.exp(-0.5 * T**2)) / 6)


def test_many_ramp_amplitudes_are_gathered():
    gains = np.sin(np.linspace(0, np.pi / 2, 5000)) ** 2
    gated = GatedTerm.of(GAUSSIAN, gains)
    want = np.mean(np.exp(-0.25 * np.multiply.outer(T, gains) ** 2), axis=1)
    assert gated.characteristic(T) == pytest.approx(want, abs=1e-5)


def test_an_envelope_with_a_law_becomes_a_term_and_back():
    term = EnvelopeTerm(name="noise", mean_power=2.0, law=GaussianLaw())
    assert term.characteristic(T) == pytest.approx(np.exp(-0.5 * T**2), abs=1e-13)


def test_clipped_noise_beside_noise():
    """Moments of the sum: independent, so that powers and their products add (derivation)."""
    law = clip_law(GaussianLaw(), 3.0)
    clipped = EnvelopeTerm(name="clipped", peak=10**0.15, law=law)

    class Sum(BaseTerm):
        def characteristic(self, t, *, residue=0, modulus=1):
            return clipped.characteristic(t) * np.exp(-0.025 * t**2)

    made = law_of_term(Sum(name="sum", mean_power=1.1))
    # Levels of the clipped part alone end at 3 dB; a tenth of noise rounds the wall off.
    rng = np.random.default_rng(4)
    n = 400_000
    x, y = (rng.normal(scale=np.sqrt(0.5), size=(n, 2)) @ (1, 1j) for _ in range(2))
    ratio = law.ratio
    x *= np.minimum(1, np.sqrt(ratio) / np.abs(x)) / np.sqrt(law.mean)
    power = np.abs(x + np.sqrt(0.1) * y) ** 2 / 1.1
    for level_db in (0.0, 2.0, 3.0, 4.0):
        want = float(made.ccdf(level_db))
        sigma = np.sqrt(want * (1 - want) / n)
        assert np.mean(power > 10 ** (level_db / 10)) == pytest.approx(want, abs=4 * sigma)
