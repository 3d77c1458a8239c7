from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from wavegen.core.render import samples_of
from wavegen.core.signal import Signal
from wavegen.dsp.offset import Offset


@dataclass(frozen=True, eq=False, kw_only=True)
class Held(Signal):
    samples: object = None

    def compute(self, start, stop, *arrays):
        return self.samples[start:stop].copy()


def held(samples):
    samples = np.asarray(samples, np.complex64)
    return Held(sample_rate_hz=Fraction(1), n_samples=samples.size, samples=samples)


def test_an_offset_is_subtracted_and_nothing_else():
    samples = np.array([1 + 2j, 3, -1j])
    got = samples_of(Offset.of(held(samples), 1 + 1j))
    assert got.tolist() == (samples - (1 + 1j)).tolist()
