"""Sources for stages: addressed by index, so that any range can be asked for."""

from dataclasses import dataclass
from fractions import Fraction
from types import SimpleNamespace

import numpy as np
import pytest

from wavegen.core.rng import random_words, stream_key
from wavegen.core.signal import Signal
from wavegen.core.site import Site

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
