"""The law of OFDM with few subcarriers: sample by sample of a symbol."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise

import numpy as np
import scipy.special

from wavegen.laws.inversion import BesselSeries, bessel_zeros
from wavegen.laws.mixture import MixedTail
from wavegen.laws.radial import RadialLaw
from wavegen.laws.term import Complexes, NoLaw, Reals
from wavegen.sources.ofdm_moments import Moments

MOST_INSTANTS = 1024
"""Different samples of a symbol that are gone through; more are thinned out where they crowd."""
MOST_SUBCARRIERS = 400
SAMPLES_PER_CYCLE = 8
"""Samples in a cycle of the widest spacing that stand for all of them."""
BLURS = (0.1, 0.1 / math.sqrt(2), 0.05)
"""Standard deviations of the noise that rounds off lattices, over the RMS value, each of half the
power of the one before."""
ACCURACY_DB = 0.001
PROBABILITIES = tuple(10.0**-k for k in range(1, 10))
_NEGLIGIBLE = 1e-14
_BLURRED_OUT = 11.0
"""At so many over the noise's standard deviation its function is 1e-13."""
_FARTHEST = 8.0
"""Amplitude over the RMS value beyond which next to nothing lies."""
_SHORTEST = 16
_BLOCK = 1 << 19


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
                value = value * _mean_cosine(rails[1], scaled * np.sin(turned))
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
    """Return the mean of ``cos(level x)`` over levels that have their opposites."""
    half = levels[levels > 1e-12 * np.abs(levels).max()]
    total = np.zeros(scaled.shape)
    for level in half:
        total += np.cos(level * scaled)
    n_zero = levels.size - 2 * half.size
    return np.asarray((2 * total + n_zero) / levels.size)


