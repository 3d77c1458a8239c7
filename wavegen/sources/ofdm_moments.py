"""Which moments of an OFDM signal follow which statistics: symbols, prefixes and edges."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np
import scipy.special
from numpy.typing import NDArray

from wavegen.laws.mixture import mean_bessel
from wavegen.laws.term import BaseTerm, Complexes, Reals
from wavegen.sources.ofdm_layout import Layout
from wavegen.sources.ofdm_power import Part, steady_samples
from wavegen.sources.ofdm_schedule import states

MOST_EDGE_GROUPS = 128
"""Weights of an edge that are told apart; the samples of a longer one are gathered."""
_BLOCK = 1 << 20


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Drawn:
    """Subcarriers of one kind whose values are drawn anew.

    Parameters
    ----------
    count : int
        How many.
    radii : float64 array, shape (order,)
        Magnitude of each point about the mean of all, level and scale included.
    """

    count: int
    radii: Reals

    @property
    def power(self) -> float:
        """Variance of one subcarrier."""
        return float(np.mean(self.radii**2))

    @property
    def rings(self) -> tuple[Reals, Reals]:
        """Different magnitudes and the share of the points on each."""
        rounded = np.round(self.radii / self.radii.max(), 10)
        _, first, counts = np.unique(rounded, return_index=True, return_counts=True)
        return self.radii[first], counts / self.radii.size


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Moments:
    """Samples of alike statistics: the same stretch of some symbols.

    Parameters
    ----------
    sources : tuple of (int, float)
        States whose data are added, each with its weight.
    starts : int64 array, shape (n_symbols,)
        First sample of each symbol, prefix included, within the clock.
    low, high : int
        The stretch, counted from there.
    known : complex128 array, shape (high - low,), or None
        What is known of the samples: pilots, and the mean of data. None for zero.
    prefix : int
        Prefix of the symbols, samples.
    """

    sources: tuple[tuple[int, float], ...]
    starts: NDArray[np.int64]
    low: int
    high: int
    known: Complexes | None
    prefix: int = 0

    @property
    def count(self) -> int:
        """Samples in a clock."""
        return self.starts.size * (self.high - self.low)

    def picked(self, residue: int, modulus: int) -> tuple[int, Complexes | None]:
        """Return how many samples leave a residue, and what is known of them."""
        if modulus == 1:
            return self.count, self.known
        places, again = np.unique((residue - self.starts - self.low) % modulus, return_counts=True)
        length = self.high - self.low
        counts = np.maximum(-(-(length - places) // modulus), 0) * again
        total = int(counts.sum())
        if self.known is None or not total:
            return total, None
        pieces = [
            np.tile(self.known[place::modulus], times)
            for place, times in zip(places.tolist(), again.tolist(), strict=True)
        ]
        return total, np.concatenate(pieces)


def moments_of(
    layout: Layout, parts: Sequence[Part], *, is_shifted: bool, scale: float
) -> tuple[list[Moments], NDArray[np.bool_], int]:
    """Return the moments of one cycle of prefixes and frame.

    Parameters
    ----------
    layout : Layout
        Prefixes and edge.
    parts : sequence of Part
        All over the same frame.
    is_shifted : bool
        Whether every subcarrier stands half a spacing higher.
    scale : float
        Amplitude of a subcarrier at 0 dB.

    Returns
    -------
    moments : list of Moments
    on : bool array, shape (n_states, n_parts)
        Which parts are on in each state.
    clock_samples : int
        Samples of the cycle.
    """
    on, numbers = states([part.presence for part in parts])
    known = [steady_samples(layout.n_fft, parts, row, is_shifted=is_shifted) * scale for row in on]
    n_cycle = math.lcm(layout.n_symbols, numbers.size)
    k = np.arange(n_cycle)
    prefixes = np.array(layout.prefixes)[k % layout.n_symbols]
    starts = np.concatenate(([0], np.cumsum(prefixes + layout.n_fft)))
    rows = np.stack((numbers[k % numbers.size], numbers[(k - 1) % numbers.size], prefixes), axis=1)
    if not layout.edge:
        rows[:, 1] = rows[:, 0]  # nothing of the symbol before is heard
    kinds, which = np.unique(rows, axis=0, return_inverse=True)
    made: list[Moments] = []
    for number, (now, before, prefix) in enumerate(kinds.tolist()):
        made += _of_kind(
            layout, known, (now, before), prefix, starts[:-1][which.reshape(-1) == number]
        )
    return made, on, int(starts[-1])


def _of_kind(
    layout: Layout,
    known: Sequence[Complexes],
    pair: tuple[int, int],
    prefix: int,
    starts: NDArray[np.int64],
) -> list[Moments]:
    """Return the steady part of symbols of a kind, and their edge in groups of samples."""
    now, before = pair
    n, edge = layout.n_fft, layout.edge
    own = known[now]
    tail = own[n - prefix :] if prefix else own[:0]
    steady = np.concatenate((tail[edge:], own)) if own.any() else None
    made = [Moments(sources=((now, 1.0),), starts=starts, low=edge, high=prefix + n, known=steady)]
    w = layout.rising
    mixed = w * tail[:edge] + (1 - w) * known[before][:edge]
    cuts = np.unique(np.rint(np.linspace(0, edge, MOST_EDGE_GROUPS + 1)).astype(int))
    for low, high in zip(cuts[:-1].tolist(), cuts[1:].tolist(), strict=True):
        rising = math.sqrt(float(np.mean(w[low:high] ** 2)))
        falling = math.sqrt(float(np.mean((1 - w[low:high]) ** 2)))
        some = mixed[low:high]
        made.append(
            Moments(
                sources=((now, rising), (before, falling)),
                starts=starts,
                low=low,
                high=high,
                known=some if some.any() else None,
                prefix=prefix,
            )
        )
    return made


@dataclass(frozen=True, eq=False, kw_only=True)
class OfdmTerm(BaseTerm):
    """OFDM with independent data: isotropic about what is known of each sample.

    Parameters
    ----------
    moments : tuple of Moments
        Of one clock.
    drawn : tuple of tuple of Drawn
        What each state draws.

    Notes
    -----
    The characteristic function of the data of a symbol is the product over its subcarriers of
    ``E[J0(t |a|)]``, that of points turned at random (their angles run over the symbol). What is
    known at a sample, ``s``, multiplies it by ``J0(t |s|)``. In the edge two symbols add,
    weighed. All is averaged over the samples of a clock. Derivation; compared with averages of
    the exact two-dimensional function over the samples in ``tests/truth/test_ofdm_law.py``.
    """

    moments: tuple[Moments, ...]
    drawn: tuple[tuple[Drawn, ...], ...]
    _last: dict[tuple[int, float], tuple[Reals, Reals]] = field(default_factory=dict, repr=False)

    def data_characteristic(self, sources: tuple[tuple[int, float], ...], t: Reals) -> Reals:
        """Return ``E[J0(t |x - s|)]`` of the data of weighed symbols."""
        total = np.ones(t.size)
        for state, gain in sources:
            total = total * self._of_state(state, gain, t)
        return total

    def _of_state(self, state: int, gain: float, t: Reals) -> Reals:
        kept = self._last.get((state, gain))
        if kept is not None and np.array_equal(kept[0], t):
            return kept[1]
        total = np.ones(t.size)
        for part in self.drawn[state]:
            rings, shares = part.rings
            waves = scipy.special.j0(np.multiply.outer(gain * t, rings))
            total *= (waves @ shares) ** part.count
        self._last[state, gain] = (t, total)
        return total

    def __getstate__(self) -> dict[str, object]:
        """Leave out what was computed last."""
        return vars(self) | {"_last": {}}

    def characteristic(self, t: Reals, *, residue: int = 0, modulus: int = 1) -> Reals:
        """Return ``E[J0(t R)]`` over the indices that leave a residue."""
        total, n_all = np.zeros(t.size), 0
        for moments in self.moments:
            count, known = moments.picked(residue, modulus)
            if not count:
                continue
            n_all += count
            value = self.data_characteristic(moments.sources, t)
            if known is not None:
                value = value * mean_bessel(np.abs(known), t)
            total += count * value
        return total / n_all

    def directional(
        self, t: Reals, angle_rad: Reals, *, residue: int = 0, modulus: int = 1
    ) -> Complexes:
        """Return the two-dimensional function over the indices that leave a residue."""
        total, n_all = np.zeros((t.size, angle_rad.size), np.complex128), 0
        for moments in self.moments:
            count, known = moments.picked(residue, modulus)
            if not count:
                continue
            n_all += count
            value = count * self.data_characteristic(moments.sources, t)[:, None]
            total += value if known is None else value * _mean_wave(known, t, angle_rad)
        return total / n_all

    @cached_property
    def is_uniform(self) -> bool:
        """Whether all samples have one law: no schedule, no edge, nothing known."""
        return all(m.known is None and m.sources == ((0, 1.0),) for m in self.moments)


def _mean_wave(known: Complexes, t: Reals, angle_rad: Reals) -> Complexes:
    """Return the mean of ``exp(j t Re(s exp(-j angle)))`` over known samples."""
    total = np.empty((t.size, angle_rad.size), np.complex128)
    step = max(_BLOCK // known.size, 1)
    for column, angle in enumerate(angle_rad):
        along = (known * np.exp(-1j * angle)).real
        for low in range(0, t.size, step):
            waves = np.exp(1j * np.multiply.outer(t[low : low + step], along))
            total[low : low + step, column] = waves.mean(axis=1)
    return total
