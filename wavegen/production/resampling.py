"""A recording or a loop at another sample rate, by an exact factor."""

from __future__ import annotations

import math
from fractions import Fraction

from wavegen.core.errors import ArgumentsError
from wavegen.core.excerpt import excerpt, padded
from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.core.units import format_hz
from wavegen.dsp.interpolation import interpolation_span
from wavegen.production.length import MOST_SAMPLES
from wavegen.stages.channel.resample import LARGEST_RATIO, Resample

OPTION = "--sample-rate"


def factor_of(signal: Signal, rate_hz: Fraction) -> Fraction:
    """Return the factor from a signal's rate to another.

    Raises
    ------
    ArgumentsError
        The rates are more than 1024 apart.
    """
    factor = rate_hz / signal.sample_rate_hz
    if not Fraction(1, LARGEST_RATIO) <= factor <= LARGEST_RATIO:
        low, high = signal.sample_rate_hz / LARGEST_RATIO, signal.sample_rate_hz * LARGEST_RATIO
        raise ArgumentsError(
            where=OPTION,
            problem=f"{format_hz(rate_hz)} is {float(factor):.4g} times the rate of the file",
            allowed=f"from {format_hz(low)} to {format_hz(high)}",
            remedy="Change the rate in several steps, or choose one that is closer.",
        )
    return factor


def loop_at_rate(signal: Signal, rate_hz: Fraction) -> tuple[Signal, list[str]]:
    """Return a loop at another rate.

    Parameters
    ----------
    signal : Signal
        One period.
    rate_hz : Fraction
        Rate wanted, Hz.

    Returns
    -------
    signal : Signal
        Of the same duration.
    doubts : list of str
        Such as power at the edges of the lower of the two bands.

    Raises
    ------
    ArgumentsError
        More than 1024 apart, too long, or the loop would be no whole number of samples; the
        nearest rate at which it is whole is named.
    """
    factor = factor_of(signal, rate_hz)
    n_samples = signal.n_samples * factor
    if n_samples.denominator != 1:
        unit = signal.sample_rate_hz / signal.n_samples
        nearest = max(round(n_samples), 1) * unit
        raise ArgumentsError(
            where=OPTION,
            problem=f"the loop of {signal.n_samples} samples would have {float(n_samples):.10g}",
            allowed=f"rates at which the loop is whole: multiples of {unit} Hz",
            remedy=f"Write {OPTION} '{nearest} Hz'.",
        )
    return _resampled(signal, rate_hz, int(n_samples))


def recording_at_rate(signal: Signal, rate_hz: Fraction) -> tuple[Signal, list[str]]:
    """Return a recording at another rate; zeros are assumed beyond its ends.

    Parameters
    ----------
    signal : Signal
        The recording.
    rate_hz : Fraction
        Rate wanted, Hz.

    Returns
    -------
    signal : Signal
        As many samples as lie before its end.
    doubts : list of str
        About its ends and its band.

    Raises
    ------
    ArgumentsError
        More than 1024 apart, or too long.
    """
    factor = factor_of(signal, rate_hz)
    reach = 2 * interpolation_span(float(min(factor, Fraction(1))))
    cycle = factor.denominator
    n_padded = -(-(signal.n_samples + reach) // cycle) * cycle
    longer = padded(signal, n_padded)
    made, doubts = _resampled(longer, rate_hz, int(n_padded * factor), room=signal.n_samples)
    n_samples = math.ceil(signal.n_samples * factor)
    n_edge = math.ceil(reach * factor / 2)
    doubts.append(
        f"zeros are assumed beyond the ends of the recording, so that its first and last {n_edge} "
        "samples are uncertain"
    )
    return excerpt(made, 0, n_samples), doubts


def _resampled(
    signal: Signal, rate_hz: Fraction, n_samples: int, *, room: int | None = None
) -> tuple[Signal, list[str]]:
    if (room or signal.n_samples) * rate_hz / signal.sample_rate_hz > MOST_SAMPLES:
        raise ArgumentsError(
            where=OPTION,
            problem=f"there would be {n_samples} samples",
            allowed=f"up to {MOST_SAMPLES} samples",
            remedy="Choose a lower rate.",
        )
    site = Site(sample_rate_hz=rate_hz, n_samples=n_samples, seed=0, label="", path=OPTION)
    made = Resample(input_rate_hz=signal.sample_rate_hz).build(site, signal)
    return made, [note.text for note in site.notes]
