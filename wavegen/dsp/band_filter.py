"""A zero-phase filter that several signals of a graph share."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from wavegen.core.signal import Samples
from wavegen.dsp.overlap_save import fft_length, filter_response, filter_rows


@dataclass(frozen=True, eq=False)
class BandFilter:
    """Taps, and what is made of them once.

    Parameters
    ----------
    taps : float64 or complex128 array, shape (2 h + 1,)
        The middle tap belongs to lag zero.
    """

    taps: NDArray[np.float64] | NDArray[np.complex128]

    def __getstate__(self) -> dict[str, object]:
        """Pickle the taps only."""
        return {"taps": self.taps}

    @property
    def half_length(self) -> int:
        """Taps on each side of lag zero: the halo."""
        return self.taps.size // 2

    @cached_property
    def n_fft(self) -> int:
        """Transform length."""
        return fft_length(self.half_length)

    @property
    def hop(self) -> int:
        """Output samples of a row: the grid of what uses it."""
        return self.n_fft - 2 * self.half_length

    @cached_property
    def response(self) -> NDArray[np.complex64]:
        """Frequency response, shape (n_fft,)."""
        return filter_response(self.taps, self.n_fft)

    def apply(self, samples: Samples, n_out: int) -> Samples:
        """Filter a stretch that begins on the grid.

        Parameters
        ----------
        samples : complex64 array, shape (n_out + 2 half_length,)
            From ``half_length`` before the first output to as much after the last.
        n_out : int
            Samples wanted.

        Returns
        -------
        complex64 array, shape (n_out,)
            Owned by the caller.
        """
        return filter_rows(
            samples, response=self.response, half_length=self.half_length, n_out=n_out
        )
