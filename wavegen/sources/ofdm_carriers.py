"""Subcarriers with one constellation, and their two-dimensional characteristic function."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from wavegen.laws.term import Complexes, Reals

_BLOCK = 1 << 19
_ROUNDING = 1e-9


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Carriers:
    """Subcarriers with one constellation.

    Parameters
    ----------
    turns : float64 array, shape (n,)
        Turns from one sample to the next.
    phases : float64 array, shape (n,)
        Angle at the first sample of the useful part, radians.
    points : complex128 array, shape (order,)
        Points about their mean, level and scale included.
    """

    turns: Reals
    phases: Reals
    points: Complexes

    @classmethod
    def laid(cls, *, turns: Reals, phases: Reals, points: Complexes) -> Carriers:
        """Return subcarriers whose points, where they lie on a line, lie on the real axis.

        Parameters
        ----------
        turns, phases, points
            As of the class; the turn of the points goes to the phases.
        """
        if is_on_a_line(points):
            angle = float(np.angle(points[np.argmax(np.abs(points))]))
            along: Complexes = (points * np.exp(-1j * angle)).real.astype(np.complex128)
            return cls(turns=turns, phases=phases + angle, points=along)
        return cls(turns=turns, phases=phases, points=points)

    @property
    def rails(self) -> tuple[Reals, Reals] | None:
        """Levels of the two rails where every pair of them is a point; None elsewhere."""
        rounded = np.round(self.points / np.abs(self.points).max(), 9)
        first, at_first = np.unique(rounded.real, return_index=True)
        second, at_second = np.unique(rounded.imag, return_index=True)
        is_grid = np.unique(rounded).size == first.size * second.size == self.points.size
        opposite = np.array_equal(first, -first[::-1]) and np.array_equal(second, -second[::-1])
        if not (is_grid and opposite):
            return None
        return self.points.real[at_first], self.points.imag[at_second]

    @property
    def has_opposites(self) -> bool:
        """Whether each point has its negative among them: all functions are real then."""
        return same_points(self.points, -self.points)

    def factor(self, t: Reals, angle_rad: Reals, sample: float, gain: float) -> Reals | Complexes:
        """Return the product over subcarriers, shape (t.size, angle.size)."""
        turned = angle_rad[:, None] - 2 * np.pi * self.turns * sample - self.phases
        step = max(_BLOCK // turned.size, 1)
        rails = self.rails
        made = np.empty((t.size, angle_rad.size), np.complex128)
        for low in range(0, t.size, step):
            scaled = (gain * t[low : low + step])[:, None, None]
            if rails:
                value = _mean_cosine(rails[0], scaled * np.cos(turned))
                if rails[1].any():  # points on the real axis have no other rail
                    value *= _mean_cosine(rails[1], scaled * np.sin(turned))
            elif self.has_opposites:
                upper = self.points[np.angle(self.points * np.exp(-1e-3j)) >= 0]
                value = np.zeros((scaled.shape[0], *turned.shape))
                for point in upper:
                    value += np.cos(scaled * (abs(point) * np.cos(turned - np.angle(point))))
                value += (self.points.size / 2 - upper.size) * 1.0  # a point at zero
                value /= self.points.size / 2
            else:
                value = np.zeros((scaled.shape[0], *turned.shape), np.complex128)
                for point in self.points:
                    place = abs(point) * np.cos(turned - np.angle(point))
                    value += np.exp(1j * scaled * place)
                value /= self.points.size
            made[low : low + step] = value.prod(axis=2)
        return made.real if rails or self.has_opposites else made


def _mean_cosine(levels: Reals, scaled: Reals) -> Reals:
    """Return the mean of ``cos(level x)`` over levels that have their opposites.

    Levels of square QAM are 1, 3, 5 ... times the least: one cosine gives them all by
    ``cos((k + 2) a) = 2 cos(2 a) cos(k a) - cos((k - 2) a)``.
    """
    half = levels[levels > 1e-12 * np.abs(levels).max()]
    n_zero = levels.size - 2 * half.size
    steps = half / half[0] if half.size else half
    if not n_zero and np.allclose(steps, 2 * np.arange(half.size) + 1, rtol=0, atol=1e-9):
        here = np.cos(half[0] * scaled)
        total, before = here.copy(), here
        turn = 4 * here * here - 2 if half.size > 1 else here
        for _ in range(half.size - 1):
            here, before = turn * here - before, here
            total += here
        return np.asarray(total / half.size)
    total = np.zeros(scaled.shape)
    for level in half:
        total += np.cos(level * scaled)
    return np.asarray((2 * total + n_zero) / levels.size)


def mirror_fold(groups: Sequence[Carriers]) -> int:
    """Return the fold of all points if all are mirrored too, at one angle at first; else 0."""
    if any(np.ptp(group.phases) > 0 for group in groups) or not all(
        same_points(group.points, group.points.conj()) for group in groups
    ):
        return 0
    return fold_of(groups)


def fold_of(groups: Sequence[Carriers]) -> int:
    """Return 4 where a quarter turn leaves all points as they are, 2 where half a turn does."""
    turns = ((fold, np.exp(2j * np.pi / fold)) for fold in (4, 2, 1))
    return next(
        fold for fold, turn in turns if all(same_points(g.points, g.points * turn) for g in groups)
    )


def same_points(first: Complexes, second: Complexes) -> bool:
    """Return whether two sets of points are one."""
    scale = np.abs(first).max()
    return bool(
        np.array_equal(
            np.unique(np.round(first / scale, 6) + 0.0),
            np.unique(np.round(second / scale, 6) + 0.0),
        )
    )


def is_on_a_line(points: Complexes) -> bool:
    """Return whether points about their mean lie on a line, as those of BPSK."""
    power = float(np.mean(np.abs(points) ** 2))
    return bool(abs(np.mean(points**2)) > (1 - _ROUNDING) * power)
