"""Real samples read as their envelope; tolerances follow from the filter's stated figures."""

import pickle
from fractions import Fraction
from itertools import pairwise

import numpy as np
import pytest
import scipy.signal

from wavegen.core.evaluate import evaluate
from wavegen.files.analytic import (
    EDGE_SAMPLES,
    IMAGE_DB,
    PASSBAND_EDGE,
    analytic_recording,
    as_complex,
    hilbert_taps,
    looped,
)
from wavegen.files.format import ReadHints
from wavegen.files.read import open_recording

N = 20_000
IMAGE = 10 ** (-IMAGE_DB / 20)
FLOAT = 4e-7
"""Rounding of a complex64 transform pair on samples of size 1."""


def real_file(folder, samples):
    path = folder / "x.rf32_le"
    samples.astype("<f4").tofile(path)
    return open_recording(path, ReadHints(sample_rate_hz=Fraction(1000)))


def tone(frequency, n=N, amplitude=0.7, phase=0.3):
    return amplitude * np.cos(2 * np.pi * frequency * np.arange(n) + phase)


def test_response_over_the_whole_passband():
    frequency = np.linspace(PASSBAND_EDGE, 0.5 - PASSBAND_EDGE, 5000)
    _, gain = scipy.signal.freqz(hilbert_taps(), worN=2 * np.pi * frequency)
    gain *= np.exp(2j * np.pi * frequency * EDGE_SAMPLES)  # the middle tap is lag zero
    # z = x + j y: twice the positive frequencies, and |1 - g| of the negative ones
    assert np.abs(gain - -1j).max() < 2 * IMAGE
    assert hilbert_taps().sum() == pytest.approx(0, abs=1e-15)


@pytest.mark.parametrize("frequency", [0.006, 0.1, 0.2503, 0.494])
def test_a_real_carrier_reads_as_its_amplitude(tmp_path, frequency):
    recording = real_file(tmp_path, tone(frequency))
    assert recording.is_real
    inside = slice(EDGE_SAMPLES, N - EDGE_SAMPLES)
    samples = recording.signal.compute(0, N)[inside]
    np.testing.assert_allclose(np.abs(samples), 0.7, atol=0.7 * 2 * IMAGE + FLOAT)
    wanted = 0.7 * np.exp(1j * (2 * np.pi * frequency * np.arange(N) + 0.3))[inside]
    np.testing.assert_allclose(samples, wanted, atol=0.7 * 2 * IMAGE + FLOAT)


def test_i_is_what_the_file_holds_and_q_what_another_makes(tmp_path):
    rng = np.random.default_rng(3)
    band = scipy.signal.firwin(301, [0.1, 0.3], pass_zero=False, fs=1)
    raw = 0.2 * scipy.signal.lfilter(band, 1, rng.standard_normal(N)).astype(np.float32)
    samples = real_file(tmp_path, raw).signal.compute(0, N)
    np.testing.assert_array_equal(samples.real, raw)
    theirs = scipy.signal.hilbert(raw.astype(np.float64))
    inside = slice(2000, N - 2000)  # theirs wraps round: its ends decay as 1/n
    np.testing.assert_allclose(samples[inside], theirs[inside], atol=3e-4)


def test_the_ends_see_zeros_and_it_is_said(tmp_path):
    raw = tone(0.1)
    recording = real_file(tmp_path, raw)
    assert str(EDGE_SAMPLES) in recording.warnings[0]
    padded = np.concatenate([np.zeros(1000), raw.astype("f4"), np.zeros(1000)])
    wanted = np.convolve(padded, hilbert_taps(), "same")[1000:-1000]
    np.testing.assert_allclose(recording.signal.compute(0, N).imag, wanted, atol=FLOAT)
    assert "short" in real_file(tmp_path, raw[:100]).warnings[0]


def test_any_cut_gives_the_same_bits(tmp_path):
    signal = real_file(tmp_path, tone(0.123)).signal
    whole = signal.compute(0, N)
    rng = np.random.default_rng(5)
    cuts = np.unique(np.concatenate([[0, 1, N - 1, N], rng.integers(1, N, 20)]))
    signal = pickle.loads(pickle.dumps(signal))  # noqa: S301 (our own bytes)
    parts = [signal.compute(int(a), int(b)) for a, b in pairwise(cuts)]
    np.testing.assert_array_equal(np.concatenate(parts), whole)
    for start, stop in ((0, 5), (3433, 3441), (N - 3, N)):
        np.testing.assert_array_equal(evaluate({signal: (start, stop)})[signal], whole[start:stop])


def test_a_loop_has_no_ends(tmp_path):
    recording = real_file(tmp_path, tone(0.1))  # 2000 whole cycles
    signal = looped(recording)
    samples = evaluate({signal: (0, N)})[signal]
    np.testing.assert_allclose(np.abs(samples), 0.7, atol=0.7 * 2 * IMAGE + FLOAT)
    part = looped(recording, 10, 1010)
    samples = evaluate({part: (0, 1000)})[part]
    np.testing.assert_allclose(np.abs(samples), 0.7, atol=0.7 * 2 * IMAGE + FLOAT)
    assert part.n_samples == 1000


def test_complex_recordings_stay_what_they_are(tmp_path):
    path = tmp_path / "x.cf32_le"
    np.ones(20, "<c8").tofile(path)
    recording = open_recording(path, ReadHints(sample_rate_hz=Fraction(1000)))
    assert as_complex(recording) is recording
    assert looped(recording) is recording.signal
    assert looped(recording, 5, 15).n_samples == 10


def test_an_offset_stays_an_offset(tmp_path):
    samples = real_file(tmp_path, np.full(N, 0.25)).signal.compute(0, N)
    middle = samples[EDGE_SAMPLES:-EDGE_SAMPLES]
    np.testing.assert_allclose(middle, 0.25, atol=FLOAT)


@pytest.mark.parametrize("n", [N, 100])
def test_a_recording_made_analytic_is_as_one_that_is_read(tmp_path, n):
    read = real_file(tmp_path, tone(0.123, n)).signal
    made = analytic_recording(read.source)
    assert made.n_samples == n
    samples = evaluate({made: (0, n)})[made]
    np.testing.assert_allclose(samples, read.compute(0, n), atol=FLOAT)
