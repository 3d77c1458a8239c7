"""Real output on an intermediate frequency: where it may stand, and what would fold back."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.errors import RecipeError
from wavegen.core.evaluate import evaluate
from wavegen.core.signal import Signal
from wavegen.core.site import Note
from wavegen.core.units import format_hz
from wavegen.dsp.cell_sums import CELL
from wavegen.dsp.highest import highest
from wavegen.dsp.windows import kaiser_window
from wavegen.files.analytic import PASSBAND_EDGE
from wavegen.meters.peak import Located

MOST_FOLDED_DB = -40.0
"""Power outside the band that real samples hold, over all of it: from here on refused. What folds
back lies over the signal; this much alone makes an EVM of 1 %."""
TOLD_FOLDED_DB = -60.0
"""From here on told."""
_STRETCH = 1 << 12
_KAISER_BETA = 12.0
"""Sidelobes 118 dB down (J. F. Kaiser's design formula): below what is told."""
_EVEN = 64
_HIGHEST = 16


def snapped_centre(
    centre_hz: Fraction, *, sample_rate_hz: Fraction, n_samples: int, where: str
) -> tuple[Fraction, list[Note]]:
    """Return an intermediate frequency on the loop's grid, and what was rounded.

    Parameters
    ----------
    centre_hz : Fraction
        As asked, Hz.
    sample_rate_hz : Fraction
        Hz.
    n_samples : int
        Length of the loop.
    where : str
        Path in the recipe.

    Returns
    -------
    frequency_hz : Fraction
        The nearest multiple of ``sample_rate_hz / n_samples``.
    notes : list of Note
        One if it is not the one asked for.

    Raises
    ------
    RecipeError
        Asked for or moved to 0 or below, or half the sample rate or beyond.

    Examples
    --------
    >>> asked = Fraction(30_000_001)
    >>> made = snapped_centre(asked, sample_rate_hz=Fraction(10**8), n_samples=1000, where="")
    >>> int(made[0])
    30000000
    """
    grid_hz = sample_rate_hz / n_samples
    frequency_hz = round(centre_hz / grid_hz) * grid_hz
    if not (0 < centre_hz < sample_rate_hz / 2 and 0 < frequency_hz < sample_rate_hz / 2):
        raise RecipeError(
            where=where,
            problem=f"{format_hz(centre_hz)} leaves no room on both sides",
            allowed=f"above 0 and below half the sample rate, {format_hz(sample_rate_hz / 2)}",
            remedy="Choose one in between, with room for the signal, or raise the sample rate.",
        )
    if frequency_hz == centre_hz:
        return frequency_hz, []
    note = Note(
        kind="rounded",
        where=where,
        text=f"moved by {format_hz(frequency_hz - centre_hz)} to whole cycles in the loop",
        asked=format_hz(centre_hz),
        given=format_hz(frequency_hz),
    )
    return frequency_hz, [note]


def spectrum_of(signal: Signal, statistics: Located, *, loops: bool = True) -> NDArray[np.float64]:
    """Return the mean spectrum of a loop, or of a recording.

    Parameters
    ----------
    signal : Signal
        Rendered, cheap to read.
    statistics : Located
        Of that signal: tells where the highest samples stand.
    loops : bool
        Whether the last sample is followed by the first; else no stretch goes over the end.

    Returns
    -------
    float64 array, shape (4096,), or of the length of a shorter recording
        Power in each bin, the bins in the order of the FFT, on any scale. Read are 64 stretches
        spread evenly and 16 at the highest cells.
    """
    n = signal.n_samples
    highest_cells = highest(statistics.cell_maxima, _HIGHEST)
    centres = [int(cell) * CELL + CELL // 2 for cell in highest_cells]
    centres += [n * number // _EVEN for number in range(_EVEN)]
    length = _STRETCH if loops else min(_STRETCH, n)
    window = kaiser_window(_STRETCH // 2, _KAISER_BETA)[:_STRETCH].astype(np.float32)
    if length < _STRETCH:
        window = np.kaiser(length, _KAISER_BETA).astype(np.float32)
    power = np.zeros(length)
    for centre in centres:
        first = centre - length // 2
        if not loops:
            first = min(max(first, 0), n - length)
        samples = evaluate({signal: (first, first + length)})[signal]
        bins = scipy.fft.fft(samples * window).astype(np.complex128)
        power += bins.real**2 + bins.imag**2
    return power


def folded_db(
    power: NDArray[np.float64], *, centre_hz: Fraction, sample_rate_hz: Fraction
) -> float:
    """Return how much of a spectrum real samples do not hold, dB over all of it.

    Parameters
    ----------
    power : float64 array
        Power in each bin, from :func:`spectrum_of`.
    centre_hz, sample_rate_hz : Fraction
        Hz.

    Returns
    -------
    float
        Of what would stand within 0.005 of the sample rate of 0 Hz or of half the rate, or
        beyond: there the envelope of real samples does not hold. ``-inf`` if that is nothing.

    Examples
    --------
    >>> flat = np.ones(4096)
    >>> rate = Fraction(100)
    >>> round(folded_db(flat, centre_hz=Fraction(25), sample_rate_hz=rate), 2)
    -2.92
    """
    frequency = np.fft.fftfreq(power.size) + float(centre_hz / sample_rate_hz)
    is_held = (frequency >= PASSBAND_EDGE) & (frequency <= 0.5 - PASSBAND_EDGE)
    share = float(power[~is_held].sum() / power.sum())
    return 10 * float(np.log10(share)) if share else -np.inf


def notes_of_folding(folded: float, *, centre_hz: Fraction, where: str) -> list[Note]:
    """Return a note where something folds back.

    Parameters
    ----------
    folded : float
        From :func:`folded_db`, dB.
    centre_hz : Fraction
        Hz.
    where : str
        Path in the recipe.

    Raises
    ------
    RecipeError
        More than :data:`MOST_FOLDED_DB`.
    """
    if folded > MOST_FOLDED_DB:
        raise RecipeError(
            where=where,
            problem=(
                f"around {format_hz(centre_hz)} the signal passes 0 Hz or half the sample rate: "
                f"{folded:.1f} dB of its power would fold back onto it"
            ),
            allowed=f"up to {MOST_FOLDED_DB:.0f} dB",
            remedy="Move the centre, raise the sample rate, or narrow the signal.",
        )
    if folded <= TOLD_FOLDED_DB:
        return []
    text = (
        f"around {format_hz(centre_hz)} {folded:.1f} dB of the power passes 0 Hz or half the "
        "sample rate and folds back onto the signal"
    )
    return [Note(kind="warning", where=where, text=text)]
