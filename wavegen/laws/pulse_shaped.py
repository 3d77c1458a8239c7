"""The law of independent symbols through a pulse, at the instants that samples fall on."""

from __future__ import annotations

import math
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property, lru_cache

import numpy as np
from numpy.typing import NDArray

from wavegen.dsp.pulse import Pulse
from wavegen.laws.angular import AngularSum, Directional, PointGroup
from wavegen.laws.radial import RadialLaw
from wavegen.laws.rails import Rail, RailPair
from wavegen.laws.term import BaseTerm, Complexes, NoLaw, Reals

MOST_PHASES = 64
"""Instants within a symbol; where samples fall on more, as many stand for all of them.

Half as many move no level of QPSK by more than 0.002 dB at roll-off 0.5 and by more than 0.0002 dB
at 0.22, down to 1e-9, and the step from there to 128 is smaller still (computed).
"""
FEW_PHASES = 40
"""The same where rails do not separate. Against 128, levels of 8PSK down to 1e-9 move by 0.0002 dB
at roll-off 0.5 and by 0.0007 dB at 0.7; 32 would move them by 0.0016 dB at 0.5 (computed).
"""
MOST_SYMMETRY = 64
_EQUAL = 1e-9


@dataclass(frozen=True, eq=False, kw_only=True)
class Instant:
    """What the signal is at one timing phase.

    Parameters
    ----------
    value : RailPair or AngularSum
        Its law.
    tilt_rad : float
        Angle that it is turned by.
    """

    value: RailPair | AngularSum
    tilt_rad: float = 0.0


