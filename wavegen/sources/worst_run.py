"""The run of symbols that makes the highest peak a pulse-shaped carrier can have."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from wavegen.dsp.pulse import Pulse

_DIRECTIONS = 64
_PHASES = 4
"""Timing phases tried: those with the largest sums of the pulse's magnitudes."""
_MOST_PHASES = 256


class Numbers(Protocol):
    """Symbol numbers by index."""

    def words(self, first: int, count: int) -> NDArray[np.unsignedinteger]:
        """Return words whose low bits number the symbols ``first ...``."""


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class WorstRun:
    """Where the run stands, and what it is.

    Parameters
    ----------
    first : int
        Its first symbol.
    numbers : int array, shape (n,)
        Points of its symbols.
    sample : int
        Where the peak comes to stand.
    amplitude : float
        Of the peak, on the scale of the pulse and the points.
    """

    first: int
    numbers: NDArray[np.int64]
    sample: int
    amplitude: float


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Planted:
    """Symbol numbers with a run in their midst.

    Parameters
    ----------
    numbers : Numbers
        What stands elsewhere.
    run : WorstRun
        What takes the place of some of them.
    """

    numbers: Numbers
    run: WorstRun

    def words(self, first: int, count: int) -> NDArray[np.unsignedinteger]:
        """Return words whose low bits number the symbols ``first ...``."""
        out = self.numbers.words(first, count).copy()
        low = max(first, self.run.first)
        high = min(first + count, self.run.first + self.run.numbers.size)
        if low < high:
            out[low - first : high - first] = self.run.numbers[
                low - self.run.first : high - self.run.first
            ].astype(out.dtype)
        return out


def worst_run(
    pulse: Pulse,
    points: NDArray[np.complex128],
    *,
    ratio: tuple[int, int],
    n_symbols: int,
    turn_rad: float = 0.0,
) -> WorstRun:
    """Return the run with the highest peak at a sample, in the middle of a loop.

    Parameters
    ----------
    pulse : Pulse
        Shape of a symbol, over time in symbols.
    points : complex128 array, shape (n_points,)
        The constellation.
    ratio : (int, int)
        Samples and symbols of the shortest common cycle.
    n_symbols : int
        Of the loop; longer than the pulse.
    turn_rad : float
        By how much each symbol is turned over the one before.

    Returns
    -------
    WorstRun

    Notes
    -----
    At an instant the signal is ``sum a_k h(t - k)``: along a direction every symbol adds most
    whose turned point, with the sign of the pulse there, reaches furthest along it. The best of
    64 directions is taken, at the samples where the pulse has the largest sum of magnitudes.
    """
    a, b = ratio
    middle = n_symbols // 2
    first_sample = -(-middle * a // b)
    samples = first_sample + np.unique(np.linspace(0, a - 1, min(a, _MOST_PHASES)).astype(int))
    span = pulse.span_symbols
    offsets = np.arange(-span, span + 1)
    instants = samples * b / a
    nearest = np.floor(instants).astype(int)
    heights = pulse.values(instants[:, None] - (nearest[:, None] + offsets))
    best: WorstRun | None = None
    for k in np.argsort(-np.abs(heights).sum(axis=1), kind="stable")[:_PHASES]:
        places = nearest[k] + offsets
        turned = points[None, :] * np.exp(1j * turn_rad * places)[:, None] * heights[k][:, None]
        for direction in np.exp(-2j * np.pi * np.arange(_DIRECTIONS) / _DIRECTIONS):
            chosen = np.argmax((turned * direction).real, axis=1)
            reach = abs(complex(turned[np.arange(places.size), chosen].sum()))
            if best is None or reach > best.amplitude * (1 + 1e-12):
                best = WorstRun(
                    first=int(places[0]),
                    numbers=chosen.astype(np.int64),
                    sample=int(samples[k]),
                    amplitude=reach,
                )
    assert best is not None  # noqa: S101 - there is always one phase and one direction
    return best


def peak_db(amplitude: float, mean_power: float) -> float:
    """Return a peak over a mean power, dB."""
    return 20 * math.log10(amplitude) - 10 * math.log10(mean_power)
