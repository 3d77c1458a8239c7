"""Peaks of rows brought down by changes on chosen lines, with a step that suits each row.

Wanted is a change ``c`` on some lines of a row ``x`` with little left above an amplitude: the least
``f(c) = 1/2 sum (|x + c| - A)_+^2`` over the samples. Its slope is the excess, seen through those
lines, and each round goes down that slope, made to keep a rule about the lines. How far, a row's
own excess says: to first order a step ``s`` along ``d`` moves a sample's envelope by ``s r``,
where ``r`` is the part of ``d`` that points outwards there, and what then is left above,
``sum (e + s r)^2`` over the samples above with excesses ``e``, is least at
``s = -sum e r / sum r^2``. Where other samples rise so far that ``f`` does not fall, the step is
halved until it does.

J. Tellado, "Multicarrier Modulation with Low PAR", 2000, has the gradient of clipping noise on
reserved lines; B. Krongold, D. Jones, "PAR reduction in OFDM via active constellation extension",
IEEE Trans. Broadcasting 49(3), 2003, 258-268, has "smart" steps, found from the samples (both from
memory; this step is a derivation, and checked against a general solver).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cache

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.signal import Samples
from wavegen.dsp.compiled import compiled, numba_types
from wavegen.dsp.envelope_excess import excess_over, power_of
from wavegen.dsp.mapping_kernel import read_values, write_values

MOST_HALVINGS = 10
"""A step that must be smaller than 1/1000 of what was expected is not taken."""

Rule = Callable[[Samples], Samples]
"""From a wanted change of lines, shape (n_rows, n_lines), to the nearest one allowed."""


@dataclass(frozen=True, slots=True, eq=False)
class Excess:
    """What stands above the amplitude.

    Parameters
    ----------
    values : complex64 array, shape (n_rows, n)
        First of each row, sample by sample, what does.
    places : int32 array, shape (n_rows, n)
        First of each row, rising, where it does.
    counts : int64 array, shape (n_rows,)
        How many values and places.
    energies : float64 array, shape (n_rows,)
        Sum of the squares.
    """

    values: Samples
    places: NDArray[np.int32]
    counts: NDArray[np.int64]
    energies: NDArray[np.float64]

    @classmethod
    def of(cls, rows: Samples, amplitude: float) -> Excess:
        """Return the excess of rows, shape (n_rows, n)."""
        made = cls(
            values=np.empty(rows.shape, np.complex64),
            places=np.empty(rows.shape, np.int32),
            counts=np.empty(rows.shape[0], np.int64),
            energies=np.full(rows.shape[0], np.inf),
        )
        advance(rows, rows, np.zeros(rows.shape[0], np.float32), amplitude, made)
        return made

    def put(self, rows: Samples) -> None:
        """Fill rows with it, shape (n_rows, n), and with zero where nothing stands above."""
        rows[:] = 0
        kernels = _compile()
        if kernels is None:
            for row, places, values, n in zip(
                rows, self.places, self.values, self.counts, strict=True
            ):
                row[places[:n]] = values[:n]
        else:
            flat = rows.view(np.float32), self.values.view(np.float32)
            kernels[2](flat, self.places, self.counts)


def descend(
    rows: Samples,
    *,
    bins: NDArray[np.uint32],
    amplitude: float,
    n_rounds: int,
    rule: Rule | None = None,
) -> Samples:
    """Bring the peaks of rows down; return the change of their lines.

    Parameters
    ----------
    rows : complex64 array, shape (n_rows, n)
        One period each; the change is added to them.
    bins : uint32 array, shape (n_lines,)
        Lines that may be changed.
    amplitude : float
        Ceiling of the envelope.
    n_rounds : int
        Pairs of transforms. A row below the ceiling is left as it is.
    rule : callable, optional
        What each round's change must keep to: a projection onto a cone, so that any multiple
        of it and any sum are allowed too.

    Returns
    -------
    complex64 array, shape (n_rows, n_lines)
        ``rows`` have gained the inverse transform of it, unscaled.
    """
    change = np.zeros((rows.shape[0], bins.size), np.complex64)
    excess = Excess.of(rows, amplitude)
    work = np.empty(rows.shape, np.complex64)
    for _ in range(n_rounds):
        if not excess.counts.any():
            break
        excess.put(work)
        lines = np.asarray(scipy.fft.fft(work, axis=1, norm="forward", overwrite_x=True))
        wanted = read_values(lines, bins=bins)
        np.negative(wanted, out=wanted)
        move = wanted if rule is None else rule(wanted)
        lines[:] = 0
        write_values(lines, move, bins=bins)
        moved = np.asarray(scipy.fft.ifft(lines, axis=1, norm="forward", overwrite_x=True))
        steps = steps_of(moved, excess)
        advance(rows, moved, steps, amplitude, excess)
        change += steps[:, None] * move
    return change


def steps_of(moved: Samples, excess: Excess) -> NDArray[np.float32]:
    """Return how far each row should go.

    Parameters
    ----------
    moved : complex64 array, shape (n_rows, n)
        Change of the samples by a step of 1.
    excess : Excess
        What stands above the amplitude.

    Returns
    -------
    float32 array, shape (n_rows,)
        ``-sum e r / sum r^2`` over the samples above, not below 0; 0 where none is.
    """
    kernels = _compile()
    if kernels is None:
        return steps_by_numpy(moved, excess)
    out = np.empty(moved.shape[0], np.float32)
    planes = moved.view(np.float32), excess.values.view(np.float32)
    kernels[0](planes, excess.places, excess.counts, out)
    return out


def steps_by_numpy(moved: Samples, excess: Excess) -> NDArray[np.float32]:
    """Do what :func:`steps_of` does, without a compiler; same parameters, same bits."""
    out = np.zeros(moved.shape[0], np.float32)
    for row, (m, e) in enumerate(zip(moved, excess.values, strict=True)):
        left = np.flatnonzero(e[: excess.counts[row]])  # one just above may be lost in rounding
        above = excess.places[row, left]
        real, imag = e.real[left].astype(np.float64), e.imag[left].astype(np.float64)
        along = m.real[above] * real + m.imag[above] * imag
        square = real * real + imag * imag
        if above.size:
            rise, width = np.cumsum(along)[-1], np.cumsum(along * along / square)[-1]
            if width > 0 and rise < 0:
                out[row] = -rise / width
    return out


def advance(
    rows: Samples, moved: Samples, steps: NDArray[np.float32], amplitude: float, excess: Excess
) -> None:
    """Go steps that make the excess smaller, and find the excess there.

    Parameters
    ----------
    rows : complex64 array, shape (n_rows, n)
        Gain ``steps`` times ``moved``.
    moved : complex64 array, shape (n_rows, n)
        Change by a step of 1.
    steps : float32 array, shape (n_rows,)
        Of each row; halved, or set to 0, where the energy of the excess would not fall.
    amplitude : float
        Ceiling of the envelope.
    excess : Excess
        That of ``rows``, then of what they become.
    """
    kernels = _compile()
    if kernels is None:
        advance_by_numpy(rows, moved, steps, amplitude, excess)
        return
    planes = rows.view(np.float32), moved.view(np.float32), excess.values.view(np.float32)
    kernels[1](planes, steps, (excess.places, excess.counts, excess.energies), amplitude)


def advance_by_numpy(
    rows: Samples, moved: Samples, steps: NDArray[np.float32], amplitude: float, excess: Excess
) -> None:
    """Do what :func:`advance` does, without a compiler; same parameters, same bits."""
    limit = np.float32(amplitude * amplitude)
    for number, (row, move) in enumerate(zip(rows, moved, strict=True)):
        before = excess.energies[number]
        if steps[number] == 0 and before < np.inf:
            continue
        for _ in range(MOST_HALVINGS):
            made = row.view(np.float32) + move.view(np.float32) * steps[number]
            above = np.flatnonzero(power_of(made.view(np.complex64)) > limit)
            left = excess_over(made.view(np.complex64)[above], amplitude)
            square = left.real.astype(np.float64) ** 2 + left.imag.astype(np.float64) ** 2
            energy = float(np.cumsum(square)[-1]) if above.size else 0.0
            if energy < before:
                row.view(np.float32)[...] = made
                excess.values[number, : above.size] = left
                excess.places[number, : above.size] = above
                excess.counts[number], excess.energies[number] = above.size, energy
                break
            steps[number] *= np.float32(0.5)
        else:
            steps[number] = 0


@cache
def _compile() -> tuple[Callable[..., None], Callable[..., None], Callable[..., None]] | None:
    """Return the compiled loops, or None where numba is missing or switched off."""
    kinds = numba_types()
    if kinds is None:
        return None
    plane, line = kinds.Array(kinds.float32, 2, "C"), kinds.Array(kinds.float32, 1, "C")
    places, counts = kinds.Array(kinds.int32, 2, "C"), kinds.Array(kinds.int64, 1, "C")
    state = kinds.Tuple((places, counts, kinds.Array(kinds.float64, 1, "C")))
    steps = kinds.void(kinds.UniTuple(plane, 2), places, counts, line)
    onwards = kinds.void(kinds.UniTuple(plane, 3), line, state, kinds.float64)
    spread = kinds.void(kinds.UniTuple(plane, 2), places, counts)
    return compiled(steps, _steps), compiled(onwards, _advance), compiled(spread, _put)


def _put(
    planes: tuple[NDArray[np.float32], NDArray[np.float32]],
    places: NDArray[np.int32],
    counts: NDArray[np.int64],
) -> None:
    rows, values = planes
    for row in range(counts.size):
        for number in range(counts[row]):
            k = 2 * places[row, number]
            rows[row, k] = values[row, 2 * number]
            rows[row, k + 1] = values[row, 2 * number + 1]


def _steps(
    planes: tuple[NDArray[np.float32], NDArray[np.float32]],
    places: NDArray[np.int32],
    counts: NDArray[np.int64],
    out: NDArray[np.float32],
) -> None:
    moved, excess = planes
    for row in range(out.size):
        rise, width = 0.0, 0.0
        for number in range(counts[row]):
            k = 2 * places[row, number]
            real = np.float64(excess[row, 2 * number])
            imag = np.float64(excess[row, 2 * number + 1])
            square = real * real + imag * imag
            if square > 0.0:  # a sample just above has lost its excess in rounding
                along = np.float64(moved[row, k]) * real + np.float64(moved[row, k + 1]) * imag
                rise += along
                width += along * along / square
        out[row] = np.float32(-rise / width) if width > 0.0 and rise < 0.0 else np.float32(0)


def _advance(
    planes: tuple[NDArray[np.float32], NDArray[np.float32], NDArray[np.float32]],
    steps: NDArray[np.float32],
    state: tuple[NDArray[np.int32], NDArray[np.int64], NDArray[np.float64]],
    amplitude: float,
) -> None:
    rows, moved, excess = planes
    places, counts, energies = state
    limit, top = np.float32(amplitude * amplitude), np.float32(amplitude)
    one, half = np.float32(1), np.float32(0.5)
    n = rows.shape[1] // 2
    power, found = np.empty(n, np.float32), np.empty(n, np.int32)
    for row in range(rows.shape[0]):
        here, move = rows[row], moved[row]
        step, before = steps[row], energies[row]
        if step == 0 and before < np.inf:
            continue
        count, energy = 0, 0.0
        for trial in range(MOST_HALVINGS + 1):
            if trial == MOST_HALVINGS:
                step = np.float32(0)
                break
            for k in range(n):
                real = here[2 * k] + move[2 * k] * step
                imag = here[2 * k + 1] + move[2 * k + 1] * step
                power[k] = real * real + imag * imag
            count, energy = 0, 0.0
            for k in range(n):
                if power[k] > limit:
                    found[count] = k
                    count += 1
                    share = one - top / np.sqrt(power[k])
                    real = (here[2 * k] + move[2 * k] * step) * share
                    imag = (here[2 * k + 1] + move[2 * k + 1] * step) * share
                    energy += np.float64(real) * real + np.float64(imag) * imag
            if energy < before:
                break
            step *= half
        steps[row] = step
        if step == 0 and before < np.inf:
            continue
        counts[row], energies[row] = count, energy
        for k in range(2 * n):
            here[k] += move[k] * step
        for number in range(count):
            k = found[number]
            places[row, number] = k
            share = one - top / np.sqrt(power[k])
            excess[row, 2 * number] = here[2 * k] * share
            excess[row, 2 * number + 1] = here[2 * k + 1] * share
