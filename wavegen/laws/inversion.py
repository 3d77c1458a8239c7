"""From the characteristic function ``E[J0(t R)]`` of an envelope to its law."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache
from typing import Protocol, runtime_checkable

import numpy as np
import scipy.special

from wavegen.laws.law import Holds, Law
from wavegen.laws.radial import RadialLaw
from wavegen.laws.term import NoLaw, Reals, Scaled, Term

MOST_TERMS = 1 << 17
"""Terms of the series; beyond, the envelope is blurred by as little as they allow."""
FIRST_TERMS = 256
NEXT_TERMS = 64
FEW_TERMS = 1 << 12
NEGLIGIBLE = 1e-14
"""Characteristic functions below this times the root of the number of terms end the series."""
SLIGHT = 1e-10
"""Functions below this at the end of the longest series are left: some 1e-12 of probability."""
EMPTY = 1e-12
"""Probability left above the radius of the series, at most."""
BLUR_DB = 2e-4
"""Blur that is accepted, dB of the mean's amplitude for one standard deviation."""
_WIDEST = 1e4
_BLOCK = 1 << 18


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class BesselSeries:
    """``P(R > r)`` as a Fourier-Bessel series.

    Parameters
    ----------
    zeros, weights : float64 array, shape (n_terms,)
        Zeros of ``J0`` over ``L``; ``2 Phi(a_n / L) / (a_n J1(a_n)^2 L)``.
    """

    zeros: Reals
    weights: Reals

    def above(self, radius: Reals) -> Reals:
        """Return ``P(R > r)`` of a flat array of radii, good to about 1e-13."""
        total = np.zeros(radius.size)
        rows = max(1, _BLOCK // max(radius.size, 1))
        for low in range(0, self.zeros.size, rows):
            part = slice(low, low + rows)
            total += self.weights[part] @ scipy.special.j1(np.outer(self.zeros[part], radius))
        return np.asarray(1 - radius * total)


def law_of_characteristic(
    characteristic: Callable[[Reals], Reals],
    *,
    name: str,
    holds: Holds,
    mean_power: float,
    peak: float = math.inf,
    lowest_probability: float = 0.0,
    most_terms: int = MOST_TERMS,
) -> RadialLaw | NoLaw:
    """Invert the characteristic function of an envelope.

    Parameters
    ----------
    characteristic : callable
        ``t -> E[J0(t R)]`` for a float64 array, exact to about 1e-14.
    name, holds, lowest_probability
        Handed on.
    mean_power : float
        Mean of ``R^2``.
    peak : float
        Highest ``R``, or ``inf``. A bound will do.
    most_terms : int
        Longest series.

    Returns
    -------
    RadialLaw or NoLaw
        No law where the series would have to be longer.

    Notes
    -----
    ``P(R > r) = 1 - (2 r / L) sum_n Phi(a_n / L) J1(a_n r / L) / (a_n J1(a_n)^2)``, ``a_n`` the
    zeros of ``J0``: the Fourier-Bessel series on ``[0, L]`` of the density, integrated
    (derivation; the integral it stands for: J. C. Kluyver, Proc. KNAW 8, 1905). It is exact where
    no probability lies above ``L``, and its absolute error is that of the arithmetic, some 1e-14
    times the number of terms' root: 0.001 dB of a level is 0.5 % of its probability or more
    (Gaussian noise at 1e-9: 4.8 per dB), so that 1e-12 serves down to 1e-9.

    ``L`` is the peak, or is doubled until nothing is left near it. Where the function falls
    slowly the envelope is that of ``x`` plus complex Gaussian noise of standard deviation
    ``s``, which moves no level by more than 4.5 ``s`` down to 1e-9; it must stay below
    ``BLUR_DB``.
    """
    rms = math.sqrt(mean_power)
    radius = min(peak * (1 + 1e-9), 6.0 * rms)
    while True:
        made = series_of(
            characteristic,
            radius=radius,
            most_terms=most_terms,
            blur=rms * (10 ** (BLUR_DB / 20) - 1),
        )
        if isinstance(made, NoLaw):
            return made
        if radius >= peak or _is_empty(made, radius):
            return RadialLaw(
                name=name,
                holds=holds,
                mean_power=mean_power,
                peak=peak,
                radius=radius,
                tail=made,
                lowest_probability=lowest_probability,
            )
        if radius > _WIDEST * rms:
            return NoLaw(reason=f"{name}: its tail has no end")
        radius = min(peak * (1 + 1e-9), 1.5 * radius)


@runtime_checkable
class KnowsLaw(Protocol):
    """A term that has a better way to its law than the series."""

    def law(self) -> Law | NoLaw:
        """Return the law."""


def law_of_term(term: Term) -> Law | NoLaw:
    """Return the law of one term: its own way, else by inversion of its function.

    Parameters
    ----------
    term : Term
        On any scale.

    Returns
    -------
    Law or NoLaw
    """
    inner = term.inner if isinstance(term, Scaled) else term  # levels are over the mean
    if isinstance(inner, KnowsLaw):
        return inner.law()
    return law_of_characteristic(
        term.characteristic,
        name=term.name,
        holds=term.holds,
        mean_power=term.mean_power,
        peak=term.peak,
        lowest_probability=term.lowest_probability,
    )


@lru_cache(maxsize=2)
def bessel_zeros(count: int) -> Reals:
    """Return the first zeros of ``J0``, shape (count,).

    Notes
    -----
    McMahon's expansion (Abramowitz and Stegun 9.5.12), then Newton's method twice.

    Examples
    --------
    >>> bessel_zeros(2).round(6).tolist()
    [2.404826, 5.520078]
    """
    b = (np.arange(1, count + 1) - 0.25) * np.pi
    zeros = b + 1 / (8 * b) - 124 / (3 * (8 * b) ** 3) + 120928 / (15 * (8 * b) ** 5)
    for _ in range(2):
        zeros += scipy.special.j0(zeros) / scipy.special.j1(zeros)
    zeros.flags.writeable = False
    return np.asarray(zeros)


def series_of(
    characteristic: Callable[[Reals], Reals], *, radius: float, most_terms: int, blur: float
) -> BesselSeries | NoLaw:
    """Return as many terms of the series of an envelope as matter.

    Parameters
    ----------
    characteristic : callable
        ``t -> E[J0(t R)]``.
    radius : float
        ``L``: the envelope stays below.
    most_terms : int
        Longest series.
    blur : float
        Widest standard deviation of noise that may be added to end the series by then.

    Returns
    -------
    BesselSeries or NoLaw
    """
    pieces: list[Reals] = []
    count, block = 0, FIRST_TERMS
    left = math.inf
    zeros = bessel_zeros(min(most_terms, FEW_TERMS))
    while count < most_terms:
        if count + block > zeros.size:
            zeros = bessel_zeros(most_terms)
        part = zeros[count : count + block]
        piece = characteristic(part / radius)
        pieces.append(piece)
        count += part.size
        left = float(np.max(np.abs(piece)))
        if left < NEGLIGIBLE * math.sqrt(count):
            break
        block = max(NEXT_TERMS, count // 8)
    phi = np.concatenate(pieces)
    a: Reals = zeros[:count]
    if left >= SLIGHT:
        wanted = 2 * math.sqrt(math.log(left / 1e-14)) * radius / float(a[-1])
        if wanted > blur:
            return NoLaw(
                reason=f"its characteristic function falls too slowly for {most_terms} terms"
            )
        phi *= np.exp(-0.25 * (wanted * a / radius) ** 2)
    return BesselSeries(zeros=a / radius, weights=2 * phi / (a * scipy.special.j1(a) ** 2 * radius))


def _is_empty(series: BesselSeries, radius: float) -> bool:
    """Return whether nothing is left near the radius of a series.

    A radius too small shows as probabilities below 0 as well as above.
    """
    return bool(np.max(np.abs(series.above(radius * np.linspace(0.8, 0.999, 40)))) < EMPTY)
