"""Terms through operations: what a part of a sum becomes behind a delay, a gate or a clip."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import scipy.special
from numpy.typing import NDArray

from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.law import Law, to_db
from wavegen.laws.mapped import amplitude_reach
from wavegen.laws.panels import nodes_of, panel_edges
from wavegen.laws.term import BaseTerm, Complexes, GaussianTerm, NoLaw, Reals, Term

_PANELS = 128
_BLOCK = 1 << 20
MOST_AMPLITUDES = 256
"""Different amplitudes of ramps that are told apart; more are gathered into so many."""


def filtered_law(source: Law, *, how: str = "filtered") -> Law | NoLaw:
    """Return the law behind a linear filter: complex Gaussian stays so, others have none.

    Parameters
    ----------
    source : Law
        Of the input.
    how : str
        What is done to it, for the reason: ``filtered``, ``resampled``.
    """
    if isinstance(source, GaussianLaw):
        return source
    return NoLaw(reason=f"{source.name}, {how}, has no law")


def filtered_term(source: Term, *, how: str = "filtered") -> Term | NoLaw:
    """Return what a part is behind a linear filter that keeps its mean power."""
    if isinstance(source, GaussianTerm):
        return source
    return NoLaw(reason=f"{source.name}, {how}, has no law")


@dataclass(frozen=True, eq=False, kw_only=True)
class DelayedTerm(BaseTerm):
    """A term that comes whole samples later. Use :meth:`of`.

    Parameters
    ----------
    inner : Term
        The term.
    lag : int
        Delay, samples.
    """

    inner: Term
    lag: int

    @classmethod
    def of(cls, inner: Term, lag: int) -> DelayedTerm:
        """Return a term delayed by whole samples."""
        return cls(
            name=inner.name,
            holds=inner.holds,
            mean_power=inner.mean_power,
            peak=inner.peak,
            clock_samples=inner.clock_samples,
            symmetry=inner.symmetry,
            data=inner.data,
            lowest_probability=inner.lowest_probability,
            inner=inner,
            lag=lag,
        )

    def characteristic(self, t: Reals, *, residue: int = 0, modulus: int = 1) -> Reals:
        """Return ``E[J0(t R)]`` over the indices that leave a residue."""
        return self.inner.characteristic(t, residue=(residue - self.lag) % modulus, modulus=modulus)

    def directional(
        self, t: Reals, angle_rad: Reals, *, residue: int = 0, modulus: int = 1
    ) -> Complexes | None:
        """Return the two-dimensional function over the indices that leave a residue."""
        return self.inner.directional(
            t, angle_rad, residue=(residue - self.lag) % modulus, modulus=modulus
        )


@dataclass(frozen=True, eq=False, kw_only=True)
class GatedTerm(BaseTerm):
    """A term while a gate is open. Use :meth:`of`.

    Parameters
    ----------
    inner : Term
        The term.
    gains : float64 array, shape (period,)
        Amplitude of the gate at each index of its period.

    Notes
    -----
    ``mean_power`` takes the power of the inner term as the same in the gate and out of it: not so
    for symbols that keep time with the gate, by as little as they are gated unevenly.
    """

    inner: Term
    gains: Reals

    @classmethod
    def of(cls, inner: Term, gains: Reals) -> GatedTerm:
        """Return a term times a periodic amplitude."""
        return cls(
            name=f"{inner.name}, gated",
            holds=inner.holds,
            mean_power=inner.mean_power * float(np.mean(gains**2)),
            peak=inner.peak * float(gains.max()),
            clock_samples=math.lcm(inner.clock_samples, gains.size),
            symmetry=inner.symmetry,
            data=inner.data,
            lowest_probability=inner.lowest_probability,
            inner=inner,
            gains=gains,
        )

    def _weights(self, residue: int, modulus: int) -> list[tuple[float, int, int, float]]:
        """Return ``(gain, residue, modulus, share)`` of the inner term over some indices."""
        clock = self.inner.clock_samples
        shared = math.gcd(clock, self.gains.size)
        inner_modulus = math.lcm(shared, math.gcd(modulus, clock))
        n = np.arange(residue, math.lcm(self.gains.size, inner_modulus, modulus), modulus)
        gains = _gathered(self.gains)[n % self.gains.size]
        pairs = np.stack((gains, n % inner_modulus), axis=1)
        found, counts = np.unique(pairs, axis=0, return_counts=True)
        return [
            (float(gain), int(place), inner_modulus, count / n.size)
            for (gain, place), count in zip(found, counts, strict=True)
        ]

    def characteristic(self, t: Reals, *, residue: int = 0, modulus: int = 1) -> Reals:
        """Return ``E[J0(t R)]`` over the indices that leave a residue."""
        total = np.zeros(t.size)
        for gain, place, inner_modulus, share in self._weights(residue, modulus):
            total += share * self.inner.characteristic(
                gain * t, residue=place, modulus=inner_modulus
            )
        return total

    def directional(
        self, t: Reals, angle_rad: Reals, *, residue: int = 0, modulus: int = 1
    ) -> Complexes | None:
        """Return the two-dimensional function over the indices that leave a residue."""
        total = np.zeros((t.size, angle_rad.size), np.complex128)
        for gain, place, inner_modulus, share in self._weights(residue, modulus):
            value = self.inner.directional(
                gain * t, angle_rad, residue=place, modulus=inner_modulus
            )
            if value is None:
                return None
            total += share * value
        return total


def _gathered(gains: Reals) -> Reals:
    """Return amplitudes with no more than 256 different ones between zero and full."""
    different = np.unique(gains)
    if different.size <= MOST_AMPLITUDES + 2:
        return gains
    place = np.rint(gains * MOST_AMPLITUDES).astype(np.int64)
    place[(place == 0) & (gains > 0)] = 1
    place[(place == MOST_AMPLITUDES) & (gains < 1)] = MOST_AMPLITUDES - 1
    squares = np.bincount(place, weights=gains**2)
    counts = np.maximum(np.bincount(place), 1)
    return np.asarray(np.sqrt(squares / counts)[place])


@dataclass(frozen=True, eq=False, kw_only=True)
class EnvelopeTerm(BaseTerm):
    """An isotropic, stationary term whose envelope follows a law: a clipped Gaussian signal.

    Parameters
    ----------
    law : Law
        Of the envelope over its mean; ``mean_power`` sets the scale.

    Notes
    -----
    ``E[J0(t R)] = 1 - t int J1(t r) P(R > r) dr`` (derivation: by parts).
    """

    law: Law

    @cached_property
    def _table(self) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        edges = panel_edges(0.0, amplitude_reach(self.law), n_panels=_PANELS)
        nodes, weights = nodes_of(edges)
        return nodes.ravel(), (weights * self.law.ccdf(to_db(nodes**2))).ravel()

    def characteristic(self, t: Reals, *, residue: int = 0, modulus: int = 1) -> Reals:
        """Return ``E[J0(t R)]``; all indices are alike."""
        nodes, weights = self._table
        scaled = t * math.sqrt(self.mean_power)
        total = np.empty(t.size)
        step = max(_BLOCK // nodes.size, 1)
        for low in range(0, t.size, step):
            some = scaled[low : low + step]
            total[low : low + step] = 1 - some * (
                scipy.special.j1(np.multiply.outer(some, nodes)) @ weights
            )
        return total
