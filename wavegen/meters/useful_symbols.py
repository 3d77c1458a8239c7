"""The useful parts of OFDM symbols, one after another, without their prefixes."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Self

import numpy as np

from wavegen.core.signal import Range, Samples, Signal
from wavegen.sources.ofdm_signal import Prefixed
from wavegen.stages.channel.gate import ActsOn, MovesBursts


@dataclass(frozen=True, eq=False, kw_only=True)
class UsefulSymbols(Signal):
    """Useful part ``k`` at ``[k n_fft, (k + 1) n_fft)``: the axis of a meter of symbols.

    Parameters
    ----------
    prefixed : Prefixed
        How the symbols are laid.
    """

    prefixed: Prefixed = field(repr=False)

    @classmethod
    def of(cls, source: Signal, prefixed: Prefixed) -> Self:
        """Return the useful parts of a loop.

        Parameters
        ----------
        source : Signal
            One turn of it, in which the symbols stand as ``prefixed`` lays them.
        prefixed : Prefixed
            Of the same rate and length.
        """
        (bodies,) = prefixed.inputs
        return cls(
            sample_rate_hz=bodies.sample_rate_hz,
            n_samples=bodies.n_samples,
            step=prefixed.layout.n_fft,
            inputs=(source,),
            mean_power=None,
            prefixed=prefixed,
        )

    def _start(self, symbol: int) -> int:
        layout = self.prefixed.layout
        return self.prefixed.start_of(symbol) + layout.prefixes[symbol % layout.n_symbols]

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the samples from the first useful part to the end of the last."""
        n = self.step
        return ((self._start(start // n), self._start(stop // n - 1) + n),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Gather whole symbols."""
        n, first, end = self.step, start // self.step, stop // self.step
        origin = self._start(first)
        out = np.empty((end - first, n), np.complex64)
        for row in range(end - first):
            place = self._start(first + row) - origin
            out[row] = arrays[0][place : place + n]
        return out.reshape(-1)


def symbols_of(signal: Signal) -> Prefixed | None:
    """Return the OFDM source behind a chain of stages, if its symbols stand where they were laid.

    Parameters
    ----------
    signal : Signal
        The end of a chain.

    Returns
    -------
    Prefixed or None
        None for other sources and for sums, and behind a delay or a change of rate.
    """
    while not isinstance(signal, Prefixed):
        if isinstance(signal, ActsOn):
            signal = signal.acts_on
            continue
        if len(signal.inputs) != 1 or isinstance(signal, MovesBursts):
            return None
        signal = signal.inputs[0]
    return signal
