import math
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.evaluate import evaluate
from wavegen.core.render import samples_of
from wavegen.core.signal import Samples, Signal
from wavegen.dsp.arrival import Arrival, bring_back

N = 20_000


@dataclass(frozen=True, eq=False, kw_only=True)
class Held(Signal):
    samples: Samples

    def compute(self, start, stop, *arrays):
        return self.samples[start:stop].copy()


def held(samples):
    samples = np.asarray(samples, np.complex64)
    return Held(sample_rate_hz=Fraction(10**6), n_samples=samples.size, samples=samples)


@pytest.fixture
def sent():
    """A loop of few lines, so that its value at any time is known."""
    rng = np.random.default_rng(3)
    lines = rng.integers(-N // 8, N // 8, 12)
    amplitudes = rng.standard_normal(12) + 1j * rng.standard_normal(12)

    def at(time):
        turns = np.outer(np.asarray(time, float), lines) / N
        return np.exp(2j * np.pi * turns) @ amplitudes

    return at


def arrive(sent, arrival):
    index = np.arange(N)
    turn = arrival.n_cycles * index / N
    return (
        arrival.gain
        * np.exp(1j * arrival.phase_rad + 2j * np.pi * turn)
        * sent(index - float(arrival.delay_samples))
    )


@pytest.mark.parametrize("delay", [0, 7, -3, Fraction(1, 2), Fraction(-13, 5), Fraction(19999, 3)])
@pytest.mark.parametrize("n_cycles", [0, 1234, -4999])
def test_comes_back_as_it_was_sent(sent, delay, n_cycles) -> None:
    """Tolerance: the windowed sinc's 1e-6 and float32."""
    arrival = Arrival(
        n_samples=N, n_cycles=n_cycles, gain=0.7, phase_rad=1.1, delay_samples=Fraction(delay)
    )
    back = samples_of(bring_back(held(arrive(sent, arrival)), arrival))
    expected = sent(np.arange(N))
    assert np.abs(back - expected).max() < 3e-6 * np.abs(expected).max()


def test_an_untouched_signal_is_itself() -> None:
    signal = held(np.ones(100))
    assert bring_back(signal, Arrival(n_samples=100)) is signal


def test_parts_of_what_is_delayed(sent) -> None:
    """Delay after a shift in frequency turns the phase by the cycles that the delay takes."""
    outer = Arrival(n_samples=N, n_cycles=50, gain=2.0, phase_rad=0.3, delay_samples=Fraction(17))
    inner = outer.placed(n_cycles=700, gain=0.5, phase_rad=-1.0).delayed(Fraction(5))
    index = np.arange(N)
    part = 0.5 * np.exp(-1j + 2j * np.pi * 700 * (index - 17) / N) * sent(index - 17 - 5)
    whole = 2 * np.exp(0.3j + 2j * np.pi * 50 * index / N) * part
    assert np.allclose(arrive(sent, inner), whole, atol=1e-9)
    assert inner.n_cycles == 750
    assert math.isclose(inner.gain, 1.0)


def test_any_cut_gives_the_same_bits(sent) -> None:
    arrival = Arrival(n_samples=N, n_cycles=99, gain=1.5, delay_samples=Fraction(7, 2))
    back = bring_back(held(arrive(sent, arrival)), arrival)
    whole = samples_of(back)
    for start, stop in ((0, 1), (4095, 4097), (-5, 9000), (19_990, 20_010)):
        part = evaluate({back: (start, stop)})[back]
        assert np.array_equal(part, whole[np.arange(start, stop) % N])


def test_remarks_are_kept() -> None:
    assert Arrival(n_samples=1).remarked("a").placed(n_cycles=0, gain=1, phase_rad=0).remarks == (
        "a",
    )
