"""A waveform as a function of its sample index."""

from __future__ import annotations

from dataclasses import dataclass, field
from fractions import Fraction
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

Samples = NDArray[np.complex64]
Range = tuple[int, int]


@dataclass(frozen=True, eq=False, kw_only=True)
class Signal:
    """One period of a cyclic waveform, described but not computed.

    A signal holds settings and other signals, never samples. Its answer for a range of
    indices does not depend on how the range is cut, bit for bit; :meth:`compute` therefore
    uses only elementwise and integer arithmetic, gathers, and FFT rows of fixed length on the
    absolute grid (four or more a call). No matrix product, running sum or reduction over the
    range, and no phase computed from ``start`` (phase at the cell's start times one ramp).

    Parameters
    ----------
    sample_rate_hz : Fraction
        Exact rate of this signal's own axis, Hz (samples, or symbols on a symbol axis).
    n_samples : int
        Length of one period on that axis.
    step : int
        Absolute grid: :meth:`compute` is asked for whole cells ``[k step, (k + 1) step)``;
        the last cell of the period is cut at ``n_samples``. 1 if there is no grid.
    inputs : tuple of Signal
        What :meth:`compute` reads. Inputs may have another period and another axis.
    mean_power : float or None
        Nominal mean of ``|x|^2`` in closed form; None where it must be measured.
    """

    sample_rate_hz: Fraction
    n_samples: int
    step: int = 1
    inputs: tuple[Signal, ...] = field(default=(), repr=False)
    mean_power: float | None = 1.0

    def __getstate__(self) -> dict[str, object]:
        """Pickle the description only: what ``cached_property`` made is made again there."""
        kind = type(self)
        return {
            name: value
            for name, value in vars(self).items()
            if not isinstance(getattr(kind, name, None), cached_property)
        }

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the range wanted of each input to compute ``[start, stop)``.

        Parameters
        ----------
        start, stop : int
            Whole grid cells inside one period.

        Returns
        -------
        tuple of (int, int)
            One range for each input, on the input's own axis; indices may pass the seam.
        """
        return ((start, stop),) * len(self.inputs)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Return samples ``[start, stop)``.

        Parameters
        ----------
        start, stop : int
            Whole grid cells inside one period: ``0 <= start < stop <= n_samples``.
        *arrays : complex64 array
            Samples of each input over the range of :meth:`needs`; read-only by contract.

        Returns
        -------
        complex64 array, shape (stop - start,)
            Owned by the caller.
        """
        raise TypeError(type(self).__name__)  # a Signal without compute is a description only
