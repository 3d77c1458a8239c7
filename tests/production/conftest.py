"""Small recipes, made once for the session, and their codes read with NumPy alone."""

from dataclasses import dataclass
from types import SimpleNamespace

import numpy as np
import pytest
from numpy.typing import NDArray

from wavegen.core.render import samples_of
from wavegen.core.signal import Signal
from wavegen.production.make import make
from wavegen.production.prepare import prepare
from wavegen.recipe.load import load_text

HEAD = "wavegen: 1\nsample_rate: 4 MHz\nduration: 2 ms\n"
CARRIER = HEAD + "signal: {kind: carrier}\n"
TONES = HEAD + "signal: {kind: tones, count: 8, spacing: 10 kHz, phases: newman}\n"
NOISE = HEAD + "signal: {kind: noise, bandwidth: 1 MHz}\n"
PULSE = "pulse: {kind: root_raised_cosine, roll_off: 0.22, span: 32 symbols}"
QPSK = "kind: single_carrier, constellation: qpsk, symbol_rate: 1 MHz, " + PULSE
SINGLE = HEAD + f"signal: {{{QPSK}}}\n"


def load(text, name="case", overrides=()):
    return load_text(text, name=name, overrides=overrides)


def prepared(text, overrides=()):
    return prepare(load(text, overrides=overrides))


def make_text(text, out, name="case", overrides=(), **options):
    return make(load(text, name, overrides), out=out, **options)


@dataclass(frozen=True, eq=False, kw_only=True)
class Held(Signal):
    """One period in memory: a leaf, as the scratch file is."""

    samples: NDArray[np.complex64]

    def compute(self, start, stop, *arrays):
        return self.samples[start:stop].copy()


def held(text):
    signal = prepared(text).built.signal
    samples = samples_of(signal)
    return Held(sample_rate_hz=signal.sample_rate_hz, n_samples=samples.size, samples=samples)


def read_ci16(path):
    """Return samples of an interleaved little-endian 16-bit file, full scale 1.0."""
    rails = np.fromfile(path, "<i2").astype(np.float64).reshape(-1, 2) / 32768
    return rails[:, 0] + 1j * rails[:, 1]


def left_in(folder):
    """Return every file and folder below one, hidden ones too."""
    return sorted(str(path.relative_to(folder)) for path in folder.rglob("*"))


@pytest.fixture(scope="session")
def lab():
    return SimpleNamespace(
        HEAD=HEAD,
        CARRIER=CARRIER,
        TONES=TONES,
        NOISE=NOISE,
        QPSK=QPSK,
        SINGLE=SINGLE,
        load=load,
        prepared=prepared,
        make=make_text,
        held=held,
        read_ci16=read_ci16,
        left_in=left_in,
    )
