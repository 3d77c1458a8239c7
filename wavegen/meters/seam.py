"""Whether a loop can be heard closing: out-of-band power at the seam against elsewhere.

A record that does not close jumps at the seam, and a jump is wide: its spectrum lies outside the
band of the signal, where a stretch from anywhere else in the loop has next to nothing.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.errors import SignalError
from wavegen.core.evaluate import evaluate
from wavegen.core.signal import Signal

LONGEST_STRETCH = 16384
SHORTEST_STRETCH = 256
N_STRETCHES = 20
KAISER_BETA = 17.0
"""Side lobes at -163 dB (J. F. Kaiser: beta = 0.1102 (A - 8.7)): below float32 rounding."""
MARGIN_DB = 3.0
"""By chance a stretch is above the largest of 20 others in one of 21 loops; by 3 dB it is not,
since each figure is a mean over many bins."""
FLOOR_DBC = -125.0
"""float32 samples alone leave about -140 dBc; converters have -100 dBc at best."""
_DEPTHS_DB = (40, 60, 80, 100)
"""How far below the band a bin lies to be out of it. A spectrum that falls off slowly hides a jump
in the first of these, where its own skirts are; it shows in a deeper one."""
_MAIN_LOBE_BINS = 7
"""The window widens a line to ``sqrt(beta^2 + pi^2) / pi`` = 5.5 bins on each side."""
_FEWEST_BINS = 1 / 64
_QUIETEST = 1 / 10
_SMOOTHED_BINS = 65
_LONGEST_SEARCHED = 1 << 22
"""Loops up to this are looked through for steps of the envelope; 20 ms at most."""
_STEP_CELL = 64
_N_STEPS = 4
_STEP_NEPER = 2 * 2.3
"""A cell of 64 samples with a hundred times the power of the one before."""
STEP_MARGIN_DB = 20.0
"""Where the signal is switched at the seam: how wide a ramp's spectrum is depends on the samples
that it happens to stand on, by ten decibels, and there are few others to compare with."""


@dataclass(frozen=True, slots=True, kw_only=True)
class SeamFigure:
    """Out-of-band power at the seam of a loop and elsewhere in it.

    Parameters
    ----------
    at_seam_dbc : float
        In the stretch centred on the seam, dB over the mean power of the other stretches.
    interior_dbc : float
        The largest of the other stretches, dB on the same scale.
    floor_dbc : float
        Where both lie below it, the seam counts as clean.
    out_of_band : str
        Which bins were counted: ``40 dB below the band`` (or 60, 80, 100), the depth at which
        the seam stands out most; ``quietest tenth`` where the signal fills the whole rate.
    n_bins : int
        How many they are.
    stretch_samples : int
        Length of a stretch.
    n_stretches : int
        Stretches compared with; 0 if the loop is so short that every stretch holds its seam:
        then nothing can be told, and ``is_clean`` is True though not tested.
    n_same_place : int
        Of these, how many stand where the seam does relative to the symbols.
    margin_db : float
        How far the seam of a loop that closes may stand above the largest of the others, dB.
    """

    at_seam_dbc: float
    interior_dbc: float
    floor_dbc: float
    out_of_band: str
    n_bins: int
    stretch_samples: int
    n_stretches: int
    n_same_place: int
    margin_db: float = MARGIN_DB

    @property
    def excess_db(self) -> float:
        """How far the seam stands above the largest of the others, dB; 0 if both are nothing."""
        if self.at_seam_dbc == self.interior_dbc:
            return 0.0
        return self.at_seam_dbc - self.interior_dbc

    @property
    def is_tested(self) -> bool:
        """False if the loop is too short for a stretch without its seam."""
        return self.n_stretches > 0

    @property
    def is_clean(self) -> bool:
        """True if the seam exceeds the rest by the margin at most, or lies below the floor."""
        return self.excess_db <= self.margin_db or self.at_seam_dbc < self.floor_dbc


def seam_figure(
    signal: Signal,
    *,
    cycle_samples: int | None = None,
    stretch_samples: int = LONGEST_STRETCH,
    floor_dbc: float = FLOOR_DBC,
) -> SeamFigure:
    """Return how a loop's seam compares with the rest of the loop.

    Parameters
    ----------
    signal : Signal
        The loop; some twenty stretches of it are read.
    cycle_samples : int, optional
        After so many samples the symbols stand as before. The other stretches stand at multiples
        of it as far as there are any; what is missing of twenty is spread evenly over the loop.
        Where there is none, four more stand at the envelope's largest steps, lest a burst that
        begins at the seam be taken for a break of it.
    stretch_samples : int
        Longest stretch; shortened to a quarter of the loop (a power of two).
    floor_dbc : float
        Where the seam counts as clean, dB.

    Returns
    -------
    SeamFigure

    Raises
    ------
    SignalError
        There is no power in any stretch.

    Notes
    -----
    Each stretch is weighted by a Kaiser window (beta 17) and transformed. In band are the bins
    that together hold 99 % of the mean spectrum of the other stretches; out of band are those
    where it is 40 dB or more below the mean density in band, 7 bins (the window's main lobe) and
    more from the others. The comparison is made with 60, 80 and 100 dB too, and the depth is
    told at which the seam exceeds the others most. Sets of fewer than 1/64 of all bins are left
    out; if none is left, the quietest tenth is taken (of the spectrum smoothed over 65 bins,
    lest chance choose them).
    """
    n = signal.n_samples
    length = 1 << (max(min(stretch_samples, n // 4), 1).bit_length() - 1)
    has_room = length >= SHORTEST_STRETCH
    if not has_room:
        length = SHORTEST_STRETCH
    same, others = _places(n, length, cycle_samples if has_room else None, has_room=has_room)
    margin_db = MARGIN_DB
    if has_room and not same and n <= _LONGEST_SEARCHED:
        steps, is_switched = _steps(signal, length)
        others += steps
        margin_db = STEP_MARGIN_DB if is_switched else MARGIN_DB
    spectra = np.stack([_spectrum(signal, place, length) for place in (0, *same, *others)])
    seam, interior = spectra[0], spectra[1:] if has_room else spectra[:1]
    mean = interior.mean(axis=0)
    reference = float(mean.sum())
    if not reference > 0.0:
        raise SignalError(
            where="seam",
            problem="there is no power in the loop where it was looked at",
            allowed="a loop with some power",
            remedy="Check the gating and the level.",
        )
    figures = []
    for chosen, name in _out_of_band(mean):
        with np.errstate(divide="ignore"):
            at_seam = 10 * np.log10(seam[chosen].sum() / reference)
            elsewhere = 10 * np.log10(interior[:, chosen].sum(axis=1).max() / reference)
        figures.append(
            SeamFigure(
                at_seam_dbc=float(at_seam),
                interior_dbc=float(elsewhere),
                floor_dbc=floor_dbc,
                out_of_band=name,
                n_bins=int(np.count_nonzero(chosen)),
                stretch_samples=length,
                n_stretches=len(same) + len(others),
                n_same_place=len(same),
                margin_db=margin_db,
            )
        )
    heard = [figure for figure in figures if figure.at_seam_dbc >= floor_dbc]
    return max(heard, key=lambda figure: figure.excess_db) if heard else figures[0]


def _places(
    n: int, length: int, cycle: int | None, *, has_room: bool
) -> tuple[list[int], list[int]]:
    """Return centres clear of the seam: whole cycles from it, and others to make twenty."""
    if not has_room:
        return [], []
    same: list[int] = []
    if cycle is not None:
        first, last = -(-length // cycle), (n - length) // cycle
        if last >= first:
            numbers = np.linspace(first, last, N_STRETCHES).round().astype(np.int64)
            same = [int(number) * cycle for number in np.unique(numbers)]
    missing = N_STRETCHES - len(same)
    spread = np.linspace(length, n - length, missing) if missing else np.zeros(0)
    return same, [int(place) for place in spread]


def _steps(signal: Signal, length: int) -> tuple[list[int], bool]:
    """Return where the envelope changes most, and whether the signal is switched at the seam.

    The places lie apart from each other and clear of the seam.
    """
    n = signal.n_samples
    samples = evaluate({signal: (0, n)})[signal]
    starts = np.arange(0, n - _STEP_CELL + 1, _STEP_CELL)
    power = np.add.reduceat(samples.real**2 + samples.imag**2, starts, dtype=np.float64)
    least = 1e-12 * float(power.max(initial=0.0)) or 1.0
    level = np.log(np.maximum(power, least))
    change = np.abs(np.diff(level))
    place = starts[1:]
    at_seam = np.abs(np.diff(np.concatenate([level[-3:], level[:3]])))
    found: list[int] = []
    for k in np.argsort(-change, kind="stable"):
        centre = int(place[k])
        if not length <= centre <= n - length:
            continue
        if all(abs(centre - other) >= length // 4 for other in found):
            found.append(centre)
            if len(found) == _N_STEPS:
                break
    return found, bool(at_seam.max() > _STEP_NEPER)


def _spectrum(signal: Signal, centre: int, length: int) -> NDArray[np.float64]:
    """Return the windowed power spectrum of a stretch, shape (length,)."""
    wanted = (centre - length // 2, centre + length // 2)
    samples = evaluate({signal: wanted})[signal].astype(np.complex128)
    power: NDArray[np.float64] = np.abs(scipy.fft.fft(samples * _window(length))) ** 2
    return power


@cache
def _window(length: int) -> NDArray[np.float64]:
    """Return the window of every stretch of a length, shape (length,)."""
    window: NDArray[np.float64] = np.kaiser(length + 1, KAISER_BETA)[:-1]
    return window


def _out_of_band(
    mean: NDArray[np.float64],
) -> list[tuple[NDArray[np.bool_], str]]:
    """Return sets of bins that count as out of band, each with its rule; one at least."""
    ranked = np.sort(mean)[::-1]
    held = np.cumsum(ranked)
    in_band = int(np.searchsorted(held, 0.99 * held[-1])) + 1
    found = []
    for depth in _DEPTHS_DB:
        band = np.flatnonzero(mean >= 10 ** (-depth / 10) * held[in_band - 1] / in_band)
        chosen = np.ones(mean.size, np.bool_)
        for shift in range(-_MAIN_LOBE_BINS, _MAIN_LOBE_BINS + 1):
            chosen[(band + shift) % mean.size] = False
        if np.count_nonzero(chosen) >= _FEWEST_BINS * mean.size:
            found.append((chosen, f"{depth} dB below the band"))
    if found:
        return found
    half = _SMOOTHED_BINS // 2
    sums = np.cumsum(np.concatenate([[0.0], mean[-half:], mean, mean[:half]]))
    smooth = sums[_SMOOTHED_BINS:] - sums[:-_SMOOTHED_BINS]
    return [(smooth <= np.quantile(smooth, _QUIETEST), "quietest tenth")]
