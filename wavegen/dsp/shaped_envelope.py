"""A loop with a given spectrum and a given distribution of its envelope, and nothing else in it.

T. Schreiber and A. Schmitz, "Improved surrogate data for nonlinearity tests", Phys. Rev. Lett.
77(4), 1996: the iterated amplitude-adjusted Fourier transform, here on the complex envelope. The
two demands are met in turn: the ranks of the envelope are given the wanted values with the phases
kept, then the spectrum is given the wanted amplitudes with its phases kept.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.signal import Samples

MOST_ROUNDS = 200
NEAR_DB = 5e-4
"""Levels that are so near are taken as met."""
_PATIENCE = 12
_GAIN = 0.98
"""Rounds that bring no 2 % in twelve are the last."""
_EVENTS = 10
"""Levels are compared down to the share of the loop that holds so many samples."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Shaped:
    """What came of it.

    Parameters
    ----------
    samples : complex64 array, shape (n,)
        Unit mean power; its spectrum is exact, its envelope nearly.
    level_error_db : float
        Largest difference of a level from the wanted one, from a share of 50 % down to ten
        samples of the loop, dB.
    worst_probability : float
        Where that is.
    beyond_band_db : float
        Power outside the wanted spectrum if the envelope were made exact instead, dB over the
        whole: how far the two demands are from agreeing.
    n_rounds : int
        Rounds made.
    """

    samples: Samples
    level_error_db: float
    worst_probability: float
    beyond_band_db: float
    n_rounds: int


def shape_envelope(
    amplitudes: NDArray[np.float64],
    envelopes: NDArray[np.float64],
    *,
    phases: NDArray[np.float64],
    most_rounds: int = MOST_ROUNDS,
) -> Shaped:
    """Return a loop with a wanted spectrum and wanted envelope values.

    Parameters
    ----------
    amplitudes : float64 array, shape (n,)
        Amplitude of every bin of the transform, in its own order; any scale, not all zero.
    envelopes : float64 array, shape (n,)
        Wanted envelope values, rising; any scale, not all zero.
    phases : float64 array, shape (n,)
        Phases of the bins to start from, rad.
    most_rounds : int
        Upper bound.

    Returns
    -------
    Shaped
        Of the best round.
    """
    n = amplitudes.size
    wanted = amplitudes / np.sqrt(np.sum(amplitudes**2)) * n  # unit mean power after the inverse
    ranks = envelopes / np.sqrt(np.mean(envelopes**2))
    places, levels = _levels_of(ranks)
    silent = wanted == 0
    samples = scipy.fft.ifft(wanted * np.exp(1j * phases), overwrite_x=True)
    best: tuple[float, int, float, Samples] | None = None
    reference, since, rounds = np.inf, 0, 0
    while True:
        envelope = np.abs(samples)
        order = np.argsort(envelope)
        error, place = _level_error(envelope[order], places, levels)
        turned = np.ones_like(samples)
        np.divide(samples, envelope, out=turned, where=envelope > 0)
        values = np.empty(n)
        values[order] = ranks
        turned *= values
        spectrum = scipy.fft.fft(turned, overwrite_x=True)
        beyond = float(np.sum(np.abs(spectrum[silent]) ** 2)) / (n * n)
        if best is None or error < best[0]:
            best = (error, place, beyond, samples.astype(np.complex64))
        since = 0 if error < _GAIN * reference else since + 1
        reference = min(reference, error) if since == 0 else reference
        if rounds == most_rounds or best[0] <= NEAR_DB or since >= _PATIENCE:
            break
        rounds += 1
        samples = scipy.fft.ifft(wanted * _phase(spectrum), overwrite_x=True)
    error, place, beyond, found = best
    return Shaped(
        samples=found,
        level_error_db=error,
        worst_probability=float(1 - place / n),
        beyond_band_db=float(10 * np.log10(max(beyond, 1e-30))),
        n_rounds=rounds,
    )


def _phase(spectrum: NDArray[np.complex128]) -> NDArray[np.complex128]:
    size = np.abs(spectrum)
    turned = np.ones_like(spectrum)
    np.divide(spectrum, size, out=turned, where=size > 0)
    return turned


def _levels_of(ranks: NDArray[np.float64]) -> tuple[NDArray[np.intp], NDArray[np.float64]]:
    """Return ranks at which levels are compared, and the levels, dB."""
    n = ranks.size
    rarest = max(_EVENTS, 1) / n
    shares = np.geomspace(0.5, min(rarest, 0.5), 60)
    places = np.unique(np.clip(np.floor((1 - shares) * n).astype(np.intp), 0, n - 1))
    return places, _db(ranks[places])


def _level_error(
    rising: NDArray[np.float64], places: NDArray[np.intp], levels: NDArray[np.float64]
) -> tuple[float, int]:
    difference = np.abs(_db(rising[places]) - levels)
    worst = int(np.argmax(difference))
    return float(difference[worst]), int(places[worst])


def _db(values: NDArray[np.float64]) -> NDArray[np.float64]:
    return np.asarray(20 * np.log10(np.maximum(values, 1e-15)))
