"""Speed of crest-factor reduction: CPU time of one step over its own transform pairs.

Run it: ``python tests/speed/bench_crest.py``. Budget: a step takes at most 1.5 times the CPU time
of the forward and inverse transforms that it contains (``scipy.fft`` rows, reused arrays, one
thread). Shortest of the repeats, interleaved.
"""

from __future__ import annotations

import argparse
import time
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import scipy.fft

from wavegen.core.allocation import keep_large_blocks
from wavegen.core.evaluate import evaluate, order
from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.dsp.band_filter import BandFilter
from wavegen.dsp.dual_projection import Corrected, DualRound, HeldBelow
from wavegen.dsp.overlap_save import BLOCK_SAMPLES, ROWS_AT_LEAST
from wavegen.stages.crest.clip_filter import ClipFilter, ClipFilterRound
from wavegen.stages.crest.peak_cancellation import CancellationPass, PeakCancellation
from wavegen.stages.crest.peak_windowing import PeakWindowed, PeakWindowing
from wavegen.stages.crest.projection import Projection
from wavegen.stages.passband import Passband

RATE_HZ = Fraction(1_000_000)
LOOP = 1 << 21
N = 1 << 20
BAND = (Passband(low_hz=Fraction(-125_000), high_hz=Fraction(125_000)),)
CEILING_DB = 6.0
TRANSITIONS_HZ = (25_000, 12_500, 2_500)


@dataclass(frozen=True, eq=False, kw_only=True)
class Held(Signal):
    """Samples that cost nothing: band-limited noise, made once."""

    def compute(self, start, stop, *arrays):
        """Return a view."""
        return SAMPLES[start:stop]


def noise():
    """Complex Gaussian samples in a quarter of the band."""
    rng = np.random.default_rng(1)
    lines = np.zeros(LOOP, np.complex64)
    inside = np.arange(-LOOP // 8, LOOP // 8)
    lines[inside] = rng.normal(size=inside.size) + 1j * rng.normal(size=inside.size)
    samples = scipy.fft.ifft(lines)
    return samples / np.sqrt(np.mean(np.abs(samples) ** 2))


SAMPLES = noise().astype(np.complex64)


def seconds(run):
    """CPU time of a call."""
    start = time.process_time()
    run()
    return time.process_time() - start


def step_seconds(signal, arrays, n):
    """CPU time of a step, its inputs being there, per output sample."""
    return seconds(lambda: signal.compute(0, n, *arrays)) / n


def pair_seconds(band: BandFilter):
    """CPU time of the bare transforms of a step, per output sample."""
    block = max(BLOCK_SAMPLES // band.n_fft, ROWS_AT_LEAST)
    work = np.ones((block, band.n_fft), np.complex64)
    times = max(1, N // (block * band.hop))

    def run():
        for _ in range(times):
            lines = scipy.fft.fft(work, axis=1, overwrite_x=True)
            scipy.fft.ifft(lines, axis=1, overwrite_x=True)

    return seconds(run) / (times * block * band.hop)


def filter_of(signal):
    """Return the filter inside a step."""
    for name in ("band", "pulse", "smoothing"):
        found = getattr(signal, name, None)
        if found is not None:
            return found
    return None


def steps():
    """Yield a name and a signal of each kind of step."""
    site = Site(sample_rate_hz=RATE_HZ, n_samples=LOOP, seed=1, label="x", path="stages[0]")
    source = Held(sample_rate_hz=RATE_HZ, n_samples=LOOP)
    for transition in TRANSITIONS_HZ:
        common = {
            "ceiling_db": CEILING_DB,
            "passbands": BAND,
            "transition_hz": Fraction(transition),
        }
        for settings, kinds in (
            (ClipFilter(rounds=2, **common), (ClipFilterRound,)),
            (PeakCancellation(passes=2, **common), (CancellationPass,)),
            (Projection(rounds=3, **common), (DualRound, Corrected, HeldBelow)),
        ):
            nodes = order([settings.build(site, source)])
            for kind in kinds:
                yield kind.__name__, [node for node in nodes if type(node) is kind][-1]
    yield PeakWindowed.__name__, PeakWindowing(ceiling_db=CEILING_DB).build(site, source)


def main():
    """Print times, and ratios where there are transforms."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--repeats", type=int, default=7)
    repeats = parser.parse_args().repeats
    keep_large_blocks()
    for name, signal in steps():
        n = min(N // signal.step * signal.step, signal.n_samples)
        needed = signal.needs(0, n)
        arrays = [
            np.array(evaluate({source: wanted})[source])
            for source, wanted in zip(signal.inputs, needed, strict=True)
        ]
        band = filter_of(signal)
        own, bare = [], []
        for _ in range(repeats):
            own.append(step_seconds(signal, arrays, n))
            if band is not None:
                bare.append(pair_seconds(band))
        text = f"{name:18s} {1e9 * min(own):6.1f} ns a sample"
        if band is not None:
            text += f", {band.taps.size:5d} taps: {min(own) / min(bare):5.2f} of its transforms"
        print(text)


if __name__ == "__main__":
    main()