@dataclass(frozen=True, eq=False, kw_only=True)
class Instants:
    """Different samples and how often each comes.

    Parameters
    ----------
    carriers : tuple of tuple of Carriers
        Of each state.
    weights : float64 array, shape (n_instants,)
        Shares of time; together 1.
    sources : list of tuple of (int, float, int)
        State, weight and sample of the useful symbol of what is added at each.
    known : complex128 array, shape (n_instants,)
        What is known at each.
    """

    carriers: tuple[tuple[Carriers, ...], ...]
    weights: Reals
    sources: list[tuple[tuple[int, float, int], ...]]
    known: Complexes

    @classmethod
    def of(
        cls,
        moments: Sequence[Moments],
        carriers: Sequence[tuple[Carriers, ...]],
        *,
        n_fft: int,
        span: int,
    ) -> Instants | None:
        """Gather the samples of a clock; None where there are too many different ones.

        Parameters
        ----------
        moments : sequence of Moments
            Of one clock.
        carriers : sequence of tuple of Carriers
            Of each state.
        n_fft : int
            Useful samples of a symbol.
        span : int
            From the lowest subcarrier to the highest, spacings.
        """
        fold = _mirror_fold(carriers)
        is_known = any(m.known is not None for m in moments)
        stride = 1
        while n_fft % (2 * stride) == 0 and n_fft // (2 * stride) >= SAMPLES_PER_CYCLE * span:
            stride *= 2
        found: dict[tuple[tuple[int, float, int], ...], list[complex]] = {}
        for m in moments:
            is_edge = len(m.sources) > 1
            fine = stride if not is_edge else max(1, min(stride, (m.high - m.low) // 2))
            for offset in range(m.low, m.high):
                sample = (offset - m.prefix) % n_fft
                if (offset - m.low if is_edge else sample) % fine:
                    continue
                places = (sample, offset)
                if not is_known and not is_edge and fold and n_fft % fold == 0:
                    # A part of a turn, and the mirror image, have the same law.
                    sample %= n_fft // fold
                    places = (min(sample, -sample % (n_fft // fold)), offset)
                key = tuple(
                    (state, round(gain, 12), place)
                    for (state, gain), place in zip(m.sources, places, strict=False)
                )
                known = 0j if m.known is None else complex(m.known[offset - m.low])
                weight = m.starts.size * fine
                found[key] = [weight + found.get(key, [0.0])[0].real, known]
        if len(found) > MOST_INSTANTS:
            return None
        weights = np.array([entry[0].real for entry in found.values()])
        return cls(
            carriers=tuple(carriers),
            weights=weights / weights.sum(),
            sources=list(found),
            known=np.array([entry[1] for entry in found.values()]),
        )

    @cached_property
    def _fold(self) -> int:
        """Fold of the symmetry of all points; 1 with anything known."""
        if self.known.any():
            return 1
        groups = [group for state in self.carriers for group in state]
        turns = ((fold, np.exp(2j * np.pi / fold)) for fold in (4, 2, 1))
        return next(
            fold
            for fold, turn in turns
            if all(same_points(g.points, g.points * turn) for g in groups)
        )

    def characteristic(self, t: Reals) -> Reals:
        """Return ``E[J0(t R)]`` over all instants; ``t`` rising.

        An instant whose function has died out over the last quarter of a stretch of ``t`` is left.
        """
        total = np.zeros(t.size)
        alive = list(range(self.weights.size))
        for low, high in pairwise(_stretches(t.size)):
            some = t[low:high]
            n_angles = -(-(64 + 8 * int(some[-1])) // (4 * self._fold)) * 4
            angle = (np.arange(n_angles) + 0.5) * (2 * np.pi / self._fold / n_angles)
            kept = []
            for number in alive:
                value = self._one(number, some, np.asarray(angle, np.float64))
                total[low:high] += self.weights[number] * value
                if np.max(np.abs(value[-(value.size // 4) - 1 :])) > _NEGLIGIBLE:
                    kept.append(number)
            alive = kept
        return total

    def _one(self, number: int, t: Reals, angle: Reals) -> Reals:
        product: Reals | Complexes = np.ones((t.size, angle.size))
        for state, gain, sample in self.sources[number]:
            for group in self.carriers[state]:
                product = product * group.factor(t, angle, float(sample), gain)
        known = self.known[number]
        if known:
            product = product * np.exp(
                1j * np.multiply.outer(t, (known * np.exp(-1j * angle)).real)
            )
        return np.asarray(product.mean(axis=1).real)


def _mirror_fold(carriers: Sequence[tuple[Carriers, ...]]) -> int:
    """Return the fold of all points if all are mirrored too, at one angle at first; else 0."""
    groups = [group for state in carriers for group in state]
    if any(np.ptp(group.phases) > 0 for group in groups) or not all(
        same_points(group.points, group.points.conj()) for group in groups
    ):
        return 0
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


def _stretches(count: int) -> list[int]:
    """Return cuts of a range: 16, 32, 64, ... and its end."""
    cuts = [0]
    while cuts[-1] < count:
        cuts.append(min(max(2 * cuts[-1], _SHORTEST), count))
    return cuts


def law_of_instants(
    instants: Instants,
    *,
    name: str,
    peak: float,
    lowest_probability: float = 0.0,
    accuracy_db: float = ACCURACY_DB,
) -> RadialLaw | NoLaw:
    """Return the law of unit mean power of what happens at some instants.

    Parameters
    ----------
    instants : Instants
        With their shares of time.
    name : str
        What it is called in results.
    peak : float
        Bound on the amplitude.
    lowest_probability : float
        Handed on.
    accuracy_db : float
        Of levels from 10 % to 1e-9.

    Returns
    -------
    RadialLaw or NoLaw
        No law where it would not be as good as that.

    Notes
    -----
    At some samples the points of few subcarriers form lattices, whose characteristic functions
    never die out. A little complex Gaussian noise of standard deviation ``e`` rounds them off;
    over the new mean, ``1 + e^2``, the CCDF is wrong by a power series in ``e^2``, whose first two
    terms three such noises take out (Richardson). What two of them give shows what is left.
    """
    reach = min(peak, _FARTHEST) + 6 * BLURS[0]
    count = math.ceil(reach * _BLURRED_OUT / BLURS[-1] / math.pi)
    zeros = bessel_zeros(count)
    phi = instants.characteristic(zeros / reach)
    made = 2 * phi / (zeros * scipy.special.j1(zeros) ** 2 * reach)
    tails = []
    for blur in BLURS:
        weights = made * np.exp(-0.25 * (blur * zeros / reach) ** 2)
        used = np.abs(weights) > 0
        # Amplitudes over the new RMS value.
        rms = math.sqrt(1 + blur**2)
        tails.append(BesselSeries(zeros=zeros[used] / reach * rms, weights=weights[used] * rms))

    def extrapolated(weights: tuple[float, ...]) -> RadialLaw:
        radius = min(reach / math.sqrt(1 + BLURS[0] ** 2), peak)
        n_used = len(weights)
        return RadialLaw(
            name=name,
            holds="over seeds",
            mean_power=1.0,
            peak=peak,
            radius=radius,
            tail=MixedTail(weights=weights, tails=tuple(tails[-n_used:]), radii=(radius,) * n_used),
            lowest_probability=lowest_probability,
        )

    by_two, by_three = extrapolated((-1.0, 2.0)), extrapolated((1 / 3, -2.0, 8 / 3))
    error_db = float(
        np.max(np.abs(by_two.level_db(PROBABILITIES) - by_three.level_db(PROBABILITIES)))
    )
    # Steps of lattices are no power series: the whole difference is taken (ten QPSK subcarriers by
    # enumeration: 0.016 dB said, 0.021 dB true).
    if error_db > accuracy_db:
        return NoLaw(
            reason=f"{name}: the samples of few subcarriers form lattices "
            f"({error_db:.3f} dB are uncertain)"
        )
    return by_three
