"""Levels at equal EVM: repeated clipping and filtering, windowing, cancellation, projection.

Run it: ``python tests/speed/study_crest.py`` (some minutes; ``--samples 18`` is quicker). For each
method its ceiling is sought that gives a wanted EVM; printed is the level at probability 1e-4 on
16 points of the band. Beside it the figures of an earlier study with symbols of 256 subcarriers of
64QAM, peaks on 16 points, and the analytic floor that nothing can pass.

The signal is one loop of many subcarriers of 64QAM, so that it has no edges in time; EVM is that
of the subcarriers, one complex gain fitted, by transforms of this script alone.
"""

from __future__ import annotations

import argparse
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import scipy.fft
from scipy.optimize import brentq
from scipy.special import erfc

from wavegen.core.allocation import keep_large_blocks
from wavegen.core.render import samples_of
from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.core.timespan import TimeSpan
from wavegen.stages.crest.clip_filter import ClipFilter
from wavegen.stages.crest.peak_cancellation import PeakCancellation
from wavegen.stages.crest.peak_windowing import PeakWindowing
from wavegen.stages.crest.projection import Projection
from wavegen.stages.passband import Passband

RATE_HZ = Fraction(1_000_000)
EARLIER = {
    "projection": {2: 8.03, 3.5: 7.25, 5: 6.67, 8: 5.79, 12.5: 4.86},
    "clip+filter x1": {2: 8.36, 3.5: 7.74, 5: 7.28, 8: 6.61, 12.5: 6.17},
    "clip+filter x2": {2: 8.23, 3.5: 7.48, 5: 6.94, 8: 6.19, 12.5: 5.40},
    "clip+filter x4": {2: 8.16, 3.5: 7.32, 5: 6.74, 8: 5.92, 12.5: 5.07},
    "clip+filter x8": {2: 8.12, 3.5: 7.23, 5: 6.68, 8: 5.82, 12.5: 4.90},
    "clip+filter x16": {2: 8.06, 3.5: 7.23, 5: 6.65, 8: 5.77, 12.5: 4.84},
}
EVMS = (2, 3.5, 5, 8, 12.5)


@dataclass(frozen=True, eq=False, kw_only=True)
class Held(Signal):
    """Samples in memory, and the lines that they are made of."""

    samples: np.ndarray
    bins: np.ndarray

    def compute(self, start, stop, *arrays):
        """Return a copy."""
        return self.samples[start:stop].copy()


