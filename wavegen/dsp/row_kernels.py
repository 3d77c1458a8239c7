"""What goes on before, between and after the transforms of filter rows, in one pass each.

``put_...`` functions fill rows of ``n_fft`` samples, ``hop`` apart, from the samples that begin
where the first row does; what lies past their end is zero. ``take_...`` functions bring the
``hop`` samples from ``half`` on of each row together with signals that begin where those do, and
write ``out``; what of the last row lies past its end is dropped. Everything is elementwise, so
that no bit depends on how a range is cut. Compiled loops do it where numba is installed; plain
NumPy gives the same bits otherwise and is their referee.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from wavegen.core.signal import Samples
from wavegen.dsp.compiled import compiled, numba_types
from wavegen.dsp.envelope_excess import excess_over

Rails = NDArray[np.float32]
"""Complex samples seen as their rails in turn."""


def put_excess(rows: Samples, samples: Samples, *, hop: int, amplitude: float) -> None:
    """Fill rows with what a polar clip takes away: ``x (1 - A / |x|)`` where ``|x| > A``.

    Parameters
    ----------
    rows : complex64 array, shape (n_rows, n_fft)
        Written to; contiguous.
    samples : complex64 array, shape (n,)
        From where the first row begins; not changed.
    hop : int
        Samples from row to row, at least half of ``n_fft``.
    amplitude : float
        Largest envelope let through.
    """
    kernels = _compile()
    if kernels is None:
        put_excess_by_numpy(rows, samples, hop=hop, amplitude=amplitude)
    else:
        kernels["put_excess"](_rails(rows), _rails(samples), hop, *_limits(amplitude))


def put_excess_by_numpy(rows: Samples, samples: Samples, *, hop: int, amplitude: float) -> None:
    """Do what :func:`put_excess` does, without a compiler; same parameters, same bits."""
    put_samples(rows, excess_over(_stretch(rows, samples, hop), amplitude), hop=hop)


def put_ahead(rows: Samples, state: Samples, before: Samples, *, hop: int, factor: float) -> None:
    """Fill rows with ``y + factor (y - y')``.

    Parameters
    ----------
    rows : complex64 array, shape (n_rows, n_fft)
        Written to; contiguous.
    state, before : complex64 array, shape (n,)
        ``y`` and ``y'`` from where the first row begins; not changed.
    hop : int
        Samples from row to row, at least half of ``n_fft``.
    factor : float
        How far beyond the state.
    """
    kernels = _compile()
    if kernels is None:
        put_ahead_by_numpy(rows, state, before, hop=hop, factor=factor)
    else:
        kernels["put_ahead"](_rails(rows), _rails(state), _rails(before), hop, np.float32(factor))


def put_ahead_by_numpy(
    rows: Samples, state: Samples, before: Samples, *, hop: int, factor: float
) -> None:
    """Do what :func:`put_ahead` does, without a compiler; same parameters, same bits."""
    y, last = (_stretch(rows, each, hop) for each in (state, before))
    put_samples(rows, _ahead(y, last, factor), hop=hop)


def put_samples(rows: Samples, samples: Samples, *, hop: int) -> None:
    """Fill rows with samples, which are contiguous; parameters as of :func:`put_excess`."""
    n_fft, size = rows.shape[1], samples.itemsize
    whole = min(max((samples.size - n_fft) // hop + 1, 0), rows.shape[0])
    if whole:  # quicker than sliding_window_view, which looks at more
        rows[:whole] = np.ndarray(
            (whole, n_fft), samples.dtype, samples, strides=(hop * size, size)
        )
    for number in range(whole, rows.shape[0]):
        found = samples[number * hop : number * hop + n_fft]
        rows[number, : found.size] = found
        rows[number, found.size :] = 0


def scale_lines(lines: Samples, response: NDArray[np.float32]) -> None:
    """Multiply the lines of each row by a real response.

    Parameters
    ----------
    lines : complex64 array, shape (n_rows, n_fft)
        Changed; contiguous.
    response : float32 array, shape (1, n_fft) or (n_rows, n_fft)
        Factor of each line.
    """
    kernels = _compile()
    if kernels is None:
        scale_lines_by_numpy(lines, response)
    else:
        kernels["scale_lines"](_rails(lines), response)


def scale_lines_by_numpy(lines: Samples, response: NDArray[np.float32]) -> None:
    """Do what :func:`scale_lines` does, without a compiler; same parameters, same bits."""
    np.multiply(lines.real, response, out=lines.real)
    np.multiply(lines.imag, response, out=lines.imag)


def take_samples(out: Samples, rows: Samples, *, half: int, hop: int) -> None:
    """Write what stands in the rows; parameters as of :func:`take_difference`."""
    whole = out.size // hop
    out[: whole * hop].reshape(whole, hop)[...] = rows[:whole, half : half + hop]
    if whole * hop < out.size:
        out[whole * hop :] = rows[whole, half : half + out.size - whole * hop]


def take_difference(
    out: Samples, base: Samples, rows: Samples, *, half: int, hop: int, gain: float = 1.0
) -> None:
    """Write ``(x - w) gain``, where ``w`` stands in the rows.

    Parameters
    ----------
    out : complex64 array, shape (n,)
        Written to.
    base : complex64 array, shape (n,) or longer
        ``x``; not changed.
    rows : complex64 array, shape (n_rows, n_fft)
        Contiguous; not changed.
    half, hop : int
        Where in a row its first output stands, and how many there are.
    gain : float
        Amplitude ratio.
    """
    kernels = _compile()
    if kernels is None:
        take_difference_by_numpy(out, base, rows, half=half, hop=hop, gain=gain)
    else:
        flat = _rails(out), _rails(base), _rails(rows)
        kernels["take_difference"](*flat, (half, hop), np.float32(gain))


def take_difference_by_numpy(
    out: Samples, base: Samples, rows: Samples, *, half: int, hop: int, gain: float = 1.0
) -> None:
    """Do what :func:`take_difference` does, without a compiler; same parameters, same bits."""
    left = base[: out.size] - _taken(rows, half, hop, out.size)
    np.multiply(left.view(np.float32), np.float32(gain), out=out.view(np.float32))


def take_excess(
    out: Samples,
    source: Samples,
    state: Samples,
    before: Samples,
    rows: Samples,
    *,
    half: int,
    hop: int,
    factor: float,
    amplitude: float,
) -> None:
    """Write what a clip takes from ``x - w + y + factor (y - y')``, where ``w`` stands in the rows.

    Parameters
    ----------
    out : complex64 array, shape (n,)
        Written to; apart from all others.
    source, state, before : complex64 array, shape (n,) or longer
        ``x``, ``y`` and ``y'``; not changed.
    rows : complex64 array, shape (n_rows, n_fft)
        Contiguous; not changed.
    half, hop : int
        Where in a row its first output stands, and how many there are.
    factor : float
        How far beyond the state.
    amplitude : float
        Largest envelope let through.
    """
    kernels = _compile()
    if kernels is None:
        take_excess_by_numpy(
            out,
            source,
            state,
            before,
            rows,
            half=half,
            hop=hop,
            factor=factor,
            amplitude=amplitude,
        )
        return
    signals = _rails(source), _rails(state), _rails(before)
    numbers = np.float32(factor), *_limits(amplitude)
    kernels["take_excess"](_rails(out), signals, _rails(rows), (half, hop), numbers)


def take_excess_by_numpy(
    out: Samples,
    source: Samples,
    state: Samples,
    before: Samples,
    rows: Samples,
    *,
    half: int,
    hop: int,
    factor: float,
    amplitude: float,
) -> None:
    """Do what :func:`take_excess` does, without a compiler; same parameters, same bits."""
    n = out.size
    left = source[:n] - _taken(rows, half, hop, n)
    left += _ahead(state[:n], before[:n], factor)
    out[:] = excess_over(left, amplitude)


def _rails(samples: Samples) -> Rails:
    return samples.view(np.float32)


def _limits(amplitude: float) -> tuple[np.float32, np.float32]:
    """Return the power and the amplitude that are let through."""
    return np.float32(amplitude * amplitude), np.float32(amplitude)


def _stretch(rows: Samples, samples: Samples, hop: int) -> Samples:
    """Return what the rows cover, as far as it is there."""
    return samples[: (rows.shape[0] - 1) * hop + rows.shape[1]]


def _taken(rows: Samples, half: int, hop: int, n: int) -> Samples:
    """Return the outputs of the rows in a row."""
    return rows[:, half : half + hop].reshape(-1)[:n]


def _ahead(state: Samples, before: Samples, factor: float) -> Samples:
    y, last = _rails(state), _rails(before)
    made: Samples = ((y - last) * np.float32(factor) + y).view(np.complex64)
    return made


@cache
def _compile() -> dict[str, Callable[..., None]] | None:
    """Return the compiled loops by name, or None where numba is missing or switched off."""
    kinds = numba_types()
    if kinds is None:
        return None
    f32, count = kinds.float32, kinds.int64
    plane, line = kinds.Array(f32, 2, "C"), kinds.Array(f32, 1, "C")
    held, sheet = (kinds.Array(f32, n, "C", readonly=True) for n in (1, 2))
    several, grid = kinds.UniTuple(held, 3), kinds.UniTuple(count, 2)

    def made(loop: Callable[..., None], *arguments: Any) -> Callable[..., None]:
        return compiled(kinds.void(*arguments), loop)

    return {
        "put_excess": made(_put_excess, plane, held, count, f32, f32),
        "put_ahead": made(_put_ahead, plane, held, held, count, f32),
        "scale_lines": made(_scale_lines, plane, sheet),
        "take_difference": made(_take_difference, line, held, plane, grid, f32),
        "take_excess": made(_take_excess, line, several, plane, grid, kinds.UniTuple(f32, 3)),
    }


def _put_excess(rows: Rails, samples: Rails, hop: int, limit: np.float32, top: np.float32) -> None:
    one, zero = np.float32(1), np.float32(0)
    shared = rows.shape[1] - 2 * hop
    for number in range(rows.shape[0]):
        first = 0
        if number:  # what the row before has already
            held = rows[number - 1, 2 * hop :]
            for k in range(shared):
                rows[number, k] = held[k]
            first = shared
        row, taken = rows[number, first:], samples[2 * number * hop + first :]
        n = min(row.size, taken.size) // 2
        for k in range(n):
            real, imag = taken[2 * k], taken[2 * k + 1]
            power = real * real + imag * imag
            share = one - top / np.sqrt(power) if power > limit else zero
            row[2 * k], row[2 * k + 1] = real * share, imag * share
        for k in range(2 * n, row.size):
            row[k] = zero


def _put_ahead(rows: Rails, state: Rails, before: Rails, hop: int, factor: np.float32) -> None:
    shared = rows.shape[1] - 2 * hop
    for number in range(rows.shape[0]):
        first = 0
        if number:
            held = rows[number - 1, 2 * hop :]
            for k in range(shared):
                rows[number, k] = held[k]
            first = shared
        begin = 2 * number * hop + first
        row, now, last = rows[number, first:], state[begin:], before[begin:]
        n = min(row.size, now.size)
        for k in range(n):
            row[k] = (now[k] - last[k]) * factor + now[k]
        for k in range(n, row.size):
            row[k] = np.float32(0)


def _scale_lines(lines: Rails, response: NDArray[np.float32]) -> None:
    for number in range(lines.shape[0]):
        row, factors = lines[number], response[number if response.shape[0] > 1 else 0]
        for k in range(factors.size):
            row[2 * k] *= factors[k]
            row[2 * k + 1] *= factors[k]


def _take_difference(
    out: Rails, base: Rails, rows: Rails, grid: tuple[int, int], gain: np.float32
) -> None:
    half, hop = grid
    for number in range(rows.shape[0]):
        begin = 2 * number * hop
        made, x, w = out[begin:], base[begin:], rows[number, 2 * half :]
        for k in range(min(made.size, 2 * hop)):
            made[k] = (x[k] - w[k]) * gain


def _take_excess(
    out: Rails,
    signals: tuple[Rails, Rails, Rails],
    rows: Rails,
    grid: tuple[int, int],
    numbers: tuple[np.float32, np.float32, np.float32],
) -> None:
    source, state, before = signals
    half, hop = grid
    factor, limit, top = numbers
    one, zero = np.float32(1), np.float32(0)
    for number in range(rows.shape[0]):
        begin = 2 * number * hop
        made, w = out[begin:], rows[number, 2 * half :]
        x, y, last = source[begin:], state[begin:], before[begin:]
        for k in range(min(made.size, 2 * hop) // 2):
            real = x[2 * k] - w[2 * k] + ((y[2 * k] - last[2 * k]) * factor + y[2 * k])
            ahead = (y[2 * k + 1] - last[2 * k + 1]) * factor + y[2 * k + 1]
            imag = x[2 * k + 1] - w[2 * k + 1] + ahead
            power = real * real + imag * imag
            share = one - top / np.sqrt(power) if power > limit else zero
            made[2 * k], made[2 * k + 1] = real * share, imag * share
