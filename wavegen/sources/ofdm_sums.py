"""Samples of OFDM at which the sum over the subcarriers takes few values: each with its share.

Subcarriers that stand at multiples of a quarter turn to each other add their points up to one
lattice, whose values are few and come about in many ways. At some samples of a symbol all of them
do, at others they fall into two or four such classes; and few subcarriers have few sums anywhere.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from wavegen.laws.mixture import KnownAmplitudes
from wavegen.laws.term import Complexes, Reals
from wavegen.sources.ofdm_carriers import Carriers, fold_of

MOST_SUMS = 1 << 23
"""Sums at one sample that are gone through."""
MOST_IN_A_CLASS = 1 << 20
N_CELLS = 1 << 18
"""Amplitudes that are told apart, evenly up to the highest: 0.0001 dB at the mean power where
peaks lie 10 dB over it."""
_BLOCK = 1 << 20
_SAME = 1e-8
"""Values over the largest that are nearer than this are one."""
_QUARTER = math.pi / 2
_ROUNDING = 1e-9

Weighed = Sequence[tuple[Carriers, float]]
Values = tuple[Complexes, Reals]
"""Different values and the share of each."""
_Members = list[tuple[Carriers, float, Reals]]


def n_sums(groups: Sequence[Carriers]) -> float:
    """Return in how many ways points of all subcarriers add up; ``inf`` if beyond counting."""
    bits = sum(group.turns.size * math.log2(group.points.size) for group in groups)
    return 2.0**bits if bits < 64 else math.inf


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Sums:
    """All sums at a sample, as independent parts that are still to be added.

    Parameters
    ----------
    parts : tuple of (values, shares)
        Of each class of subcarriers.
    """

    parts: tuple[Values, ...]

    @property
    def count(self) -> int:
        """How many sums there are."""
        return math.prod(values.size for values, _ in self.parts)

    def counted(self, highest: float) -> Reals:
        """Return the share of the sums in each cell of amplitude, shape (N_CELLS,).

        Parameters
        ----------
        highest : float
            Amplitude at the end of the last cell.
        """
        first: Values = (np.zeros(1, np.complex128), np.ones(1))
        second = first
        for part in sorted(self.parts, key=lambda part: part[0].size):
            if first[0].size <= second[0].size:
                first = _all_of(first, part)
            else:
                second = _all_of(second, part)
        cells = np.zeros(N_CELLS)
        step = max(_BLOCK // second[0].size, 1)
        for low in range(0, first[0].size, step):
            some = slice(low, low + step)
            power = np.add.outer(first[0].real[some], second[0].real) ** 2
            power += np.add.outer(first[0].imag[some], second[0].imag) ** 2
            cell = (np.sqrt(power, out=power) * (N_CELLS / highest)).astype(np.int64).ravel()
            np.minimum(cell, N_CELLS - 1, out=cell)
            share = np.multiply.outer(first[1][some], second[1]).ravel()
            cells += np.bincount(cell, share, minlength=N_CELLS)
        return cells


def as_amplitudes(cells: Reals, highest: float) -> KnownAmplitudes:
    """Return what cells hold as amplitudes in their middles; shares made to be 1 together."""
    used = np.flatnonzero(cells)
    return KnownAmplitudes(
        amplitudes=np.asarray((used + 0.5) * (highest / N_CELLS), np.float64),
        shares=cells[used] / cells.sum(),
    )


def sums_at(weighed: Weighed, sample: float, known: complex) -> Sums | None:
    """Return the sums at a sample, where there are few.

    Parameters
    ----------
    weighed : sequence of (Carriers, float)
        What is added there, each with its weight.
    sample : float
        Of the useful part.
    known : complex
        What is added to all sums.

    Returns
    -------
    Sums or None
        None where there are more than :data:`MOST_SUMS`.
    """
    parts: list[Values] = [(np.array([known], np.complex128), np.ones(1))]
    room = MOST_SUMS
    fold = 1 if known else fold_of([group for group, _ in weighed])
    for angle, members in _classes(weighed, sample).items():
        of_class = _of_class(members, min(room, MOST_IN_A_CLASS), fold if len(parts) == 1 else 1)
        if of_class is None:
            return None
        room //= of_class[0].size
        parts.append((of_class[0] * np.exp(1j * angle), of_class[1]))
    return Sums(parts=tuple(parts))


def _classes(weighed: Weighed, sample: float) -> dict[float, _Members]:
    """Return subcarriers by their angle within a quarter turn, with the quarters of each."""
    classes: dict[float, _Members] = {}
    for group, gain in weighed:
        angles = 2 * np.pi * group.turns * sample + group.phases
        within = np.round(angles % _QUARTER, 9)
        within[within > _QUARTER - _ROUNDING] = 0.0
        for angle in np.unique(within):
            quarters = np.rint((angles[within == angle] - angle) / _QUARTER)
            classes.setdefault(float(angle), []).append((group, gain, quarters))
    return classes


def _of_class(members: _Members, room: int, fold: int) -> Values | None:
    """Add up subcarriers at multiples of a quarter turn to each other; None beyond the room.

    Turns by ``fold`` leave the amplitudes of all sums as they are: where all levels of the first
    subcarrier have an opposite, one of each two is enough.
    """
    if all(group.rails is not None for group, _, _ in members):
        real, imag = (_rail(members, rail, room, is_half=fold > 1 + rail) for rail in (0, 1))
        if real is None or imag is None or real[0].size * imag[0].size > room:
            return None
        values = np.add.outer(real[0], 1j * imag[0]).ravel()
        return values, np.multiply.outer(real[1], imag[1]).ravel()
    total: Values = (np.zeros(1, np.complex128), np.ones(1))
    for group, gain, quarters in members:
        for turn in quarters:
            points = group.points * (gain * np.exp(1j * _QUARTER * turn))
            total = _different(_all_of(total, (points, np.full(points.size, 1 / points.size))))
            if total[0].size > room:
                return None
    return total


def _rail(members: _Members, rail: int, room: int, *, is_half: bool) -> tuple[Reals, Reals] | None:
    """Return the values of one rail, and their shares: a quarter turn swaps the two.

    The levels of a rail have their opposites, so that no sign matters.
    """
    values, shares = np.zeros(1), np.ones(1)
    for group, gain, quarters in members:
        assert group.rails is not None  # noqa: S101 - asked by the caller
        for turn in quarters:
            levels = gain * group.rails[(rail + int(turn)) % 2]
            if is_half and np.all(levels != 0):
                levels = levels[levels > 0]
            is_half = False
            sums = np.add.outer(values, levels).ravel()
            values, shares = _merged(sums, np.repeat(shares / levels.size, levels.size))
            if values.size > room:
                return None
    return values, shares


def _all_of(first: Values, second: Values) -> Values:
    """Return all sums of two, and their shares."""
    values = np.add.outer(first[0], second[0]).ravel()
    return values, np.multiply.outer(first[1], second[1]).ravel()


def _merged(values: Reals, shares: Reals) -> tuple[Reals, Reals]:
    """Return different values, rising, and the share of each."""
    order = np.argsort(values, kind="stable")
    ordered = values[order]
    width = _SAME * max(float(np.abs(ordered).max()), _ROUNDING)
    first = np.flatnonzero(np.concatenate(([True], np.diff(ordered) > width)))
    return ordered[first], np.add.reduceat(shares[order], first)


def _different(total: Values) -> Values:
    """Return the values that differ, and the share of each."""
    values, shares = total
    unit = _SAME * float(np.abs(values).max())
    near = np.rint(values.real / unit) + 1j * np.rint(values.imag / unit)
    _, first, which = np.unique(near, return_index=True, return_inverse=True)
    together: NDArray[np.float64] = np.bincount(which.ravel(), shares).astype(np.float64)
    return values[first], together
