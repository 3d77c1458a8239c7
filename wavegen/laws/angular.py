"""Independent symbols of any constellation times taps, at one instant: by angle."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from typing import Protocol, Self

import numpy as np

from wavegen.core.errors import SignalError
from wavegen.laws.cumulants import ORDER, count_large, cumulants, power_sums
from wavegen.laws.harmonics import REACH, harmonics_of
from wavegen.laws.inversion import series_of
from wavegen.laws.radial import Tail
from wavegen.laws.term import Complexes, NoLaw, Reals

MOST_TERMS = 1 << 12
"""Terms of a series: each needs an average over more directions than the one before."""
MOST_BLUR = 3e-5
"""Blur accepted of an envelope whose function is not over by then, over its peak."""
MOST_LISTED = 1 << 18
"""Values of an envelope that are listed one by one."""

_CELLS = 1 << 15
_MARGIN = 48
_ROWS = 64
_PLACES = 1e8
"""Points closer than 1 over this are taken for one."""


class Directional(Protocol):
    """Part of a sum whose two-dimensional function is known."""

    def directional(self, t: Reals, angle_rad: Reals) -> Complexes:
        """Return ``E[exp(j t Re(x exp(-j angle)))]``, shape (t.size, angle.size)."""

    def reach(self, angle_rad: Reals) -> Reals:
        """Return the highest ``Re(x exp(-j angle))``."""

    def listed(self) -> tuple[Complexes, Reals] | None:
        """Return all values and their probabilities, None where there are too many."""


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class ListedEnvelope:
    """An envelope of so few values that they are listed.

    Parameters
    ----------
    envelope, over : float64 array, shape (n,) and (n + 1,)
        Values, rising; the probability of the values from each on.
    """

    envelope: Reals
    over: Reals

    @classmethod
    def of(cls, values: Complexes, weights: Reals) -> ListedEnvelope:
        """Return the envelope of values with given probabilities."""
        envelope = np.abs(values)
        order = np.argsort(envelope)
        over = np.concatenate([np.cumsum(weights[order][::-1])[::-1], [0.0]])
        return cls(envelope=envelope[order], over=over)

    def above(self, radius: Reals) -> Reals:
        """Return ``P(R > r)`` of a flat array of radii; equal to within 1e-12 counts as equal."""
        place = np.searchsorted(self.envelope, radius * (1 + 1e-12), side="right")
        return self.over.take(place)


@dataclass(frozen=True, slots=True, kw_only=True)
class MirroredGrid:
    """Points that are their own mirror images about both axes, by columns.

    Parameters
    ----------
    columns : tuple of (tuple of (float, float), tuple of (float, float))
        For all columns of the same points: distance and weight of each column, then those of the
        points in them. Weights add up to 1 over all products.
    """

    columns: tuple[tuple[tuple[tuple[float, float], ...], tuple[tuple[float, float], ...]], ...]

    @classmethod
    def of(cls, points: Complexes) -> Self | None:
        """Return the columns, None where points have no mirror images or share few columns."""
        places = [
            (round(float(x) * _PLACES), round(float(y) * _PLACES))
            for x, y in zip(points.real, points.imag, strict=True)
        ]
        keys = set(places)
        is_mirrored = all((-x, y) in keys and (x, -y) in keys for x, y in keys)
        if not is_mirrored or len(keys) != points.size:
            return None
        columns: dict[int, float] = {}
        rows: dict[int, float] = {}
        members: dict[int, set[int]] = {}
        for point, (x, y) in zip(points, places, strict=True):
            columns[abs(x)] = abs(float(point.real))
            rows[abs(y)] = abs(float(point.imag))
            members.setdefault(abs(x), set()).add(abs(y))
        if 2 * (len(columns) + len(rows)) > points.size // 2:
            return None
        alike: dict[frozenset[int], list[int]] = {}
        for x, ys in members.items():
            alike.setdefault(frozenset(ys), []).append(x)
        made = tuple(
            (
                tuple((columns[x], (2.0 if x else 1.0) / points.size) for x in sorted(xs)),
                tuple((rows[y], 2.0 if y else 1.0) for y in sorted(ys)),
            )
            for ys, xs in alike.items()
        )
        return cls(columns=made)

    def mean(self, across: Reals, up: Reals) -> Reals:
        """Return the mean of ``exp(j (x across + y up))`` over the points."""
        total = np.zeros(across.shape)
        cosines: dict[float, Reals] = {}
        for columns, points in self.columns:
            inner = np.zeros(across.shape)
            for y, weight in points:
                if y not in cosines:
                    cosines[y] = np.cos(y * up)
                inner += weight * cosines[y]
            outer = np.zeros(across.shape)
            for x, weight in columns:
                outer += weight * np.cos(x * across)
            total += outer * inner
        return total


@dataclass(frozen=True, eq=False, kw_only=True)
class PointGroup:
    """``sum_k a_k h_k`` with independent, equally likely symbols ``a_k``.

    Parameters
    ----------
    points : complex128 array, shape (order,)
        Symbols.
    taps : float64 array, shape (n_taps,)
        ``h_k``.
    has_opposites : bool
        Whether each point has its negative among them.
    """

    points: Complexes
    taps: Reals
    has_opposites: bool

    @cached_property
    def _scaled(self) -> tuple[Reals, Reals]:
        """Taps times the largest point, largest first, and their power sums."""
        order = np.argsort(-np.abs(self.taps))
        scaled = self.taps[order] * np.abs(self.points).max()
        heard = scaled[np.abs(scaled) > 1e-13 * np.abs(scaled).max(initial=0.0)]
        return heard, power_sums(heard)

    def listed(self) -> tuple[Complexes, Reals] | None:
        """Return all values and their probabilities, None where there are too many."""
        heard = self._scaled[0] / np.abs(self.points).max()
        if heard.size * math.log(self.points.size) > math.log(MOST_LISTED):
            return None
        values = np.zeros(1, np.complex128)
        for tap in heard:
            values = np.add.outer(values, tap * self.points).ravel()
        return values, np.full(values.size, 1 / values.size)

    def reach(self, angle_rad: Reals) -> Reals:
        """Return the highest ``Re(x exp(-j angle))``."""
        along = np.real(self.points[:, None] * np.exp(-1j * angle_rad))
        positive = self.taps[self.taps > 0].sum()
        negative = self.taps[self.taps < 0].sum()
        return np.asarray(positive * along.max(axis=0) + negative * along.min(axis=0))

    def directional(self, t: Reals, angle_rad: Reals) -> Complexes:
        """Return ``E[exp(j t Re(x exp(-j angle)))]``, shape (t.size, angle.size)."""
        taps, sums = self._scaled
        points = self.points / np.abs(self.points).max()
        along = np.real(points[:, None] * np.exp(-1j * angle_rad))
        n_large = count_large(taps, float(t.max(initial=0.0)))
        kappa = cumulants(along)
        stride = 2 if self.has_opposites else 1
        exponent = np.zeros((t.size, angle_rad.size), np.complex128)
        for order in range(stride, ORDER + 1, stride):
            weight = (1j**order) * sums[n_large, order - 1] * t**order
            exponent += weight[:, None] * kappa[order - 1]
        if not self.has_opposites:
            total = np.exp(exponent)
            for tap in taps[:n_large]:
                scaled = 1j * (t * tap)[:, None]
                total *= sum(np.exp(scaled * one) for one in along) / along.shape[0]
            return total
        real = np.exp(exponent.real)
        n_far = int(np.count_nonzero(np.abs(taps[:n_large]) * t.max(initial=0.0) > REACH))
        if n_far < n_large:
            harmonics_of(points).multiply(real, t, taps[n_far:n_large], angle_rad)
        if self._grid is not None:
            across, up = np.cos(angle_rad), np.sin(angle_rad)
            for tap in taps[:n_far]:
                real *= self._grid.mean((t * tap)[:, None] * across, (t * tap)[:, None] * up)
            return real.astype(np.complex128)
        along = along[np.angle(points * np.exp(-1e-3j)) >= 0]  # one of each pair
        for tap in taps[:n_far]:
            scaled = (t * tap)[:, None]
            factor = np.cos(scaled * along[0])
            for one in along[1:]:
                factor += np.cos(scaled * one)
            real *= factor
            real /= along.shape[0]
        return real.astype(np.complex128)

    @cached_property
    def _grid(self) -> MirroredGrid | None:
        return MirroredGrid.of(self.points / np.abs(self.points).max())


@dataclass(frozen=True, eq=False, kw_only=True)
class AngularSum:
    """Independent parts, each turned by an angle.

    Parameters
    ----------
    parts : tuple of (Directional, float)
        Parts, and the angle that each is turned by, radians.
    symmetry : int
        The sum turned by ``1 / symmetry`` of a circle has the same law.
    is_mirrored : bool
        The sum has the law of its conjugate.
    """

    parts: tuple[tuple[Directional, float], ...]
    symmetry: int
    is_mirrored: bool

    @cached_property
    def peak(self) -> float:
        """Highest envelope, or a bound 3e-7 above it: the reach in the farthest direction."""
        angle = np.linspace(0.0, 2 * np.pi, 1 << 12, endpoint=False)
        reach = np.zeros(angle.size)
        for part, turn in self.parts:
            reach += part.reach(angle - turn)
        return float(reach.max() / np.cos(np.pi / angle.size))

    def characteristic(self, t: Reals) -> Reals:
        """Return ``E[J0(t R)]``: the average of :meth:`directional` over the angle."""
        out = np.empty(t.size)
        start = 0
        while start < t.size:
            n = self._n_angles(float(t[start : start + _ROWS].max()))
            part = t[start : start + max(1, min(_ROWS, _CELLS // n))]
            width = 2 * np.pi / self._fold
            if self.is_mirrored:
                n = (n + 1) // 2
                half = width / 2 / n
                angle = np.linspace(half / 2, width / 2 - half / 2, n)
            else:
                angle = np.linspace(0.0, width, n, endpoint=False)
            out[start : start + part.size] = self.directional(part, angle).real.mean(axis=1)
            start += part.size
        return out

    def above(self, radius: Reals) -> Reals:
        """Return ``P(R > r)`` of a flat array of radii.

        Raises
        ------
        SignalError
            There is no :attr:`tail`.
        """
        if self.tail is None:
            raise SignalError(
                where="envelope",
                problem="its law is not known here",
                allowed="sums whose characteristic function falls fast enough",
                remedy="Choose a pulse that spreads over more symbols.",
            )
        return self.tail.above(radius)

    @cached_property
    def tail(self) -> Tail | None:
        """``P(R > r)``; None where the envelope is too sharp for a series."""
        few = self.listed()
        if few is not None:
            return few
        made = series_of(
            self.characteristic, radius=self.peak, most_terms=MOST_TERMS, blur=MOST_BLUR
        )
        return None if isinstance(made, NoLaw) else made

    def listed(self) -> ListedEnvelope | None:
        """Return every envelope with its probability, None where there are too many."""
        values, weights = np.zeros(1, np.complex128), np.ones(1)
        for part, turn in self.parts:
            inner = part.listed()
            if inner is None or inner[0].size * values.size > MOST_LISTED:
                return None
            values = np.add.outer(values, inner[0] * np.exp(1j * turn)).ravel()
            weights = np.multiply.outer(weights, inner[1]).ravel()
        return ListedEnvelope.of(values, weights)

    @property
    def _fold(self) -> int:
        """Return the fold of the function's real part: opposite directions are conjugates."""
        return self.symmetry * (1 + self.symmetry % 2)

    def _n_angles(self, highest: float) -> int:
        return int((1.1 * highest * self.peak + _MARGIN) / self._fold) + 2

    def directional(self, t: Reals, angle_rad: Reals) -> Complexes:
        """Return ``E[exp(j t Re(x exp(-j angle)))]``, shape (t.size, angle.size)."""
        (part, turn), *rest = self.parts
        total = part.directional(t, angle_rad - turn)
        for part, turn in rest:
            total *= part.directional(t, angle_rad - turn)
        return total
