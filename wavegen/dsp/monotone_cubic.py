"""Curves through measured points that swing nowhere: monotone cubic interpolation."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

Reals = NDArray[np.float64]


@dataclass(frozen=True, eq=False, kw_only=True)
class MonotoneCubic:
    """Cubic pieces through points, rising where the points rise and falling where they fall.

    Parameters
    ----------
    x : float64 array, shape (n_points,)
        Rising; two or more.
    y : float64 array, shape (n_points,)
        Values there.

    Notes
    -----
    F. N. Fritsch, J. Butland, "A method for constructing local monotone piecewise cubic
    interpolants", SIAM J. Sci. Stat. Comput. 5(2), 1984: slopes are weighted harmonic means of
    those of the two pieces, zero at an extreme point; one-sided at the ends. The curve and its
    slope are continuous.

    Examples
    --------
    >>> curve = MonotoneCubic(x=np.array([0.0, 1.0, 2.0, 3.0]), y=np.array([0.0, 0.0, 1.0, 1.0]))
    >>> curve(np.array([0.5, 1.5, 2.5])).tolist()
    [0.0, 0.5, 1.0]
    """

    x: Reals
    y: Reals

    def __call__(self, at: Reals) -> Reals:
        """Return values of the curve; beyond its ends those of the end points.

        Parameters
        ----------
        at : float64 array
            Places on the x axis.
        """
        place = np.clip(at, self.x[0], self.x[-1])
        piece = np.clip(np.searchsorted(self.x, place, side="right") - 1, 0, self.x.size - 2)
        distance = place - self.x.take(piece)
        c0, c1, c2, c3 = (row.take(piece) for row in self._pieces)
        value: Reals = c0 + distance * (c1 + distance * (c2 + distance * c3))
        return value

    @cached_property
    def _pieces(self) -> Reals:
        """Coefficients of rising powers of the distance from each point, shape (4, n - 1)."""
        h, rise = np.diff(self.x), np.diff(self.y) / np.diff(self.x)
        slope = self._slopes(h, rise)
        bend = (3 * rise - 2 * slope[:-1] - slope[1:]) / h
        twist = (slope[:-1] + slope[1:] - 2 * rise) / h**2
        return np.stack((self.y[:-1], slope[:-1], bend, twist))

    def _slopes(self, h: Reals, rise: Reals) -> Reals:
        if rise.size == 1:
            return np.repeat(rise, 2)
        slope = np.zeros(self.x.size)
        is_same = rise[:-1] * rise[1:] > 0
        first, second = 2 * h[1:] + h[:-1], h[1:] + 2 * h[:-1]
        before, after = np.where(is_same, rise[:-1], 1.0), np.where(is_same, rise[1:], 1.0)
        mean = (first + second) / (first / before + second / after)
        slope[1:-1] = np.where(is_same, mean, 0.0)
        slope[0] = _end_slope(h[0], h[1], rise[0], rise[1])
        slope[-1] = _end_slope(h[-1], h[-2], rise[-1], rise[-2])
        return slope


def _end_slope(h_end: float, h_next: float, rise_end: float, rise_next: float) -> float:
    """Return the slope of a parabola through three points, held so that nothing swings."""
    slope = ((2 * h_end + h_next) * rise_end - h_end * rise_next) / (h_end + h_next)
    if slope * rise_end <= 0:
        return 0.0
    if rise_end * rise_next <= 0 and abs(slope) > 3 * abs(rise_end):
        return 3 * rise_end
    return slope
