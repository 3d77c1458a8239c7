"""Speed of crest-factor reduction: CPU time of one step over its own transform pairs.

Run it: ``python tests/speed/bench_crest.py``. Budget: a step takes at most 1.5 times the CPU time
of the forward and inverse transforms that it contains (``scipy.fft`` rows, reused arrays, one
thread). Each time is the shortest of the repeats, interleaved. A step of a method on symbols is
what a signal of 12 rounds takes beyond one of 4, over 8; of selected mapping, 9 candidates beyond
one over their 8 inverse transforms alone. The last step of a projection filters a real signal, two
stretches in each transform: printed is its time over that half pair, and over a whole one, which
a filter of complex samples takes.
"""

from __future__ import annotations

import argparse
import dataclasses
import time
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import scipy.fft

from wavegen.core.allocation import keep_large_blocks
from wavegen.core.evaluate import evaluate, order
from wavegen.core.index_set import IndexSet
from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.dsp.band_filter import BandFilter
from wavegen.dsp.dual_projection import Corrected, DualRound, HeldBelow
from wavegen.dsp.overlap_save import BLOCK_SAMPLES, ROWS_AT_LEAST
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Group, Ofdm
from wavegen.sources.ofdm_layout import CyclicPrefix
from wavegen.stages.crest.clip_filter import ClipFilter, ClipFilterRound
from wavegen.stages.crest.constellation_extension import ConstellationExtension
from wavegen.stages.crest.peak_cancellation import CancellationPass, PeakCancellation
from wavegen.stages.crest.peak_windowing import PeakWindowed, PeakWindowing
from wavegen.stages.crest.projection import Projection
from wavegen.stages.crest.selected_mapping import SelectedMapping
from wavegen.stages.crest.tone_reservation import ToneReservation
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


def symbols():
    """Return 1200 subcarriers of 64QAM on 4096 samples, half a second of them held."""
    settings = Ofdm(
        subcarrier_spacing_hz=Fraction(15_000),
        groups=(
            Group(
                subcarriers=IndexSet.parse("-600..-1, 1..600"),
                constellation=Constellation.parse("64qam"),
            ),
        ),
        cyclic_prefix=CyclicPrefix.parse("0 samples"),
    )
    site = Site(
        sample_rate_hz=Fraction(61_440_000), n_samples=1 << 19, seed=1, label="x", path="signal"
    )
    return settings.build(site)


def body_steps():
    """Yield a name, two signals of bodies, the steps between them, and pairs of each step."""
    source = symbols()
    site = Site(
        sample_rate_hz=source.sample_rate_hz,
        n_samples=source.n_samples,
        seed=1,
        label="x",
        path="stages[0]",
    )
    free = IndexSet.parse("-660..-601, 601..660")
    for make in (
        lambda n: ToneReservation(ceiling_db=CEILING_DB, subcarriers=free, rounds=n),
        lambda n: ConstellationExtension(ceiling_db=CEILING_DB, rounds=n),
        lambda n: Projection(ceiling_db=CEILING_DB, rounds=n),
    ):
        few, many = (make(n).build(site, source).bodies for n in (4, 12))
        gained = dataclasses.replace(many, amplitude=few.amplitude)
        yield type(many).__name__, few, gained, 8, 1.0
    few, many = (SelectedMapping(candidates=n).build(site, source).bodies.choice for n in (2, 10))
    yield type(many).__name__, few, many, 8, 0.5


def row_seconds(n_fft):
    """CPU time of a bare pair of transforms of rows, per sample."""
    work = np.ones((max(BLOCK_SAMPLES // n_fft, ROWS_AT_LEAST), n_fft), np.complex64)
    times = max(1, N // work.size)

    def run():
        for _ in range(times):
            lines = scipy.fft.fft(work, axis=1, overwrite_x=True)
            scipy.fft.ifft(lines, axis=1, overwrite_x=True)

    return seconds(run) / (times * work.size)


def on_symbols(repeats):
    """Print times of the steps of methods on symbols."""
    for name, few, many, n_steps, pairs in body_steps():
        start, stop = many.needs(0, many.n_samples)[0]
        held = np.array(evaluate({many.inputs[0]: (start, stop)})[many.inputs[0]])
        longer, shorter, bare = [], [], []
        for _ in range(repeats):
            longer.append(step_seconds(many, [held], many.n_samples))
            shorter.append(step_seconds(few, [held], few.n_samples))
            bare.append(pairs * row_seconds(many.view.n_points) * many.view.n_points / 4096)
        own = (min(longer) - min(shorter)) / n_steps * many.n_samples / held.size
        text = f"{name:18s} {1e9 * own:6.1f} ns a sample, {many.view.n_points} points a symbol"
        print(f"{text}: {own / min(bare):5.2f} of its transforms")


def main():
    """Print times, and ratios where there are transforms."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--repeats", type=int, default=7)
    repeats = parser.parse_args().repeats
    keep_large_blocks()
    on_symbols(repeats)
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
            ratio = min(own) / min(bare)
            text += f", {band.taps.size:5d} taps, rows of {band.n_fft}: "
            if name == HeldBelow.__name__:
                text += f"{2 * ratio:5.2f} of its half pair, {ratio:5.2f} of a whole one"
            else:
                text += f"{ratio:5.2f} of its transforms"
        print(text)


if __name__ == "__main__":
    main()
