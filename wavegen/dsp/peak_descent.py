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
from functools import cache

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.signal import Samples
from wavegen.dsp.envelope_excess import excess_over
from wavegen.dsp.mapping_kernel import read_values, write_values

MOST_HALVINGS = 10
"""A step that must be smaller than 1/1000 of what was expected is not taken."""

Rule = Callable[[Samples], Samples]
"""From a wanted change of lines, shape (n_rows, n_lines), to the nearest one allowed."""


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
    excess = excess_over(rows.reshape(-1), amplitude).reshape(rows.shape)
    for _ in range(n_rounds):
        if not excess.any():
            break
        lines = scipy.fft.fft(excess, axis=1, norm="forward")
        wanted = read_values(np.asarray(lines, np.complex64), bins=bins)
        np.negative(wanted, out=wanted)
        move = wanted if rule is None else rule(wanted)
        placed = np.zeros_like(rows)
        write_values(placed, move, bins=bins)
        moved = scipy.fft.ifft(placed, axis=1, norm="forward", overwrite_x=True)
        steps = steps_of(np.asarray(moved, np.complex64), excess)
        advance(rows, np.asarray(moved, np.complex64), steps, amplitude, excess)
        change += steps[:, None] * move
    return change


def steps_of(moved: Samples, excess: Samples) -> NDArray[np.float32]:
    """Return how far each row should go.

    Parameters
    ----------
    moved : complex64 array, shape (n_rows, n)
        Change of the samples by a step of 1.
    excess : complex64 array, shape (n_rows, n)
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
    kernels[0](moved.view(np.float32), excess.view(np.float32), out)
    return out


def steps_by_numpy(moved: Samples, excess: Samples) -> NDArray[np.float32]:
    """Do what :func:`steps_of` does, without a compiler; same parameters, same bits."""
    out = np.zeros(moved.shape[0], np.float32)
    for row, (m, e) in enumerate(zip(moved, excess, strict=True)):
        above = np.flatnonzero((e.real != 0) | (e.imag != 0))
        real, imag = e.real[above].astype(np.float64), e.imag[above].astype(np.float64)
        along = m.real[above] * real + m.imag[above] * imag
        square = real * real + imag * imag
        if above.size:
            rise, width = np.cumsum(along)[-1], np.cumsum(along * along / square)[-1]
            if width > 0 and rise < 0:
                out[row] = -rise / width
    return out


def advance(
    rows: Samples, moved: Samples, steps: NDArray[np.float32], amplitude: float, excess: Samples
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
    excess : complex64 array, shape (n_rows, n)
        That of ``rows``, then of what they become.
    """
    kernels = _compile()
    if kernels is None:
        advance_by_numpy(rows, moved, steps, amplitude, excess)
        return
    flat = rows.view(np.float32), moved.view(np.float32), excess.view(np.float32)
    kernels[1](*flat, steps, amplitude)


def advance_by_numpy(
    rows: Samples, moved: Samples, steps: NDArray[np.float32], amplitude: float, excess: Samples
) -> None:
    """Do what :func:`advance` does, without a compiler; same parameters, same bits."""
    for number, (row, move) in enumerate(zip(rows, moved, strict=True)):
        if steps[number] == 0:
            continue
        before = _energy(excess[number])
        for _ in range(MOST_HALVINGS):
            made = row.view(np.float32) + move.view(np.float32) * steps[number]
            left = excess_over(made.view(np.complex64), amplitude)
            if _energy(left) < before:
                row.view(np.float32)[...] = made
                excess[number] = left
                break
            steps[number] *= np.float32(0.5)
        else:
            steps[number] = 0


def _energy(samples: Samples) -> float:
    square = samples.real.astype(np.float64) ** 2 + samples.imag.astype(np.float64) ** 2
    return float(np.cumsum(square)[-1])


@cache
def _compile() -> tuple[Callable[..., None], Callable[..., None]] | None:
    """Return the compiled loops, or None where numba is missing or switched off."""
    try:
        import numba
    except ImportError:
        return None
    if getattr(numba.config, "DISABLE_JIT", False):
        return None
    f32, f64, void = numba.types.float32, numba.types.float64, numba.types.void
    plane, line = numba.types.Array(f32, 2, "C"), numba.types.Array(f32, 1, "C")
    kinds = (void(plane, plane, line), void(plane, plane, plane, line, f64))
    loops: tuple[Callable[..., None], ...] = (_steps, _advance)
    pairs = list(zip(kinds, loops, strict=True))
    try:
        made = [numba.njit(kind, nogil=True, cache=True)(loop) for kind, loop in pairs]
    except RuntimeError:  # no folder can be written for the cache
        made = [numba.njit(kind, nogil=True)(loop) for kind, loop in pairs]
    return made[0], made[1]


def _steps(
    moved: NDArray[np.float32], excess: NDArray[np.float32], out: NDArray[np.float32]
) -> None:
    for row in range(moved.shape[0]):
        rise, width = 0.0, 0.0
        for k in range(0, moved.shape[1], 2):
            real, imag = np.float64(excess[row, k]), np.float64(excess[row, k + 1])
            square = real * real + imag * imag
            if square > 0.0:
                along = np.float64(moved[row, k]) * real + np.float64(moved[row, k + 1]) * imag
                rise += along
                width += along * along / square
        out[row] = np.float32(-rise / width) if width > 0.0 and rise < 0.0 else np.float32(0)


def _advance(
    rows: NDArray[np.float32],
    moved: NDArray[np.float32],
    excess: NDArray[np.float32],
    steps: NDArray[np.float32],
    amplitude: float,
) -> None:
    limit, top = np.float32(amplitude * amplitude), np.float32(amplitude)
    one = np.float32(1)
    left = np.empty(rows.shape[1], np.float32)
    for row in range(rows.shape[0]):
        step, before = steps[row], 0.0
        for k in range(0, rows.shape[1], 2):
            real, imag = np.float64(excess[row, k]), np.float64(excess[row, k + 1])
            before += real * real + imag * imag
        halvings = 0
        while step > 0:
            after = 0.0
            for k in range(0, rows.shape[1], 2):
                real = rows[row, k] + moved[row, k] * step
                imag = rows[row, k + 1] + moved[row, k + 1] * step
                power = real * real + imag * imag
                left[k] = left[k + 1] = np.float32(0)
                if power > limit:
                    share = one - top / np.sqrt(power)
                    left[k], left[k + 1] = real * share, imag * share
                    after += np.float64(left[k]) ** 2 + np.float64(left[k + 1]) ** 2
            if after < before:
                for k in range(rows.shape[1]):
                    rows[row, k] += moved[row, k] * step
                    excess[row, k] = left[k]
                break
            halvings += 1
            step = step * np.float32(0.5) if halvings < MOST_HALVINGS else np.float32(0)
        steps[row] = step