def loop(n_samples, oversampling, seed=1):
    """Return one loop of 64QAM subcarriers, unit power."""
    rng = np.random.default_rng(seed)
    count = n_samples // oversampling
    bins = np.arange(-(count // 2), count - count // 2)
    levels = np.arange(-7, 8, 2) / np.sqrt(42)
    lines = np.zeros(n_samples, np.complex128)
    lines[bins] = rng.choice(levels, count) + 1j * rng.choice(levels, count)
    samples = (scipy.fft.ifft(lines) * n_samples / np.sqrt(count)).astype(np.complex64)
    return Held(sample_rate_hz=RATE_HZ, n_samples=n_samples, samples=samples, bins=bins)


def passband(oversampling):
    """Return the band of the loop as settings, with steep edges."""
    half = RATE_HZ / oversampling / 2
    band = (Passband(low_hz=-half, high_hz=half),)
    return {"passbands": band, "transition_hz": half / 40}


def figures(source, settings):
    """Return EVM in percent, level at 1e-4 and peak on 16 points of the band, and ACLR, dB."""
    site = Site(
        sample_rate_hz=RATE_HZ, n_samples=source.n_samples, seed=1, label="x", path="stages[0]"
    )
    before = scipy.fft.fft(source.samples.astype(np.complex128))
    made = samples_of(settings.build(site, source)).astype(np.complex128)
    after = scipy.fft.fft(made)
    want, got = before[source.bins], after[source.bins]
    gain = np.vdot(want, got) / np.vdot(want, want)
    evm = 100 * np.sqrt(np.sum(np.abs(got / gain - want) ** 2) / np.sum(np.abs(want) ** 2))
    n = source.n_samples
    oversampling = n // source.bins.size
    dense = np.zeros(n * 16 // oversampling, np.complex128)
    dense[: n // 2], dense[-n // 2 :] = after[: n // 2], after[-n // 2 :]
    power = np.abs(scipy.fft.ifft(dense)) ** 2
    power /= power.mean()
    place = scipy.fft.fftfreq(n) * oversampling
    beside = (place > 0.5) & (place <= 1.5)
    aclr = 10 * np.log10(np.sum(np.abs(got) ** 2) / max(np.sum(np.abs(after[beside]) ** 2), 1e-30))
    level = 10 * np.log10(np.quantile(power, 1 - 1e-4))
    return float(evm), float(level), float(10 * np.log10(power.max())), float(aclr)


def floor_percent(level_db):
    """Return the least EVM, gain fitted, of a Gaussian signal with a peak at a level, percent.

    The samples at the band's own rate are an orthogonal image of the lines, so that nothing does
    less harm than clipping them at ``A``: ``(P - a^2) / a^2`` with the gain ``a`` and the output
    power ``P`` of the clipped Gaussian, about whose mean the level is.
    """
    ceiling = 10 ** (level_db / 10)
    g = brentq(lambda r: r / -np.expm1(-r) - ceiling, 1e-6, 100)
    power = -np.expm1(-g)
    gain = power + np.sqrt(np.pi * g) / 2 * erfc(np.sqrt(g))
    return 100 * np.sqrt((power - gain**2) / gain**2)


def at_evm(source, make, evm):
    """Return the ceiling that gives an EVM, and the figures there."""
    low, high = 1.0, 10.0
    for _ in range(7):
        middle = (low + high) / 2
        got = figures(source, make(middle))
        if abs(got[0] - evm) < 0.01 * evm:
            break
        low, high = (middle, high) if got[0] > evm else (low, middle)
    return middle, got


def main():
    """Print the tables."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--samples", type=int, default=19, help="of the loop, as a power of two")
    parser.add_argument("--rounds", type=int, default=50, help="of the projection")
    given = parser.parse_args()
    keep_large_blocks()
    source, band = loop(1 << given.samples, 8), passband(8)
    for name, earlier in EARLIER.items():
        for evm in EVMS:

            def make(ceiling_db, name=name):
                if name == "projection":
                    return Projection(ceiling_db=ceiling_db, rounds=given.rounds, **band)
                rounds = int(name.rpartition("x")[2])
                return ClipFilter(ceiling_db=ceiling_db, rounds=rounds, **band)

            ceiling_db, (got, level, peak, _) = at_evm(source, make, evm)
            print(
                f"{name:16s} ceiling {ceiling_db:5.2f} dB: EVM {got:6.2f} %, {level:5.2f} dB at "
                f"1e-4 (earlier {earlier[evm]:.2f} at {evm} %), peak {peak:5.2f}, "
                f"floor {floor_percent(peak):5.2f} %",
                flush=True,
            )
    source, band = loop(1 << given.samples, 4), passband(4)
    ceiling_db = 10 * np.log10(10**0.6 / -np.expm1(-(10**0.6)))
    for lengths in (1.1, 2.1, 4.1, 8.0):
        length = TimeSpan(Fraction(lengths) * 4, "samples")
        got = figures(source, PeakWindowing(ceiling_db=ceiling_db, length=length))
        print(f"peak windowing, length {lengths}/B: EVM {got[0]:.2f} %, ACLR {got[3]:.1f} dB")
    for pulse in ("band", "spectrum"):
        settings = PeakCancellation(ceiling_db=6.16, passes=2, pulse=pulse, **band)
        got = figures(source, settings)
        print(f"peak cancellation, {pulse}: EVM {got[0]:.2f} %, {got[1]:.2f} dB at 1e-4")


if __name__ == "__main__":
    main()
