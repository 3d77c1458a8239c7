"""What a receiver makes of a single carrier: symbols behind the matched filter."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from wavegen.core.errors import SignalError
from wavegen.core.signal import Range, Samples, Signal
from wavegen.dsp.arrival import Arrival, bring_back
from wavegen.dsp.matched_filter import MatchedRows, is_receivable, plan_matched
from wavegen.dsp.pulse import Pulse


@dataclass(frozen=True, eq=False, kw_only=True)
class MatchedSymbols(Signal):
    """Samples behind the filter matched to a pulse, at the instants of the symbols.

    Parameters
    ----------
    pulse : Pulse
        Shape of a symbol.
    ratio : (int, int)
        Samples and symbols (half symbols where staggered) of the shortest cycle.
    """

    pulse: Pulse
    ratio: tuple[int, int]

    @cached_property
    def rows(self) -> MatchedRows:
        """Return what turns ranges of samples into ranges of symbols."""
        return _rows(self.pulse, self.ratio, self.n_samples)

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the samples under the pulses of symbols ``[start, stop)``."""
        return (self.rows.needs(start, stop),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Return symbols ``[start, stop)``."""
        return self.rows.receive(start, stop, arrays[0])


@dataclass(frozen=True, eq=False, kw_only=True)
class JoinedRails(Signal):
    """Symbols from half symbols: I of one, Q of the next, as offset QPSK sends them.

    Parameters
    ----------
    gain : complex
        What the half symbols are divided by first: a turn of the phase would mix the rails.
    """

    gain: complex = 1.0

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the half symbols of symbols ``[start, stop)``."""
        return ((2 * start, 2 * stop),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Take one rail of each; their scale is ``sqrt(2)``."""
        turned = arrays[0] * np.complex64(1 / (self.gain * math.sqrt(2)))
        out = np.empty(stop - start, np.complex64)
        out.real = turned.real[0::2]
        out.imag = turned.imag[1::2]
        return out


def match(
    conditioned: Signal,
    arrival: Arrival,
    *,
    pulse: Pulse,
    ratio: tuple[int, int],
    axis: Signal,
) -> MatchedSymbols:
    """Return the symbols of a carrier in what a receiver gets.

    Parameters
    ----------
    conditioned : Signal
        What arrives.
    arrival : Arrival
        How the carrier stands in it.
    pulse : Pulse
        Shape of a symbol.
    ratio : (int, int)
        Samples and symbols of the shortest cycle.
    axis : Signal
        The symbols sent, or their rails: gives the axis.

    Returns
    -------
    MatchedSymbols

    Raises
    ------
    SignalError
        Symbols fall between samples and the pulse is not smooth: no filter is exact.
    """
    if not is_receivable(pulse, n_symbols=ratio[1]):
        raise SignalError(
            where="single_carrier",
            problem=f"{ratio[0]}/{ratio[1]} samples a symbol with a pulse that jumps or bends at "
            "whole symbols have no exact matched filter",
            allowed="whole samples a symbol, or a band-limited pulse",
            remedy="Choose a sample rate that is a multiple of the symbol rate.",
        )
    return MatchedSymbols(
        sample_rate_hz=axis.sample_rate_hz,
        n_samples=axis.n_samples,
        step=_rows(pulse, ratio, axis.n_samples).step,
        inputs=(bring_back(conditioned, arrival),),
        mean_power=None,
        pulse=pulse,
        ratio=ratio,
    )


def _rows(pulse: Pulse, ratio: tuple[int, int], period: int) -> MatchedRows:
    return plan_matched(pulse, n_samples=ratio[0], n_symbols=ratio[1], period_symbols=period)
