"""Small signals that exercise every clause of the contract, each with a direct reference."""

from dataclasses import dataclass
from fractions import Fraction
from types import SimpleNamespace

import numpy as np
import pytest
import scipy.fft

from wavegen.core.rng import random_words, stream_key
from wavegen.core.signal import Signal

RATE_HZ = Fraction(1_000_000)


@dataclass(frozen=True, eq=False, kw_only=True)
class White(Signal):
    """Uniform points on a 16-bit grid, by index."""

    label: str = "white"

    def compute(self, start, stop, *arrays):
        key = stream_key(7, self.label)
        words = random_words(
            key, 2 * start, 2 * (stop - start), period=2 * self.n_samples, width_bytes=2
        )
        rails = (words.astype(np.float32) - np.float32(32767.5)) / np.float32(32768)
        return rails.view(np.complex64)


@dataclass(frozen=True, eq=False, kw_only=True)
class Filter(Signal):
    """Overlap-save by FFT rows on the absolute grid; ``step`` is the hop."""

    taps: np.ndarray
    n_fft: int

    def needs(self, start, stop):
        half = self.taps.size // 2
        return ((start - half, stop + half),)

    def compute(self, start, stop, *arrays):
        overlap = self.taps.size - 1
        hop = self.n_fft - overlap
        n_rows = -(-(stop - start) // hop)
        padded = np.zeros(n_rows * hop + overlap, np.complex64)
        padded[: arrays[0].size] = arrays[0]
        rows = np.lib.stride_tricks.sliding_window_view(padded, self.n_fft)[::hop]
        response = scipy.fft.fft(self.taps, self.n_fft).astype(np.complex64)
        spectra = scipy.fft.fft(rows, axis=1)
        spectra *= response
        return scipy.fft.ifft(spectra, axis=1)[:, overlap:].reshape(-1)[: stop - start]


@dataclass(frozen=True, eq=False, kw_only=True)
class Echo(Signal):
    """The input plus a quarter of itself ``delay`` samples earlier; reads it twice."""

    delay: int

    def needs(self, start, stop):
        return ((start, stop), (start - self.delay, stop - self.delay))

    def compute(self, start, stop, *arrays):
        return arrays[0] + np.float32(0.25) * arrays[1]


@dataclass(frozen=True, eq=False, kw_only=True)
class Decimator(Signal):
    """Every ``factor``-th sample: another axis, and a strided answer."""

    factor: int

    def needs(self, start, stop):
        return ((start * self.factor, (stop - 1) * self.factor + 1),)

    def compute(self, start, stop, *arrays):
        return arrays[0][:: self.factor]


@dataclass(frozen=True, eq=False, kw_only=True)
class Product(Signal):
    """Two signals of any period, multiplied sample by sample."""

    def compute(self, start, stop, *arrays):
        return arrays[0] * arrays[1]


def white(n_samples, label="white", step=1):
    return White(sample_rate_hz=RATE_HZ, n_samples=n_samples, label=label, step=step)


def filtered(source, n_taps=31, n_fft=128):
    taps = np.hanning(n_taps + 2)[1:-1]
    return Filter(
        sample_rate_hz=source.sample_rate_hz,
        n_samples=source.n_samples,
        step=n_fft - n_taps + 1,
        inputs=(source,),
        taps=taps / taps.sum(),
        n_fft=n_fft,
    )


def echoed(source, delay):
    return Echo(
        sample_rate_hz=source.sample_rate_hz,
        n_samples=source.n_samples,
        inputs=(source, source),
        delay=delay,
    )


def decimated(source, factor):
    assert source.n_samples % factor == 0
    return Decimator(
        sample_rate_hz=source.sample_rate_hz / factor,
        n_samples=source.n_samples // factor,
        inputs=(source,),
        factor=factor,
    )


def multiplied(first, second):
    return Product(sample_rate_hz=RATE_HZ, n_samples=first.n_samples, inputs=(first, second))


def chain(source, rounds):
    for _ in range(rounds):
        source = filtered(source)
    return source


def entangled(n_samples):
    """Return one graph with every difficulty in it, on a period that no grid divides."""
    source = white(n_samples)
    short = white(37, "short")
    return multiplied(chain(echoed(source, n_samples // 2 + 13), 3), short)


def direct_white(n_samples, label="white"):
    return white(n_samples, label).compute(0, n_samples)


def direct_filter(samples, n_taps=31):
    taps = np.hanning(n_taps + 2)[1:-1]
    taps = taps / taps.sum()
    kernel = np.zeros(samples.size)
    for tap, value in enumerate(taps):
        kernel[(tap - n_taps // 2) % samples.size] += value
    spectrum = np.fft.fft(samples.astype(np.complex128)) * np.fft.fft(kernel)
    return np.fft.ifft(spectrum)


@pytest.fixture(scope="session")
def lab():
    return SimpleNamespace(
        rate_hz=RATE_HZ,
        white=white,
        filtered=filtered,
        echoed=echoed,
        decimated=decimated,
        multiplied=multiplied,
        chain=chain,
        entangled=entangled,
        direct_white=direct_white,
        direct_filter=direct_filter,
    )
