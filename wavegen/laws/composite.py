"""Sums of independent parts, each at its own frequency: one term from several."""

from __future__ import annotations

import cmath
import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property
from itertools import combinations, pairwise, product
from typing import Protocol, runtime_checkable

import numpy as np
import scipy.fft
import scipy.special

from wavegen.laws.constant import ConstantLaw
from wavegen.laws.inversion import law_of_characteristic
from wavegen.laws.law import Law
from wavegen.laws.periodic import PeriodicLaw
from wavegen.laws.phasors import phasor_law
from wavegen.laws.term import BaseTerm, Complexes, NoLaw, Reals, Scaled, Term

HIGHEST_ORDER = 24
"""Multiples of the phases that are looked at: what ties only higher ones does not matter."""
LONGEST_SERIES = 1 << 13
"""Terms of the series of parts with data: each costs more than the one before."""
MOST_RESIDUES = 64
"""Common time indices that are told apart."""
MOST_STATES = 32
"""Phases of parts in a simple ratio; more are evenly sampled by as many."""
MOST_STEPS = 8
"""Highest offset over the common divisor of offsets in a simple ratio."""
MOST_ENVELOPES = 4096
_MARGIN = 40
_CELLS = 1 << 16


@dataclass(frozen=True, slots=True, kw_only=True)
class Placed:
    """A part and where it stands.

    Parameters
    ----------
    term : Term
        The part.
    gain : float
        Amplitude ratio.
    turn_rad : float
        Phase at index 0.
    n_cycles : int
        Frequency, cycles per loop.
    """

    term: Term
    gain: float = 1.0
    turn_rad: float = 0.0
    n_cycles: int = 0

    @property
    def moved(self) -> Term:
        """The part at its level and phase."""
        return Scaled.of(self.term, gain=self.gain, turn_rad=self.turn_rad)


@dataclass(frozen=True, eq=False, kw_only=True)
class LineTerm(BaseTerm):
    """An unmodulated carrier of known phase.

    Parameters
    ----------
    value : complex
        What it is at zero frequency.
    """

    value: complex

    @classmethod
    def of(cls, value: complex, *, name: str = "carrier") -> LineTerm:
        """Return the term."""
        return cls(
            name=name,
            holds="every loop",
            mean_power=abs(value) ** 2,
            peak=abs(value),
            symmetry=1,
            value=value,
        )

    def characteristic(self, t: Reals, *, residue: int = 0, modulus: int = 1) -> Reals:
        """Return ``J0(a t)``."""
        return np.asarray(scipy.special.j0(self.peak * t))

    def directional(
        self, t: Reals, angle_rad: Reals, *, residue: int = 0, modulus: int = 1
    ) -> Complexes:
        """Return ``exp(j a t cos(phase - angle))``."""
        along = np.real(self.value * np.exp(-1j * angle_rad))
        return np.asarray(np.exp(1j * np.outer(t, along)))

    def law(self) -> Law:
        """Return the law of a constant envelope."""
        return ConstantLaw()


@dataclass(frozen=True, eq=False, kw_only=True)
class ConstantEnvelopeTerm(BaseTerm):
    """A carrier of constant envelope whose phase carries data."""

    symmetry: int = 1
    peak: float = 1.0

    def characteristic(self, t: Reals, *, residue: int = 0, modulus: int = 1) -> Reals:
        """Return ``J0(a t)``."""
        return np.asarray(scipy.special.j0(self.peak * t))

    def directional(
        self, t: Reals, angle_rad: Reals, *, residue: int = 0, modulus: int = 1
    ) -> None:
        """Return None: how its phase is spread is not told."""

    def law(self) -> Law:
        """Return the law of a constant envelope."""
        return ConstantLaw()


