"""One symbol's characteristic function over radius and angle, as a few harmonics of the angle."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property, lru_cache

import numpy as np
import scipy.special

from wavegen.laws.term import Complexes, Reals

REACH = 48.0
"""Radii up to which the functions of the radius are kept in a table."""
_PER_UNIT = 32
"""Entries of the table for a radius of 1."""
_NODES = 8
_NOTHING = 1e-17
_MARGIN = 56


@dataclass(frozen=True, eq=False, kw_only=True)
class PointHarmonics:
    """``E[exp(j s Re(a exp(-j angle)))]`` of equally likely points with opposites.

    Parameters
    ----------
    points : complex128 array, shape (order,)
        Magnitudes of 1 and below; each point has its negative among them.

    Notes
    -----
    ``exp(j z cos x) = sum_m j^m J_m(z) exp(j m x)`` (Abramowitz and Stegun 9.1.41-45) for every
    point; odd orders cancel among opposites, and all but multiples of the points' own symmetry
    cancel too: of 8PSK orders 0, 8, 16 ... are left. Each order's function of the radius is a
    polynomial through the eight nearest entries of a table: it errs by less than
    ``(1/32)^8 43 / 8!``, 1e-15 (derivation).
    """

    points: Complexes

    @cached_property
    def _kept(self) -> tuple[list[tuple[int, bool]], Reals]:
        """Return orders with cosine (or sine), and their functions at the entries."""
        _, first, ring = np.unique(
            np.abs(self.points).round(12), return_index=True, return_inverse=True
        )
        radii = np.abs(self.points[first])
        angle = np.angle(self.points)
        places = np.arange(-3, REACH * _PER_UNIT + 6) / _PER_UNIT
        orders: list[tuple[int, bool]] = []
        rows: list[Reals] = []
        for order in range(0, int(REACH) + _MARGIN, 2):
            weights = np.zeros((2, radii.size))
            np.add.at(weights[0], ring, np.cos(order * angle) / angle.size)
            np.add.at(weights[1], ring, np.sin(order * angle) / angle.size)
            is_heard = np.abs(weights).max(axis=1) > 1e-12
            if not is_heard.any():
                continue
            bessel = _bessel(order, np.outer(radii, places))
            sign = (2.0 if order else 1.0) * (-1.0 if order % 4 else 1.0)
            for is_sine in np.flatnonzero(is_heard):
                orders.append((order, bool(is_sine)))
                rows.append(sign * (weights[is_sine] @ bessel))
        return orders, np.array(rows)

    @cached_property
    def _powers(self) -> Reals:
        """Return powers of the place in each step, shape (n_orders, 8, n_steps)."""
        rows = self._kept[1]
        windows = np.lib.stride_tricks.sliding_window_view(rows, _NODES, axis=1)
        return np.ascontiguousarray(np.swapaxes(windows @ through_eight().T, 1, 2))

    @cached_property
    def _starts(self) -> Reals:
        """Return the radii from which each order, and any after it, is heard; rising."""
        rows = np.abs(self._kept[1])[:, 3:]
        first = np.argmax(rows > _NOTHING, axis=1) / _PER_UNIT
        first[rows.max(axis=1) <= _NOTHING] = math.inf
        return np.asarray(np.minimum.accumulate(first[::-1])[::-1] - 1 / _PER_UNIT)

    def multiply(self, total: Reals, t: Reals, taps: Reals, angle_rad: Reals) -> None:
        """Multiply by the functions of symbols at taps.

        Parameters
        ----------
        total : float64 array, shape (t.size, angle.size)
            Changed in place.
        t : float64 array, shape (n,)
            Not negative.
        taps : float64 array, shape (n_taps,)
            By falling magnitude; ``t`` times each is at most ``REACH``.
        angle_rad : float64 array, shape (n_angles,)
            Directions.
        """
        sizes = np.abs(taps)
        n_heard = np.searchsorted(self._starts, sizes * float(t.max()), side="left")
        orders = self._kept[0][: int(n_heard.max(initial=0))]
        waves = np.array(
            [(np.sin if is_sine else np.cos)(order * angle_rad) for order, is_sine in orders]
        )
        place = np.outer(sizes, t) * _PER_UNIT
        number = place.astype(np.int64)
        place -= number
        values = np.empty((taps.size, t.size, len(orders)))
        for row, powers in enumerate(self._powers[: len(orders)]):
            count = int(np.count_nonzero(n_heard > row))  # the first ones: they are the largest
            at, part = number[:count], place[:count]
            value = powers[-1].take(at)
            for factor in powers[-2::-1]:
                value *= part
                value += factor.take(at)
            values[:count, :, row] = value
        for one, count in zip(values, n_heard, strict=True):
            total *= one[:, :count] @ waves[:count]


def _bessel(order: int, x: Reals) -> Reals:
    """Return ``J_order(x)`` of an even order, 0 where ``(x / 2)^order / order!`` says it is."""
    with np.errstate(divide="ignore"):
        size = order * np.log(np.abs(x) / 2) if order else np.zeros(x.shape)
    is_heard = size - math.lgamma(order + 1) > math.log(_NOTHING)
    out = np.zeros(x.shape)
    out[is_heard] = scipy.special.jv(order, x[is_heard])
    return out


def harmonics_of(points: Complexes) -> PointHarmonics:
    """Return the harmonics of points, made once for all that ask for the same points."""
    return _harmonics_of(np.ascontiguousarray(points, np.complex128).tobytes())


@lru_cache(maxsize=16)
def _harmonics_of(raw: bytes) -> PointHarmonics:
    return PointHarmonics(points=np.frombuffer(raw, np.complex128))


@lru_cache(maxsize=1)
def through_eight() -> Reals:
    """Return what turns eight entries, -3 ... 4, into coefficients of powers, shape (8, 8)."""
    places = np.arange(-3.0, 5.0)
    found = np.linalg.inv(np.vander(places, increasing=True))
    return np.asarray(np.rint(found * math.factorial(7)) / math.factorial(7))  # exact entries
