"""The signal of least distortion under a ceiling, with nothing outside its band.

Wanted is the ``u`` of least energy inside a band with ``|x + u| <= A`` at every sample: the
projection of ``x`` onto an intersection of convex sets. Its dual has one complex number ``y`` a
sample and no constraint that couples them: ``u = -H y``, where ``H`` passes the band, and

    y <- v - clip(v, A),    v = y + x - H y,

is a gradient step on the dual followed by a proximal step; ``v - clip(v, A)`` is zero wherever
``|v| <= A``. ``H`` has norm 1, so that steps of 1 are safe, and Nesterov's momentum makes the
error fall with the square of the number of rounds.

A. Beck, M. Teboulle, "A fast iterative shrinkage-thresholding algorithm for linear inverse
problems", SIAM J. Imaging Sciences 2(1), 2009, 183-202; on the dual: A. Beck, M. Teboulle,
"A fast dual proximal gradient algorithm for convex minimization and applications", Operations
Research Letters 42(1), 2014, 1-6 (both from memory; the optimum is checked against its
optimality conditions in tests).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.signal import Range, Samples, Signal
from wavegen.dsp.band_filter import BandFilter
from wavegen.dsp.peak_rows import put_lack, take_lowered
from wavegen.dsp.row_kernels import put_ahead, put_excess, scale_lines, take_excess
from wavegen.dsp.windows import STOPBAND_DB, kaiser_beta, kaiser_window


def momentum(n_rounds: int) -> list[float]:
    """Return how much of the last change each round adds before it starts.

    Parameters
    ----------
    n_rounds : int
        Rounds.

    Returns
    -------
    list of float
        ``(t - 1) / t'`` with ``t' = (1 + sqrt(1 + 4 t^2)) / 2``; 0 for the first two.

    Examples
    --------
    >>> [round(each, 3) for each in momentum(4)]
    [0.0, 0.0, 0.282, 0.434]
    """
    found, t = [0.0], 1.0
    while len(found) < n_rounds:
        following = (1 + math.sqrt(1 + 4 * t * t)) / 2
        found.append((t - 1) / following)
        t = following
    return found[:n_rounds]


def project_rows(
    rows: NDArray[np.complex64],
    *,
    response: NDArray[np.float32],
    amplitude: float,
    n_rounds: int,
) -> NDArray[np.complex64]:
    """Project each of several loops by itself: symbol bodies, say.

    Parameters
    ----------
    rows : complex64 array, shape (n_rows, n_fft)
        Each row is one period; four or more a call are fastest. Not changed.
    response : float32 array, shape (n_fft,) or (n_rows, n_fft)
        What may be changed of each bin: 1 inside the band, 0 outside.
    amplitude : float
        Ceiling of every envelope.
    n_rounds : int
        Pairs of transforms a row.

    Returns
    -------
    complex64 array, shape (n_rows, n_fft)
        Owned by the caller. In the band; the ceiling is passed by a little, the less the more
        rounds.
    """
    lines = correcting_lines(rows, response=response, amplitude=amplitude, n_rounds=n_rounds)
    made = np.asarray(scipy.fft.ifft(lines, axis=1, norm="forward", overwrite_x=True))
    made += rows
    return made


def correcting_lines(
    rows: NDArray[np.complex64],
    *,
    response: NDArray[np.float32],
    amplitude: float,
    n_rounds: int,
) -> NDArray[np.complex64]:
    """Return what :func:`project_rows` adds to each row, as its bins.

    Parameters
    ----------
    rows, response, amplitude, n_rounds
        As there.

    Returns
    -------
    complex64 array, shape (n_rows, n_fft)
        On the scale of ``fft(row) / n_fft``; owned by the caller.
    """
    factors, n_fft = np.atleast_2d(response), rows.shape[1]

    def in_band(states: Samples) -> Samples:
        lines = np.asarray(scipy.fft.fft(states, axis=1, norm="forward", overwrite_x=True))
        scale_lines(lines, factors)
        return lines

    work, state, before, after = (np.empty(rows.shape, np.complex64) for _ in range(4))
    put_excess(state, rows.reshape(-1), hop=n_fft, amplitude=amplitude)
    before[:] = state
    for factor in momentum(n_rounds)[1:]:
        source, y, last, made = (each.reshape(-1) for each in (rows, state, before, after))
        put_ahead(work, y, last, hop=n_fft, factor=factor)
        lines = in_band(work)
        back = np.asarray(scipy.fft.ifft(lines, axis=1, norm="forward", overwrite_x=True))
        take_excess(
            made, source, y, last, back, half=0, hop=n_fft, factor=factor, amplitude=amplitude
        )
        state, before, after = after, state, before
    lines = in_band(state)
    return np.negative(lines, out=lines)


@dataclass(frozen=True, eq=False, kw_only=True)
class DualRound(Signal):
    """One round: the dual variable from the two before it. Use :func:`project`.

    Parameters
    ----------
    band : BandFilter
        What passes may be changed.
    amplitude : float
        Ceiling of the envelope.
    factor : float
        Momentum of the round.

    Notes
    -----
    Inputs are the signal, then the last dual variable and the one before it; a round that lacks
    one has zeros for it, and the first has neither.
    """

    band: BandFilter
    amplitude: float
    factor: float = 0.0

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the range itself of the signal, with the filter's halo of the states."""
        reach = self.band.half_length
        states = ((start - reach, stop + reach),) * (len(self.inputs) - 1)
        return ((start, stop), *states)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Return ``v - clip(v)`` of ``v = z + x - H z``."""
        source, out = arrays[0], np.empty(stop - start, np.complex64)
        if len(arrays) == 1:
            put_excess(out[None], source, hop=out.size, amplitude=self.amplitude)
            return out
        half, hop = self.band.half_length, self.band.hop
        state, before = arrays[1], arrays[-1]

        def put(rows: Samples, low: int) -> None:
            put_ahead(rows, state[low:], before[low:], hop=hop, factor=self.factor)

        def take(rows: Samples, low: int, high: int) -> None:
            take_excess(
                out[low:high],
                source[low:high],
                state[half + low : half + high],
                before[half + low : half + high],
                rows,
                half=half,
                hop=hop,
                factor=self.factor,
                amplitude=self.amplitude,
            )

        self.band.run(out.size, put, take)
        return out


@dataclass(frozen=True, eq=False, kw_only=True)
class Corrected(Signal):
    """A signal less its dual variable in the band: ``x - H y``.

    Parameters
    ----------
    band : BandFilter
        What passes may be changed.
    """

    band: BandFilter

    @property
    def acts_on(self) -> Signal:
        """The signal that is corrected: when it is on, this is."""
        return self.inputs[0]

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the range itself of the signal, with the filter's halo of the dual variable."""
        reach = self.band.half_length
        return ((start, stop), (start - reach, stop + reach))

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Subtract what passes the band."""
        return self.band.apply(arrays[1], stop - start, base=arrays[0])


@dataclass(frozen=True, eq=False, kw_only=True)
class HeldBelow(Signal):
    """A signal under a gain so smooth that no sample passes an amplitude.

    Parameters
    ----------
    amplitude : float
        Highest envelope, before ``gain``.
    gain : float
        Amplitude ratio of the whole.
    smoothing : BandFilter
        Taps that are not negative and sum to 1.

    Notes
    -----
    What the gain must lack at each sample is spread to its neighbours (the largest within the
    taps' half length) and then smoothed over as many: the smoothed lack is nowhere less than
    the needed one, and its spectrum is that of the taps.
    """

    amplitude: float
    gain: float
    smoothing: BandFilter

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the range with twice the half length of the taps on both sides."""
        reach = 2 * self.smoothing.half_length
        return ((start - reach, stop + reach),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Multiply by one less the smoothed lack."""
        source, out = arrays[0], np.empty(stop - start, np.complex64)
        half, hop = self.smoothing.half_length, self.smoothing.hop

        def put(rows: Samples, low: int) -> None:
            put_lack(rows, source[low:], hop=hop, reach=half, amplitude=self.amplitude)

        def take(rows: Samples, low: int, high: int) -> None:
            here = source[2 * half + low : 2 * half + high]
            take_lowered(out[low:high], here, rows, half=half, hop=hop, gain=self.gain)

        self.smoothing.run(out.size, put, take, n_parts=2)
        return out


def project(source: Signal, *, band: BandFilter, amplitude: float, n_rounds: int) -> Signal:
    """Return the projection of a signal: in-band changes only, the ceiling nearly kept.

    Parameters
    ----------
    source : Signal
        What is projected.
    band : BandFilter
        What passes may be changed; its response lies between 0 and 1.
    amplitude : float
        Ceiling of the envelope.
    n_rounds : int
        Rounds, each a pair of transforms; 1 or more.

    Returns
    -------
    Signal
        Its mean power must be measured. :func:`hold_below` makes the ceiling hold.
    """
    states: list[Signal] = []
    for factor in momentum(n_rounds):
        one = DualRound(
            sample_rate_hz=source.sample_rate_hz,
            n_samples=source.n_samples,
            step=band.hop,
            inputs=(source, *reversed(states[-2:])),
            mean_power=None,
            band=band,
            amplitude=amplitude,
            factor=factor,
        )
        states.append(one)
    return Corrected(
        sample_rate_hz=source.sample_rate_hz,
        n_samples=source.n_samples,
        step=band.hop,
        inputs=(source, states[-1]),
        mean_power=None,
        band=band,
    )


def hold_below(
    source: Signal, *, amplitude: float, gain: float, half_length: int, mean_power: float | None
) -> Signal:
    """Return a signal that stays below an amplitude at every sample, times a gain.

    Parameters
    ----------
    source : Signal
        Passes the amplitude by little.
    amplitude, gain : float
        Highest envelope before the gain, and the gain.
    half_length : int
        Over how many samples on each side the gain changes.
    mean_power : float or None
        Of the result.
    """
    window = kaiser_window(half_length, kaiser_beta(STOPBAND_DB))
    smoothing = BandFilter(window / window.sum())
    return HeldBelow(
        sample_rate_hz=source.sample_rate_hz,
        n_samples=source.n_samples,
        step=2 * smoothing.hop,
        inputs=(source,),
        mean_power=mean_power,
        amplitude=amplitude,
        gain=gain,
        smoothing=smoothing,
    )