@dataclass(frozen=True, eq=False, kw_only=True)
class PulseShapedTerm(BaseTerm):
    """Independent, equally likely symbols through a pulse. Use :meth:`of`.

    Parameters
    ----------
    points : complex128 array, shape (order,)
        Symbols, of unit mean power.
    pulse : Pulse
        Shape, on any scale.
    ratio : (int, int)
        Samples and symbols of the shortest cycle, in lowest terms: sample ``n`` stands at
        ``n b / a`` symbols.
    period_symbols : int
        Symbols in the loop; where the pulse is longer it meets itself.
    turns : Fraction
        Rotation from symbol to symbol, over a full turn.
    is_staggered : bool
        Whether the Q rail is half a symbol late.
    """

    points: Complexes
    pulse: Pulse
    ratio: tuple[int, int]
    period_symbols: int
    turns: Fraction = Fraction(0)
    is_staggered: bool = False

    @classmethod
    def of(
        cls,
        *,
        name: str,
        points: Complexes,
        pulse: Pulse,
        ratio: tuple[int, int],
        period_symbols: int,
        turns: Fraction = Fraction(0),
        is_staggered: bool = False,
        data: frozenset[str] = frozenset(),
        lowest_probability: float = 0.0,
    ) -> PulseShapedTerm:
        """Return the term, of unit mean power; its peak is that of the instants visited."""
        b = ratio[1]
        n_kinds = (turns * symmetry_of(points)).denominator
        clock = ratio[0] * (n_kinds // math.gcd(n_kinds, b))

        def made(peak: float) -> PulseShapedTerm:
            return cls(
                name=name,
                clock_samples=clock,
                symmetry=2 if is_staggered else symmetry_of(points),
                data=data,
                lowest_probability=lowest_probability,
                points=points,
                pulse=pulse,
                ratio=ratio,
                period_symbols=period_symbols,
                turns=turns,
                is_staggered=is_staggered,
                peak=peak,
            )

        instants = made(math.inf).instants(0, 1)
        return made(max(instant.value.peak for instant, _ in instants))

    def instants(self, residue: int, modulus: int) -> tuple[tuple[Instant, float], ...]:
        """Return the different instants that indices of a residue fall on, and their shares."""
        modulus = math.gcd(modulus, self.ratio[0])
        return _instants(self, residue % modulus, modulus)

    def characteristic(self, t: Reals, *, residue: int = 0, modulus: int = 1) -> Reals:
        """Return ``E[J0(t R)]`` over the indices that leave a residue."""
        out = np.zeros(t.shape)
        for instant, share in self.instants(residue, modulus):
            out += share * instant.value.characteristic(t)
        return out

    def directional(
        self, t: Reals, angle_rad: Reals, *, residue: int = 0, modulus: int = 1
    ) -> Complexes | None:
        """Return the two-dimensional function; None where a rotation turns it with the symbols."""
        if self._plan.n_kinds > 1:
            return None
        out = np.zeros((t.size, angle_rad.size), np.complex128)
        for instant, share in self.instants(residue, modulus):
            out += share * instant.value.directional(t, angle_rad - instant.tilt_rad)
        return out

    @cached_property
    def _plan(self) -> _Plan:
        return _Plan(self)

    def kind(self, index: int) -> object:
        """Return what is equal for indices of one two-dimensional function."""
        a, b = self.ratio
        return self._plan.at(Fraction(index * b % a, a))[0]

    def law(self) -> RadialLaw | NoLaw:
        """Return the law of the envelope: the mean over the instants."""
        instants = self.instants(0, 1)
        with ThreadPoolExecutor() as pool:  # NumPy lets go of the interpreter's lock
            list(pool.map(_prepare, [instant.value for instant, _ in instants]))
        for instant, _ in instants:
            if isinstance(instant.value, AngularSum) and instant.value.tail is None:
                return NoLaw(reason="nearly discrete: few symbols make up the envelope")
        return RadialLaw(
            name=self.name,
            holds=self.holds,
            mean_power=self.mean_power,
            peak=self.peak,
            radius=self.peak,
            tail=InstantsTail(instants=instants),
            lowest_probability=self.lowest_probability,
        )

    @cached_property
    def gain(self) -> float:
        """Factor that brings the pulse to unit mean power."""
        phases = [phase for phase, _ in _phases(self.ratio[0], 0, 1)]
        energy = np.mean([np.sum(self._raw(phase) ** 2) for phase in phases])
        return float(energy**-0.5)

    def taps(self, phase: Fraction, *, late: bool = False) -> Reals:
        """Return the pulse of each symbol at an instant, shape (n_taps,).

        Parameters
        ----------
        phase : Fraction
            Time after symbol 0, symbols, 0 to 1.
        late : bool
            Of the rail that is half a symbol late.
        """
        return self.gain * self._raw(phase - Fraction(1, 2) if late else phase)

    def _raw(self, phase: Fraction) -> Reals:
        span = self.pulse.span_symbols
        numbers = np.arange(-span, span + 2)
        if self.pulse.is_sampled:  # the phase is whole samples then
            per_symbol = self.ratio[0]
            values = self.pulse.on_lattice(per_symbol)
            places = np.rint(float(phase) * per_symbol).astype(np.int64)
            places = places - numbers * per_symbol + span * per_symbol
            inside = (places >= 0) & (places < values.size)
            taps = np.where(inside, values[np.clip(places, 0, values.size - 1)], 0.0)
        else:
            # One division of whole numbers: whole symbols exactly, where a pulse jumps.
            instants = (phase.numerator - numbers * phase.denominator) / phase.denominator
            taps = self.pulse.values(instants)
        if numbers.size > self.period_symbols:
            folded = np.zeros(self.period_symbols)
            np.add.at(folded, numbers % self.period_symbols, taps)
            return folded
        return taps

    def _numbers(self) -> NDArray[np.int64]:
        span = self.pulse.span_symbols
        numbers = np.arange(-span, span + 2)
        return np.arange(self.period_symbols) if numbers.size > self.period_symbols else numbers


def _prepare(value: RailPair | AngularSum) -> None:
    """Compute ahead what is kept of an instant."""
    if isinstance(value, AngularSum):
        _ = value.tail
    else:
        value.above(np.array([0.5 * value.peak]))


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class InstantsTail:
    """``P(R > r)`` over instants.

    Parameters
    ----------
    instants : tuple of (Instant, float)
        What they are, and the share of each in time.
    """

    instants: tuple[tuple[Instant, float], ...]

    def above(self, radius: Reals) -> Reals:
        """Return the probability above each radius of a flat array."""
        out = np.zeros(radius.size)
        for instant, share in self.instants:
            inside = radius < instant.value.peak
            out[inside] += share * instant.value.above(radius[inside])
        return out


def symmetry_of(points: Complexes) -> int:
    """Return the highest fold of the symmetry of points about zero, up to 64.

    Examples
    --------
    >>> symmetry_of(np.array([1, 1j, -1, -1j])), symmetry_of(np.array([1, -1])), symmetry_of(
    ...     np.array([1, 0.5])
    ... )
    (4, 2, 1)
    """
    for fold in range(min(points.size, MOST_SYMMETRY), 1, -1):
        if _is_same(points, points * np.exp(2j * np.pi / fold)):
            return fold
    return 1


def _is_same(points: Complexes, others: Complexes) -> bool:
    """Return whether two sets of points are one."""
    return np.array_equal(_keys(points), _keys(others))


def _keys(points: Complexes) -> NDArray[np.complex128]:
    # Moved off the halves, so that rounding does not part equal points.
    return np.sort_complex(np.round(points + (0.31831 + 0.27183j) * 1e-7, 6) + 0.0)


def _phases(
    n: int, residue: int, modulus: int, *, step: int = 1, most: int = MOST_PHASES
) -> list[tuple[Fraction, float]]:
    """Return the phases of indices ``i`` with ``i mod modulus = residue``: ``i step mod n / n``.

    Where there are many, ``most`` evenly spaced ones stand for them.
    """
    count = n // modulus
    first = Fraction(residue * step % modulus, n)
    used = min(count, most) if count > FEW_PHASES else count
    return [(first + Fraction(j, used), 1 / used) for j in range(used)]


@lru_cache(maxsize=64)
def _instants(
    term: PulseShapedTerm, residue: int, modulus: int
) -> tuple[tuple[Instant, float], ...]:
    a, b = term.ratio
    shares: dict[tuple[bytes, ...], float] = {}
    makers: dict[tuple[bytes, ...], Callable[[], Instant]] = {}
    plan = term._plan
    most = MOST_PHASES if plan.has_rails or term.is_staggered else FEW_PHASES
    for phase, share in _phases(a, residue, modulus, step=b, most=most):
        key, maker = plan.at(phase)
        shares[key] = shares.get(key, 0.0) + share
        makers.setdefault(key, maker)
    return tuple((makers[key](), share) for key, share in shares.items())


class _Plan:
    """How the points of a term are best taken: as rails, or by angle."""

    def __init__(self, term: PulseShapedTerm) -> None:
        self.term = term
        self.symmetry = symmetry_of(term.points)
        self.tilt, self.levels = _rails(term.points)
        fold = Fraction(1, self.symmetry)
        numbers = term._numbers()
        self.classes = [int(number) * term.turns % fold for number in numbers]
        self.kinds = sorted(set(self.classes))
        self.n_kinds = (term.turns % fold / fold).denominator
        quarters = all(kind in {Fraction(0), Fraction(1, 4)} for kind in self.kinds)
        one_line = self.levels is not None and not self.levels[1].any()
        self.has_rails = self.levels is not None and (
            self.kinds == [Fraction(0)] or (quarters and one_line)
        )

    def at(self, phase: Fraction) -> tuple[tuple[bytes, ...], Callable[[], Instant]]:
        """Return what tells this instant from others, and what makes it."""
        taps = self.term.taps(phase)
        if self.term.is_staggered:
            late = self.term.taps(phase, late=True)
            return (_key(np.abs(taps)), _key(np.abs(late))), lambda: self._staggered(taps, late)
        groups = [
            (taps[[one == kind for one in self.classes]], float(2 * np.pi * kind))
            for kind in self.kinds
        ]
        keys = [_key(part if self.symmetry % 2 else np.abs(part)) for part, _ in groups]
        # Turned as a whole, the envelope is the same: the kinds are evenly spaced.
        key = min(tuple(keys[i:] + keys[:i]) for i in range(len(keys)))
        return key, lambda: self._instant(groups)

    def _staggered(self, taps: Reals, late: Reals) -> Instant:
        points = self.term.points  # they pair every level of I with every one of Q
        pair = RailPair(
            first=Rail(taps=taps, levels=np.unique(points.real.round(12))),
            second=Rail(taps=late, levels=np.unique(points.imag.round(12))),
        )
        return Instant(value=pair)

    def _instant(self, groups: list[tuple[Reals, float]]) -> Instant:
        if self.has_rails and self.levels is not None:
            real, imaginary = self.levels
            if len(groups) == 1:
                return Instant(value=_pair(groups[0][0], real, imaginary), tilt_rad=self.tilt)
            first, second = (Rail(taps=taps, levels=real) for taps, _ in groups)
            return Instant(value=RailPair(first=first, second=second), tilt_rad=self.tilt)
        parts: list[tuple[Directional, float]] = []
        for taps, turn in groups:
            if self.levels is not None:
                parts.append((_pair(taps, *self.levels), turn + self.tilt))
            else:
                has_opposites = self.symmetry % 2 == 0
                one = PointGroup(points=self.term.points, taps=taps, has_opposites=has_opposites)
                parts.append((one, turn))
        points = self.term.points
        is_mirrored = _is_same(points, points.conj()) and all(
            (2 * kind) % Fraction(1, self.symmetry) == 0 for kind in self.kinds
        )
        value = AngularSum(parts=tuple(parts), symmetry=self.symmetry, is_mirrored=is_mirrored)
        return Instant(value=value)


def _pair(taps: Reals, real: Reals, imaginary: Reals) -> RailPair:
    """Return the rails of symbols that pair levels."""
    first = Rail(taps=taps, levels=real)
    if np.array_equal(real, imaginary):
        return RailPair(first=first, second=first)  # computed once
    return RailPair(first=first, second=Rail(taps=taps, levels=imaginary))


def _key(taps: Reals) -> bytes:
    return np.sort(np.round(taps / _EQUAL) + 0.0).tobytes()


def _rails(points: Complexes) -> tuple[float, tuple[Reals, Reals] | None]:
    """Return the tilt at which points pair the levels of two symmetric rails, and the levels."""
    corner = float(np.angle(points[np.argmax(np.abs(points))]))
    tilts = [0.0, np.pi / 4, corner, corner - np.pi / 4]
    for tilt in tilts:
        turned = points * np.exp(-1j * tilt)
        real, imaginary = turned.real.round(9) + 0.0, turned.imag.round(9) + 0.0
        levels = np.unique(real), np.unique(imaginary)
        pairs = np.unique(real + 1j * imaginary)
        is_grid = levels[0].size * levels[1].size == pairs.size == points.size
        is_even = all(np.allclose(level, -level[::-1], atol=1e-8) for level in levels)
        if is_grid and is_even:
            exact = [np.array([turned.real[real == one].mean() for one in levels[0]])]
            exact.append(np.array([turned.imag[imaginary == one].mean() for one in levels[1]]))
            return tilt, (exact[0], np.where(np.abs(exact[1]) < 1e-9, 0.0, exact[1]))
    return 0.0, None
