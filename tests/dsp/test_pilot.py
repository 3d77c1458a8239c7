from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.signal import Signal
from wavegen.dsp.overlap_save import Filtered
from wavegen.dsp.pilot import WHOLE_SAMPLES, is_whole, pilot_spectrum, power_beyond, power_gain
from wavegen.dsp.windows import design_lowpass


@dataclass(frozen=True, eq=False, kw_only=True)
class Tone(Signal):
    n_cycles: int = 0
    on_samples: int = 1 << 60

    def compute(self, start, stop, *arrays):
        index = np.arange(start, stop)
        turn = index * self.n_cycles % self.n_samples / self.n_samples
        return np.where(index < self.on_samples, np.exp(2j * np.pi * turn), 0).astype(np.complex64)


def tone(n_samples, frequency, **fields):
    return Tone(
        sample_rate_hz=Fraction(1),
        n_samples=n_samples,
        n_cycles=int(n_samples * frequency),
        **fields,
    )


@pytest.mark.parametrize("n_samples", [8, 1000, WHOLE_SAMPLES, WHOLE_SAMPLES + 1, 10**9])
def test_a_tone_lies_on_its_side_of_an_edge(n_samples):
    assert is_whole(tone(n_samples, 0)) == (n_samples <= WHOLE_SAMPLES)
    assert power_beyond(tone(n_samples, 0.375), 0.3) == pytest.approx(1, abs=1e-6)
    assert power_beyond(tone(n_samples, -0.375), 0.4) == pytest.approx(0, abs=1e-9)


@pytest.mark.parametrize("n_samples", [5, 100, 4096, 10**6])
@pytest.mark.parametrize("frequency", [0.0, 0.2, -0.2])
def test_gain_is_that_of_the_filter(n_samples, frequency):
    taps = design_lowpass(passband_edge=0.15, stopband_edge=0.25, stopband_db=80)
    signal = tone(n_samples, frequency)
    response = np.exp(-2j * np.pi * signal.n_cycles / n_samples * np.arange(taps.size)) @ taps
    # Within the main lobe of the window on long loops: 1e-2 on the slope of the edge.
    assert power_gain(signal, taps) == pytest.approx(abs(response) ** 2, rel=1e-2)


def test_gain_is_exact_for_a_short_loop():
    rng = np.random.default_rng(9)

    @dataclass(frozen=True, eq=False, kw_only=True)
    class Held(Signal):
        def compute(self, start, stop, *arrays):
            return samples[start:stop].copy()

    samples = (rng.standard_normal(501) + 1j * rng.standard_normal(501)).astype(np.complex64)
    source = Held(sample_rate_hz=Fraction(1), n_samples=501)
    taps = rng.standard_normal(1201) + 1j * rng.standard_normal(1201)  # longer than the loop
    made = Filtered.of(source, taps)
    got = made.compute(0, 501, np.tile(samples, 7)[501 * 3 - 600 :][: 501 + 1200])
    want = np.mean(np.abs(got) ** 2) / np.mean(np.abs(samples) ** 2)
    assert power_gain(source, taps) == pytest.approx(want, rel=1e-5)


def test_silence():
    nothing = tone(100, 0, on_samples=0)
    assert power_gain(nothing, np.ones(3)) is None
    assert power_beyond(nothing, 0.1) == 0
    assert not pilot_spectrum(nothing).any()


def test_a_short_burst_far_in_a_long_loop_is_found():
    # One part in 20 of the loop is on: some of 64 places fall into it.
    assert pilot_spectrum(tone(10**7, 0.1, on_samples=5 * 10**5)).any()
