"""Sums of phasors with independent uniform phases: how random walks of given steps end."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.special
from numpy.typing import NDArray

from wavegen.laws.constant import ConstantLaw
from wavegen.laws.inversion import law_of_characteristic
from wavegen.laws.law import Holds, Law
from wavegen.laws.radial import RadialLaw
from wavegen.laws.term import NoLaw, Reals

MOST_BY_QUADRATURE = 4
_NODES = 33
_REACH = 3.2
"""Of the double-exponential rule: beyond, its weights are below 1e-15."""


def phasor_law(
    amplitudes: NDArray[np.float64], *, name: str, holds: Holds = "over seeds"
) -> Law | NoLaw:
    """Return the law of a sum of phasors whose phases are independent and uniform.

    Parameters
    ----------
    amplitudes : float64 array, shape (n,)
        Above 0, any scale.
    name, holds
        Handed on.

    Returns
    -------
    Law or NoLaw

    Notes
    -----
    One: constant. Two: ``P(R^2 > x) = acos((x - a^2 - b^2) / 2ab) / pi``. Three and four: the
    angles between them, integrated piece by piece by the double-exponential rule (H. Takahasi,
    M. Mori, Publ. RIMS 9, 1974), as the series falls slowly. More: the series of
    :func:`wavegen.laws.inversion.law_of_characteristic` on the product of ``J0(a t)`` (J. C.
    Kluyver, Proc. KNAW 8, 1905).
    """
    sizes = np.sort(np.asarray(amplitudes, dtype=np.float64))[::-1]
    power = float(np.sum(sizes**2))
    if sizes.size == 1:
        return ConstantLaw(holds=holds)
    peak = float(sizes.sum())
    if sizes.size <= MOST_BY_QUADRATURE:
        return RadialLaw(
            name=name,
            holds=holds,
            mean_power=power,
            peak=peak,
            radius=peak,
            tail=FewPhasors(amplitudes=tuple(sizes.tolist())),
        )
    return law_of_characteristic(
        lambda t: phasor_characteristic(sizes, t),
        name=name,
        holds=holds,
        mean_power=power,
        peak=peak,
    )


def phasor_characteristic(amplitudes: Reals, t: Reals) -> Reals:
    """Return the product of ``J0(a t)`` over phasors, shape of ``t``."""
    sizes, counts = np.unique(amplitudes, return_counts=True)
    product = np.ones_like(t)
    for size, count in zip(sizes, counts, strict=True):
        product *= scipy.special.j0(size * t) ** count
    return product


@dataclass(frozen=True, slots=True, kw_only=True)
class FewPhasors:
    """``P(R > r)`` of two to four phasors.

    Parameters
    ----------
    amplitudes : tuple of float
        Largest first.
    """

    amplitudes: tuple[float, ...]

    def above(self, radius: Reals) -> Reals:
        """Return the probability above each radius of a flat array."""
        a, b, *rest = self.amplitudes
        if not rest:
            return share_above(radius, np.float64(a), b)
        if len(rest) == 1:
            first = np.full(radius.shape, a)
            return _three(radius, first, b, rest[0])
        parts = [
            _four(piece, a, b, *rest) for piece in np.array_split(radius, -(-radius.size // 16))
        ]
        return np.concatenate(parts)


def share_above(radius: Reals, first: Reals | np.float64, second: float) -> Reals:
    """Return the probability that two phasors add to more than a radius.

    Parameters
    ----------
    radius, first : float64 array
        Broadcast together.
    second : float
        Above 0.
    """
    low = np.abs(first - second)
    # Half-angle form: no cancellation where the two are nearly equal or the sum nearly straight.
    with np.errstate(divide="ignore", invalid="ignore"):
        share = (radius - low) * (radius + low) / (4 * first * second)
    share = np.where(first * second > 0, share, np.where(radius >= low, 1.0, 0.0))
    return np.asarray(1 - (2 / np.pi) * np.arcsin(np.sqrt(np.clip(share, 0.0, 1.0))))


def _three(radius: Reals, first: Reals, second: float, third: float) -> Reals:
    """Return the mean of :func:`share_above` over the angle between the first two.

    ``radius`` and ``first`` have one shape; so has the result.
    """
    edges = np.stack([np.abs(radius - third), radius + third], axis=-1)
    angle, weight = _pieces(_angle_at(edges, first[..., None], second))
    pair = _joined(angle, first[..., None], second)
    return np.asarray(np.sum(weight * share_above(radius[..., None], pair, third), axis=-1))


def _four(radius: Reals, a: float, b: float, c: float, d: float) -> Reals:
    """Return the same for four, over the angle between the first two."""
    corners = [abs(c - d), c + d]
    edges = np.stack(
        [np.abs(radius - corner) for corner in corners] + [radius + corner for corner in corners],
        axis=-1,
    )
    angle, weight = _pieces(_angle_at(edges, np.float64(a), b))
    pair = _joined(angle, np.float64(a), b)
    wide = np.broadcast_to(radius[:, None], pair.shape)
    return np.asarray(np.sum(weight * _three(wide, pair, c, d), axis=-1))


def _joined(angle: Reals, first: Reals | np.float64, second: float) -> Reals:
    """Return the length of two phasors at an angle."""
    return np.asarray(np.sqrt((first - second) ** 2 + 4 * first * second * np.cos(angle / 2) ** 2))


def _angle_at(length: Reals, first: Reals | np.float64, second: float) -> Reals:
    """Return the angle at which two phasors have a length; 0 or pi beyond."""
    low = np.abs(first - second)
    with np.errstate(divide="ignore", invalid="ignore"):
        share = (length - low) * (length + low) / (4 * first * second)
    share = np.where(np.isfinite(share), share, 1.0)
    return np.asarray(2 * np.arccos(np.sqrt(np.clip(share, 0.0, 1.0))))


def _pieces(edges: Reals) -> tuple[Reals, Reals]:
    """Return nodes and weights on [0, pi], cut at edges (last axis); weights sum to 1."""
    cuts = np.sort(edges, axis=-1)
    shape = (*cuts.shape[:-1], 1)
    cuts = np.concatenate([np.zeros(shape), cuts, np.full(shape, np.pi)], axis=-1)
    middle = 0.5 * (cuts[..., 1:] + cuts[..., :-1])[..., None]
    half = 0.5 * (cuts[..., 1:] - cuts[..., :-1])[..., None]
    u = np.linspace(-_REACH, _REACH, _NODES)
    inner = 0.5 * np.pi * np.sinh(u)
    node = np.tanh(inner)
    weight = 0.5 * np.pi * np.cosh(u) / np.cosh(inner) ** 2
    weight *= 2 / weight.sum()
    flat = (*cuts.shape[:-1], -1)
    return (middle + half * node).reshape(flat), (half * weight / np.pi).reshape(flat)
