import pickle
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.evaluate import evaluate
from wavegen.core.render import samples_of
from wavegen.core.signal import Samples, Signal
from wavegen.dsp.overlap_save import Filtered, fft_length, filter_rows, folded_energy


@dataclass(frozen=True, eq=False, kw_only=True)
class Table(Signal):
    values: Samples

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        return self.values[start:stop].copy()


def table(n: int, seed: int = 3) -> Table:
    rng = np.random.default_rng(seed)
    values = (rng.standard_normal(n) + 1j * rng.standard_normal(n)).astype(np.complex64)
    return Table(sample_rate_hz=Fraction(1), n_samples=n, values=values)


def some_taps(half: int, *, is_complex: bool) -> np.ndarray:
    rng = np.random.default_rng(half)
    taps = rng.standard_normal(2 * half + 1)
    return taps + 1j * rng.standard_normal(taps.size) if is_complex else taps


def cyclic_convolution(values: np.ndarray, taps: np.ndarray) -> np.ndarray:
    half = taps.size // 2
    out = np.zeros(values.size, np.complex128)
    for tap, lag in zip(taps, range(-half, half + 1), strict=True):
        out += tap * np.roll(values, lag)
    return out


@pytest.mark.parametrize("is_complex", [False, True])
@pytest.mark.parametrize(
    ("n", "half"), [(20000, 40), (20000, 200), (1, 7), (5, 40), (50, 40), (900, 1), (4096, 0)]
)
def test_filter_is_the_cyclic_convolution(n, half, is_complex):
    source, taps = table(n), some_taps(half, is_complex=is_complex)
    expected = cyclic_convolution(source.values.astype(np.complex128), taps)
    got = samples_of(Filtered.of(source, taps))
    # complex64 transforms of a few thousand points err by less than 1e-6 of the rms.
    assert np.abs(got - expected).max() < 1e-5 * np.sqrt(np.mean(np.abs(expected) ** 2))


@pytest.mark.parametrize(("n", "half"), [(30011, 100), (300, 100), (7, 100)])
def test_bits_do_not_depend_on_the_cut(n, half):
    signal = Filtered.of(table(n), some_taps(half, is_complex=False))
    whole = samples_of(signal)
    rng = np.random.default_rng(11)
    for _ in range(20):
        start = int(rng.integers(-2 * n, 2 * n))
        count = int(rng.integers(1, 2 * n))
        got = evaluate({signal: (start, start + count)})[signal]
        expected = whole.take(np.arange(start, start + count), mode="wrap")
        np.testing.assert_array_equal(got.view(np.uint32), expected.view(np.uint32))


def test_input_is_left_alone_and_the_signal_crosses_processes():
    source = table(5000)
    kept = source.values.copy()
    signal = Filtered.of(source, some_taps(30, is_complex=False))
    first = samples_of(signal)
    np.testing.assert_array_equal(source.values, kept)
    np.testing.assert_array_equal(samples_of(pickle.loads(pickle.dumps(signal))), first)  # noqa: S301 - our own bytes


def test_rows_read_no_sample_beyond_what_is_given():
    response = np.ones(1024, np.complex64)
    samples = np.arange(3000).astype(np.complex64)
    out = filter_rows(samples, response=response, half_length=100, n_out=2800)
    np.testing.assert_allclose(out, samples[100:2900], rtol=1e-5, atol=1e-3)


@pytest.mark.parametrize("half", [0, 1, 100, 127, 5000, 20000, 130000])
def test_transform_leaves_at_least_half_of_each_row(half):
    length = fft_length(half)
    assert length & (length - 1) == 0
    assert length - 2 * half >= length // 2


@pytest.mark.parametrize("period", [1, 3, 10, 61, 100])
def test_folded_energy_is_the_gain_for_white_noise_of_that_period(period):
    taps = some_taps(30, is_complex=True)
    impulse = np.zeros(period)
    impulse[0] = 1
    expected = np.sum(np.abs(cyclic_convolution(impulse, taps)) ** 2)
    assert folded_energy(taps, period) == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize("lag", [3, -7, 20_001, -50_000])
def test_lag_delays_the_filter(lag):
    source = table(20_000)
    taps = some_taps(40, is_complex=True)
    want = np.roll(samples_of(Filtered.of(source, taps)), lag)
    got = samples_of(Filtered.of(source, taps, lag=lag))
    # Rows stand elsewhere under the samples, so the float32 rounding differs.
    assert np.abs(got - want).max() < 1e-5 * np.abs(want).max()
