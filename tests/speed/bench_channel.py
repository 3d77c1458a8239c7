"""Speed of the channel stages, and of a filter over the FFT pairs that it contains.

Run it: ``python tests/speed/bench_channel.py``. Budget: a filter takes at most 1.5 times the CPU
time of its own forward and inverse transforms (``scipy.fft`` rows, reused arrays, one thread).
Shortest of the repeats, interleaved.
"""

from __future__ import annotations

import argparse
import time
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import scipy.fft

from wavegen.core.allocation import keep_large_blocks
from wavegen.core.evaluate import evaluate
from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.core.timespan import TimeSpan
from wavegen.dsp.overlap_save import BLOCK_SAMPLES, ROWS_AT_LEAST
from wavegen.stages.channel.delay import Delay
from wavegen.stages.channel.filter import Filter
from wavegen.stages.channel.gate import Gate
from wavegen.stages.channel.resample import Resample

RATE_HZ = Fraction(1_000_000)
LOOP = 1 << 21
N = 1 << 20
TRANSITIONS_HZ = (100_000, 20_000, 5_000, 1_000, 100)
RATIOS = (Fraction(2), Fraction(1, 2), Fraction(3, 2), Fraction(125, 96))


@dataclass(frozen=True, eq=False, kw_only=True)
class Held(Signal):
    """Samples that cost nothing: a ramp of phase, made once."""

    def compute(self, start, stop, *arrays):
        """Return a view."""
        return SAMPLES[start:stop]


SAMPLES = np.exp(1j * np.arange(LOOP) * 0.1).astype(np.complex64)


def seconds(run, repeats):
    """CPU time of the shortest call."""
    best = float("inf")
    for _ in range(repeats):
        start = time.process_time()
        run()
        best = min(best, time.process_time() - start)
    return best


def site(n_samples=LOOP):
    """Where everything is built."""
    return Site(sample_rate_hz=RATE_HZ, n_samples=n_samples, seed=1, label="x", path="stages[0]")


def rate_of(signal, repeats):
    """Output samples a second, the input being there."""
    n = min(N // signal.step * signal.step, signal.n_samples)
    (source,), (needed,) = signal.inputs, signal.needs(0, n)
    array = evaluate({source: needed})[source]
    return n / seconds(lambda: signal.compute(0, n, array), repeats)


def fft_rate(signal, repeats):
    """Output samples a second of the bare transforms of a filter."""
    block = max(BLOCK_SAMPLES // signal.n_fft, ROWS_AT_LEAST)
    work = np.ones((block, signal.n_fft), np.complex64)
    times = max(1, N // (block * signal.step))

    def run():
        for _ in range(times):
            lines = scipy.fft.fft(work, axis=1, overwrite_x=True)
            scipy.fft.ifft(lines, axis=1, overwrite_x=True)

    return times * block * signal.step / seconds(run, repeats)


def main():
    """Print rates, and ratios where there is a budget."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--repeats", type=int, default=9)
    repeats = parser.parse_args().repeats
    keep_large_blocks()
    source = Held(sample_rate_hz=RATE_HZ, n_samples=LOOP)
    for transition in TRANSITIONS_HZ:
        settings = Filter(bandwidth_hz=Fraction(200_000), transition_hz=Fraction(transition))
        signal = settings.build(site(), source)
        pairs = [(rate_of(signal, 1), fft_rate(signal, 1)) for _ in range(repeats)]
        rate, bare = (max(rates) for rates in zip(*pairs, strict=True))
        name = f"filter of {signal.taps.size} taps"
        print(f"{name:32s} {rate / 1e6:8.1f} MS/s {bare / rate:6.2f} of its FFTs")
    stages = {
        "delay, whole samples": Delay(delay=TimeSpan.parse("5 samples")),
        "delay, a part of a sample": Delay(delay=TimeSpan.parse("0.3 samples")),
        "gate, short period": Gate(pattern="10", slot=TimeSpan.parse("4 samples")),
        "gate, ramps": Gate(
            duty_percent=Fraction(25),
            period=TimeSpan.parse("1024 samples"),
            ramp=TimeSpan.parse("16 samples"),
        ),
        "gate, long period": Gate(pattern="1101", slot=TimeSpan.parse("131072 samples")),
    }
    for name, settings in stages.items():
        rate = rate_of(settings.build(site(), source), repeats)
        print(f"{name:32s} {rate / 1e6:8.1f} MS/s")
    for ratio in RATIOS:
        n_in = LOOP // ratio.numerator // ratio.denominator * ratio.denominator
        before = Held(sample_rate_hz=RATE_HZ / ratio, n_samples=n_in)
        settings = Resample(input_rate_hz=RATE_HZ / ratio)
        rate = rate_of(settings.build(site(int(n_in * ratio)), before), repeats)
        print(f"{f'resample by {ratio}':32s} {rate / 1e6:8.1f} MS/s")


if __name__ == "__main__":
    main()
