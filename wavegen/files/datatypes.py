"""Sample codes: how a complex number becomes two integers or floats in a file, and back.

The scale is fixed: an envelope equal to one rail's full scale is 0 dBFS, so samples handed in
and out have full scale 1.0. Two's complement rails of ``b`` bits have full scale ``2^(b-1)``
(32768 for 16 bits): -1.0 is a code, +1.0 saturates by one code. Unsigned 8-bit rails follow the
common practice of receivers that make them, ``(u - 127.5) / 127.5``.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import SignalError
from wavegen.core.signal import Samples

Codes = NDArray[Any]
"""Sample codes, shape (n_samples, 2): column 0 is I, column 1 is Q."""

_BLOCK = 1 << 15
"""Samples worked on at a time: the float rails of a block (256 kB) stay in the second cache."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Datatype:
    """A way to write one complex sample.

    Parameters
    ----------
    name : str
        Name by the SigMF grammar (``ci24_le`` is this program's, by the same grammar).
    rail : str
        NumPy type of one rail as codes are held, with its byte order: ``"<i2"``.
    full_scale : float
        Code (less ``offset``) that stands for 1.0.
    is_integer : bool
        Whether samples are rounded.
    offset : float
        Code that stands for 0.
    n_bits : int
        Bits of one rail.

    Notes
    -----
    Source of names: SigMF 1.2.5, ``core:datatype``. 24-bit codes are held in int32, one code
    a step; how the file packs them is the format's business.
    """

    name: str
    rail: str
    full_scale: float
    is_integer: bool
    n_bits: int
    offset: float = 0.0

    @property
    def dtype(self) -> np.dtype[Any]:
        """NumPy type of one rail."""
        return np.dtype(self.rail)

    @property
    def bytes_per_sample(self) -> int:
        """Bytes of one I/Q pair in a file."""
        return 2 * self.n_bits // 8

    @property
    def lowest(self) -> int:
        """Smallest integer code."""
        return 0 if self.dtype.kind == "u" else -(1 << (self.n_bits - 1))

    @property
    def highest(self) -> int:
        """Largest integer code."""
        return (1 << (self.n_bits if self.dtype.kind == "u" else self.n_bits - 1)) - 1


def _signed(name: str, rail: str, n_bits: int) -> Datatype:
    full_scale = float(1 << (n_bits - 1))
    return Datatype(name=name, rail=rail, full_scale=full_scale, is_integer=True, n_bits=n_bits)


def _floating(name: str, rail: str, n_bits: int) -> Datatype:
    return Datatype(name=name, rail=rail, full_scale=1.0, is_integer=False, n_bits=n_bits)


CI8 = _signed("ci8", "i1", 8)
CI16_LE = _signed("ci16_le", "<i2", 16)
CI16_BE = _signed("ci16_be", ">i2", 16)
CI24_LE = _signed("ci24_le", "<i4", 24)
CI32_LE = _signed("ci32_le", "<i4", 32)
CF32_LE = _floating("cf32_le", "<f4", 32)
CF64_LE = _floating("cf64_le", "<f8", 64)
CU8 = Datatype(name="cu8", rail="u1", full_scale=127.5, is_integer=True, n_bits=8, offset=127.5)

DATATYPES: dict[str, Datatype] = {
    item.name: item for item in (CI8, CI16_LE, CI16_BE, CI24_LE, CI32_LE, CF32_LE, CF64_LE, CU8)
}
"""All datatypes by name."""


