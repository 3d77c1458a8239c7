from fractions import Fraction

import numpy as np
import pytest

import wavegen.dsp.phase_noise as module
from wavegen.core.render import samples_of
from wavegen.core.signal import Signal
from wavegen.dsp.phase_noise import fade, phase_noise

RATE = 1e6


def sloped(offset):
    """A density that falls by 20 dB a decade to a floor."""
    return 1e-9 * (1e4 / np.maximum(offset, 10.0)) ** 2 + 1e-12


def made(n, *, seed=1, label="a"):
    like = Signal(sample_rate_hz=Fraction(10**6), n_samples=n)
    slow, fast = phase_noise(sloped, like=like, seed=seed, label=label)
    phase = samples_of(slow).real.astype(np.float64)
    return phase if fast is None else phase + samples_of(fast).real


def check_density(phase):
    """Compare bands of an octave with the density: 4 standard errors of exponential lines."""
    n = phase.size
    lines = np.abs(np.fft.rfft(phase)) ** 2 / n**2 / (RATE / n)
    offset = np.fft.rfftfreq(n, 1 / RATE)
    low = 8 * RATE / n
    while 2 * low < RATE / 2:
        inside = (offset >= low) & (offset < 2 * low)
        ratio = np.mean(lines[inside] / sloped(offset[inside]))
        assert ratio == pytest.approx(1.0, abs=4 / np.sqrt(inside.sum()) + 0.003), low
        low *= 2


@pytest.mark.parametrize("n", [40_000, 40_001])
def test_lines_alone_have_the_density(n):
    check_density(made(n))


def test_a_long_loop_has_the_density_across_the_two_parts(monkeypatch):
    monkeypatch.setattr(module, "WHOLE_SAMPLES", 1 << 16)
    monkeypatch.setattr(module, "LEAST_POINTS", 1 << 12)
    monkeypatch.setattr(module, "HALF_LENGTH", 1 << 12)
    n = 400_000
    like = Signal(sample_rate_hz=Fraction(10**6), n_samples=n)
    slow, fast = phase_noise(sloped, like=like, seed=1, label="a")
    assert slow.n_lines * RATE / n == pytest.approx(1280.0)  # so both parts are looked at
    assert fast is not None
    check_density(made(n))


def test_it_closes_at_the_seam():
    phase = made(50_000)
    steps = np.diff(np.concatenate((phase, phase[:1])))
    assert abs(steps[-1]) < 5 * np.std(steps)


def test_seed_and_label_name_it():
    assert not np.array_equal(made(1000), made(1000, seed=2))
    assert not np.array_equal(made(1000), made(1000, label="b"))
    np.testing.assert_array_equal(made(1000), made(1000))


def test_the_parts_cross_over_in_power():
    offset = np.array([0.0, 10.0, 500.0, 707.10678, 1000.0, 5000.0])
    np.testing.assert_allclose(fade(offset, 1000.0), [1, 1, 1, 0.5**0.5, 0, 0], atol=1e-8)
