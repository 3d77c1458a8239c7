"""What a record looks like besides its power, sample by sample: codes, sums of rails, repeats.

Compiled loops where numba is installed; the same figures come, bit for bit, from plain NumPy
otherwise, which is also the referee.
"""

from __future__ import annotations

import threading
from collections.abc import Callable
from dataclasses import dataclass
from functools import cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from wavegen.core.signal import Samples
from wavegen.dsp.cell_sums import CELL, sum_cells

N_SUMS = 3
FLOAT_SHIFT = 14
"""Bits of a float32 that are left out where values of any scale are counted."""
N_FLOAT_CODES = 1 << (32 - FLOAT_SHIFT)
_INFINITE = 0x7F800000
_MINUS_INFINITE = 0xFF800000
_LOWEST = 0xBF800000
"""Float32 bits of infinity, minus infinity and -1."""
_LEAST_PLAIN, _ABOVE_PLAIN = 2.0**-80, 2.0**80
_SHORTEST = 64
"""Fewer samples are not worth a call of a compiled loop."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Glance:
    """What is found out at one glance over a stretch.

    Parameters
    ----------
    has_bad : bool
        Whether a rail of any sample is not finite.
    has_lowest : bool
        Whether a rail of any sample is at -1, the lowest code, or beyond.
    """

    has_bad: bool
    has_lowest: bool


def glance(samples: Samples) -> Glance:
    """Return whether samples may not be finite, or at the lowest code.

    Parameters
    ----------
    samples : complex64 array, shape (n,)
        Anything may be among them.
    """
    loops = compiled_loops()
    if loops is None or samples.size < _SHORTEST:
        return glance_by_numpy(samples)
    parts = _parts(samples)
    has_bad, has_lowest = loops["glance"](parts.view(np.uint32), parts.view(np.int32))
    return Glance(has_bad=bool(has_bad), has_lowest=bool(has_lowest))


def glance_by_numpy(samples: Samples) -> Glance:
    """Do as :func:`glance` in plain NumPy."""
    parts = _parts(samples)
    return Glance(
        has_bad=not np.isfinite(parts).all(),
        has_lowest=bool(np.any((parts <= np.float32(-1)) | np.isnan(parts) & np.signbit(parts))),
    )


def longest_repeat(samples: Samples) -> tuple[int, int, int]:
    """Return how long samples repeat: from the start, to the end, and at most between.

    Parameters
    ----------
    samples : complex64 array, shape (n,)
        One or more, finite.

    Returns
    -------
    first, last, longest : int
        All alike: ``(n, n, 0)``.
    """
    loops = compiled_loops()
    if loops is None or samples.size < _SHORTEST:
        return longest_repeat_by_numpy(samples)
    first, last, longest = loops["repeats"](_parts(samples))
    return int(first), int(last), int(longest)


def longest_repeat_by_numpy(samples: Samples) -> tuple[int, int, int]:
    """Do as :func:`longest_repeat` in plain NumPy."""
    n = samples.size
    cuts = np.flatnonzero(samples[1:] != samples[:-1]) + 1
    if not cuts.size:
        return n, n, 0
    between = int(np.diff(cuts).max()) if cuts.size > 1 else 0
    return int(cuts[0]), n - int(cuts[-1]), between


def count_codes(samples: Samples, counts: NDArray[np.uint32], scale: float | None) -> None:
    """Count the values of each rail.

    Parameters
    ----------
    samples : complex64 array, shape (n,)
        Finite.
    counts : uint32 array, shape (n_rails, n_codes)
        Added to. Codes to full scale: place ``k`` stands for code ``k - n_codes // 2``, what
        lies beyond goes to the ends. Floats: place ``k`` for the values whose float32 bits begin
        with ``k``.
    scale : float or None
        Codes to full scale; None for floats.
    """
    loops = compiled_loops()
    if loops is None or samples.size < _SHORTEST:
        count_codes_by_numpy(samples, counts, scale)
    elif scale is not None:
        loops["codes"](_parts(samples), counts, np.float32(scale), _workspace().places)
    else:
        loops["floats"](_parts(samples).view(np.uint32), counts)


def count_codes_by_numpy(samples: Samples, counts: NDArray[np.uint32], scale: float | None) -> None:
    """Do as :func:`count_codes` in plain NumPy."""
    for rail, row in zip((samples.real, samples.imag), counts, strict=False):
        if scale is not None:
            middle = np.float32(row.size // 2) + np.float32(0.5)
            place = rail * np.float32(scale) + middle
            place = np.clip(place, 0, np.float32(row.size - 1)).astype(np.int64)
        else:
            bits = np.ascontiguousarray(rail, np.float32).view(np.uint32)
            place = (bits >> np.uint32(FLOAT_SHIFT)).astype(np.int64)
        np.add(row, np.bincount(place, minlength=row.size), out=row, casting="unsafe")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RailSums:
    """Sums over cells of 1024 samples, and how far samples stand out.

    Parameters
    ----------
    sums : float64 array, shape (n_cells, 3)
        Of I, of Q, and of ``|x - offset|^2``.
    nearest, furthest : float
        Least and largest ``|x - offset|^2``.
    peak : float
        Largest ``|x|^2``.
    """

    sums: NDArray[np.float64]
    nearest: float
    furthest: float
    peak: float


def sum_rails(samples: Samples, offset: complex) -> RailSums:
    """Return sums over whole cells; powers are taken in float32, sums in float64.

    Parameters
    ----------
    samples : complex64 array, shape (n_cells * 1024,)
        Finite; one cell or more.
    offset : complex
        Distances are taken from this.
    """
    loops = compiled_loops()
    if loops is None:
        return sum_rails_by_numpy(samples, offset)
    sums, extremes = np.empty((samples.size // CELL, N_SUMS)), np.empty(3, np.float32)
    work, centre = _workspace(), np.complex64(offset)
    loops["sums"](
        _parts(samples), centre.real, centre.imag, sums, extremes.view(np.uint32),
        work.power, work.power.view(np.uint32), work.far, work.far.view(np.uint32), work.wide,
    )  # fmt: skip
    nearest, furthest, peak = extremes.tolist()
    if not _is_plain(peak, samples):
        return _sum_wide(samples, offset)
    return RailSums(sums=sums, nearest=nearest, furthest=furthest, peak=peak)


def sum_rails_by_numpy(samples: Samples, offset: complex) -> RailSums:
    """Do as :func:`sum_rails` in plain NumPy."""
    with np.errstate(over="ignore", under="ignore"):
        power, far = _power(samples), _power(samples - np.complex64(offset))
    if not _is_plain(float(power.max()), samples):
        return _sum_wide(samples, offset)
    parts = (samples.real, samples.imag, far)
    return RailSums(
        sums=np.stack([sum_cells(part) for part in parts], axis=1),
        nearest=float(far.min()),
        furthest=float(far.max()),
        peak=float(power.max()),
    )


def _is_plain(peak: float, samples: Samples) -> bool:
    """Return whether float32 holds the powers; of silence it does."""
    return _LEAST_PLAIN < peak < _ABOVE_PLAIN or (peak == 0 and not samples.any())


def _sum_wide(samples: Samples, offset: complex) -> RailSums:
    """Do as :func:`sum_rails` with powers in float64, for samples on an odd scale."""
    wide = samples.astype(np.complex128)
    power, far = (part.real**2 + part.imag**2 for part in (wide, wide - offset))
    parts = (wide.real, wide.imag, far)
    return RailSums(
        sums=np.stack([sum_cells(part) for part in parts], axis=1),
        nearest=float(far.min()),
        furthest=float(far.max()),
        peak=float(power.max()),
    )


def _power(samples: Samples) -> NDArray[np.float32]:
    return samples.real * samples.real + samples.imag * samples.imag


def difference_maxima(samples: Samples) -> NDArray[np.float32]:
    """Return how high the fourth difference stands in each cell of 1024 samples.

    Parameters
    ----------
    samples : complex64 array, shape (n + 4,)
        With two more at each end of the cells; anything may be among them.

    Returns
    -------
    float32 array, shape (ceil(n / 1024),)
        Largest ``|d|^2`` of each cell, the last may be short; what is not finite counts as 0.
    """
    loops = compiled_loops()
    if loops is None or samples.size < _SHORTEST:
        return difference_maxima_by_numpy(samples)
    out, work = np.zeros(-(-(samples.size - 4) // CELL), np.float32), _workspace()
    loops["breaks"](
        _parts(samples), out.view(np.uint32), work.rails, work.power, work.power.view(np.uint32)
    )
    return out


def difference_maxima_by_numpy(samples: Samples) -> NDArray[np.float32]:
    """Do as :func:`difference_maxima` in plain NumPy."""
    found = fourth_difference(samples)
    power = np.zeros(-(-found.size // CELL) * CELL, np.float32)
    with np.errstate(invalid="ignore", over="ignore"):
        power[: found.size] = _power(found)
    power[~np.isfinite(power)] = 0
    highest: NDArray[np.float32] = power.reshape(-1, CELL).max(axis=1)
    return highest


def high_places(
    samples: Samples, threshold: np.float32
) -> tuple[NDArray[np.intp], NDArray[np.float32]]:
    """Return the places that have a high sample at one of their two ends.

    Parameters
    ----------
    samples : complex64 array, shape (n + 1,)
        Place ``k`` lies between samples ``k`` and ``k + 1``; powers are finite.
    threshold : float32
        ``|x|^2`` from which a sample is high; above 0.

    Returns
    -------
    places : intp array, shape (n_high,)
        Rising.
    near : float32 array, shape (n_high,)
        The larger of the powers at both ends.
    """
    loops = compiled_loops()
    if loops is None or samples.size < _SHORTEST:
        return high_places_by_numpy(samples, threshold)
    places, near = np.empty(samples.size, np.int64), np.empty(samples.size, np.float32)
    power = _workspace().power
    n = loops["high"](_parts(samples), threshold, power, power.view(np.uint32), places, near)
    return places[:n].astype(np.intp), near[:n].copy()


def high_places_by_numpy(
    samples: Samples, threshold: np.float32
) -> tuple[NDArray[np.intp], NDArray[np.float32]]:
    """Do as :func:`high_places` in plain NumPy."""
    power = _power(samples)
    near = np.maximum(power[:-1], power[1:])
    places = np.flatnonzero(near >= threshold)
    return places, near[places]


def fourth_difference(samples: Samples) -> Samples:
    """Return ``x[n-2] - 4 x[n-1] + 6 x[n] - 4 x[n+1] + x[n+2]`` of all but two at each end.

    Parameters
    ----------
    samples : complex64 array, shape (n + 4,)
        What is not finite gives anything not finite.

    Returns
    -------
    complex64 array, shape (n,)
    """
    x = samples
    with np.errstate(invalid="ignore", over="ignore"):
        found = x[:-4] + x[4:]
        found -= np.float32(4) * (x[1:-3] + x[3:-1])
        found += np.float32(6) * x[2:-2]
    return found


def _parts(samples: Samples) -> NDArray[np.float32]:
    return np.ascontiguousarray(samples).view(np.float32)


class _Workspace(threading.local):
    """Arrays reused by each thread."""

    def __init__(self) -> None:
        self.wide = np.empty(3 * CELL // 4)
        self.far = np.empty(CELL, np.float32)
        self.rails = np.empty(2 * CELL, np.float32)
        self.places = np.empty(2 * CELL, np.int32)
        self.power = np.empty(CELL, np.float32)


@cache
def _workspace() -> _Workspace:
    return _Workspace()


_COMPILING = threading.Lock()


def compiled_loops() -> dict[str, Callable[..., Any]] | None:
    """Return the compiled loops by name, or None where numba is missing or switched off."""
    with _COMPILING:
        return _compile()


@cache
def _compile() -> dict[str, Callable[..., Any]] | None:
    try:
        import numba
    except ImportError:
        return None
    if getattr(numba.config, "DISABLE_JIT", False):
        return None
    kinds: Any = numba.types
    f32, u32, i32, f64 = kinds.float32, kinds.uint32, kinds.int32, kinds.float64

    def row(kind: Any, *, readonly: bool = False) -> Any:
        return kinds.Array(kind, 1, "C", readonly=readonly)

    parts, bits = row(f32, readonly=True), row(u32, readonly=True)
    counts = kinds.Array(u32, 2, "C")
    three, two = kinds.UniTuple(kinds.int64, 3), kinds.UniTuple(kinds.boolean, 2)
    sums = (parts, f32, f32, kinds.Array(f64, 2, "C"), row(u32))
    loops = {
        "glance": (two(bits, row(i32, readonly=True)), _glance),
        "repeats": (three(parts), _repeats),
        "codes": (kinds.void(parts, counts, f32, row(i32)), _codes),
        "floats": (kinds.void(bits, counts), _floats),
        "sums": (kinds.void(*sums, row(f32), row(u32), row(f32), row(u32), row(f64)), _sums),
        "high": (kinds.int64(parts, f32, row(f32), row(u32), row(kinds.int64), row(f32)), _high),
        "breaks": (kinds.void(parts, row(u32), row(f32), row(f32), row(u32)), _breaks),
    }
    try:
        return {
            name: numba.njit(kind, nogil=True, cache=True)(loop)
            for name, (kind, loop) in loops.items()
        }
    except RuntimeError:  # no folder can be written for the cache
        return {name: numba.njit(kind, nogil=True)(loop) for name, (kind, loop) in loops.items()}


def _glance(
    bits: NDArray[np.uint32], signed: NDArray[np.int32]
) -> tuple[bool, bool]:  # pragma: no cover - compiled
    """Compare bits.

    Those of positive floats rise with them as whole numbers; those of negative ones, read
    without a sign, rise with their magnitude.
    """
    most_negative, most_positive = np.uint32(0), np.int32(0)
    for i in range(bits.size):
        most_negative = max(most_negative, bits[i])
        most_positive = max(most_positive, signed[i])
    bad = most_positive >= np.int32(_INFINITE) or most_negative >= np.uint32(_MINUS_INFINITE)
    return bool(bad), bool(most_negative >= np.uint32(_LOWEST))


def _repeats(parts: NDArray[np.float32]) -> tuple[int, int, int]:  # pragma: no cover - compiled
    n = parts.size // 2
    first, cuts, longest, run = 0, 0, 0, 1
    for i in range(2, 2 * n, 2):
        if parts[i] == parts[i - 2] and parts[i + 1] == parts[i - 1]:
            run += 1
            continue
        if run > 1 and cuts:
            longest = max(longest, run)
        if not cuts:
            first = run
        cuts += 1
        run = 1
    if not cuts:
        return n, n, 0
    if cuts > 1:
        longest = max(longest, 1)
    return first, run, longest


def _codes(
    parts: NDArray[np.float32],
    counts: NDArray[np.uint32],
    scale: np.float32,
    places: NDArray[np.int32],
) -> None:  # pragma: no cover - compiled
    """Round by adding a half: what is added makes every place positive."""
    highest = np.float32(counts.shape[1] - 1)
    zero, middle = np.float32(0), np.float32(counts.shape[1] // 2) + np.float32(0.5)
    both = counts.shape[0] > 1
    for first in range(0, parts.size, places.size):
        mine = parts[first : min(first + places.size, parts.size)]
        for i in range(mine.size):
            place = mine[i] * scale + middle
            place = min(highest, place)
            place = max(zero, place)
            places[i] = np.int32(place)
        for i in range(0, mine.size, 2):
            counts[0, places[i]] += np.uint32(1)
        if both:
            for i in range(1, mine.size, 2):
                counts[1, places[i]] += np.uint32(1)


def _floats(
    bits: NDArray[np.uint32], counts: NDArray[np.uint32]
) -> None:  # pragma: no cover - compiled
    shift = np.uint32(FLOAT_SHIFT)
    n_rails = counts.shape[0]
    for i in range(0, bits.size, 2):
        counts[0, bits[i] >> shift] += np.uint32(1)
        if n_rails > 1:
            counts[1, bits[i + 1] >> shift] += np.uint32(1)


def _sums(  # noqa: PLR0917 - arrays of the thread, handed in
    parts: NDArray[np.float32],
    centre_i: np.float32,
    centre_q: np.float32,
    sums: NDArray[np.float64],
    extremes: NDArray[np.uint32],
    power: NDArray[np.float32],
    power_bits: NDArray[np.uint32],
    far: NDArray[np.float32],
    far_bits: NDArray[np.uint32],
    wide: NDArray[np.float64],
) -> None:  # pragma: no cover - compiled
    """Add as :func:`wavegen.dsp.cell_sums.sum_cells` does, four quarters of a cell first."""
    nearest, furthest, peak = np.uint32(0xFFFFFFFF), np.uint32(0), np.uint32(0)
    for cell in range(sums.shape[0]):
        mine = parts[2 * cell * CELL : 2 * (cell + 1) * CELL]
        for i in range(CELL):
            real = mine[2 * i]
            imag = mine[2 * i + 1]
            power[i] = real * real + imag * imag
            real -= centre_i
            imag -= centre_q
            far[i] = real * real + imag * imag
        for i in range(CELL):
            nearest = min(nearest, far_bits[i])
            furthest = max(furthest, far_bits[i])
            peak = max(peak, power_bits[i])
        for i in range(256):
            a = np.float64(mine[2 * i]) + np.float64(mine[2 * i + 1024])
            b = np.float64(mine[2 * i + 512]) + np.float64(mine[2 * i + 1536])
            c = np.float64(mine[2 * i + 1]) + np.float64(mine[2 * i + 1025])
            d = np.float64(mine[2 * i + 513]) + np.float64(mine[2 * i + 1537])
            wide[i] = a + b
            wide[256 + i] = c + d
        for i in range(256):
            a = np.float64(far[i]) + np.float64(far[i + 512])
            b = np.float64(far[i + 256]) + np.float64(far[i + 768])
            wide[512 + i] = a + b
        width = 128
        while width >= 1:
            for i in range(width):
                wide[i] += wide[i + width]
                wide[256 + i] += wide[256 + i + width]
                wide[512 + i] += wide[512 + i + width]
            width >>= 1
        sums[cell, 0] = wide[0]
        sums[cell, 1] = wide[256]
        sums[cell, 2] = wide[512]
    extremes[0], extremes[1], extremes[2] = nearest, furthest, peak


def _high(  # noqa: PLR0917 - arrays of the thread, handed in
    parts: NDArray[np.float32],
    threshold: np.float32,
    power: NDArray[np.float32],
    bits: NDArray[np.uint32],
    places: NDArray[np.int64],
    near: NDArray[np.float32],
) -> int:  # pragma: no cover - compiled
    """Look place by place only where the largest power of 1024 samples is high."""
    n, found = parts.size // 2 - 1, 0
    power[0] = threshold
    least = bits[0]
    for first in range(0, n, CELL - 1):
        count = min(CELL, n + 1 - first)
        mine = parts[2 * first : 2 * (first + count)]
        for i in range(count):
            power[i] = mine[2 * i] * mine[2 * i] + mine[2 * i + 1] * mine[2 * i + 1]
        high = np.uint32(0)
        for i in range(count):
            high = max(high, bits[i])
        if high < least:
            continue
        for i in range(count - 1):
            larger = max(power[i], power[i + 1])
            if larger >= threshold:
                places[found] = first + i
                near[found] = larger
                found += 1
    return found


def _breaks(
    parts: NDArray[np.float32],
    out: NDArray[np.uint32],
    rails: NDArray[np.float32],
    power: NDArray[np.float32],
    bits: NDArray[np.uint32],
) -> None:  # pragma: no cover - compiled
    """Compare bits of powers, which rise as they do; those of infinities and NaN lie above."""
    four, six, infinite = np.float32(4), np.float32(6), np.uint32(_INFINITE)
    n = parts.size // 2 - 4
    for cell in range(out.size):
        first = cell * CELL
        count = min(CELL, n - first)
        mine = parts[2 * first : 2 * (first + count) + 8]
        for i in range(2 * count):
            found = mine[i] + mine[i + 8]
            found -= four * (mine[i + 2] + mine[i + 6])
            rails[i] = found + six * mine[i + 4]
        for i in range(count):
            power[i] = rails[2 * i] * rails[2 * i] + rails[2 * i + 1] * rails[2 * i + 1]
        high = np.uint32(0)
        for i in range(count):
            high = max(high, bits[i])
        if high >= infinite:
            high = np.uint32(0)
            for i in range(count):
                if bits[i] < infinite:
                    high = max(high, bits[i])
        out[cell] = high
