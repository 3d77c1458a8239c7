"""Spectra of stretches spread over a record: its offset, its lines, its images."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.evaluate import evaluate
from wavegen.core.signal import Signal

Floats = NDArray[np.float64]
MOST_STRETCHES = 2048
_LENGTHS = (512, 128, 32)
_FEWEST = 16
_ROWS_TOGETHER = 16
LARGEST_IMBALANCE = 0.5
"""|E x^2| over E |x|^2 from which a signal is one-sided by nature (BPSK, real samples)."""
_FEWEST_PAIRS = 8.0
_LINE_OVER_FLOOR = 30.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Stretches:
    """What spectra of stretches say.

    Parameters
    ----------
    offset : complex
        Median over stretches of the mean of each: a DC offset that no stray sample moves.
    pseudo_ratio : complex
        ``E x^2 / E |x|^2`` about the mean: 0 for equal and orthogonal rails.
    pseudo_sigma : float
        Its standard error, from how it scatters over frequency; inf where it cannot be told from
        the nature of the signal (few lines, one-sided).
    strongest_line : float
        Power of the strongest spectral line other than at 0 Hz, 0 if there is none.
    n_stretches : int
        How many were looked at.
    flat_bandwidth : float
        Width of a flat band whose spectrum is spread as far about its middle (root of 12 times
        the root-mean-square), cycles per sample; 0 where it is not known.
    """

    offset: complex
    pseudo_ratio: complex
    pseudo_sigma: float
    strongest_line: float
    n_stretches: int
    flat_bandwidth: float = 0.0


def look_at_stretches(signal: Signal) -> Stretches:
    """Transform up to 2048 stretches of 512 samples, in 128 places spread evenly over a record.

    Parameters
    ----------
    signal : Signal
        What is looked at; samples that are not finite make their stretch drop out.

    Returns
    -------
    Stretches

    Notes
    -----
    Gain and phase errors between I and Q add ``k conj(x)`` to ``x``: at every pair of
    frequencies ``+f, -f`` the product ``X(f) X(-f)`` gets the same share, ``2 k``, of the power
    in both. Products of other origin (symmetric tones, subcarriers that carry related data) have
    their own phase in each pair. So the ratio is judged by its scatter over pairs. Derivation;
    tested in ``tests/meters/test_stretches.py``. Each stretch counts by its shape, so that one
    loud stretch decides nothing, and without its own mean.
    """
    n = signal.n_samples
    length = next((size for size in _LENGTHS if n >= _FEWEST * size), 0)
    if not length:
        samples = evaluate({signal: (0, n)})[signal]
        good = samples[np.isfinite(samples)]
        mean = complex(good.astype(np.complex128).mean()) if good.size else 0j
        return Stretches(
            offset=mean, pseudo_ratio=0j, pseudo_sigma=np.inf, strongest_line=0.0, n_stretches=0
        )
    count = min(n // length, MOST_STRETCHES)
    window = np.hanning(length + 1)[:-1]
    products, powers = np.zeros(length, np.complex128), np.zeros(length)
    spectrum = np.zeros(length)
    means: list[NDArray[np.complex128]] = []
    n_read = 0
    for rows in _rows(signal, count, length):
        rows_mean = rows.mean(axis=1)
        means.append(rows_mean)
        level = np.mean(np.abs(rows - rows_mean[:, None]) ** 2, axis=1)
        is_loud = level > 0
        if not is_loud.any():
            continue
        shaped = (rows - rows_mean[:, None])[is_loud]
        bins = scipy.fft.fft(shaped * window, axis=1)
        spectrum += (np.abs(bins) ** 2).sum(axis=0)
        bins /= np.sqrt(level[is_loud])[:, None]
        mirror = np.roll(bins[:, ::-1], 1, axis=1)
        products += (bins * mirror).sum(axis=0)
        powers += (np.abs(bins) ** 2 + np.abs(mirror) ** 2).sum(axis=0) / 2
        n_read += int(np.count_nonzero(is_loud))
    all_means = np.concatenate(means) if means else np.zeros(1, np.complex128)
    ratio, sigma = _ratio(products, powers, n_read)
    return Stretches(
        offset=complex(np.median(all_means.real), np.median(all_means.imag)),
        pseudo_ratio=ratio,
        pseudo_sigma=sigma,
        strongest_line=_line(spectrum / max(n_read, 1), window),
        n_stretches=n_read,
        flat_bandwidth=_flat_bandwidth(spectrum),
    )


def _rows(signal: Signal, count: int, length: int) -> list[NDArray[np.complex128]]:
    """Return groups of stretches, shape (n, length); those that are not finite are left out."""
    n_groups = -(-count // _ROWS_TOGETHER)
    n_places = signal.n_samples // length
    groups = []
    for group in range(n_groups):
        # Side by side within a group: one read of the file each.
        first = group * n_places // n_groups
        last = min(first + _ROWS_TOGETHER, (group + 1) * n_places // n_groups)
        span = (first * length, last * length)
        rows = evaluate({signal: span})[signal].reshape(-1, length)
        rows = rows[np.isfinite(rows).all(axis=1)]
        if rows.size:
            groups.append(rows.astype(np.complex128))
    return groups


def _ratio(products: NDArray[np.complex128], powers: Floats, n_read: int) -> tuple[complex, float]:
    """Return the ratio and its standard error over pairs of frequencies."""
    half = products.size // 2
    pair, weight = products[2:half], powers[2:half]  # the bins at 0 Hz lost their mean
    total = float(weight.sum())
    if not total > 0 or n_read < 1:
        return 0j, np.inf
    ratio = complex(pair.sum() / total)
    n_pairs = total**2 / float(np.sum(weight**2))
    if abs(ratio) > LARGEST_IMBALANCE or n_pairs < _FEWEST_PAIRS:
        return ratio, np.inf
    scatter = np.sum(np.abs(pair - ratio * weight) ** 2) / total**2
    # The window makes three neighbouring bins move together: half as many count.
    return ratio, float(np.sqrt(2.0 * scatter))


def _line(spectrum: Floats, window: Floats) -> float:
    """Return the power of the strongest line that stands 15 dB over bins 4 to 8 beside it."""
    beside = np.zeros(spectrum.size)
    for shift in (*range(-8, -3), *range(4, 9)):
        np.maximum(beside, np.roll(spectrum, shift), out=beside)
    power = spectrum / float(window.sum()) ** 2
    is_line = spectrum > _LINE_OVER_FLOOR * beside
    is_line[[0, 1, 2, -1, -2]] = False
    # A comb finer than the stretch can tell shows a ripple: its lines are as strong as its bins.
    return float(power[is_line].max()) if is_line.any() else 0.0


def _flat_bandwidth(spectrum: Floats) -> float:
    """Return the width of a flat band of the same spread, cycles per sample.

    The window spreads each line by a variance of a third of a bin squared (Hann: weights 1/6,
    2/3, 1/6), which is taken off.
    """
    total, n = float(spectrum.sum()), spectrum.size
    if not total > 0:
        return 0.0
    turn = np.exp(2j * np.pi * np.arange(n) / n)
    middle = float(np.angle(np.sum(spectrum * turn))) / (2 * np.pi)
    away = (np.arange(n) / n - middle + 0.5) % 1.0 - 0.5
    variance = float(np.sum(spectrum * away**2)) / total - 1 / (3 * n * n)
    return float(np.sqrt(12 * max(variance, 0.0)))
