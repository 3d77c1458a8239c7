"""How long the loop is: whole cycles of everything in it, near what was asked."""

from __future__ import annotations

import math
from fractions import Fraction

from wavegen.core.errors import RecipeError
from wavegen.core.site import Cycle, Note
from wavegen.core.units import format_s
from wavegen.recipe.settings import Duration, Extent

MOST_SAMPLES = 4_000_000_000
"""Index arithmetic is exact to here; a complex 16-bit file of this length has 16 GB."""
LARGEST_STRETCH = 2
"""A loop may be this many times longer than asked; beyond, the recipe must say so itself."""


def counts_periods(duration: Duration) -> bool:
    """Return whether a duration counts periods of the data."""
    extents = (duration.at, duration.multiple, duration.least, duration.most)
    return any(extent is not None and extent.unit == "periods" for extent in extents)


def loop_length(
    duration: Duration, cycle: Cycle, sample_rate_hz: Fraction
) -> tuple[int, list[Note]]:
    """Return the loop's length in samples and what was rounded.

    Parameters
    ----------
    duration : Duration
        What was asked: a value, or one with a multiple, a least and a most.
    cycle : Cycle
        Shortest loop of the signal; one that holds whole periods of the data where the
        duration counts these (:func:`counts_periods`).
    sample_rate_hz : Fraction
        Hz.

    Returns
    -------
    n_samples : int
        A whole multiple of the cycle and of ``duration.multiple``.
    notes : list of Note
        One if the length is not the one asked for.

    Raises
    ------
    RecipeError
        Symbols asked of a signal without them, more than :data:`MOST_SAMPLES`, a length
        outside its own limits, or no whole loop within the limits; the sentence says which
        would fit.
    """
    asked = in_samples(duration.at, cycle, sample_rate_hz, "duration")
    unit = 1
    if duration.multiple is not None:
        multiple = in_samples(duration.multiple, cycle, sample_rate_hz, "duration.multiple")
        if multiple.denominator != 1 or multiple < 1:
            raise RecipeError(
                where="duration.multiple",
                problem=f"{duration.multiple} is {float(multiple):.6g} samples",
                allowed="a whole number of samples, at least 1",
                remedy="Give the generator's granularity in samples.",
            )
        unit = int(multiple)
    quantum = math.lcm(cycle.n_samples, unit)
    least, most = Fraction(0), Fraction(MOST_SAMPLES)
    if duration.least is not None:
        least = in_samples(duration.least, cycle, sample_rate_hz, "duration.least")
    if duration.most is not None:
        most = min(most, in_samples(duration.most, cycle, sample_rate_hz, "duration.most"))
    low, high = max(1, math.ceil(least / quantum)), math.floor(most / quantum)
    if low > high:
        raise _nothing_fits(duration, quantum, low, sample_rate_hz)
    if not least <= asked <= most:
        raise _beyond(asked, least, most, sample_rate_hz)
    count = min(max(math.floor(asked / quantum + Fraction(1, 2)), low), high)
    n_samples = count * quantum
    if n_samples > LARGEST_STRETCH * asked:
        raise RecipeError(
            where="duration",
            problem=f"{duration.at} is shorter than the shortest loop",
            allowed=f"at least {_both(quantum, sample_rate_hz)}",
            remedy="Ask for a whole number of these loops.",
        )
    if n_samples == asked:
        return n_samples, []
    note = Note(
        kind="rounded",
        where="duration",
        text=f"the loop is a whole number of {quantum}-sample cycles",
        asked=str(duration.at),
        given=_both(n_samples, sample_rate_hz),
    )
    return n_samples, [note]


def in_samples(extent: Extent, cycle: Cycle, sample_rate_hz: Fraction, where: str) -> Fraction:
    """Return an extent in samples, exactly.

    Raises
    ------
    RecipeError
        Symbols or periods of a signal that has none, or nothing at all.
    """
    if extent.unit == "seconds":
        samples = extent.value * sample_rate_hz
    elif extent.unit == "samples":
        samples = extent.value
    elif extent.unit == "periods" and cycle.n_data_periods:
        samples = extent.value * cycle.n_samples / cycle.n_data_periods
    elif extent.unit == "periods":
        raise RecipeError(
            where=where,
            problem=f"{extent} of data without a period",
            allowed="periods of data of the kinds prbs, pattern or file",
            remedy="Write a time, or give the source such data.",
        )
    elif cycle.n_symbols:
        samples = extent.value * cycle.n_samples / cycle.n_symbols
    else:
        raise RecipeError(
            where=where,
            problem=f"{extent} of a signal without symbols of one length",
            allowed="a time or a number of samples",
            remedy="Write it like 10 ms or 12288 samples.",
        )
    if samples <= 0:
        raise RecipeError(
            where=where,
            problem=f"{extent} is no length",
            allowed="more than zero",
            remedy="Ask for a longer one.",
        )
    return samples


def _both(n_samples: int, sample_rate_hz: Fraction) -> str:
    return f"{format_s(n_samples / sample_rate_hz)} ({n_samples} samples)"


def _beyond(
    asked: Fraction, least: Fraction, most: Fraction, sample_rate_hz: Fraction
) -> RecipeError:
    low, high = (_both(n, sample_rate_hz) for n in (max(1, math.ceil(least)), math.floor(most)))
    return RecipeError(
        where="duration",
        problem=f"{format_s(asked / sample_rate_hz)} is {float(asked):.10g} samples",
        allowed=f"from {low} to {high}",
        remedy="Correct the length or its limits, or lower the sample rate.",
    )


def _nothing_fits(
    duration: Duration, quantum: int, low: int, sample_rate_hz: Fraction
) -> RecipeError:
    limits = f"least {duration.least}, " if duration.least is not None else ""
    limits += f"most {duration.most or f'{MOST_SAMPLES} samples'}"
    return RecipeError(
        where="duration",
        problem=f"no whole number of {_both(quantum, sample_rate_hz)} lies within {limits}",
        allowed=f"limits that hold {_both(low * quantum, sample_rate_hz)}",
        remedy="Widen the limits, or choose rates with a shorter common loop.",
    )