def encode(samples: Samples, datatype: Datatype, out: Codes | None = None) -> tuple[Codes, int]:
    """Round samples to codes: half to even, saturating at the ends.

    Parameters
    ----------
    samples : complex64 array, shape (n_samples,)
        Full scale 1.0.
    datatype : Datatype
        What is written.
    out : array of ``datatype.dtype``, shape (n_samples, 2), C order, optional
        Where the codes go: reuse one over many blocks (fresh memory costs as much again).

    Returns
    -------
    codes : array of ``datatype.dtype``, shape (n_samples, 2)
        ``out`` if given; else, for ``cf32_le``, it may share the memory of ``samples``.
    n_saturated : int
        Rails (not samples) whose rounded value lay outside the codes. Always 0 for floats.

    Raises
    ------
    SignalError
        A NaN or infinite sample where codes are integers.

    Notes
    -----
    Full scales are powers of two (but for ``cu8``), so the only rounding is that to the code.

    Examples
    --------
    >>> encode(np.array([0.5 - 1j, 1.0 + 0j], np.complex64), CI8)
    (array([[  64, -128],
           [ 127,    0]], dtype=int8), 1)
    """
    samples = np.ascontiguousarray(samples, np.complex64)
    rails = samples.view(np.float32)
    if not datatype.is_integer:
        pairs = rails.reshape(-1, 2)
        if out is None:
            return pairs.astype(datatype.dtype, copy=False), 0
        out[:] = pairs
        return out, 0
    codes = np.empty(rails.size, datatype.dtype) if out is None else out.reshape(-1)
    kind = np.float64 if datatype.n_bits > 24 else np.float32
    scale, offset = kind(datatype.full_scale), kind(datatype.offset)
    low, high = datatype.lowest, datatype.highest
    buffer = np.empty(min(2 * _BLOCK, rails.size), kind)
    n_saturated = 0
    for start in range(0, rails.size, 2 * _BLOCK):
        part = rails[start : start + 2 * _BLOCK]
        work = np.multiply(part, scale, out=buffer[: part.size])
        if offset:
            work += offset
        if not (work.min() >= low and work.max() <= high):
            if not np.isfinite(part).all():
                raise _not_finite(part, start)
            np.rint(work, out=work)
            n_saturated += int(np.count_nonzero(work < low) + np.count_nonzero(work > high))
            np.clip(work, low, high, out=work)
        codes[start : start + part.size] = np.rint(work, out=work)
    return codes.reshape(-1, 2), n_saturated


def _not_finite(part: NDArray[np.float32], start: int) -> SignalError:
    first = (start + int(np.argmin(np.isfinite(part)))) // 2
    return SignalError(
        where=f"sample {first} of the block",
        problem="is not a finite number",
        allowed="finite samples",
        remedy="Find the stage that made it, or write a float datatype.",
    )


def decode(codes: Codes, datatype: Datatype) -> Samples:
    """Return the samples that codes stand for.

    Parameters
    ----------
    codes : array of ``datatype.dtype``, shape (n_samples, 2)
        Not modified. A flat array of interleaved rails is taken as well.
    datatype : Datatype
        What was read.

    Returns
    -------
    complex64 array, shape (n_samples,)
        Full scale 1.0; owned by the caller.

    Notes
    -----
    Exact up to 24 bits and for ``cf32_le``; ``ci32_le`` and ``cf64_le`` are rounded to float32.

    Examples
    --------
    >>> decode(np.array([[64, -128]], np.int8), CI8)
    array([0.5-1.j], dtype=complex64)
    """
    flat = np.ascontiguousarray(codes).reshape(-1)
    samples = np.empty(flat.size // 2, np.complex64)
    rails = samples.view(np.float32)
    if not datatype.is_integer:
        with np.errstate(over="ignore", invalid="ignore"):  # beyond float32 reads as infinite
            rails[:] = flat
        return samples
    offset = np.float32(datatype.offset)
    full_scale = np.float32(datatype.full_scale)
    step = np.float32(1.0 / datatype.full_scale)
    for start in range(0, flat.size, 2 * _BLOCK):
        work = rails[start : start + 2 * _BLOCK]
        work[:] = flat[start : start + 2 * _BLOCK]
        if offset:
            work -= offset
            work /= full_scale
        else:
            work *= step  # a power of two, so this is exact, and faster than a division
    return samples


def first_not_finite(samples: Samples) -> int | None:
    """Return the index of the first NaN or infinite sample of a block, or None.

    Examples
    --------
    >>> first_not_finite(np.array([0, 1j, complex("nan")], np.complex64))
    2
    """
    is_finite = np.isfinite(samples)
    return None if is_finite.all() else int(np.argmin(is_finite))


def quantised(samples: Samples, datatype: Datatype) -> Samples:
    """Return samples as they will be read back: ``decode(encode(samples))``.

    Parameters
    ----------
    samples : complex64 array, shape (n_samples,)
        Full scale 1.0.
    datatype : Datatype
        What is written.

    Returns
    -------
    complex64 array, shape (n_samples,)
        Owned by the caller.

    Examples
    --------
    >>> quantised(np.array([0.3 + 0.7j], np.complex64), CI8) * 128
    array([38.+90.j], dtype=complex64)
    """
    return decode(encode(samples, datatype)[0], datatype)
