"""Band-limited loops, how methods are built on them, and figures by plain NumPy."""

from dataclasses import dataclass
from fractions import Fraction
from types import SimpleNamespace

import numpy as np
import pytest
from numpy.typing import NDArray

from wavegen.core.render import samples_of
from wavegen.core.signal import Signal
from wavegen.core.site import Site

RATE_HZ = Fraction(1_000_000)


@dataclass(frozen=True, eq=False, kw_only=True)
class Held(Signal):
    """Samples in memory."""

    samples: NDArray[np.complex64]

    def compute(self, start, stop, *arrays):
        return self.samples[start:stop].copy()


def held(samples):
    samples = np.asarray(samples, np.complex64)
    return Held(sample_rate_hz=RATE_HZ, n_samples=samples.size, samples=samples)


def banded(n_samples, *bands, seed=1):
    """Return a loop of random lines in bands (low, high, level in dB), unit power."""
    rng = np.random.default_rng(seed)
    place = np.fft.fftfreq(n_samples)
    lines = np.zeros(n_samples, np.complex128)
    for low, high, level_db in bands:
        inside = (place >= low) & (place < high)
        points = rng.choice([1, -1, 1j, -1j], int(inside.sum()))
        lines[inside] = 10 ** (level_db / 20) * points
    samples = np.fft.ifft(lines)
    return held(samples / np.sqrt(np.mean(np.abs(samples) ** 2)))


def build(settings, source):
    site = Site(
        sample_rate_hz=RATE_HZ, n_samples=source.n_samples, seed=1, label="x", path="stages[0]"
    )
    return settings.build(site, source), site.notes


def papr_db(samples):
    power = np.abs(samples.astype(np.complex128)) ** 2
    return 10 * np.log10(power.max() / power.mean())


def change_spectrum(signal, source):
    """Return frequency and power of each line of what changed, the gain fitted, dBc."""
    x = samples_of(source).astype(np.complex128)
    y = samples_of(signal).astype(np.complex128)
    gain = np.vdot(x, y) / np.vdot(x, x)
    lines = np.abs(np.fft.fft(y / gain - x)) ** 2 / (x.size * np.sum(np.abs(x) ** 2))
    return np.fft.fftfreq(x.size), lines


def change_dbc(signal, source, bands):
    """Return the power of the change outside some bands (low, high), dBc."""
    place, lines = change_spectrum(signal, source)
    outside = np.ones(place.size, bool)
    for low, high in bands:
        outside &= (place < low) | (place > high)
    return 10 * np.log10(lines[outside].sum() + 1e-30)


def evm_percent(signal, source):
    """Return the whole change, the gain fitted, over the source."""
    return 100 * np.sqrt(change_spectrum(signal, source)[1].sum())


@pytest.fixture(scope="session")
def reduction():
    return SimpleNamespace(
        rate_hz=RATE_HZ,
        held=held,
        banded=banded,
        build=build,
        papr_db=papr_db,
        change_dbc=change_dbc,
        change_spectrum=change_spectrum,
        evm_percent=evm_percent,
    )
