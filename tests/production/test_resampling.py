from fractions import Fraction
from itertools import pairwise

import numpy as np
import pytest

from wavegen.core.errors import ArgumentsError
from wavegen.core.render import samples_of
from wavegen.core.signal import Signal
from wavegen.production.resampling import factor_of, loop_at_rate, recording_at_rate


class Tone(Signal):
    """A tone of a twentieth of the rate."""

    def compute(self, start, stop, *arrays):
        return np.exp(2j * np.pi * (np.arange(start, stop) % 20) / 20).astype(np.complex64)


def tone(n_samples, rate_hz=1_000_000):
    return Tone(sample_rate_hz=Fraction(rate_hz), n_samples=n_samples)


def expected(n_samples, factor):
    return np.exp(2j * np.pi * np.arange(n_samples) / 20 / float(factor))


ERROR = 2e-6
"""-114 dB: images lie 120 dB down, and the float32 rows add -130 dB to each sample."""


@pytest.mark.parametrize(
    "factor", [Fraction(3, 2), Fraction(2, 5), Fraction(625, 384), Fraction(2)]
)
def test_a_loop_is_the_same_waveform_at_every_sample(factor):
    n_samples = 20 * factor.denominator * 10
    rate_hz = 1_000_000 * factor
    made, doubts = loop_at_rate(tone(n_samples), rate_hz)
    assert (made.n_samples, made.sample_rate_hz) == (n_samples * factor, rate_hz)
    assert doubts == []
    found = samples_of(made)
    assert np.abs(found - expected(found.size, factor)).max() < ERROR


def test_a_loop_that_would_not_be_whole_is_refused_with_the_nearest_rate():
    with pytest.raises(ArgumentsError) as caught:
        loop_at_rate(tone(1000), Fraction(1_234_567))
    error = caught.value
    assert error.where == "--sample-rate"
    assert "multiples of 1000 Hz" in error.allowed
    assert error.remedy == "Write --sample-rate '1235000 Hz'."
    assert loop_at_rate(tone(1000), Fraction(1_235_000))[0].n_samples == 1235


@pytest.mark.parametrize("factor", [Fraction(3, 2), Fraction(2, 5), Fraction(1237, 1000)])
@pytest.mark.parametrize("n_samples", [3000, 3001])
def test_a_recording_inside_its_ends(factor, n_samples):
    made, doubts = recording_at_rate(tone(n_samples), 1_000_000 * factor)
    assert made.n_samples == -(-n_samples * factor.numerator // factor.denominator)
    found = samples_of(made)
    (doubt,) = [text for text in doubts if "ends" in text]
    n_edge = int(doubt.split(" samples are")[0].rpartition(" ")[2])
    inside = slice(n_edge, -n_edge)
    assert np.abs(found - expected(found.size, factor))[inside].max() < ERROR
    assert np.abs(found - expected(found.size, factor))[:4].max() > 0.01


def test_the_end_of_a_recording_does_not_reach_its_start():
    """A burst in the last samples leaves the first ones zero: the two are padded apart."""

    class Late(Signal):
        def compute(self, start, stop, *arrays):
            return (np.arange(start, stop) >= 1990).astype(np.complex64)

    late = Late(sample_rate_hz=Fraction(1000), n_samples=2000)
    found = samples_of(recording_at_rate(late, Fraction(1500))[0])
    assert np.abs(found[:2800]).max() < ERROR
    assert np.abs(found[2986:]).max() > 0.5


def test_any_cut_gives_the_same_bits():
    made, _ = recording_at_rate(tone(5000), Fraction(1_300_000))
    whole = samples_of(made)
    cuts = [0, 1, 777, 4096, 6000, made.n_samples]
    parts = [samples_of(made, a, b) for a, b in pairwise(cuts)]
    np.testing.assert_array_equal(np.concatenate(parts), whole)


@pytest.mark.parametrize(
    ("rate_hz", "fits"), [(1000, True), (976, False), (1024_000_000, True), (1024_000_001, False)]
)
def test_rates_far_apart(rate_hz, fits):
    if fits:
        assert factor_of(tone(10), Fraction(rate_hz)) == Fraction(rate_hz, 1_000_000)
        return
    with pytest.raises(ArgumentsError, match="976"):
        factor_of(tone(10), Fraction(rate_hz))


def test_too_many_samples():
    for change in (loop_at_rate, recording_at_rate):
        with pytest.raises(ArgumentsError, match="4000000000"):
            change(tone(10_000_000), Fraction(500_000_000))


def test_power_at_the_edge_of_the_band_is_told():
    class Edge(Signal):
        def compute(self, start, stop, *arrays):
            return np.exp(2j * np.pi * 0.48 * np.arange(start, stop)).astype(np.complex64)

    edge = Edge(sample_rate_hz=Fraction(1000), n_samples=10_000)
    for change in (loop_at_rate, recording_at_rate):
        assert any("of the power lies beyond" in text for text in change(edge, Fraction(1500))[1])
