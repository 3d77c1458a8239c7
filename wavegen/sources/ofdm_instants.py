"""The law of OFDM with few subcarriers: sample by sample of a symbol."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from functools import cached_property
from itertools import pairwise
from typing import Any, NamedTuple

import numpy as np
import scipy.special
from numpy.typing import NDArray

from wavegen.laws.inversion import BesselSeries, bessel_zeros
from wavegen.laws.mixture import KnownAmplitudes, MixedTail
from wavegen.laws.radial import RadialLaw, Tail
from wavegen.laws.term import Complexes, NoLaw, Reals
from wavegen.sources.ofdm_carriers import Carriers, fold_of, mirror_fold
from wavegen.sources.ofdm_moments import Moments
from wavegen.sources.ofdm_sums import N_CELLS, Sums, as_amplitudes, sums_at

MOST_INSTANTS = 1024
"""Different samples of a symbol that are gone through; more are thinned out where they crowd."""
MOST_SUBCARRIERS = 400
SAMPLES_PER_CYCLE = 8
"""Samples in a cycle of the widest spacing that stand for all of them."""
BLURS = (0.05, 0.05 / math.sqrt(2), 0.025, 0.025 / math.sqrt(2), 0.0125)
"""Standard deviations of the noise that rounds off close points, over the RMS value, each of half
the power of the one before."""
RICHARDSON = (1 / 3, -2.0, 8 / 3)
"""Weights of three such noises, that with the least power last."""
MOST_VALUES = 150_000_000
"""Sums at all instants together that are gone through."""
ACCURACY_DB = 0.001
PER_DECADE = 8
PROBABILITIES = tuple(10.0 ** (-k / PER_DECADE) for k in range(PER_DECADE, 9 * PER_DECADE + 1))
_NEGLIGIBLE = 1e-14
_BLURRED_OUT = 5.5
"""At so many over the least standard deviation its function is 5e-4, and the next but one 1e-13;
what is left of the points' own there is small as well."""
_FARTHEST = 8.0
"""Amplitude over the RMS value beyond which next to nothing lies."""
_SHORTEST = 16
MOST_PLACES = 4096
"""Places of subcarriers that angles are made to fall on."""
_WHOLE = 1e-6
"""Steps this near to a whole number are one."""
FEWEST_DECADES = 3
"""Down to how many decades a law must be as good as it says to be one."""


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
    n_places : int
        Places, evenly round the circle, at which subcarriers stand at whole samples but for what
        their groups are turned by; 0 if it is not known.
    """

    carriers: tuple[tuple[Carriers, ...], ...]
    weights: Reals
    sources: list[tuple[tuple[int, float, int], ...]]
    known: Complexes
    n_places: int = 0

    @classmethod
    def of(
        cls,
        moments: Sequence[Moments],
        carriers: Sequence[tuple[Carriers, ...]],
        *,
        n_fft: int,
        span: int,
        finest: int = 0,
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
        finest : int
            Samples of a symbol to go through at least, where it has so many.
        """
        fold = mirror_fold([group for state in carriers for group in state])
        is_known = any(m.known is not None for m in moments)
        stride, least = 1, max(SAMPLES_PER_CYCLE * span, finest)
        while n_fft % (2 * stride) == 0 and n_fft // (2 * stride) >= least:
            stride *= 2
        found: dict[tuple[tuple[int, float, int], ...], list[complex]] = {}
        for m in moments:
            is_edge = len(m.sources) > 1
            fine = stride if not is_edge else max(1, min(stride, (m.high - m.low) // 2))
            for offset in range(m.low, m.high):
                sample = (offset - m.prefix) % n_fft
                if is_edge:
                    is_left, share = (offset - m.low) % fine != 0, fine
                elif _is_near_quarter(sample, n_fft, fine):
                    # Lattices pass within a sample or two: every one for itself.
                    is_left, share = False, 1
                else:
                    is_left, share = sample % fine != 0, fine
                if is_left:
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
                weight = m.starts.size * share
                found[key] = [weight + found.get(key, [0.0])[0].real, known]
        if len(found) > MOST_INSTANTS:
            return None
        weights = np.array([entry[0].real for entry in found.values()])
        return cls(
            carriers=tuple(carriers),
            weights=weights / weights.sum(),
            sources=list(found),
            known=np.array([entry[1] for entry in found.values()]),
            n_places=_n_places(carriers, n_fft),
        )

    @cached_property
    def _fold(self) -> int:
        """Fold of the symmetry of all points; 1 with anything known."""
        if self.known.any():
            return 1
        return fold_of([group for state in self.carriers for group in state])

    @cached_property
    def exact(self) -> dict[int, Sums]:
        """The instants whose sums can be gone through, those with the fewest first."""
        found = []
        for number, sources in enumerate(self.sources):
            if len(sources) == 1:
                state, gain, sample = sources[0]
                weighed = [(group, gain) for group in self.carriers[state]]
                made = sums_at(weighed, sample, complex(self.known[number]))
                if made is not None:
                    found.append((number, made))
        found.sort(key=lambda item: item[1].count)
        n_all = np.cumsum([made.count for _, made in found])
        return dict(found[: int(np.searchsorted(n_all, MOST_VALUES, side="right"))])

    def exact_amplitudes(self, highest: float) -> KnownAmplitudes:
        """Return the amplitudes of all exact instants, each with its share among them."""
        cells = np.zeros(N_CELLS)
        for number, made in self.exact.items():
            cells += self.weights[number] * made.counted(highest)
        return as_amplitudes(cells, highest)

    def characteristic(self, t: Reals, numbers: Sequence[int] | None = None) -> Reals:
        """Return ``E[J0(t R)]`` over instants, all unless told; ``t`` rising.

        An instant whose function has died out over the last quarter of a stretch of ``t`` is left.
        Instants together count as much as their weights say.
        """
        total = np.zeros(t.size)
        alive = list(range(self.weights.size) if numbers is None else numbers)
        for low, high in pairwise(_stretches(t.size)):
            some = t[low:high]
            n_angles = -(-(64 + 8 * int(some[-1])) // (4 * self._fold)) * 4
            if 0 < self.n_places <= MOST_PLACES:
                unit = math.lcm(self.n_places, self._fold) // self._fold
                n_angles = -(-n_angles // unit) * unit
            circle = _Circle(t=some, n_angles=n_angles, n_round=n_angles * self._fold)
            kept = []
            for number in alive:
                value = self._one(number, circle)
                total[low:high] += self.weights[number] * value
                if np.max(np.abs(value[-(value.size // 4) - 1 :])) > _NEGLIGIBLE:
                    kept.append(number)
            alive = kept
        return total

    def _one(self, number: int, circle: _Circle) -> Reals:
        sources, known = self.sources[number], self.known[number]
        product: Reals | Complexes = np.ones((circle.t.size, circle.n_angles))
        for state, gain, sample in sources:
            for group in self.carriers[state]:
                # The weights of an edge come once: no table serves twice.
                found = circle.factor(group, sample, gain, again=len(sources) == 1)
                product = product * found
        if known:
            along = (known * np.exp(-1j * circle.angle_rad)).real
            product = product * np.exp(1j * np.multiply.outer(circle.t, along))
        return np.asarray(product.mean(axis=1).real)


@dataclass(slots=True, eq=False, kw_only=True)
class _Circle:
    """Angles at which functions are averaged, and what a subcarrier gives at all of them.

    Where subcarriers stand at whole steps of the angles, each gives the same figures, moved
    along: they are computed once for a group.

    Parameters
    ----------
    t : float64 array, shape (n,)
        Arguments.
    n_angles : int
        Angles that are averaged: the first of those round the circle.
    n_round : int
        Angles round the circle, half a step from zero.
    """

    t: Reals
    n_angles: int
    n_round: int
    _tables: dict[tuple[int, float], Reals | Complexes] = field(default_factory=dict)

    @property
    def angle_rad(self) -> Reals:
        """The angles."""
        return np.asarray((np.arange(self.n_angles) + 0.5) * (2 * np.pi / self.n_round), np.float64)

    def factor(
        self, group: Carriers, sample: int, gain: float, *, again: bool
    ) -> Reals | Complexes:
        """Return the product over the subcarriers of a group at a sample, shape (n, n_angles)."""
        steps = (group.turns * sample + group.phases / (2 * np.pi)) * self.n_round
        whole = np.rint(steps)
        if not again or np.abs(steps - whole).max() > _WHOLE:
            return group.factor(self.t, self.angle_rad, float(sample), gain)
        table = self._table(group, gain)
        product: NDArray[Any] = np.ones((self.t.size, self.n_angles), table.dtype)
        for step in whole.astype(np.int64) % self.n_round:
            first = int(-step % self.n_round)
            product *= table[:, first : first + self.n_angles]
        return product

    def _table(self, group: Carriers, gain: float) -> Reals | Complexes:
        """Return what a subcarrier at zero gives, twice round the circle."""
        if (id(group), gain) not in self._tables:
            one = replace(group, turns=np.zeros(1), phases=np.zeros(1))
            angle = np.asarray((np.arange(self.n_round) + 0.5) * (2 * np.pi / self.n_round))
            found = one.factor(self.t, angle.astype(np.float64), 0.0, gain)
            twice: NDArray[Any] = np.concatenate((found, found), axis=1)
            self._tables[id(group), gain] = twice
        return self._tables[id(group), gain]


def _n_places(carriers: Sequence[tuple[Carriers, ...]], n_fft: int) -> int:
    """Return how many places round the circle hold all turns; 0 if it is not n_fft or twice it."""
    turns = np.concatenate([np.zeros(1), *(group.turns for state in carriers for group in state)])
    for count in (n_fft, 2 * n_fft):
        if np.abs(turns * count - np.rint(turns * count)).max() < _WHOLE:
            return count
    return 0


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
        Lowest probability the data serve.
    accuracy_db : float
        Of levels from 10 % down to the lowest probability the law speaks for.

    Returns
    -------
    RadialLaw or NoLaw
        No law where it would not be as good as that down to 0.1 %.

    Notes
    -----
    Instants with few sums are counted sum by sum: :mod:`wavegen.sources.ofdm_sums`. Those near
    them still have points close together, whose characteristic functions die out late. A little
    complex Gaussian noise of standard deviation ``e`` rounds them off; over the new mean,
    ``1 + e^2``, the CCDF is wrong by a power series in ``e^2``, whose first two terms three such
    noises take out (Richardson). What comes out with noises of four times the power shows how
    close the points still matter.
    """
    exact = instants.exact
    others = [number for number in range(instants.weights.size) if number not in exact]
    left = float(instants.weights[others].sum())
    steps = instants.exact_amplitudes(peak) if exact else None
    coarse = fine = _Weighed()
    if others:
        tails, radius = _blurred(instants, others, peak)
        coarse, fine = (
            _Weighed(tuple(weight * left for weight in RICHARDSON), tuple(three), (radius,) * 3)
            for three in (tails[:3], tails[-3:])
        )

    def law_of(part: _Weighed) -> RadialLaw:
        tails = part if steps is None else part.and_steps(steps, 1 - left)
        return RadialLaw(
            name=name,
            holds="over seeds",
            mean_power=1.0,
            peak=peak,
            radius=peak,
            tail=MixedTail(weights=tails.weights, tails=tails.tails, radii=tails.radii),
            lowest_probability=lowest_probability,
        )

    law = law_of(fine)
    if not others:
        return law
    error_db = np.abs(law_of(coarse).level_db(PROBABILITIES) - law.level_db(PROBABILITIES))
    # What matters closer still is not seen; so half of what is allowed is allowed.
    wrong = np.flatnonzero(error_db > accuracy_db / 2)
    if not wrong.size:
        return law
    if wrong[0] <= (FEWEST_DECADES - 1) * PER_DECADE:
        return NoLaw(
            reason=f"{name}: the samples of few subcarriers form lattices "
            f"({error_db[wrong].max():.3f} dB are uncertain)"
        )
    sure_down_to = 10.0 ** -(1 + (int(wrong[0]) - 1) // PER_DECADE)
    return replace(law, lowest_probability=max(lowest_probability, sure_down_to))


class _Weighed(NamedTuple):
    """Tails to add up, and where each ends."""

    weights: tuple[float, ...] = ()
    tails: tuple[Tail, ...] = ()
    radii: tuple[float, ...] = ()

    def and_steps(self, steps: KnownAmplitudes, weight: float) -> _Weighed:
        """Return them with amplitudes that are known one by one."""
        return _Weighed((*self.weights, weight), (*self.tails, steps), (*self.radii, float(np.inf)))


def _blurred(instants: Instants, numbers: Sequence[int], peak: float) -> tuple[list[Tail], float]:
    """Return the tail of instants rounded off by each noise, and where it ends."""
    reach = min(peak, _FARTHEST) + 6 * BLURS[0]
    count = math.ceil(reach * _BLURRED_OUT / BLURS[-1] / math.pi)
    zeros = bessel_zeros(count)
    share = float(instants.weights[[*numbers]].sum())
    phi = instants.characteristic(zeros / reach, numbers) / share
    made = 2 * phi / (zeros * scipy.special.j1(zeros) ** 2 * reach)
    tails: list[Tail] = []
    for blur in BLURS:
        weights = made * np.exp(-0.25 * (blur * zeros / reach) ** 2)
        used = np.abs(weights) > 0
        # Amplitudes over the new RMS value.
        rms = math.sqrt(1 + blur**2)
        tails.append(BesselSeries(zeros=zeros[used] / reach * rms, weights=weights[used] * rms))
    return tails, min(reach / math.sqrt(1 + BLURS[0] ** 2), peak)


def _is_near_quarter(sample: int, n_fft: int, stride: int) -> bool:
    """Return whether a sample is in the cell of a stride about a quarter of the symbol."""
    quarter = n_fft // math.gcd(4, n_fft)
    return (sample + (stride - 1) // 2) % quarter < stride
