"""A pulse on the symbol axis: its support, its band, its values and its energy."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from typing import Protocol

import numpy as np
import scipy.fft
from numpy.typing import NDArray

ENERGY_LATTICE = 1 << 12
"""Most points a symbol at which an energy is summed; bands below half of it lose nothing."""


@dataclass(frozen=True, kw_only=True)
class Pulse:
    """Base of every pulse: a real function of time in symbols, zero outside its support.

    Parameters
    ----------
    span_symbols : int
        The pulse is zero for ``|t| >= span_symbols``.
    half_band : float or None
        Highest frequency in symbol rates if band-limited, such as ``(1 + roll_off) / 2``; None
        for sampled pulses and for the hold.
    is_sampled : bool
        Known only at whole samples, so that the samples per symbol must be an integer.
    is_matched : bool
        A filter matched to it is meant to leave no interference between symbols.
    is_smooth : bool
        False where it jumps or bends at whole symbols, smooth as it may be between them.
    """

    span_symbols: int
    half_band: float | None = None
    is_sampled: bool = False
    is_matched: bool = False
    is_smooth: bool = True

    def values(self, t: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return the pulse at times in symbols from its own symbol's instant.

        Parameters
        ----------
        t : float64 array
            Any shape.

        Returns
        -------
        float64 array, same shape
        """
        raise TypeError(type(self).__name__)  # the base only describes

    def on_lattice(self, per_symbol: int) -> NDArray[np.float64]:
        """Return values at ``per_symbol`` points a symbol over the whole support.

        Parameters
        ----------
        per_symbol : int
            Points a symbol.

        Returns
        -------
        float64 array, shape (2 * span_symbols * per_symbol,)
            From ``t = -span_symbols`` on.
        """
        half = self.span_symbols * per_symbol
        return self.values(np.arange(-half, half) / per_symbol)


