"""Complex baseband as a real signal on an intermediate frequency, for files of one rail."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import SignalError
from wavegen.core.signal import Samples, Signal
from wavegen.core.units import format_hz

_CELL = 1 << 12
"""Samples whose phases come from one start and one ramp."""


@dataclass(frozen=True, eq=False, kw_only=True)
class Turned(Signal):
    """``x exp(j 2 pi f t)``: a signal whose 0 Hz stands at another frequency.

    Parameters
    ----------
    turns : Fraction
        Cycles per sample; of a loop a multiple of one over its length.

    Notes
    -----
    Phases are exact: whole turns are taken off as integers.
    """

    turns: Fraction

    @cached_property
    def _ramp(self) -> NDArray[np.complex128]:
        count = min(_CELL, self.n_samples)
        up, around = self.turns.as_integer_ratio()
        places = [up * place % around / around for place in range(count)]
        return np.asarray(np.exp(2j * np.pi * np.array(places, np.float64)))

    def phasors(self, start: int, stop: int) -> Iterator[tuple[slice, NDArray[np.complex128]]]:
        """Give the phasors of samples ``[start, stop)`` in pieces, and where each belongs."""
        up, around = self.turns.as_integer_ratio()
        position = start
        while position < stop:
            cell = position // _CELL * _CELL
            end = min(cell + _CELL, stop)
            turn = np.exp(2j * np.pi * (up * cell % around / around))
            inside = slice(position - start, end - start)
            yield inside, self._ramp[position - cell : end - cell] * turn
            position = end

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Turn each sample by its phase."""
        out = np.empty(stop - start, np.complex64)
        for inside, phasors in self.phasors(start, stop):
            out[inside] = arrays[0][inside] * phasors
        return out


@dataclass(frozen=True, eq=False, kw_only=True)
class RealIf(Turned):
    """``Re{x exp(j 2 pi f t)}``: real samples, in the real part; the imaginary part is 0.

    Notes
    -----
    No factor: an envelope of 1.0 becomes a real carrier with peaks of 1.0, so that 0 dBFS stays
    what it is, and the mean of the squared real samples is half of ``mean |x|^2``.
    """

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Turn each sample by its phase and keep the real part."""
        out = np.zeros(stop - start, np.complex64)
        for inside, phasors in self.phasors(start, stop):
            part = arrays[0][inside]
            out.real[inside] = part.real * phasors.real - part.imag * phasors.imag
        return out


def turned(source: Signal, frequency_hz: Fraction) -> Signal:
    """Return a signal whose 0 Hz stands at another frequency; itself if that is 0 Hz.

    Parameters
    ----------
    source : Signal
        A recording, or a loop of which the frequency has whole cycles.
    frequency_hz : Fraction
        Where 0 Hz goes, Hz; below 0 as well.
    """
    if not frequency_hz:
        return source
    return Turned(
        sample_rate_hz=source.sample_rate_hz,
        n_samples=source.n_samples,
        inputs=(source,),
        mean_power=None,
        turns=frequency_hz / source.sample_rate_hz,
    )


def real_part(source: Signal, frequency_hz: Fraction) -> RealIf:
    """Return real samples of a signal whose 0 Hz goes to a frequency, which is not checked.

    Parameters
    ----------
    source : Signal
        Complex; at 0 Hz its real part alone is kept.
    frequency_hz : Fraction
        Hz.
    """
    return RealIf(
        sample_rate_hz=source.sample_rate_hz,
        n_samples=source.n_samples,
        inputs=(source,),
        mean_power=None,
        turns=frequency_hz / source.sample_rate_hz,
    )


def real_if(source: Signal, frequency_hz: Fraction, where: str) -> RealIf:
    """Return a loop of baseband as a real signal on an intermediate frequency.

    Parameters
    ----------
    source : Signal
        One period.
    frequency_hz : Fraction
        Where the baseband's 0 Hz goes, between 0 and half the sample rate. What the signal
        occupies must fit between these too: what passes either end folds back.
    where : str
        For messages.

    Raises
    ------
    SignalError
        At ``where``: outside that range, or no whole number of cycles in the loop (its seam
        would jump); the nearest frequency that fits is named.
    """
    rate, count = source.sample_rate_hz, source.n_samples
    if not 0 < frequency_hz < rate / 2:
        raise SignalError(
            where=where,
            problem=f"the intermediate frequency {format_hz(frequency_hz)}",
            allowed=f"above 0 and below half the sample rate, {format_hz(rate / 2)}",
            remedy="Choose one in between, with room for the signal on both sides.",
        )
    cycles = frequency_hz * count / rate
    if cycles.denominator != 1:
        fits = round(cycles) * rate / count
        raise SignalError(
            where=where,
            problem=f"{format_hz(frequency_hz)} makes {float(cycles):.6g} cycles in the loop",
            allowed=f"whole cycles: multiples of {format_hz(rate / count)}",
            remedy=f"Use {fits} Hz, or change the duration.",
        )
    return real_part(source, frequency_hz)
