import math

import numpy as np
import pytest

from wavegen.laws.constant import ConstantLaw
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.listed import ListedLaw
from wavegen.laws.own_samples import (
    bend_samples,
    clip_samples,
    delayed_law,
    gate_samples,
    own_samples,
)
from wavegen.laws.periodic import PeriodicLaw
from wavegen.laws.term import NoLaw

HARMONICS = np.array([0, 1, 5, 6])
AMPLITUDES = np.array([1.0, 0.6j, -0.4, 0.3 + 0.1j])


def tones(n_instants=50, stride=3):
    return PeriodicLaw.of_harmonics(
        HARMONICS, AMPLITUDES, n_instants=n_instants, stride=stride, name="tones"
    )


def powers(n_instants=50, stride=3, lag=0):
    t = stride * (np.arange(n_instants) - lag) / n_instants
    wave = np.exp(2j * np.pi * np.outer(t, HARMONICS)) @ AMPLITUDES
    return np.abs(wave) ** 2 / np.mean(np.abs(wave) ** 2)


@pytest.fixture
def pattern():
    rng = np.random.default_rng(5)
    samples = rng.standard_normal(600).view(np.complex128)
    return ListedLaw.of(samples.astype(np.complex64), name="pattern")


def test_tones_fall_on_the_instants_of_their_loop():
    np.testing.assert_allclose(own_samples(tones()).in_order, powers(), atol=1e-12)
    late = delayed_law(tones(), 7)
    np.testing.assert_allclose(own_samples(late).in_order, powers(lag=7), atol=1e-12)
    assert late.ccdf(1.0) == tones().ccdf(1.0)
    assert own_samples(tones(n_instants=None)) is None
    assert own_samples(tones(n_instants=(1 << 22) + 1)) is None


def test_what_is_listed_and_what_is_not(pattern):
    assert own_samples(pattern) is pattern
    assert own_samples(ConstantLaw()).in_order.tolist() == [1.0]
    assert own_samples(GaussianLaw()) is None
    assert delayed_law(GaussianLaw(), 3) is not None
    np.testing.assert_array_equal(
        delayed_law(pattern, 3).in_order, np.roll(pattern.in_order, 3) / pattern.in_order.mean()
    )


@pytest.mark.parametrize("ceiling_db", [0.5, 2.0, 4.0])
def test_a_clip_leaves_the_ceiling_over_the_new_mean(pattern, ceiling_db):
    found = clip_samples(pattern, ceiling_db)
    assert found.peak_db == pytest.approx(ceiling_db, abs=1e-10)
    assert found.in_order.mean() == pytest.approx(1.0, abs=1e-12)
    kept = pattern.in_order < 0.1
    ratio = found.in_order[kept] / pattern.in_order[kept]
    assert np.ptp(ratio) == pytest.approx(0, abs=1e-12)
    assert found.name == "pattern, clipped"


def test_a_ceiling_that_is_not_reached_or_cannot_be(pattern):
    assert clip_samples(pattern, 30.0) is pattern
    rare = ListedLaw.of(np.array([1, 0, 0, 0], np.complex64), name="rare")
    assert isinstance(clip_samples(rare, 3.0), NoLaw)  # it stands 6.02 dB over its mean


def test_a_curve_is_applied_to_every_sample(pattern):
    found = bend_samples(pattern, lambda r: np.tanh(r) * np.exp(0.3j * r**2), name="bent")
    want = np.tanh(np.sqrt(pattern.in_order)) ** 2
    np.testing.assert_allclose(found.in_order, want / want.mean(), atol=1e-12)


def test_a_gate_is_laid_over_the_samples(pattern):
    gains = np.array([0, 0.5, 1, 1, 1, 0.5, 0, 0.0])
    found = gate_samples(pattern, gains, gains == 1)
    n = math.lcm(300, 8)
    want = np.resize(pattern.in_order, n) * np.resize(gains, n) ** 2
    np.testing.assert_allclose(found.in_order, want / want.mean(), atol=1e-12)
    assert found.on_powers.size == n * 3 // 8
    assert gate_samples(pattern, np.zeros(4), np.zeros(4, bool)) is None
    assert gate_samples(pattern, np.ones((1 << 22) - 1), np.ones((1 << 22) - 1, bool)) is None
    # Behind a gate, ceiling and curve are about the time it is fully open.
    clipped = clip_samples(found, 2.0)
    on = clipped.on_powers
    assert 10 * np.log10(on.max() / on.mean()) == pytest.approx(2.0, abs=1e-10)
    bent = bend_samples(found, np.tanh, name="bent")
    amplitude = np.sqrt(found.in_order / found.on_powers.mean())
    want = np.tanh(amplitude) ** 2
    np.testing.assert_allclose(bent.in_order, want / want.mean(), atol=1e-12)
