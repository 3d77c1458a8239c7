"""How long a loop must be for a fault of its power statistics to be found."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import ArgumentsError
from wavegen.core.signal import Signal
from wavegen.dsp.occupied_bands import stretch_spectrum
from wavegen.laws.law import Law
from wavegen.laws.sample_size import samples_to_find
from wavegen.meters.equivalence import DOWN_TO, FALSE_ALARM, FOUND, alarm_of_a_decade
from wavegen.production.sidecar import rounded
from wavegen.stages.channel.gate import on_time

LARGEST_FAULT_DB = 10.0
_SMOOTHED = 31


def fault_rows(law: Law, signal: Signal, *, fault_db: float, probability: float) -> dict[str, Any]:
    """Return how long a loop of a recipe must be for a fault to be found.

    Parameters
    ----------
    law : Law
        Of the recipe.
    signal : Signal
        The same; a few stretches are computed for the width of its spectrum.
    fault_db : float
        Shift of a level, dB.
    probability : float
        At which the level is taken, up to 10 %.

    Returns
    -------
    dict
        JSON values; ``n_samples`` is null where every loop shows it.

    Raises
    ------
    ArgumentsError
        A fault that is not above 0, a probability over 10 %, or one at which the signal is off.

    Notes
    -----
    Normal approximation with the correlation of Gaussian noise of a flat band
    (:func:`wavegen.laws.sample_size.samples_to_find`), as wide as :func:`flat_width` says; about
    right for signals that are no noise. Off-times add to the length.
    """
    if not 0 < fault_db <= LARGEST_FAULT_DB:
        raise ArgumentsError(
            where="--fault",
            problem=f"{fault_db:g} dB is no fault to look for",
            allowed=f"above 0 dB, up to {LARGEST_FAULT_DB:g} dB",
            remedy="Write it like 0.1dB.",
        )
    alarm = alarm_of_a_decade(min(DOWN_TO, probability))
    if probability > 0.1:
        raise ArgumentsError(
            where="--at",
            problem=f"{probability:g} is no probability at which levels are compared",
            allowed="up to 10%",
            remedy="Write it like 0.1%.",
        )
    row: dict[str, Any] = {
        "fault_db": fault_db,
        "probability": probability,
        "found_in": FOUND,
        "false_alarm": FALSE_ALARM,
    }
    if law.holds == "every loop":
        return row | {"is": "the same for every loop: any loop shows it", "n_samples": None}
    judged: Law = getattr(law, "on_time", None) or law
    bursts = on_time(signal)
    if not np.isfinite(judged.level_db(probability)):
        raise ArgumentsError(
            where="--at",
            problem=f"the signal is off at {probability:g}, so that there is no level",
            allowed="probabilities below its share of on-time",
            remedy="Ask for a smaller one.",
        )
    oversampling = max(1.0, 1 / flat_width(stretch_spectrum(signal)))
    count = samples_to_find(
        fault_db,
        probability,
        oversampling=oversampling,
        law=judged,
        power=FOUND,
        false_alarm=alarm,
    )
    if bursts is not None and judged is not law:
        count = math.ceil(count / float(bursts.duty_fully_on))
    return row | {
        "is": "about how long a loop must be, off-times included",
        "oversampling": rounded(oversampling, 3),
        "n_samples": count,
        "duration_s": float(count / signal.sample_rate_hz),
    }


def flat_width(spectrum: NDArray[np.float64]) -> float:
    """Return the width of a flat band that is as correlated as a spectrum, over the sample rate.

    Parameters
    ----------
    spectrum : float64 array, shape (n_bins,)
        Power in each bin, in the order of the FFT.

    Returns
    -------
    float
        The smaller of two: ``(sum S)^2 / sum S^2``, which keeps the sum of squared correlations
        and so what counts at low levels; and ``sqrt(12)`` times the RMS width, which keeps how
        long the power stays above a high level.

    Examples
    --------
    >>> round(flat_width(np.repeat([1.0, 0.0, 0.0, 0.0], 4096)), 2)
    0.25
    """
    n = spectrum.size
    share = spectrum / spectrum.sum()
    # Squares of an average over few stretches are too large: neighbours are averaged first.
    even = np.convolve(np.tile(share, 3), np.ones(_SMOOTHED) / _SMOOTHED, "same")[n : 2 * n]
    by_squares = 1 / float(np.sum(even**2)) / n
    # About the mean direction, so that a band across the seam of the axis is no wider.
    frequency = np.fft.fftfreq(n)
    centre = float(np.angle(np.sum(share * np.exp(2j * np.pi * frequency)))) / (2 * np.pi)
    distance = (frequency - centre + 0.5) % 1 - 0.5
    mean = float(np.sum(share * distance))
    spread = math.sqrt(float(np.sum(share * (distance - mean) ** 2)) + 1 / (12 * n * n))
    return min(by_squares, math.sqrt(12) * spread)