@dataclass(frozen=True, eq=False, kw_only=True)
class Stretched(Pulse):
    """A pulse on an axis of half symbols: twice as long there.

    Parameters
    ----------
    inner : Pulse
        The pulse on the symbol axis.
    """

    inner: Pulse

    @classmethod
    def of(cls, pulse: Pulse) -> Stretched:
        """Return a pulse as one whose axis counts half symbols."""
        return cls(
            span_symbols=2 * pulse.span_symbols,
            half_band=None if pulse.half_band is None else pulse.half_band / 2,
            is_sampled=pulse.is_sampled,
            is_matched=pulse.is_matched,
            is_smooth=pulse.is_smooth,
            inner=pulse,
        )

    def values(self, t: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return the pulse at times in half symbols."""
        return self.inner.values(t / 2)


class PulseSettings(Protocol):
    """What every member of PULSES is: a frozen dataclass of settings."""

    def design(self, samples_per_symbol: Fraction) -> Pulse:
        """Return the pulse for an output of so many samples a symbol."""


def end_taper(t: NDArray[np.float64], span_symbols: int) -> NDArray[np.float64]:
    """Return the weight that brings a cut pulse to zero at the ends of its span.

    Parameters
    ----------
    t : float64 array
        Times in symbols.
    span_symbols : int
        Half-length of the pulse.

    Returns
    -------
    float64 array, same shape
        1 over the inner half of the span (whole symbols), half a period of a raised cosine over
        the outer half, 0 beyond.

    Notes
    -----
    A plain cut of a root raised cosine leaves a floor outside the band; the taper lowers it and
    the interference between symbols as well. Measured on the spectrum, 0.2 symbol rates beyond
    the band edge, floor against the passband, and EVM behind the same filter:

    ========  ====  ================  =================
    roll-off  span  plain cut         with this taper
    ========  ====  ================  =================
    0.22      32    -71 dB, 0.0190 %  -97 dB, 0.0262 %
    0.22      64    -83 dB, 0.0066 %  -122 dB, 0.0047 %
    0.10      128   -87 dB, 0.0067 %  -138 dB, 0.0040 %
    0.05      256   -93 dB, 0.0051 %  -156 dB, 0.0028 %
    0.50      32    -78 dB, 0.0062 %  -104 dB, 0.0051 %
    ========  ====  ================  =================

    A taper over the outer quarter left -115 dB (0.22, 64); a Kaiser window over the whole span
    went further down near the edge but cost 0.06 % EVM or more.

    Examples
    --------
    >>> end_taper(np.array([0.0, 32.0, 48.0, 64.0]), 64).round(3).tolist()
    [1.0, 1.0, 0.5, 0.0]
    """
    kept = span_symbols // 2
    into = np.clip((np.abs(t) - kept) / (span_symbols - kept), 0.0, 1.0)
    return np.where(np.abs(t) < span_symbols, 0.5 + 0.5 * np.cos(np.pi * into), 0.0)


def default_span(roll_off: float) -> int:
    """Return the default half-length of a root raised cosine, symbols.

    Parameters
    ----------
    roll_off : float
        0 to 1.

    Returns
    -------
    int
        ``14 / roll_off`` rounded up to an even number, at least 48, at most 256.

    Notes
    -----
    The tails fall as ``1 / (4 pi roll_off t^2)``, so that equal interference needs a span in
    proportion to ``1 / roll_off``: EVM behind the same filter stays below 0.0055 % from roll-off
    0.05 to 1; 48 symbols hold the floor outside the band below -110 dB at large roll-offs
    (computed; tested in ``tests/truth/test_pulses.py``).

    Examples
    --------
    >>> [default_span(roll_off) for roll_off in (0.05, 0.1, 0.22, 0.35, 1.0)]
    [256, 140, 64, 48, 48]
    """
    wanted = 14.0 / roll_off if roll_off > 14.0 / 256 else 256.0
    return min(max(2 * int(np.ceil(wanted / 2)), 48), 256)


def mean_energy(pulse: Pulse, *, per_symbol: int, period_symbols: int) -> float:
    """Return the mean power of symbols of unit power and independent data, shaped by a pulse.

    Parameters
    ----------
    pulse : Pulse
        The shape.
    per_symbol : int
        Phases of the output within a symbol: the numerator of the samples per symbol in lowest
        terms.
    period_symbols : int
        Symbols in the loop; where the pulse is longer it meets itself.

    Returns
    -------
    float
        ``sum_k h(t - k)^2`` averaged over the phases, exact for the loop.

    Notes
    -----
    Derivation: for independent symbols of unit power and zero mean ``E|x(t)|^2 = sum_k
    h(t - k)^2``, and the output instants visit every phase equally often. Above
    ``ENERGY_LATTICE`` phases fewer are taken; ``h^2`` of a band-limited pulse has no
    frequency above the symbol rate times ``2 half_band``, so nothing is lost.
    """
    points = per_symbol if pulse.is_sampled else min(per_symbol, ENERGY_LATTICE)
    values = pulse.on_lattice(points).reshape(-1, points)
    wraps = -(-values.shape[0] // period_symbols)
    if wraps > 1:
        values = np.pad(values, ((0, wraps * period_symbols - values.shape[0]), (0, 0)))
        values = values.reshape(wraps, period_symbols, points).sum(axis=0)
    return float(np.sum(values**2) / points)


def residual_evm_percent(pulse: Pulse, *, per_symbol: int = 8) -> float:
    """Return the interference between symbols that a cut pulse leaves behind a matched filter.

    Parameters
    ----------
    pulse : Pulse
        The shape; the receive filter is the same.
    per_symbol : int
        Lattice of the computation, above twice the band.

    Returns
    -------
    float
        RMS of the interference over the wanted term, percent.
    """
    values = pulse.on_lattice(per_symbol)
    length = scipy.fft.next_fast_len(2 * values.size)
    length += -length % per_symbol
    spectrum = np.abs(scipy.fft.rfft(values, length)) ** 2
    correlation = scipy.fft.irfft(spectrum, length)[::per_symbol]
    return float(100.0 * np.sqrt(np.sum(correlation[1:] ** 2)) / correlation[0])
