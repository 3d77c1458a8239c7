"""A loop with a given spectrum and a given distribution of its envelope, and nothing else in it.

T. Schreiber and A. Schmitz, "Improved surrogate data for nonlinearity tests", Phys. Rev. Lett.
77(4), 1996: the iterated amplitude-adjusted Fourier transform, here on the complex envelope. The
two demands are met in turn: the ranks of the envelope are given the wanted values with the phases
kept, then the spectrum is given the wanted amplitudes with its phases kept. Each round starts from
where the last two point to (Y. Nesterov's momentum), which needs a fifth of the rounds.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.signal import Samples

Reals = NDArray[np.float32] | NDArray[np.float64]
Complexes = NDArray[np.complex64] | NDArray[np.complex128]
MOST_ROUNDS = 200
NEAR_DB = 5e-4
"""Levels that are so near are taken as met."""
_PATIENCE = 25
_GAIN = 0.98
"""Rounds that bring no 2 % in twenty-five are the last."""
_MOMENTUM = 0.95
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
    within: NDArray[np.bool_] | None = None,
    most_rounds: int = MOST_ROUNDS,
) -> Shaped:
    """Return a loop with a wanted spectrum and wanted envelope values.

    Parameters
    ----------
    amplitudes : float64 array, shape (n,)
        Amplitude of every bin of the transform, in its own order; any scale, not all zero.
    envelopes : float64 array, shape (n,), or as many as ``within`` is true
        Wanted envelope values, rising; any scale, not all zero.
    phases : float64 array, shape (n,)
        Phases of the bins to start from, rad.
    within : bool array, shape (n,), optional
        Samples that are to follow the envelope, over their own RMS value: what a gate keeps. The
        others follow it too, by as many of its quantiles as they are, lest the spectrum of what
        is kept be another.
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
    # Rounds run in single precision; what they find is made exact in double at the end.
    sizes, values = wanted.astype(np.float32), ranks.astype(np.float32)
    start = (wanted * np.exp(1j * phases)).astype(np.complex64)
    samples: Samples = scipy.fft.ifft(start, overwrite_x=True)
    before = samples.copy()
    best: tuple[float, int, Samples] | None = None
    reference, since, rounds = np.inf, 0, 0
    is_kept = np.ones(n, np.bool_) if within is None else within
    kept, others = np.flatnonzero(is_kept), np.flatnonzero(~is_kept)
    parts = [(kept, values)]
    if others.size:
        place = (np.arange(others.size) + 0.5) / others.size * ranks.size - 0.5
        rest = np.interp(place, np.arange(ranks.size), ranks)
        parts.append((others, rest.astype(np.float32)))
    while True:
        power = _power(samples)
        error, place = _level_error(power[kept] if others.size else power, places, levels)
        if best is None or error < best[0]:
            best = (error, place, samples.copy())
        since = 0 if error < _GAIN * reference else since + 1
        reference = error if since == 0 else reference
        if rounds == most_rounds or best[0] <= NEAR_DB or since >= _PATIENCE:
            break
        before -= samples  # one step ahead; nothing else looks at it any more
        before *= np.float32(-min(rounds / (rounds + 3), _MOMENTUM))
        before += samples
        spectrum = scipy.fft.fft(_with_ranks(before, parts), overwrite_x=True)
        rounds += 1
        _set_size(spectrum, sizes)
        before, samples = samples, scipy.fft.ifft(spectrum, overwrite_x=True)
    spectrum = scipy.fft.fft(best[2].astype(np.complex128), overwrite_x=True)
    _set_size(spectrum, wanted)
    found = scipy.fft.ifft(spectrum, overwrite_x=True)
    error, place = _level_error(_power(found[kept]), places, levels)
    exact = scipy.fft.fft(_with_ranks(found, parts), overwrite_x=True)
    beyond = float(np.sum(np.abs(exact[wanted == 0]) ** 2)) / (n * n)
    return Shaped(
        samples=found.astype(np.complex64),
        level_error_db=error,
        worst_probability=float(1 - place / ranks.size),
        beyond_band_db=float(10 * np.log10(max(beyond, 1e-30))),
        n_rounds=rounds,
    )


def _with_ranks(
    samples: Complexes, parts: list[tuple[NDArray[np.intp], NDArray[np.float32]]]
) -> Complexes:
    """Give the envelope of each part wanted values by its ranks, the phases kept."""
    out = np.empty_like(samples)
    for places, ranks in parts:
        part = samples[places] if len(parts) > 1 else samples
        values = np.empty(part.size, np.float32)
        values[_order(_power(part))] = ranks
        if len(parts) == 1:
            out[:] = part
            _set_size(out, values)
            continue
        _set_size(part, values)
        out[places] = part
    return out


def _order(power: Reals) -> NDArray[np.uint64]:
    """Return the indices that sort powers, equal to within 1e-9 by index.

    The bits of what is not negative sort as the numbers do; with the index in the lowest ones a
    plain sort does, in half the time of one that carries indices.
    """
    n_bits = np.uint64(max((power.size - 1).bit_length(), 1))
    keys = power.astype(np.float64).view(np.uint64) >> n_bits << n_bits
    keys |= np.arange(power.size, dtype=np.uint64)
    keys.sort()
    return np.asarray(keys & ((np.uint64(1) << n_bits) - np.uint64(1)))


def _power(samples: Complexes) -> Reals:
    out: Reals = np.square(samples.real)
    out += np.square(samples.imag)
    return out


def _set_size(samples: Complexes, size: Reals) -> None:
    """Give samples magnitudes, the phases kept, in place; what is 0 gets phase 0."""
    own = _power(samples)
    np.sqrt(own, out=own)
    is_zero = own == 0
    if is_zero.any():
        samples[is_zero], own[is_zero] = 1.0, 1.0
    np.divide(size, own, out=own)
    samples.real *= own
    samples.imag *= own


def _levels_of(ranks: NDArray[np.float64]) -> tuple[NDArray[np.intp], NDArray[np.float64]]:
    """Return ranks at which levels are compared, and the levels, dB."""
    n = ranks.size
    rarest = max(_EVENTS, 1) / n
    shares = np.geomspace(0.5, min(rarest, 0.5), 60)
    places = np.unique(np.clip(np.floor((1 - shares) * n).astype(np.intp), 0, n - 1))
    return places, _db(ranks[places])


def _level_error(
    power: Reals, places: NDArray[np.intp], levels: NDArray[np.float64]
) -> tuple[float, int]:
    over_mean: NDArray[np.float64] = np.sort(power)[places].astype(np.float64)
    over_mean /= np.mean(power, dtype=np.float64)
    rising = np.sqrt(over_mean)
    difference = np.abs(_db(rising) - levels)
    worst = int(np.argmax(difference))
    return float(difference[worst]), int(places[worst])


def _db(values: NDArray[np.float64]) -> NDArray[np.float64]:
    return np.asarray(20 * np.log10(np.maximum(values, 1e-15)))
