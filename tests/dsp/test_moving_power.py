from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.evaluate import evaluate
from wavegen.core.render import samples_of
from wavegen.core.signal import Signal
from wavegen.dsp.moving_power import MovingPower


@dataclass(frozen=True, eq=False, kw_only=True)
class Held(Signal):
    samples: object = None

    def compute(self, start, stop, *arrays):
        return self.samples[start:stop].copy()


def held(samples):
    samples = np.asarray(samples, np.complex64)
    return Held(sample_rate_hz=Fraction(1), n_samples=samples.size, samples=samples)


@pytest.fixture
def noise():
    rng = np.random.default_rng(8)
    return (rng.standard_normal(5000) + 1j * rng.standard_normal(5000)).astype(np.complex64)


@pytest.mark.parametrize("window", [1, 2, 3, 16, 80, 255, 256])
def test_a_record_is_averaged_over_what_is_there(noise, window):
    power = np.abs(noise.astype(np.complex128)) ** 2
    sums = np.convolve(power, np.ones(window), "same")
    counts = np.convolve(np.ones(power.size), np.ones(window), "same")
    got = np.abs(samples_of(MovingPower.of(held(noise), window, loops=False))) ** 2
    # Float32 of the root: 1.2e-7 relative at most, twice that in power.
    assert got == pytest.approx(sums / counts, rel=3e-7)


@pytest.mark.parametrize("window", [5, 64])
def test_a_loop_is_averaged_across_its_seam(noise, window):
    power = np.abs(noise.astype(np.complex128)) ** 2
    around = np.concatenate([power[-window:], power, power[:window]])
    want = np.convolve(around, np.ones(window), "same")[window:-window] / window
    got = np.abs(samples_of(MovingPower.of(held(noise), window, loops=True))) ** 2
    assert got == pytest.approx(want, rel=3e-7)


def test_the_cut_changes_no_bit(noise):
    moving = MovingPower.of(held(np.tile(noise, 12)), 100, loops=False)
    whole = samples_of(moving)
    for low, high in ((0, 7), (3, 40_000), (17_001, 59_990), (59_999, 60_000)):
        assert evaluate({moving: (low, high)})[moving].tobytes() == whole[low:high].tobytes()


def test_silence_after_a_loud_burst_reads_as_silence():
    samples = np.zeros(1000)
    samples[:300] = 1e9
    samples[600] = 1e-9
    got = samples_of(MovingPower.of(held(samples), 64, loops=False)).real
    assert np.all(got[340:560] == 0)
    assert got[600] == pytest.approx(1e-9 / 8, rel=1e-6)
