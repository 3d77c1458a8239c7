"""Sources for stages: addressed by index, so that any range can be asked for."""

from dataclasses import dataclass
from fractions import Fraction
from types import SimpleNamespace

import numpy as np
import pytest
from numpy.typing import NDArray

from wavegen.core.index_set import IndexSet
from wavegen.core.render import samples_of
from wavegen.core.rng import random_words, stream_key
from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.dsp.arrival import Arrival
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Group, Ofdm
from wavegen.sources.ofdm_layout import CyclicPrefix, Stretch

RATE_HZ = Fraction(1_000_000)


@dataclass(frozen=True, eq=False, kw_only=True)
class Gaussian(Signal):
    """White complex Gaussian samples of unit power (Box and Muller, 1958)."""

    label: str = "gaussian"

    def compute(self, start, stop, *arrays):
        key = stream_key(5, self.label)
        words = random_words(
            key, 2 * start, 2 * (stop - start), period=2 * self.n_samples, width_bytes=4
        )
        uniform = (words + 0.5) / 2.0**32
        turn = np.exp(2j * np.pi * uniform[1::2])
        return (np.sqrt(-np.log(uniform[::2])) * turn).astype(np.complex64)


@dataclass(frozen=True, eq=False, kw_only=True)
class Given(Signal):
    """Samples written down in the test, repeated; read-only, as inputs are by contract."""

    values: tuple[complex, ...]

    def compute(self, start, stop, *arrays):
        values = np.array(self.values, np.complex64)
        samples = values[np.arange(start, stop) % values.size]
        samples.flags.writeable = False
        return samples


def gaussian(n_samples, label="gaussian", **fields):
    return Gaussian(sample_rate_hz=RATE_HZ, n_samples=n_samples, label=label, **fields)


def given(values, n_samples=None, **fields):
    values = tuple(values)
    return Given(
        sample_rate_hz=RATE_HZ, n_samples=n_samples or len(values), values=values, **fields
    )


def site(n_samples, path="stages[0]"):
    return Site(sample_rate_hz=RATE_HZ, n_samples=n_samples, seed=1, label="one", path=path)


@pytest.fixture(scope="session")
def bench():
    return SimpleNamespace(rate_hz=RATE_HZ, gaussian=gaussian, given=given, site=site)


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


def reduce(settings, source):
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
        build=reduce,
        papr_db=papr_db,
        change_dbc=change_dbc,
        change_spectrum=change_spectrum,
        evm_percent=evm_percent,
    )


def built_ofdm(subcarriers, constellation="qpsk", *, n_symbols=28, fft_samples=256, **fields):
    """Return OFDM behind a prefix of a sixteenth with an edge of half of that, and its site."""
    group = Group(
        subcarriers=IndexSet.parse(subcarriers), constellation=Constellation.parse(constellation)
    )
    usual = {
        "subcarrier_spacing_hz": RATE_HZ / fft_samples,
        "groups": (group,),
        "cyclic_prefix": CyclicPrefix.parse("1/16"),
        "edge_window": Stretch.parse("1/32"),
    }
    settings = Ofdm(**usual | fields)
    cycle = settings.cycle(RATE_HZ, "signal")
    n_samples = cycle.n_samples * -(-n_symbols // cycle.n_symbols)
    return settings.build(site(n_samples, path="signal"))


def subcarriers_of(signal):
    """Return what a receiver finds and what was sent, shape (n_symbols, n_active) each."""
    reception = signal.receive(signal, Arrival(n_samples=signal.n_samples))
    both = samples_of(reception.received), samples_of(reception.ideal)
    return tuple(each.reshape(-1, reception.n_columns).astype(np.complex128) for each in both)


def bodies_of(signal):
    """Return the bins of each useful symbol by a transform of the test's own, (n, n_fft)."""
    rows = samples_of(signal.bodies).reshape(-1, signal.layout.n_fft).astype(np.complex128)
    return np.fft.fft(rows, axis=1) / signal.layout.n_fft


@pytest.fixture(scope="session")
def ofdm():
    return SimpleNamespace(
        build=built_ofdm, reduce=reduce, subcarriers=subcarriers_of, bins=bodies_of
    )
