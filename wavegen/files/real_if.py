"""Complex baseband as a real signal on an intermediate frequency, for files of one rail."""

from __future__ import annotations

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
class RealIf(Signal):
    """``Re{x exp(j 2 pi f t)}``: real samples, in the real part; the imaginary part is 0.

    Parameters
    ----------
    n_cycles : int
        Cycles of the intermediate frequency in one period of the loop.

    Notes
    -----
    No factor: an envelope of 1.0 becomes a real carrier with peaks of 1.0, so that 0 dBFS stays
    what it is, and the mean of the squared real samples is half of ``mean |x|^2``. Phases are
    exact: whole numbers of periods are taken off as integers.
    """

    n_cycles: int

    @cached_property
    def _ramp(self) -> NDArray[np.complex128]:
        count = min(_CELL, self.n_samples)
        turns = [self.n_cycles * place % self.n_samples for place in range(count)]
        return np.asarray(np.exp(2j * np.pi * (np.array(turns, np.float64) / self.n_samples)))

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Turn each sample by its phase and keep the real part."""
        out = np.zeros(stop - start, np.complex64)
        position = start
        while position < stop:
            cell = position // _CELL * _CELL
            end = min(cell + _CELL, stop)
            turn = np.exp(2j * np.pi * (self.n_cycles * cell % self.n_samples / self.n_samples))
            phasors = self._ramp[position - cell : end - cell] * turn
            inside = slice(position - start, end - start)
            part = arrays[0][inside]
            out.real[inside] = part.real * phasors.real - part.imag * phasors.imag
            position = end
        return out


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
    return RealIf(
        sample_rate_hz=rate,
        n_samples=count,
        inputs=(source,),
        mean_power=None,
        n_cycles=int(cycles),
    )
