from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.evaluate import evaluate
from wavegen.core.render import samples_of
from wavegen.core.signal import Signal
from wavegen.dsp.differences import DifferenceHeights, FourthDifference


@dataclass(frozen=True, eq=False, kw_only=True)
class Held(Signal):
    samples: object = None

    def compute(self, start, stop, *arrays):
        return self.samples[start:stop].copy()


def held(samples):
    samples = np.asarray(samples, np.complex64)
    return Held(sample_rate_hz=Fraction(1), n_samples=samples.size, samples=samples)


def test_its_gain_is_that_of_four_differences():
    # |2 sin(pi f)|^4; exp is good to 6e-8 in float32, 16 of them add up: 1e-6.
    index = np.arange(400)
    for cycles in (10, 50, 130, 200):
        tone = np.exp(2j * np.pi * cycles * index / 400)
        got = np.abs(samples_of(FourthDifference.of(held(tone), loops=True)))
        want = (2 * np.sin(np.pi * cycles / 400)) ** 4
        assert got == pytest.approx(want, abs=2e-6)


def test_a_step_gives_three():
    got = samples_of(FourthDifference.of(held([0] * 10 + [1] * 10), loops=False))
    assert got.real.tolist() == [0] * 8 + [1, -3, 3, -1] + [0] * 8


def test_ends_of_a_record_and_what_is_not_finite_give_nothing():
    samples = np.ones(30, np.complex64)
    samples[0] = 50
    samples[15] = np.nan
    assert np.all(samples_of(FourthDifference.of(held(samples), loops=False))[[0, 1, 28, 29]] == 0)
    assert np.all(samples_of(FourthDifference.of(held(samples), loops=False))[13:18] == 0)
    assert samples_of(FourthDifference.of(held(samples), loops=True))[29] != 0


def test_the_cut_changes_no_bit():
    rng = np.random.default_rng(1)
    signal = FourthDifference.of(held(rng.standard_normal(3000)), loops=False)
    whole = samples_of(signal)
    for low, high in ((0, 1), (1, 3), (5, 2999), (2998, 3000)):
        assert evaluate({signal: (low, high)})[signal].tobytes() == whole[low:high].tobytes()


@pytest.mark.parametrize("loops", [False, True])
@pytest.mark.parametrize("n", [5000, 4096, 1500])
def test_heights_are_the_largest_of_each_cell(loops, n):
    samples = np.random.default_rng(2).standard_normal(n)
    samples[1200] = np.nan
    source = held(samples)
    power = np.abs(samples_of(FourthDifference.of(source, loops=loops))) ** 2
    heights = DifferenceHeights.of(source, loops=loops)
    cells = np.concatenate([power, np.zeros(-n % 1024)]).reshape(-1, 1024)
    assert samples_of(heights).real == pytest.approx(cells.max(axis=1), rel=1e-5)
    assert evaluate({heights: (1, 2)})[heights][0] == samples_of(heights)[1]
