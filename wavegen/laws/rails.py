"""Two independent rails, each a sum of independent levels times taps: their joint envelope."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property, lru_cache

import numpy as np
import scipy.fft
import scipy.special

from wavegen.laws.cumulants import ORDER, count_large, cumulants, power_sums
from wavegen.laws.harmonics import through_eight
from wavegen.laws.term import Complexes, Reals

MOST_ATOMS = 1 << 13
"""Values of a rail that are listed one by one; more are a density."""
MOST_POINTS = 1 << 17
"""Points of a rail's characteristic function; one that has not fallen by then is blurred."""
NEGLIGIBLE = 1e-14
MOST_NODES = 1 << 22
"""Places in the plane at which densities are taken; where they are so sharp that it would take
more, the characteristic function is averaged over the angle instead."""
OVERSAMPLING = 8
_SMALLEST = 1e-13
_BLOCK = 1 << 12
_CELLS = 1 << 15
_TABLE_STEP = 0.12
"""Between entries of a table, over the peak of the rail."""


@dataclass(frozen=True, eq=False, kw_only=True)
class Rail:
    """A sum of independent, equally likely levels times taps.

    Parameters
    ----------
    taps : float64 array, shape (n_taps,)
        Not all zero, unless the rail is silent.
    levels : float64 array, shape (n_levels,)
        Every level has its negative among them.
    """

    taps: Reals
    levels: Reals

    @cached_property
    def peak(self) -> float:
        """Highest magnitude."""
        return float(np.abs(self.taps).sum() * np.abs(self.levels).max())

    @cached_property
    def _heard(self) -> Reals:
        sizes = np.sort(np.abs(self.taps))[::-1]
        return np.asarray(sizes[sizes > _SMALLEST * sizes[:1].max(initial=0.0)])

    @property
    def is_listed(self) -> bool:
        """Whether the values are few enough to be listed."""
        n_levels = np.unique(self.levels.round(12)).size
        return self._heard.size * math.log2(max(n_levels, 2)) <= math.log2(MOST_ATOMS)

    @cached_property
    def atoms(self) -> tuple[Reals, Reals]:
        """Values, rising, and their probabilities."""
        levels, counts = np.unique(self.levels.round(12), return_counts=True)
        chance = counts / counts.sum()
        values, weights = np.zeros(1), np.ones(1)
        for tap in self._heard:
            values = (values[:, None] + tap * levels).ravel()
            weights = (weights[:, None] * chance).ravel()
        order = np.argsort(values)
        return values[order], weights[order]

    def characteristic(self, t: Reals) -> Reals:
        """Return ``E cos(t x)``, shape of ``t``: the product over the taps."""
        top = float(np.abs(self.levels).max())
        levels = self.levels / top
        sizes, counts = np.unique(np.abs(levels.round(12)), return_counts=True)
        chance = counts / counts.sum()
        out = np.ones(t.shape)
        flat_t, flat = t.ravel() * top, out.reshape(-1)
        for low in range(0, flat.size, _BLOCK):
            scaled_t = flat_t[low : low + _BLOCK]
            total = flat[low : low + _BLOCK]
            n_large = count_large(self._heard, float(scaled_t.max()))
            for tap in self._heard[:n_large]:
                scaled = scaled_t * tap
                factor = chance[0] * np.cos(sizes[0] * scaled)
                for size, weight in zip(sizes[1:], chance[1:], strict=True):
                    factor += weight * np.cos(size * scaled)
                total *= factor
            square = scaled_t**2
            exponent = np.zeros(total.size)
            for order in range(ORDER, 0, -2):
                sign = -1.0 if order % 4 else 1.0
                exponent += sign * self._cumulants[order - 1] * self._sums[n_large, order - 1]
                exponent *= square
            total *= np.exp(exponent)
        return out

    def looked_up(self, t: Reals) -> Reals:
        """Return :meth:`characteristic` from a table, good to 1e-13; ``t`` >= 0."""
        if not self.peak:
            return np.ones(t.shape)
        step = _TABLE_STEP / self.peak
        powers = self._table_to(float(t.max(initial=0.0)) / step)
        out = np.empty(t.shape)
        flat_t, flat = t.reshape(-1), out.reshape(-1)
        for low in range(0, flat.size, _CELLS):
            place = flat_t[low : low + _CELLS] / step
            number = place.astype(np.int64)
            place -= number
            value = powers[-1].take(number)
            for row in powers[-2::-1]:
                value *= place
                value += row.take(number)
            flat[low : low + _CELLS] = value
        return out

    def _table_to(self, count: float) -> Reals:
        """Return powers of the place in each step, shape (8, n_steps), up to enough steps."""
        size = 1 << max(10, math.ceil(math.log2(count + 8)))
        made = self._table[0] if self._table else np.zeros((8, 0))
        if made.shape[1] < size:
            places: Reals = np.abs(np.arange(made.shape[1] - 3, size + 5))
            values = self.characteristic(places * (_TABLE_STEP / self.peak))
            windows = np.lib.stride_tricks.sliding_window_view(values, 8)
            made = np.concatenate([made, through_eight() @ windows.T], axis=1)
            self._table[:] = [made]
        return made

    @cached_property
    def _table(self) -> list[Reals]:
        return []

    @cached_property
    def _cumulants(self) -> Reals:
        return cumulants(self.levels / np.abs(self.levels).max())

    @cached_property
    def _sums(self) -> Reals:
        return power_sums(self._heard)

    @cached_property
    def _lines(self) -> Reals:
        """Return the characteristic function at multiples of ``pi / (1.02 peak)``."""
        reach = 1.02 * self.peak
        spacing = math.pi / reach
        pieces: list[Reals] = []
        count, block = 0, 512
        while count < MOST_POINTS:
            piece = self.characteristic(np.arange(count, count + block) * np.float64(spacing))
            pieces.append(piece)
            count += block
            if np.max(np.abs(piece)) < NEGLIGIBLE:
                break
            block = max(512, count // 4)
        phi = np.concatenate(pieces)
        t = spacing * np.arange(count)
        left = float(np.max(np.abs(pieces[-1])))
        if left >= NEGLIGIBLE:
            width = 2 * math.sqrt(math.log(left / NEGLIGIBLE)) / t[-1]
            phi *= np.exp(-0.25 * (width * t) ** 2)
        return phi

    @cached_property
    def _grid(self) -> tuple[float, Reals, Reals, Reals]:
        """Return the spacing, and on ``x = 0, dx, ...`` distribution, density and its slope."""
        reach = 1.02 * self.peak
        phi = self._lines / reach
        count = phi.size
        t = math.pi / reach * np.arange(count)
        heard = int(np.flatnonzero(np.abs(phi) > 1e-6 * phi[0])[-1])
        n = 2 * scipy.fft.next_fast_len(max(count, OVERSAMPLING * min(count, 2 * heard)))
        half = n // 2 + 1
        # f(x) = (1/2 + sum_j phi_j cos(t_j x)) / reach: Fourier series over 2 reach
        density = scipy.fft.irfft(0.5 * phi, n, norm="forward")[:half]
        with np.errstate(divide="ignore", invalid="ignore"):
            over = np.where(t > 0, phi / t, 0.0)
        # irfft gives sum of Re(c exp(j t x)): -j c gives the sines.
        sines = scipy.fft.irfft(-0.5j * over, n, norm="forward")[:half]
        slope = scipy.fft.irfft(0.5j * phi * t, n, norm="forward")[:half]
        step = 2 * reach / n
        x = step * np.arange(half)
        distribution = 0.5 * x / reach + sines  # P(0 < x <= X)
        return step, distribution, density, slope

    def density(self, x: Reals) -> Reals:
        """Return the probability density at ``|x|``."""
        step, _, density, slope = self._grid
        return _hermite(np.abs(x) / step, density, step * slope)

    def outside(self, x: Reals) -> Reals:
        """Return ``P(|rail| > x)`` for ``x`` >= 0."""
        if self.is_listed:
            values, weights = self.atoms
            tail = np.concatenate([np.cumsum(weights[::-1])[::-1], [0.0]])
            return np.asarray(
                2 * tail[np.searchsorted(values, x + 1e-12 * self.peak, side="right")]
            )
        step, _, density, _ = self._grid
        return np.asarray(2 * _hermite(x / step, self._tail, -step * density))

    @cached_property
    def _tail(self) -> Reals:
        return 0.5 - self._grid[1]

    @cached_property
    def bandwidth(self) -> float:
        """Return the ``t`` beyond which the characteristic function is below 1e-6."""
        heard = np.flatnonzero(np.abs(self._lines) > 1e-6)
        return float((heard[-1] + 1) * math.pi / (1.02 * self.peak))


@dataclass(frozen=True, eq=False, kw_only=True)
class RailPair:
    """The envelope of two independent rails.

    Parameters
    ----------
    first, second : Rail
        I and Q, in any order.
    """

    first: Rail
    second: Rail

    @cached_property
    def peak(self) -> float:
        """Highest envelope."""
        return math.hypot(self.first.peak, self.second.peak)

    @cached_property
    def _n_angles(self) -> int:
        band = max(self.first.bandwidth, self.second.bandwidth)
        return int(min(max(64, 0.5 * band * self.peak), 8192))

    def above(self, radius: Reals) -> Reals:
        """Return ``P(R > r)`` of a flat array of radii."""
        if not self.second.peak:
            return self.first.outside(radius)
        if self.first.is_listed:
            values, weights = self.first.atoms
            out = np.zeros(radius.size)
            for value, weight in zip(values, weights, strict=True):
                rest = radius**2 - value**2
                inside = self.second.outside(np.sqrt(np.maximum(rest, 0.0)))
                out += weight * np.where(rest < -1e-12 * self.peak**2, 1.0, inside)
            return out
        nodes, weights = _legendre(self._n_angles)
        angle = 0.25 * np.pi * (nodes + 1)
        weight = 0.5 * np.pi * weights  # both signs of the rail
        out = self.first.outside(radius)
        rows = max(1, _CELLS // angle.size)
        for low in range(0, radius.size, rows):
            part = radius[low : low + rows]
            across = np.outer(part, np.cos(angle))
            terms = self.first.density(np.outer(part, np.sin(angle)))
            terms *= self.second.outside(across)
            terms *= across
            out[low : low + rows] += terms @ weight
        return out

    def characteristic(self, t: Reals) -> Reals:
        """Return ``E[J0(t R)]``."""
        if not self.second.peak and not self.first.is_listed:
            x, weight = _spread(self.first, t)
            return scipy.special.j0(np.outer(t, x)) @ weight
        highest = float(t.max(initial=0.0))
        is_fine = self._n_radii(highest) * self._n_angles > MOST_NODES
        if self.first.is_listed or self.second.is_listed or is_fine:
            return self._averaged(t)
        x, weight = self._radial(highest)
        out = np.empty(t.size)
        rows = max(1, (1 << 20) // x.size)
        for low in range(0, t.size, rows):
            part = slice(low, low + rows)
            out[part] = scipy.special.j0(np.outer(t[part], x)) @ weight
        return out

    def _n_radii(self, highest: float) -> int:
        """Return how many envelopes are good for ``t`` up to ``highest``."""
        wanted = 0.6 * (highest + self._band) * self.peak + 64
        n = 64 << max(0, math.ceil(2 * math.log2(wanted / 64))) // 2
        return n * 3 // 2 if n < wanted else n

    def _radial(self, highest: float) -> tuple[Reals, Reals]:
        """Return envelopes and their weights: good for ``t`` up to ``highest``."""
        n = self._n_radii(highest)
        made = self._radials.get(n)
        if made is None:
            made = self._radials[n] = self._radial_of(n)
        return made

    @cached_property
    def _radials(self) -> dict[int, tuple[Reals, Reals]]:
        return {}

    def _radial_of(self, n: int) -> tuple[Reals, Reals]:
        nodes, weights = _legendre(n)
        radius = 0.5 * self.peak * (nodes + 1)
        # Equal rails are mirrored at 45 degrees.
        n_mirrored = 2 if self.first is self.second else 1
        angles, shares = _legendre(self._n_angles // n_mirrored)
        angle = 0.25 * np.pi / n_mirrored * (angles + 1)
        around = np.empty(radius.size)
        rows = max(1, _CELLS // angle.size)
        for low in range(0, radius.size, rows):
            part = radius[low : low + rows]
            f = self.first.density(np.outer(part, np.cos(angle)))
            f *= self.second.density(np.outer(part, np.sin(angle)))
            around[low : low + rows] = f @ shares
        share = weights * radius * around
        return radius, share / share.sum()  # takes most of the interpolation's error of 1e-12 out

    @property
    def _band(self) -> float:
        return max(self.first.bandwidth, self.second.bandwidth)

    def _averaged(self, t: Reals) -> Reals:
        """Return the average over the angle of the rails' functions."""
        out = np.empty(t.size)
        for low in range(0, t.size, 16):
            part = t[low : low + 16]
            n = int(0.6 * float(part.max()) * self.peak + 40)
            angle = (np.arange(n) + 0.5) * (0.5 * np.pi / n)
            both = self.first.characteristic(np.outer(part, np.cos(angle)))
            both *= self.second.characteristic(np.outer(part, np.sin(angle)))
            out[low : low + 16] = both.mean(axis=1)
        return out

    def directional(self, t: Reals, angle_rad: Reals) -> Complexes:
        """Return ``E[exp(j t Re(x exp(-j angle)))]``, shape (t.size, angle.size)."""
        both = self.first.looked_up(np.outer(t, np.abs(np.cos(angle_rad))))
        both *= self.second.looked_up(np.outer(t, np.abs(np.sin(angle_rad))))
        return both.astype(np.complex128)

    def listed(self) -> tuple[Complexes, Reals] | None:
        """Return all values and their probabilities, None where there are too many."""
        if not (self.first.is_listed and self.second.is_listed):
            return None
        real, imaginary = self.first.atoms, self.second.atoms
        values = np.add.outer(real[0], 1j * imaginary[0]).ravel()
        return values, np.multiply.outer(real[1], imaginary[1]).ravel()

    def reach(self, angle_rad: Reals) -> Reals:
        """Return the highest ``Re(x exp(-j angle))``."""
        along = self.first.peak * np.abs(np.cos(angle_rad))
        return np.asarray(along + self.second.peak * np.abs(np.sin(angle_rad)))


def _spread(rail: Rail, t: Reals) -> tuple[Reals, Reals]:
    """Return magnitudes of one rail and their weights."""
    n = int(0.6 * (float(t.max(initial=0.0)) + rail.bandwidth) * rail.peak + 64)
    nodes, weights = _legendre(n)
    x = 0.5 * rail.peak * (nodes + 1)
    return x, rail.peak * weights * rail.density(x)


@lru_cache(maxsize=16)
def _legendre(n: int) -> tuple[Reals, Reals]:
    """Return the nodes and weights of a Gauss-Legendre rule in panels of 64 on -1 ... 1."""
    size = 64
    panels = max(1, -(-n // size))
    nodes, weights = np.polynomial.legendre.leggauss(size)
    middle = (2 * np.arange(panels) + 1) / panels - 1
    return (
        np.asarray((middle[:, None] + nodes / panels).ravel()),
        np.tile(weights / panels, panels),
    )


def _hermite(place: Reals, values: Reals, slopes: Reals) -> Reals:
    """Return a cubic through values and slopes (per point) at places in points; 0 beyond."""
    number = np.minimum(place.astype(np.int64), values.size - 2)
    u = place - number
    v0, v1 = values.take(number), values.take(number + 1)
    s0, s1 = slopes.take(number), slopes.take(number + 1)
    rise = v1 - v0
    out = v0 + u * (s0 + u * (3 * rise - 2 * s0 - s1 + u * (s0 + s1 - 2 * rise)))
    return np.where(u > 1, 0.0, out)
