"""Where a source stands in what a chain of sums and stages made of it, and the way back."""

from __future__ import annotations

import cmath
import math
from dataclasses import dataclass, replace
from fractions import Fraction
from functools import cached_property

import numpy as np

from wavegen.core.signal import Range, Samples, Signal
from wavegen.dsp.interpolation import delay_taps
from wavegen.dsp.overlap_save import Filtered

CELL_SAMPLES = 1 << 12
"""Grid of the phase: exact at each cell's start, one ramp within."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Arrival:
    """How a source ``x`` arrives: ``gain e^(j phase) e^(j 2 pi n_cycles i / n) x(i - delay)``.

    Parameters
    ----------
    n_samples : int
        Samples ``n`` of the loop in which it arrives.
    n_cycles : int
        Frequency offset, whole cycles in the loop.
    gain : float
        Amplitude ratio.
    phase_rad : float
        Phase at sample 0.
    delay_samples : Fraction
        Delay, samples of that loop.
    remarks : tuple of str
        What on the way has no exact gain or delay.
    """

    n_samples: int
    n_cycles: int = 0
    gain: float = 1.0
    phase_rad: float = 0.0
    delay_samples: Fraction = Fraction(0)
    remarks: tuple[str, ...] = ()

    def placed(self, *, n_cycles: int, gain: float, phase_rad: float) -> Arrival:
        """Return the arrival of a part of what arrives so: shifted, weighed and turned in it."""
        late = n_cycles * self.delay_samples / self.n_samples % 1
        return replace(
            self,
            n_cycles=self.n_cycles + n_cycles,
            gain=self.gain * gain,
            phase_rad=self.phase_rad + phase_rad - math.tau * float(late),
        )

    def delayed(self, delay_samples: Fraction) -> Arrival:
        """Return the arrival of what is delayed in what arrives so."""
        return replace(self, delay_samples=self.delay_samples + delay_samples)

    def remarked(self, remark: str) -> Arrival:
        """Return the same arrival with one more remark."""
        return replace(self, remarks=(*self.remarks, remark))


@dataclass(frozen=True, eq=False, kw_only=True)
class Returned(Signal):
    """A signal turned back in frequency, phase, level and whole samples of delay.

    Parameters
    ----------
    n_cycles : int
        Cycles in the loop by which it is shifted down.
    factor : complex
        What it is multiplied by besides.
    lag : int
        Samples by which it is advanced.
    """

    n_cycles: int
    factor: complex
    lag: int

    @cached_property
    def _ramp(self) -> Samples:
        turn = -self.n_cycles * np.arange(CELL_SAMPLES) % self.n_samples / self.n_samples
        return np.asarray(np.exp(2j * np.pi * turn)).astype(np.complex64)

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the range that lies the delay behind."""
        return ((start + self.lag, stop + self.lag),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Multiply cell by cell."""
        out = np.empty(stop - start, np.complex64)
        for cell in range(start, stop, CELL_SAMPLES):
            low, high = cell - start, min(cell - start + CELL_SAMPLES, out.size)
            turn = -self.n_cycles * (cell + self.lag) % self.n_samples / self.n_samples
            factor = np.complex64(self.factor * cmath.exp(2j * math.pi * turn))
            np.multiply(self._ramp[: high - low], factor, out=out[low:high])
            out[low:high] *= arrays[0][low:high]
        return out


def bring_back(signal: Signal, arrival: Arrival) -> Signal:
    """Return what arrived as it was sent, at the rate at which it arrives.

    Parameters
    ----------
    signal : Signal
        What a receiver gets.
    arrival : Arrival
        How the source arrives in it.

    Returns
    -------
    Signal
        ``signal`` itself where nothing was done to the source. A delay by part of a sample is
        undone by a windowed sinc, flat to 0.9 of half the sample rate.
    """
    lag = math.floor(arrival.delay_samples + Fraction(1, 2))
    rest = arrival.delay_samples - lag
    plain = arrival.n_cycles == 0 and arrival.gain == 1 and arrival.phase_rad == 0 and lag == 0
    if not plain:
        signal = Returned(
            sample_rate_hz=signal.sample_rate_hz,
            n_samples=signal.n_samples,
            step=CELL_SAMPLES,
            inputs=(signal,),
            mean_power=None,
            n_cycles=arrival.n_cycles,
            factor=cmath.rect(1 / arrival.gain, -arrival.phase_rad),
            lag=lag,
        )
    if rest:
        signal = Filtered.of(signal, delay_taps(-float(rest)))
    return signal
