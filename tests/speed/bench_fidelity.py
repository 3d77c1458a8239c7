"""Speed of the fidelity meters, over the transforms that they contain.

Run it: ``python tests/speed/bench_fidelity.py``. CPU time of the shortest of interleaved repeats,
one thread. The core of the spectrum are its forward transforms (six a sample at the default
overlap), that of the EVM of OFDM the one forward transform a symbol that a receiver needs, that of
a single carrier the transforms of its matched filter, that of the cubic metric ``np.sum``.
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
from wavegen.meters.cubic import CubicMeter
from wavegen.meters.evm_probe import probes_of
from wavegen.meters.spectrum import SpectrumMeter
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Group, Ofdm
from wavegen.sources.ofdm_layout import CyclicPrefix
from wavegen.sources.single_carrier import SingleCarrier
from wavegen.sources.subcarriers import IndexSet

RATE_HZ = Fraction(122_880_000)
N = 1 << 21


@dataclass(frozen=True, eq=False, kw_only=True)
class Held(Signal):
    """Samples that cost nothing."""

    def compute(self, start, stop, *arrays):
        """Return a view."""
        return SAMPLES[start:stop]


SAMPLES = np.exp(1j * np.arange(3 * N) * 0.1).astype(np.complex64)


def seconds(run):
    """CPU time of one call."""
    start = time.process_time()
    run()
    return time.process_time() - start


def feed(meter, signal, samples):
    """Feed a meter as a strip does."""
    reading = meter.begin(signal)
    for low in range(0, samples.size, 1 << 20):
        reading.feed(low, samples[low : low + (1 << 20)])
    reading.result()


def rows(length, count, *, inverse=0):
    """Transform rows in cache: ``count`` of them, and some of another length back."""
    per_call = max((1 << 16) // length, 4)
    work = np.ones((per_call, length), np.complex64)
    back = np.ones((per_call, max(inverse, 1)), np.complex64)
    for _ in range(max(count // per_call, 1)):
        scipy.fft.fft(work, axis=1, overwrite_x=True)
        if inverse:
            scipy.fft.ifft(back, axis=1, overwrite_x=True)


def site(n_samples):
    """Where everything is built."""
    return Site(sample_rate_hz=RATE_HZ, n_samples=n_samples, seed=1, label="x", path="signal")


def ofdm():
    """A 20 MHz carrier at 122.88 MS/s."""
    settings = Ofdm(
        subcarrier_spacing_hz=Fraction(15_000),
        groups=(
            Group(
                subcarriers=IndexSet.parse("-636..-1, 1..636"),
                constellation=Constellation.parse("64qam"),
            ),
        ),
        cyclic_prefix=CyclicPrefix.parse(["160/2048", "6 x 144/2048"]),
    )
    cycle = settings.cycle(RATE_HZ, "signal").n_samples
    return settings.build(site(N // cycle * cycle))


def carrier():
    """A shaped carrier of 4 samples a symbol."""
    settings = SingleCarrier(constellation=Constellation.parse("64qam"), symbol_rate_hz=RATE_HZ / 4)
    return settings.build(site(N))


def evm_run(source):
    """Return what receives and meters one period of a source, the samples being there."""
    held = Held(sample_rate_hz=RATE_HZ, n_samples=source.n_samples)
    tap = probes_of(source, held)[0].taps()[0]
    sent = evaluate({tap.signal.inputs[1]: (0, tap.signal.inputs[1].n_samples)})
    (ideal,) = sent.values()

    def run():
        received = evaluate({tap.signal.inputs[0]: (0, ideal.size)})[tap.signal.inputs[0]]
        feed(tap.meter, tap.signal, tap.signal.compute(0, 2 * ideal.size, received, ideal))

    return run


def main():
    """Print rates, and ratios to what each contains."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--repeats", type=int, default=5)
    repeats = parser.parse_args().repeats
    keep_large_blocks()
    flat = Held(sample_rate_hz=RATE_HZ, n_samples=N)
    spectrum = SpectrumMeter()
    n_segments = -(-N // spectrum.hop_samples)
    wide, single = ofdm(), carrier()
    matched = probes_of(single)[0].receptions[0].received.rows
    n_in, n_out = matched.units * matched.n_samples, matched.units * matched.n_symbols
    n_rows = -(-single.n_samples // (matched.hop_cycles * matched.n_samples))
    n_symbols = wide.ideal.n_samples // wide.ideal.bodies.indices.size
    n_fft = wide.layout.n_fft
    cases = {
        "spectrum, 4096": (
            N,
            lambda: feed(spectrum, flat, SAMPLES[:N]),
            lambda: rows(4096, n_segments),
        ),
        "cubic metric": (
            N,
            lambda: feed(CubicMeter(), flat, SAMPLES[:N]),
            lambda: np.sum(SAMPLES[:N]),
        ),
        "EVM, OFDM 8192": (wide.n_samples, evm_run(wide), lambda: rows(n_fft, n_symbols)),
        "EVM, single carrier": (
            single.n_samples,
            evm_run(single),
            lambda: rows(n_in, n_rows, inverse=n_out),
        ),
    }
    for name, (n_samples, run, bare) in cases.items():
        pairs = [(seconds(run), seconds(bare)) for _ in range(repeats)]
        taken, least = (min(times) for times in zip(*pairs, strict=True))
        print(f"{name:24s} {n_samples / taken / 1e6:8.1f} MS/s {taken / least:6.2f} of its core")


if __name__ == "__main__":
    main()
