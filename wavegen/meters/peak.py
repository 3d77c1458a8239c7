"""The peak between the samples, where the converter's output really goes.

Why the search may be narrow. If ``M`` is the largest magnitude of a waveform whose spectrum fills
the fraction ``b`` of the sample rate, then at ``tau`` samples from that place its magnitude is
still ``M cos(pi b tau)`` or more (the bound behind 1/cos(pi / 2L), L = 1/b: M. Sharif,
M. Gharavi-Alkhansari, B. H. Khalaj, IEEE Trans. Commun. 51(1), 2003, 72-78; from memory, its
figures re-computed). So

- the nearest sample (tau <= 1/2) is at most ``-20 log10 cos(pi b / 2)`` below the peak: 3.01 dB
  at b = 1/2, 0.69 dB at b = 1/4. ``b`` is read off the spectrum where the highest samples stand and
  at places spread over the signal; the search goes ``MARGIN_DB`` deeper than the bound, for the
  power that is left outside the band. It never goes deeper than ``SEARCHED_DB`` = 4.5 dB (the
  bound at b = 0.59): that covers the worst seen in random signals at b = 1 (4.2 dB in OFDM
  symbols of 256 subcarriers);
- on a grid of half samples (tau <= 1/4) it is at most 3.01 dB below for any b up to 1;
- on a grid of quarter samples (tau <= 1/8), at most 0.69 dB below;
- on the final grid of sixteenths (tau <= 1/32), at most 0.042 dB: what the figure can still miss.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cache
from typing import Protocol

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.evaluate import evaluate
from wavegen.core.signal import Samples, Signal
from wavegen.dsp.cell_sums import CELL
from wavegen.dsp.highest import highest
from wavegen.dsp.record_kernel import high_places

POINTS_PER_SAMPLE = 16
HALF_LENGTH = 64
"""Samples on each side of an interpolated point."""
_KAISER_BETA = 12.0
"""118 dB of suppression; with 128 taps the transition is 0.061 of the sample rate wide (J. F.
Kaiser's design formula, A = 8 + 2.285 (N - 1) dw): flat up to 0.93 of the sample rate."""
_SHORT_HALF_LENGTH = 4
_SHORT_BETA = 4.0
SEARCHED_DB = 4.5
MARGIN_DB = 0.5
LEFT_OUT = 1e-5
"""Share of the power that may lie outside the band that counts as filled."""
_STRETCH = 4096
_STRETCHES = 16
"""Stretches whose spectrum is read: this many at the highest samples, as many spread evenly."""
_LEAST_PLAIN = 2.0**-80
_COARSE = 0.45
"""Half-sample grid: cos(pi/4)^2 = 0.5, and a tenth less for the short filter's own error."""
_FINE = 0.85
"""Quarter-sample grid: cos(pi/8)^2 = 0.8536."""
_BLOCK = 64 * CELL
_MOST_COARSE = 256
"""Places interpolated to quarters in a block; only constant envelopes hold more."""
_MOST_FINE = 32
"""Places interpolated to sixteenths in a block."""


@dataclass(frozen=True, slots=True, kw_only=True)
class BetweenSamplesPeak:
    """The largest power of a waveform, between samples too.

    Parameters
    ----------
    power : float
        Largest ``|x|^2`` on the grid of 16 points a sample; never below ``sample_peak``.
    position_samples : float
        Where it is, on the axis of the signal, in samples.
    sample_peak : float
        Largest ``|x|^2`` at a sample.
    gained_db : float
        The first over the second, dB.
    """

    power: float
    position_samples: float
    sample_peak: float
    gained_db: float


class Located(Protocol):
    """What is known of a signal's samples before the search: where its largest stand."""

    @property
    def start(self) -> int:
        """Index of the first sample."""

    @property
    def n_samples(self) -> int:
        """How many there are."""

    @property
    def peak(self) -> float:
        """Largest power at a sample."""

    @property
    def peak_index(self) -> int:
        """Where it stands first."""

    @property
    def cell_maxima(self) -> NDArray[np.float64]:
        """Largest power of each cell of 1024 samples on the absolute grid."""


@dataclass(frozen=True, slots=True)
class _Best:
    power: float
    position: float

    def better(self, power: float, position: float) -> _Best:
        """Return the larger; of equals, the earlier."""
        if (power, -position) > (self.power, -self.position):
            return _Best(power, position)
        return self


def peak_between_samples(
    signal: Signal, statistics: Located, *, loops: bool = True
) -> BetweenSamplesPeak:
    """Return the largest power of a waveform on 16 points a sample.

    Parameters
    ----------
    signal : Signal
        What was measured, cheap to read again (stored): up to once over is read.
    statistics : Located
        Of that signal: over a whole period if it loops, else over what is searched.
    loops : bool
        Whether the last sample is followed by the first. If not, the search stays inside: within
        64 samples of either end only the samples themselves count, since nobody knows what
        stood beyond.

    Returns
    -------
    BetweenSamplesPeak

    Notes
    -----
    Band-limited interpolation by a Kaiser-windowed sinc of 64 samples on each side; valid for
    signals that fill up to 0.93 of the sample rate. The grid misses at most 0.042 dB of the true
    peak. Searched are places near samples that the peak can be near (see the module), first on a
    rough grid of half samples, then on quarters, then on sixteenths. Of a block of 65536 samples
    at most 256 and 32 places go into the second and the third round, the best of the round
    before: this bounds the time for constant envelopes, where every place is as good as any
    other. The blocks lie on the absolute grid, so nothing depends on strips or workers.
    """
    first, last = statistics.start, statistics.start + statistics.n_samples
    low, high = (first, last) if loops else (first + HALF_LENGTH, last - HALF_LENGTH)
    scale = 1.0
    if not _LEAST_PLAIN < statistics.peak < 1 / _LEAST_PLAIN:  # float32 would run out of range
        scale = float(np.exp2(np.floor(np.log2(statistics.peak) / 2)))
    peak = statistics.peak / scale**2
    searched = 10.0 ** (-searched_db(filled_fraction(signal, statistics, loops=loops)) / 10)
    best = _Best(peak, float(statistics.peak_index))
    for start, stop, largest in _blocks(statistics, searched, loops=loops):
        start, stop = max(start, low), min(stop, high)  # noqa: PLW2901
        if start >= stop or largest / scale**2 < best.power * searched:
            continue
        wanted = (start - HALF_LENGTH, stop + HALF_LENGTH)
        samples = evaluate({signal: wanted})[signal]
        if scale != 1.0:
            samples = (samples.astype(np.complex128) / scale).astype(np.complex64)
        best = _search(samples, start, best, searched)
    return BetweenSamplesPeak(
        power=best.power * scale**2,
        position_samples=best.position,
        sample_peak=statistics.peak,
        gained_db=10.0 * float(np.log10(best.power / peak)),
    )


def searched_db(filled: float) -> float:
    """Return how far below the largest sample the peak's neighbours may stand, dB.

    Parameters
    ----------
    filled : float
        Fraction of the sample rate that the signal fills, 0 to 1.

    Examples
    --------
    >>> round(searched_db(0.25), 2), searched_db(1.0)
    (1.19, 4.5)
    """
    bound = -20.0 * math.log10(max(math.cos(math.pi * filled / 2), 1e-9))
    return min(bound + MARGIN_DB, SEARCHED_DB)


def filled_fraction(signal: Signal, statistics: Located, *, loops: bool = True) -> float:
    """Return the fraction of the sample rate that holds all but 1e-5 of the power.

    Parameters
    ----------
    signal : Signal
        What was measured.
    statistics : Located
        Of that signal: tells where the highest samples stand.
    loops : bool
        Whether stretches may pass the seam.

    Returns
    -------
    float
        Width of the smallest band (anywhere, round the ends of the spectrum too) in the mean
        spectrum of stretches of 4096 samples: 16 at the highest cells, 16 spread evenly. 1.0
        where the signal is shorter than a stretch and does not loop.
    """
    n = statistics.n_samples
    if not loops and n < _STRETCH:
        return 1.0
    highest_cells = highest(statistics.cell_maxima, _STRETCHES)
    centres = [statistics.start // CELL * CELL + int(cell) * CELL for cell in highest_cells]
    centres += [statistics.start + n * i // _STRETCHES for i in range(_STRETCHES)]
    window = np.kaiser(_STRETCH, _KAISER_BETA).astype(np.float32)
    spectrum = np.zeros(_STRETCH)
    for centre in centres:
        start = centre - _STRETCH // 2
        if not loops:
            start = min(max(start, statistics.start), statistics.start + n - _STRETCH)
        samples = evaluate({signal: (start, start + _STRETCH)})[signal]
        largest = float(np.abs(samples).max())
        if largest > 0:  # each stretch counts by its shape, so that no level runs out of range
            bins = scipy.fft.fft(samples * (window / np.float32(largest)))
            spectrum += np.abs(bins.astype(np.complex128)) ** 2
    return 1.0 - _widest_gap(spectrum, LEFT_OUT) / _STRETCH


def _widest_gap(spectrum: NDArray[np.float64], share: float) -> int:
    """Return the most neighbouring bins, round the ends too, that hold up to a share of all."""
    n = spectrum.size
    total = np.concatenate(([0.0], np.cumsum(np.concatenate((spectrum, spectrum)))))
    limit = share * total[n]
    ends = np.searchsorted(total, total[:n] + limit, side="right") - 1
    return int(min(np.max(ends - np.arange(n)), n))


def _blocks(statistics: Located, searched: float, *, loops: bool) -> list[tuple[int, int, float]]:
    """Return stretches to search and the largest power at their samples, the largest first."""
    first_cell = statistics.start // CELL
    maxima = statistics.cell_maxima
    # A place belongs to the sample before it: a cell's last place may owe its height to the next.
    beyond = maxima[0] if loops else 0.0
    blocks: list[tuple[int, int, float]] = []
    per_block = _BLOCK // CELL
    for block in range(first_cell // per_block, (first_cell + maxima.size - 1) // per_block + 1):
        low = max(block * per_block - first_cell, 0)
        high = min((block + 1) * per_block - first_cell, maxima.size)
        after = maxima[high : high + 1] if high < maxima.size else [beyond]
        reach = np.maximum(maxima[low:high], np.concatenate([maxima[low + 1 : high], after]))
        cells = np.flatnonzero(reach >= statistics.peak * searched) + low
        if cells.size:
            start, stop = cells[0] + first_cell, cells[-1] + first_cell + 1
            blocks.append((int(start) * CELL, int(stop) * CELL, float(reach.max())))
    return sorted(blocks, key=lambda item: (-item[2], item[0]))


def _search(samples: Samples, start: int, best: _Best, searched: float) -> _Best:
    """Search the places after each sample of a block for a larger power.

    Parameters
    ----------
    samples : complex64 array, shape (n + 2 * 64,)
        The block with 64 samples on each side.
    start : int
        Index of the block's first sample.
    best : _Best
        The best so far.
    searched : float
        Power, over the best, from which a sample's neighbourhood is looked at.
    """
    n = samples.size - 2 * HALF_LENGTH
    inner = samples[HALF_LENGTH : HALF_LENGTH + n + 1]
    places, near = high_places(inner, np.float32(best.power * searched))
    if not places.size:
        return best
    rough = np.maximum(_halfway(samples, places, n), near)
    kept = _largest(rough, at_least=best.power * _COARSE, most=_MOST_COARSE)
    places, near = places[kept], near[kept]
    if not places.size:
        return best
    quarters = _interpolate(samples, places, range(4, POINTS_PER_SAMPLE, 4))
    fine = np.maximum(quarters.max(axis=1), near)
    floor = max(best.power, float(fine.max())) * _FINE
    places = places[_largest(fine, at_least=floor, most=_MOST_FINE)]
    if not places.size:
        return best
    points = _interpolate(samples, places, range(1, POINTS_PER_SAMPLE))
    row, point = np.unravel_index(int(points.argmax()), points.shape)
    position = start + int(places[row]) + (int(point) + 1) / POINTS_PER_SAMPLE
    return best.better(float(points[row, point]), position)


def _power(samples: Samples) -> NDArray[np.float32]:
    return samples.real * samples.real + samples.imag * samples.imag


def _largest(values: NDArray[np.floating], *, at_least: float, most: int) -> NDArray[np.intp]:
    """Return the indices of the largest values, rising; of equals, the earlier."""
    chosen = np.flatnonzero(values >= at_least)
    if chosen.size > most:
        among = values[chosen]
        bound = np.partition(among, among.size - most)[among.size - most]
        above = np.flatnonzero(among > bound)
        equal = np.flatnonzero(among == bound)[: most - above.size]
        chosen = chosen[np.sort(np.concatenate([above, equal]))]
    return chosen


def _halfway(samples: Samples, places: NDArray[np.intp], n: int) -> NDArray[np.float32]:
    """Return the power halfway after each place, by a filter of 8 taps."""
    taps = _taps(_SHORT_HALF_LENGTH, _SHORT_BETA, np.array([0.5]))[0].astype(np.float32)
    first = HALF_LENGTH - _SHORT_HALF_LENGTH + 1
    dense = 4 * places.size > n
    total = np.zeros(n if dense else places.size, np.complex64)
    for k in range(_SHORT_HALF_LENGTH):  # symmetric: two samples share a tap
        left, right = first + k, first + 2 * _SHORT_HALF_LENGTH - 1 - k
        if dense:
            total += taps[k] * (samples[left : left + n] + samples[right : right + n])
        else:
            total += taps[k] * (samples[places + left] + samples[places + right])
    return _power(total[places] if dense else total)


def _interpolate(samples: Samples, places: NDArray[np.intp], points: range) -> NDArray[np.float64]:
    """Return the power at sixteenths after each place, shape (n_places, n_points)."""
    taps = _taps(HALF_LENGTH, _KAISER_BETA, np.array(points) / POINTS_PER_SAMPLE)
    rows = samples[places[:, None] + np.arange(1, 2 * HALF_LENGTH + 1)].astype(np.complex128)
    value = np.einsum("pk,tk->pt", rows, taps)
    power: NDArray[np.float64] = value.real**2 + value.imag**2
    return power


@cache
def _kaiser_sinc(half: int, beta: float, shift: float) -> NDArray[np.float64]:
    """Return the taps that read a waveform at ``shift`` samples after the middle one."""
    distance = np.arange(1 - half, half + 1) - shift
    window = np.i0(beta * np.sqrt(np.maximum(1.0 - (distance / half) ** 2, 0.0))) / np.i0(beta)
    taps = np.sinc(distance) * window
    scaled: NDArray[np.float64] = taps / taps.sum()
    return scaled


def _taps(half: int, beta: float, shifts: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return one row of ``2 half`` taps for each shift; they sum to 1."""
    return np.stack([_kaiser_sinc(half, beta, float(shift)) for shift in shifts])
