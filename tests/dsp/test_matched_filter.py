from fractions import Fraction

import numpy as np
import pytest

from wavegen.dsp.matched_filter import is_receivable, plan_matched
from wavegen.dsp.pulses.half_sine import HalfSine
from wavegen.dsp.pulses.root_raised_cosine import RootRaisedCosine

SPAN = 16


def direct(samples, pulse, a, b, symbols):
    """Sum of samples times pulses, scaled by 1 / energy, as the definition says."""
    found = []
    for k in symbols:
        first = int(np.ceil((k - SPAN) * a / b))
        n = np.arange(first, int((k + SPAN) * a // b) + 1)
        found.append(np.sum(samples[n % samples.size] * pulse.values(n * b / a - k)))
    lattice = pulse.on_lattice(a)
    energy = np.sum(lattice**2) / a
    return np.array(found) * b / a / np.sqrt(energy)


@pytest.mark.parametrize(("a", "b"), [(4, 1), (2, 1), (10, 3), (97, 41)])
def test_agrees_with_the_definition(a, b) -> None:
    """Tolerance: float32 transforms; between samples also the pulse's own band limit."""
    rng = np.random.default_rng(a)
    n = 60 * a
    spectrum = rng.standard_normal(n) + 1j * rng.standard_normal(n)
    samples = np.fft.ifft(spectrum).astype(np.complex64) * np.float32(n**0.5)
    pulse = RootRaisedCosine(roll_off=0.25, span_symbols=SPAN).design(Fraction(a, b))
    rows = plan_matched(pulse, n_samples=a, n_symbols=b, period_symbols=60 * b)
    count = 60 * b
    first, last = rows.needs(0, count)
    wrapped = samples[np.arange(first, last) % n]
    found = rows.receive(0, count, wrapped)
    expected = direct(samples, pulse, a, b, range(count))
    tolerance = 2e-6 if b == 1 else 1e-4
    assert np.abs(found - expected).max() < tolerance * np.abs(expected).max()


@pytest.mark.parametrize(("a", "b", "n_rows"), [(4, 1, 5), (10, 3, 5), (4, 1, 75), (5, 1, 90)])
def test_any_cut_gives_the_same_bits(a, b, n_rows) -> None:
    """Many rows too: they are transformed in groups."""
    rng = np.random.default_rng(1)
    pulse = RootRaisedCosine(roll_off=0.25, span_symbols=SPAN).design(Fraction(a, b))
    rows = plan_matched(pulse, n_samples=a, n_symbols=b, period_symbols=4096 * b)
    count = n_rows * rows.step + 3
    first, last = rows.needs(0, count)
    raw = rng.standard_normal((last - first, 2)).astype(np.float32).view(np.complex64)[:, 0]
    whole = rows.receive(0, count, raw)
    for start in range(0, count, rows.step):
        stop = min(start + rows.step, count)
        low, high = rows.needs(start, stop)
        assert np.array_equal(
            rows.receive(start, stop, raw[low - first : high - first]), whole[start:stop]
        )


def test_a_pulse_that_bends_needs_samples_at_its_instants() -> None:
    pulse = HalfSine().design(Fraction(10, 3))
    assert is_receivable(pulse, n_symbols=1)
    assert not is_receivable(pulse, n_symbols=3)