@dataclass(frozen=True, eq=False, kw_only=True)
class LinesTerm(BaseTerm):
    """Unmodulated tones on the loop's grid: known at each index. Use :meth:`of`.

    Parameters
    ----------
    bins : tuple of int
        Cycles per loop, rising.
    values : tuple of complex
        What each tone is at zero frequency.
    n_samples : int
        Samples in the loop.
    """

    bins: tuple[int, ...]
    values: tuple[complex, ...]
    n_samples: int

    @classmethod
    def of(
        cls, bins: Sequence[int], values: Sequence[complex], *, n_samples: int
    ) -> LinesTerm | LineTerm:
        """Return the term of one tone or several."""
        lines: dict[int, complex] = {}
        for one, value in zip(bins, values, strict=True):
            lines[int(one)] = lines.get(int(one), 0j) + complex(value)
        lines = {one: lines[one] for one in sorted(lines) if lines[one]}
        if len(lines) == 1:
            return LineTerm.of(next(iter(lines.values())))
        step = math.gcd(n_samples, *(b - a for a, b in pairwise(lines)))
        period = n_samples // step
        return cls(
            name=f"{len(lines)} tones",
            holds="every loop",
            mean_power=math.fsum(abs(value) ** 2 for value in lines.values()),
            peak=math.fsum(abs(value) for value in lines.values()),
            clock_samples=period,
            symmetry=1,
            bins=tuple(lines),
            values=tuple(lines.values()),
            n_samples=n_samples,
        )

    @property
    def spacing(self) -> int:
        """Greatest common divisor of the distances between tones, cycles per loop."""
        return math.gcd(*(b - a for a, b in pairwise(self.bins)))

    @cached_property
    def envelope(self) -> Reals:
        """Envelope at each index of the period."""
        spectrum = np.zeros(self.clock_samples, np.complex128)
        step = self.n_samples // self.clock_samples
        for one, value in zip(self.bins, self.values, strict=True):
            spectrum[(one - self.bins[0]) // step % self.clock_samples] += value
        return np.asarray(np.abs(scipy.fft.ifft(spectrum, norm="forward")))

    def characteristic(self, t: Reals, *, residue: int = 0, modulus: int = 1) -> Reals:
        """Return the mean of ``J0(t R)`` over the indices that leave a residue."""
        envelope, weights = _gathered(self.envelope[residue % modulus :: modulus])
        out = np.empty(t.size)
        rows = max(1, _CELLS // envelope.size)
        for low in range(0, t.size, rows):
            part = t[low : low + rows]
            out[low : low + rows] = scipy.special.j0(np.outer(part, envelope)) @ weights
        return out

    def directional(
        self, t: Reals, angle_rad: Reals, *, residue: int = 0, modulus: int = 1
    ) -> None:
        """Return None: tones beside parts in a simple ratio to them are not told."""

    def law(self) -> Law | NoLaw:
        """Return the exact curve of the tones' own period."""
        place = (np.array(self.bins) - self.bins[0]) // self.spacing
        return PeriodicLaw.of_harmonics(
            place,
            np.array(self.values),
            n_instants=self.clock_samples,
            stride=self.spacing // math.gcd(self.spacing, self.n_samples),
            name=f"{len(self.bins)} tones, own period",
        )


@dataclass(frozen=True, eq=False, kw_only=True)
class ProductTerm(BaseTerm):
    """Parts whose relative phases run freely: their functions multiply at each common index.

    Parameters
    ----------
    factors : tuple of Term
        The parts.
    placed : tuple of Placed
        What it was made of, for a sum around it.
    """

    factors: tuple[Term, ...]
    placed: tuple[Placed, ...] = ()

    @cached_property
    def _common(self) -> int:
        """Return the period of what two clocks have in common.

        Given the index modulo this, the indices modulo each clock are independent (Chinese
        remainder theorem: of every prime power only one clock has more than is given).
        """
        clocks = [term.clock_samples for term in self.factors]
        return math.lcm(*(math.gcd(a, b) for a, b in combinations(clocks, 2)))

    def characteristic(self, t: Reals, *, residue: int = 0, modulus: int = 1) -> Reals:
        """Return the product, averaged over the common indices that leave a residue."""
        common = math.lcm(self._common, math.gcd(modulus, self.clock_samples))
        step = math.gcd(modulus, common)
        cases = self._cases(residue % step, step, common)
        out = np.zeros(t.shape)
        for index, count in cases:
            one = np.full(t.shape, float(count))
            for term in self.factors:
                shared = math.gcd(common, term.clock_samples)
                one *= term.characteristic(t, residue=index % shared, modulus=shared)
            out += one
        return out / sum(count for _, count in cases)

    def _cases(self, residue: int, step: int, common: int) -> list[tuple[int, int]]:
        """Return the common indices of different functions, and how many are like each."""
        found = self._known_cases.get((residue, step, common))
        if found is None:
            alike: dict[tuple[object, ...], list[int]] = {}
            for index in range(residue, common, step):
                kinds = tuple(
                    _kind(term, index)
                    if common % term.clock_samples == 0
                    else index % math.gcd(common, term.clock_samples)
                    for term in self.factors
                )
                alike.setdefault(kinds, []).append(index)
            found = [(indices[0], len(indices)) for indices in alike.values()]
            self._known_cases[residue, step, common] = found
        return found

    @cached_property
    def _known_cases(self) -> dict[tuple[int, int, int], list[tuple[int, int]]]:
        return {}

    def directional(
        self, t: Reals, angle_rad: Reals, *, residue: int = 0, modulus: int = 1
    ) -> Complexes | None:
        """Return None: a sum around this one takes its parts."""
        return (
            None
            if self.symmetry
            else super().directional(t, angle_rad, residue=residue, modulus=modulus)
        )

    def law(self) -> Law | NoLaw:
        """Return the law: that of phasors where every envelope is constant."""
        if all(is_constant(term) for term in self.factors):
            amplitudes = np.array([term.peak for term in self.factors])
            return phasor_law(amplitudes, name=self.name, holds=self.holds)
        return law_of_characteristic(
            self.characteristic,
            name=self.name,
            holds=self.holds,
            mean_power=self.mean_power,
            peak=self.peak,
            lowest_probability=self.lowest_probability,
            most_terms=LONGEST_SERIES,
        )


@dataclass(frozen=True, eq=False, kw_only=True)
class TiedTerm(BaseTerm):
    """Parts whose phases move together: enumerated, with their two-dimensional functions.

    Parameters
    ----------
    factors : tuple of Term
        The parts.
    steps : tuple of int
        Frequency of each over the common divisor of the differences; the first is 0.
    turns : (int, int)
        ``(g, N)``: the common phase turns by ``g / N`` of a circle from index to index.
    """

    factors: tuple[Term, ...]
    steps: tuple[int, ...]
    turns: tuple[int, int]

    def characteristic(self, t: Reals, *, residue: int = 0, modulus: int = 1) -> Reals:
        """Return the mean over indices, phases and directions of the product."""
        step = math.gcd(modulus, self.clock_samples)
        indices = range(residue % step, self.clock_samples, step)
        cases: dict[tuple[object, ...], list[int]] = {}
        for index in indices:
            met = tuple(round(phase, 9) for phase in self._phases(index))
            kinds = tuple(_kind(term, index) for term in self.factors)
            cases.setdefault((kinds, met), []).append(index)
        out = np.zeros(t.shape)
        for alike in cases.values():
            phases = self._phases(alike[0])
            for phase in phases:
                out += self._mean(t, alike[0], phase) * (len(alike) / len(phases))
        return out / len(indices)

    def _phases(self, index: int) -> list[float]:
        """Return the common phases met at the indices that leave a residue, radians."""
        g, n = self.turns
        count = n // math.gcd(n, g * self.clock_samples)
        first = g * index % n / n
        used = min(count, MOST_STATES)
        return [math.tau * (first + j / used) for j in range(used)]

    def _mean(self, t: Reals, index: int, phase: float) -> Reals:
        out = np.empty(t.size)
        folds = [term.symmetry for term in self.factors]
        fold, unit = math.gcd(*folds), math.lcm(*folds)
        start = 0
        while start < t.size:
            highest = float(t[start : start + 64].max())
            n = unit // fold * (int((1.1 * highest * self.peak + _MARGIN) / unit) + 2)
            rows = max(1, min(64, _CELLS // n))
            part = t[start : start + rows]
            total = np.ones((part.size, n), np.complex128)
            for term, step in zip(self.factors, self.steps, strict=True):
                clock, repeats = term.clock_samples, term.symmetry // fold
                width = 2 * np.pi / term.symmetry
                angle = np.linspace(0.0, width, n // repeats, endpoint=False) - step * phase
                made = term.directional(part, angle, residue=index % clock, modulus=clock)
                if made is not None:
                    total *= np.tile(made, repeats)
            out[start : start + rows] = total.real.mean(axis=1)
            start += rows
        return out

    def directional(
        self, t: Reals, angle_rad: Reals, *, residue: int = 0, modulus: int = 1
    ) -> None:
        """Return None: its directions are not told."""

    def law(self) -> Law | NoLaw:
        """Return the law by a series that is not too long."""
        return law_of_characteristic(
            self.characteristic,
            name=self.name,
            holds=self.holds,
            mean_power=self.mean_power,
            peak=self.peak,
            lowest_probability=self.lowest_probability,
            most_terms=LONGEST_SERIES // 2,
        )


def combine_terms(parts: Sequence[Placed], *, n_samples: int) -> Term | NoLaw:
    """Return the term of a sum of parts.

    Parameters
    ----------
    parts : sequence of Placed
        At least one.
    n_samples : int
        Samples in the loop.

    Returns
    -------
    Term or NoLaw
        No law where parts share data, or where their phases are tied to each other in a way
        that is not followed here.

    Notes
    -----
    For independent parts at one index the two-dimensional characteristic functions multiply.
    Part ``i`` turns by ``c_i / N`` of a circle a sample; as a Fourier series over the angle,
    the mean over the indices of a product of harmonics ``m_i`` (multiples of the symmetry of
    each part, adding up to 0) is 0 unless ``sum m_i c_i P`` is a multiple of ``N``, ``P`` the
    common clock. Where no such ``m_i`` up to ``HIGHEST_ORDER`` exist the phases run freely, and
    ``E[J0(t R)]`` multiply; where they do, the phases met are enumerated (derivation; tested by
    simulation in ``tests/truth/test_laws_composite.py``).
    """
    flat = list(_flattened(parts))
    shared = _shared(flat)
    if shared:
        return NoLaw(reason=f"shared data: two parts carry {shared}")
    lines, others = _without_lines(flat, n_samples)
    pooled = [*others, *([lines] if lines is not None else [])]
    isotropic = [one for one in pooled if not one.term.symmetry]
    directed = [one for one in pooled if one.term.symmetry]
    common = _common_facts(flat)
    if len(directed) > 1:
        tied = _tie(directed, n_samples=n_samples)
        if isinstance(tied, NoLaw):
            return tied
        directed = tied
    factors = tuple(one.moved for one in [*directed, *isotropic])
    if len(factors) == 1:
        return factors[0]
    return ProductTerm(
        name=common.name,
        holds=common.holds,
        mean_power=math.fsum(term.mean_power for term in factors),
        peak=math.fsum(term.peak for term in factors),
        clock_samples=math.lcm(*(term.clock_samples for term in factors)),
        symmetry=1 if directed else 0,
        data=common.data,
        lowest_probability=common.lowest_probability,
        factors=factors,
        placed=tuple(flat),
    )


@runtime_checkable
class HasKinds(Protocol):
    """A term that tells which indices have one law."""

    def kind(self, index: int) -> object:
        """Return something equal for indices of one two-dimensional function."""


def _kind(term: Term, index: int) -> object:
    inner = term.inner if isinstance(term, Scaled) else term
    return inner.kind(index) if isinstance(inner, HasKinds) else index % inner.clock_samples


def _gathered(envelope: Reals) -> tuple[Reals, Reals]:
    """Return at most 4096 envelopes and their shares, that keep every mean of ``J0(t R)``."""
    ordered = np.sort(envelope)
    if ordered.size <= MOST_ENVELOPES:
        return ordered, np.full(ordered.size, 1 / ordered.size)
    # Pairs at mean +- deviation keep three moments of what lies in each interval.
    n_bins = MOST_ENVELOPES // 2
    place = np.minimum((ordered * (n_bins / ordered[-1])).astype(np.int64), n_bins - 1)
    counts = np.bincount(place, minlength=n_bins)
    used = counts > 0
    counts = counts[used]
    starts = np.concatenate([[0], np.cumsum(counts)[:-1]])
    centre = np.add.reduceat(ordered, starts) / counts
    rest = ordered - np.repeat(centre, counts)
    spread = np.sqrt(np.add.reduceat(rest**2, starts) / counts)
    share = counts / (2 * ordered.size)
    return np.concatenate([centre - spread, centre + spread]), np.concatenate([share, share])


def is_constant(term: Term) -> bool:
    """Return whether a part has a constant envelope."""
    return math.isclose(term.peak**2, term.mean_power, rel_tol=1e-9)


def _common_facts(flat: Sequence[Placed]) -> BaseTerm:
    terms = [one.term for one in flat]
    is_sure = all(term.holds == "every loop" for term in terms)
    return BaseTerm(
        name=" + ".join(term.name for term in terms),
        holds="every loop" if is_sure else "over seeds",
        data=frozenset().union(*(term.data for term in terms)),
        lowest_probability=max(term.lowest_probability for term in terms),
    )


def _flattened(parts: Sequence[Placed]) -> Iterator[Placed]:
    """Yield the parts, those of sums among them one by one."""
    for one in parts:
        inner: Term = one.term
        gain, turn = one.gain, one.turn_rad
        while isinstance(inner, Scaled):
            gain, turn, inner = gain * inner.gain, turn + inner.turn_rad, inner.inner
        if not isinstance(inner, ProductTerm):
            yield Placed(term=inner, gain=gain, turn_rad=turn, n_cycles=one.n_cycles)
            continue
        for deeper in inner.placed:
            yield Placed(
                term=deeper.term,
                gain=deeper.gain * gain,
                turn_rad=deeper.turn_rad + turn,
                n_cycles=deeper.n_cycles + one.n_cycles,
            )


def _shared(flat: Sequence[Placed]) -> str | None:
    seen: set[str] = set()
    for one in flat:
        both = seen & one.term.data
        if both:
            return min(both)
        seen |= one.term.data
    return None


def _without_lines(flat: Sequence[Placed], n_samples: int) -> tuple[Placed | None, list[Placed]]:
    """Return all unmodulated tones as one part, and the others."""
    bins: list[int] = []
    values: list[complex] = []
    others: list[Placed] = []
    for one in flat:
        factor = cmath.rect(one.gain, one.turn_rad)
        if isinstance(one.term, LineTerm):
            bins.append(one.n_cycles)
            values.append(one.term.value * factor)
        elif isinstance(one.term, LinesTerm):
            bins.extend(one.n_cycles + place for place in one.term.bins)
            values.extend(value * factor for value in one.term.values)
        else:
            others.append(one)
    if not bins:
        return None, others
    made = LinesTerm.of(bins, values, n_samples=n_samples)
    first = made.bins[0] if isinstance(made, LinesTerm) else bins[0]
    return Placed(term=made, n_cycles=first), others


def _tie(directed: list[Placed], *, n_samples: int) -> list[Placed] | NoLaw:
    """Return the parts as they are if their phases run freely, else as one enumerated part."""
    clocks = [one.term.clock_samples for one in directed]
    period = math.lcm(*(clock for clock in clocks if n_samples % clock == 0))
    lines = next((one for one in directed if isinstance(one.term, LinesTerm)), None)
    if lines is not None and isinstance(lines.term, LinesTerm):
        rest = [one for one in directed if one is not lines]
        own = math.lcm(*(one.term.clock_samples for one in rest))
        modulus = math.gcd(n_samples, lines.term.spacing * own)
        shifts = [(one.n_cycles - lines.n_cycles) * own % modulus for one in rest]
        for orders in _orders([one.term.symmetry for one in rest]):
            turn = sum(m * shift for m, shift in zip(orders, shifts, strict=True))
            if any(orders) and turn % modulus == 0:
                return NoLaw(
                    reason="tones in a simple ratio to a modulated part beside them have no law"
                )
        return directed
    for orders in _orders([one.term.symmetry for one in directed]):
        turn = sum(m * one.n_cycles for m, one in zip(orders, directed, strict=True))
        if any(orders) and not sum(orders) and turn * period % n_samples == 0:
            return _enumerated(directed, period, n_samples)
    return directed


def _orders(symmetries: Sequence[int]) -> Iterator[tuple[int, ...]]:
    """Yield the harmonics of the angle that parts have, up to the highest order."""
    if len(symmetries) > 4:
        # Pairs and triples tell of simple ratios; all combinations would be too many.
        for chosen in combinations(range(len(symmetries)), 3):
            for orders in _orders([symmetries[i] for i in chosen]):
                full = [0] * len(symmetries)
                for place, order in zip(chosen, orders, strict=True):
                    full[place] = order
                yield tuple(full)
        return
    ranges = [
        range(-(HIGHEST_ORDER // fold) * fold, HIGHEST_ORDER + 1, fold) for fold in symmetries
    ]
    yield from product(*ranges)


def _enumerated(directed: list[Placed], period: int, n_samples: int) -> list[Placed] | NoLaw:
    reason = "offsets in a simple ratio to each other or to the symbol clocks have no law"
    first = directed[0].n_cycles
    offsets = [one.n_cycles - first for one in directed]
    common = math.gcd(*offsets)
    steps = [offset // common if common else 0 for offset in offsets]
    turns = (common % n_samples, n_samples)
    count = n_samples // math.gcd(n_samples, common * period)
    is_long = count > MOST_STATES and max(map(abs, steps)) > MOST_STEPS
    if is_long or period > MOST_RESIDUES:
        return NoLaw(reason=reason)
    probe, one_angle = np.zeros(1), np.zeros(1)
    for one in directed:
        if one.term.directional(probe, one_angle) is None:
            return NoLaw(reason=f"{one.term.name} beside a part tied to its phase has no law")
    if sum(one.term.symmetry == 1 for one in directed) > 1:
        return NoLaw(reason="two parts with a mean, tied in phase, have no law")
    factors = tuple(one.moved for one in directed)
    facts = _common_facts(directed)
    term = TiedTerm(
        name=facts.name,
        holds=facts.holds,
        mean_power=math.fsum(factor.mean_power for factor in factors),
        peak=math.fsum(factor.peak for factor in factors),
        clock_samples=period,
        symmetry=1,
        data=facts.data,
        lowest_probability=facts.lowest_probability,
        factors=factors,
        steps=tuple(steps),
        turns=turns,
    )
    return [Placed(term=term, n_cycles=first)]
