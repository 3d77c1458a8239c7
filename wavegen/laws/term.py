"""What a part tells of itself so that laws compose as signals do.

A *term* is a part of a composite as its law sees it. Terms of independent data multiply: the
characteristic function ``E[J0(t R)]`` of a sum of parts, whose relative phases are jointly
uniform, is the product of theirs at each common time index, averaged after
(:mod:`wavegen.laws.composite`). :func:`wavegen.laws.inversion.law_of_term` turns one term into a
law, :func:`wavegen.laws.composite.combine_terms` several into one term.

A source or combiner offers ``term(site) -> Term | NoLaw`` beside ``law(site) -> Law | NoLaw``.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from wavegen.laws.law import Holds

Reals = NDArray[np.float64]
Complexes = NDArray[np.complex128]


@dataclass(frozen=True, slots=True, kw_only=True)
class NoLaw:
    """What mathematics, or this program, has no law for.

    Parameters
    ----------
    reason : str
        Short and by name, for results: ``finite pattern: pn9 repeats after 511 bits``.
    """

    reason: str


class Term(Protocol):
    """A complex variable at each sample index: its statistics repeat after a clock.

    All amplitudes are on one scale of the term's own: ``mean_power`` is the mean of ``|x|^2``.
    """

    @property
    def name(self) -> str:
        """What it is called in results: ``QPSK, root raised cosine 0.22``."""

    @property
    def holds(self) -> Holds:
        """Whether one loop follows it exactly, or only the average over seeds."""

    @property
    def mean_power(self) -> float:
        """Mean of ``|x|^2`` over all indices."""

    @property
    def peak(self) -> float:
        """Highest amplitude ``|x|`` that can occur; ``inf`` if there is none."""

    @property
    def clock_samples(self) -> int:
        """Samples after which the statistics repeat, on the absolute index; 1 if stationary."""

    @property
    def symmetry(self) -> int:
        """Fold of the symmetry about zero, at every index and given all other indices' phase.

        0: isotropic, any turn leaves the law as it is (complex Gaussian). ``s`` >= 1: a turn by
        ``1/s`` of a circle does: 4 for QPSK and square QAM, 8 for 8PSK, 2 for BPSK, 1 for what is
        known or has a mean (an unmodulated carrier).
        """

    @property
    def data(self) -> frozenset[str]:
        """Streams of data it depends on; terms that have one in common are not independent."""

    @property
    def lowest_probability(self) -> float:
        """Lowest probability at which the law speaks for the data; 0 if at every one.

        A pseudo-random sequence of ``n`` bits serves down to ``10 / n``.
        """

    def characteristic(self, t: Reals, *, residue: int = 0, modulus: int = 1) -> Reals:
        """Return ``E[J0(t R)]`` over the indices that leave a residue.

        Parameters
        ----------
        t : float64 array, shape (n,)
            Not negative, in units of 1 over amplitude.
        residue, modulus : int
            Average over the indices ``n`` with ``n mod modulus = residue``; ``modulus`` divides
            ``clock_samples``. By default over all indices.

        Returns
        -------
        float64 array, shape (n,)
            1 at ``t`` = 0; exact to about 1e-14 absolute.
        """

    def directional(
        self, t: Reals, angle_rad: Reals, *, residue: int = 0, modulus: int = 1
    ) -> Complexes | None:
        """Return ``E[exp(j t Re(x exp(-j angle)))]``: the two-dimensional function, in polar form.

        Parameters
        ----------
        t : float64 array, shape (n,)
            Radius, not negative.
        angle_rad : float64 array, shape (m,)
            Direction.
        residue, modulus : int
            As in :meth:`characteristic`, which is the average of this over the angle.

        Returns
        -------
        complex128 array, shape (n, m), or None
            None where it is not known: such a term joins others whose phases run freely only.
        """


@dataclass(frozen=True, eq=False, kw_only=True)
class BaseTerm:
    """Base of the terms here: what is common, with defaults of a stationary isotropic part.

    Parameters
    ----------
    name, holds, mean_power, peak, clock_samples, symmetry, data, lowest_probability
        See :class:`Term`.

    Notes
    -----
    A subclass states :meth:`characteristic`; one that is not isotropic states
    :meth:`directional` too.
    """

    name: str
    holds: Holds = "over seeds"
    mean_power: float = 1.0
    peak: float = math.inf
    clock_samples: int = 1
    symmetry: int = 0
    data: frozenset[str] = frozenset()
    lowest_probability: float = 0.0

    def characteristic(self, t: Reals, *, residue: int = 0, modulus: int = 1) -> Reals:
        """Return ``E[J0(t R)]`` over the indices that leave a residue."""
        raise TypeError(type(self).__name__)  # the base only describes

    def directional(
        self, t: Reals, angle_rad: Reals, *, residue: int = 0, modulus: int = 1
    ) -> Complexes | None:
        """Return the two-dimensional function; that of an isotropic term has no direction."""
        flat = self.characteristic(t, residue=residue, modulus=modulus).astype(np.complex128)
        return np.repeat(flat[:, None], angle_rad.size, axis=1)


@dataclass(frozen=True, eq=False, kw_only=True)
class Scaled(BaseTerm):
    """A term at another level and phase. Use :meth:`of`.

    Parameters
    ----------
    inner : Term
        The term.
    gain : float
        Amplitude ratio, above 0.
    turn_rad : float
        Angle that it is turned by.
    """

    inner: Term
    gain: float
    turn_rad: float = 0.0

    @classmethod
    def of(cls, inner: Term, *, gain: float, turn_rad: float = 0.0) -> Scaled:
        """Return a term times ``gain exp(j turn)``."""
        return cls(
            name=inner.name,
            holds=inner.holds,
            mean_power=inner.mean_power * gain**2,
            peak=inner.peak * gain,
            clock_samples=inner.clock_samples,
            symmetry=inner.symmetry,
            data=inner.data,
            lowest_probability=inner.lowest_probability,
            inner=inner,
            gain=gain,
            turn_rad=turn_rad,
        )

    def characteristic(self, t: Reals, *, residue: int = 0, modulus: int = 1) -> Reals:
        """Return ``E[J0(t R)]`` over the indices that leave a residue."""
        return self.inner.characteristic(self.gain * t, residue=residue, modulus=modulus)

    def directional(
        self, t: Reals, angle_rad: Reals, *, residue: int = 0, modulus: int = 1
    ) -> Complexes | None:
        """Return the two-dimensional function, turned."""
        return self.inner.directional(
            self.gain * t, angle_rad - self.turn_rad, residue=residue, modulus=modulus
        )


@dataclass(frozen=True, eq=False, kw_only=True)
class GaussianTerm(BaseTerm):
    """Complex Gaussian noise: ``exp(-t^2 P / 4)`` at a mean power ``P``."""

    name: str = "complex Gaussian"

    def characteristic(self, t: Reals, *, residue: int = 0, modulus: int = 1) -> Reals:
        """Return ``E[J0(t R)]``; all indices are alike."""
        return np.exp(-0.25 * self.mean_power * t**2)
