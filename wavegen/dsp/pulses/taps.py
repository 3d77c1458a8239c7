"""A pulse given by its samples."""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction
from typing import Annotated

import numpy as np
from annotated_types import MaxLen, MinLen
from numpy.typing import NDArray

from wavegen.core.units import QuantityError
from wavegen.dsp.pulse import Pulse

MOST_TAPS = 1 << 16


@dataclass(frozen=True, slots=True, kw_only=True)
class Taps:
    """Settings of a pulse of own design.

    Parameters
    ----------
    taps : tuple of float, optional
        Samples of the pulse at the output sample rate, on any scale (the energy is made 1), not
        all zero. The middle one, of two middle ones the earlier, falls on its symbol's instant.
        The sample rate must be a whole multiple of the symbol rate.
    file : str, optional
        Text file that holds them instead, its path relative to the recipe: decimal numbers with
        blanks, line ends or commas between them.
    """

    taps: Annotated[tuple[float, ...], MinLen(1), MaxLen(MOST_TAPS)] | None = None
    file: str | None = None

    def __post_init__(self) -> None:
        """Refuse neither and both."""
        if (self.taps is None) == (self.file is None):
            raise QuantityError(
                problem="neither taps nor a file is given"
                if self.taps is None
                else "both taps and a file are given",
                allowed="one of the keys taps and file",
                remedy="Write taps: [0.5, 1, 0.5], or file: taps.txt.",
                key="taps",
            )

    def design(self, samples_per_symbol: Fraction) -> Pulse:
        """Return the pulse.

        Parameters
        ----------
        samples_per_symbol : Fraction
            A whole number; the caller refuses others, see ``Pulse.is_sampled``.

        Raises
        ------
        ValueError
            Taps in a file that the caller has not read.
        """
        if self.taps is None:
            message = "taps in a file are read before a pulse is designed"
            raise ValueError(message)
        per_symbol = math.floor(samples_per_symbol)
        longest = len(self.taps) - (len(self.taps) - 1) // 2
        return SampledPulse(
            span_symbols=-(-longest // per_symbol),
            is_sampled=True,
            per_symbol=per_symbol,
            taps=np.array(self.taps, dtype=np.float64),
        )


@dataclass(frozen=True, eq=False, kw_only=True)
class SampledPulse(Pulse):
    """A pulse known at ``per_symbol`` points a symbol.

    Parameters
    ----------
    per_symbol : int
        Samples a symbol.
    taps : float64 array, shape (n_taps,)
        The samples.
    """

    per_symbol: int
    taps: NDArray[np.float64]

    def values(self, t: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return the tap at the nearest sample, 0 beyond the taps."""
        index = np.rint(t * self.per_symbol).astype(np.int64) + (self.taps.size - 1) // 2
        inside = (index >= 0) & (index < self.taps.size)
        return np.where(inside, self.taps[np.where(inside, index, 0)], 0.0)
