"""What the cross-fade that closes a recording does to its levels and to its spectrum."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.render import samples_of
from wavegen.core.signal import Samples, Signal
from wavegen.dsp.power_bins import bin_edges
from wavegen.dsp.power_kernel import PowerTally, tally

Reals = NDArray[np.float64]

_STRIP = 1 << 19
_PROBABILITIES = (0.1, 0.01, 0.001, 1e-4)
_EVENTS = 10
LONGEST_FFT = 4096
_SEGMENTS = 8
_BANDS = 40
_SHARE = 0.99


def strips(signal: Signal, first: int, stop: int) -> Iterator[Samples]:
    """Yield the samples of a range, half a million at a time."""
    for start in range(first, stop, _STRIP):
        yield samples_of(signal, start, min(start + _STRIP, stop))


def counted(signal: Signal) -> tuple[list[PowerTally], float, complex]:
    """Return tallies of a signal, its mean power, and the sum of its samples."""
    found, power, total = [], 0.0, 0j
    for samples in strips(signal, 0, signal.n_samples):
        found.append(tally(samples))
        power += float(found[-1].sums.sum())
        total += complex(samples.sum(dtype=np.complex128))
    return found, power / signal.n_samples, total


def largest_change(plain: list[PowerTally], closed: list[PowerTally]) -> tuple[float, float]:
    """Return the largest difference of a level over the mean, dB, and its probability."""
    before, after = _levels(plain), _levels(closed)
    common = [q for q in before if q in after]
    if not common:
        return 0.0, 0.0
    worst = max(common, key=lambda q: abs(after[q] - before[q]))
    return abs(after[worst] - before[worst]), worst


def _levels(found: list[PowerTally]) -> dict[float, float]:
    """Return levels over the mean, dB, at the probabilities that a loop resolves."""
    used = [item for item in found if item.counts.size]
    if not used:
        return {}
    first = min(item.first_bin for item in used)
    last = max(item.first_bin + item.counts.size for item in used)
    counts = np.zeros(last - first, np.int64)
    for item in used:
        start = item.first_bin - first
        counts[start : start + item.counts.size] += item.counts
    n = int(counts.sum()) + sum(item.n_zeros for item in found)
    mean = sum(float(item.sums.sum()) for item in found) / n
    above = np.cumsum(counts[::-1])[::-1]
    edges = bin_edges(first, counts.size)[:-1]
    levels = {}
    for probability in _PROBABILITIES:
        if probability * n < _EVENTS:
            continue
        place = int(np.searchsorted(-above, -probability * n))
        levels[probability] = 10 * math.log10(edges[min(place, edges.size - 1)] / mean)
    return levels


@dataclass(frozen=True, slots=True, kw_only=True)
class SpectrumChange:
    """How the spectrum of a closed loop differs from that of the stretch it is made of.

    Parameters
    ----------
    largest_db : float
        Largest change in a fortieth of the band that holds 99 % of the power, dB.
    beside_dbc : (float, float) or None
        Power further out than that band's own width from its middle, over the whole, before and
        after, dBc; None where the rate leaves no room there.
    """

    largest_db: float
    beside_dbc: tuple[float, float] | None


def spectrum_change(plain: Signal, closed: Signal) -> SpectrumChange | None:
    """Return what closing a loop does to its spectrum.

    Parameters
    ----------
    plain : Signal
        The stretch as recorded.
    closed : Signal
        The loop: as long.

    Returns
    -------
    SpectrumChange or None
        None of loops too short to tell.

    Notes
    -----
    Periodograms of segments side by side (P. D. Welch, IEEE Trans. Audio Electroacoust. 15, 1967)
    under a Blackman window; of the loop one more, across its seam.
    """
    n = closed.n_samples
    n_fft = 1 << min(n // _SEGMENTS, LONGEST_FFT).bit_length() - 1 if n >= _SEGMENTS else 0
    if n_fft < 2 * _BANDS:
        return None
    densities = [_density(plain, n_fft), _density(closed, n_fft)]
    ends = samples_of(closed, n - n_fft // 2, n), samples_of(closed, 0, n_fft // 2)
    densities[1] += _periodograms(np.concatenate(ends), n_fft)
    shares = [density / density.sum() for density in densities]
    below = np.cumsum(shares[0])
    low, high = np.searchsorted(below, [(1 - _SHARE) / 2, (1 + _SHARE) / 2])
    edges = np.unique(np.linspace(low, high + 1, _BANDS + 1).round().astype(np.int64))
    bands = [np.add.reduceat(share, edges[:-1]) for share in (s[: high + 1] for s in shares)]
    change_db = 10 * np.log10(bands[1] / bands[0])
    width = high + 1 - low
    outside = np.abs(np.arange(n_fft) - (low + high) / 2) > width
    beside = [10 * math.log10(max(float(share[outside].sum()), 1e-30)) for share in shares]
    return SpectrumChange(
        largest_db=float(np.abs(change_db).max()),
        beside_dbc=(beside[0], beside[1]) if outside.any() else None,
    )


def _density(signal: Signal, n_fft: int) -> Reals:
    """Return the sum of the periodograms of all whole segments, from the lowest frequency up."""
    total = np.zeros(n_fft)
    for samples in strips(signal, 0, signal.n_samples):
        total += _periodograms(samples, n_fft)
    return total


def _periodograms(samples: Samples, n_fft: int) -> Reals:
    rows = samples[: samples.size // n_fft * n_fft].reshape(-1, n_fft)
    lines = scipy.fft.fft(rows * np.blackman(n_fft).astype(np.float32), axis=1)
    powers = (np.abs(lines) ** 2).sum(axis=0, dtype=np.float64)
    return np.asarray(np.fft.fftshift(powers))
