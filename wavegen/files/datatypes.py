"""Sample codes: how a complex number becomes two integers or floats in a file, and back.

The scale is fixed: an envelope equal to one rail's full scale is 0 dBFS, so samples handed in
and out have full scale 1.0. Two's complement rails of ``b`` bits have full scale ``2^(b-1)``
(32768 for 16 bits): -1.0 is a code, +1.0 saturates by one code. Unsigned 8-bit rails follow the
common practice of receivers that make them, ``(u - 127.5) / 127.5``.

Real datatypes (``ri16_le``) hold one rail: a real carrier whose peak is full scale is 0 dBFS, so
that the envelope of a real signal and that of complex baseband are on one scale.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import SignalError
from wavegen.core.signal import Samples
from wavegen.dsp.code_kernel import round_and_hold

Codes = NDArray[Any]
"""Sample codes, shape (n_samples, 2): column 0 is I, column 1 is Q. Real ones have one column;
those of two channels stand side by side: I and Q of channel 0, then I and Q of channel 1."""

Alignment = Literal["left", "right"]
ALIGNMENTS: tuple[Alignment, ...] = ("left", "right")
WORD_BITS = (12, 14, 16)
"""Bits of a converter's word that can stand in a 16-bit container."""

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
        Code (less ``offset``) that stands for 1.0, before it is shifted.
    is_integer : bool
        Whether samples are rounded.
    offset : float
        Code that stands for 0.
    n_bits : int
        Bits of one rail that count.
    n_container_bits : int or None
        Bits of one rail in the file; None if all of them count.
    shift : int
        Zero bits below a word that stands at the left of its container.

    Notes
    -----
    Source of names: SigMF 1.2.5, ``core:datatype``; ``c`` is complex, ``r`` real. 24-bit codes
    are held in int32, one code a step; how the file packs them is the format's business.
    """

    name: str
    rail: str
    full_scale: float
    is_integer: bool
    n_bits: int
    offset: float = 0.0
    n_container_bits: int | None = None
    shift: int = 0

    @property
    def dtype(self) -> np.dtype[Any]:
        """NumPy type of one rail."""
        return np.dtype(self.rail)

    @property
    def is_real(self) -> bool:
        """Whether a sample is one real number."""
        return self.name.startswith("r")

    @property
    def n_rails(self) -> int:
        """Columns of codes: 2, or 1 for real samples."""
        return 1 if self.is_real else 2

    @property
    def bytes_per_sample(self) -> int:
        """Bytes of one I/Q pair, or of one real sample, in a file."""
        return self.n_rails * (self.n_container_bits or self.n_bits) // 8

    @property
    def is_padded(self) -> bool:
        """Whether a word is shorter than its container."""
        return self.n_container_bits is not None

    @property
    def align(self) -> Alignment | None:
        """Where a shorter word stands in its container; None if it fills it."""
        if not self.is_padded:
            return None
        return "left" if self.shift else "right"

    @property
    def container(self) -> Datatype:
        """The datatype whose words fill the container."""
        return DATATYPES[self.name]

    @property
    def label(self) -> str:
        """Name with its word, for file names: ``ci16_le`` or ``ci16_le_12bit_left``."""
        return f"{self.name}_{self.n_bits}bit_{self.align}" if self.is_padded else self.name

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

RI8 = _signed("ri8", "i1", 8)
RI16_LE = _signed("ri16_le", "<i2", 16)
RI16_BE = _signed("ri16_be", ">i2", 16)
RI24_LE = _signed("ri24_le", "<i4", 24)
RI32_LE = _signed("ri32_le", "<i4", 32)
RF32_LE = _floating("rf32_le", "<f4", 32)
RF64_LE = _floating("rf64_le", "<f8", 64)

_COMPLEX = (CI8, CI16_LE, CI16_BE, CI24_LE, CI32_LE, CF32_LE, CF64_LE, CU8)
_REAL = (RI8, RI16_LE, RI16_BE, RI24_LE, RI32_LE, RF32_LE, RF64_LE)

DATATYPES: dict[str, Datatype] = {item.name: item for item in (*_COMPLEX, *_REAL)}
"""All datatypes by name."""


def real_of(datatype: Datatype) -> Datatype:
    """Return the real datatype whose rail is that of a complex one.

    Examples
    --------
    >>> real_of(CI16_LE).name
    'ri16_le'
    """
    return DATATYPES["r" + datatype.name[1:]]


def takes_words(datatype: Datatype) -> bool:
    """Return whether shorter words can stand in a datatype's rails: those of 16-bit integers."""
    return datatype.is_integer and datatype.n_bits == 16


def word_in(datatype: Datatype, *, bits: int, align: Alignment) -> Datatype:
    """Return a 16-bit datatype whose words have fewer bits.

    Parameters
    ----------
    datatype : Datatype
        One that :func:`takes_words`.
    bits : int
        One of :data:`WORD_BITS`; 16 returns ``datatype`` itself.
    align : {"left", "right"}
        ``right``: codes of 12 bits run from -2048 to 2047. ``left``: the same, times 16.

    Returns
    -------
    Datatype
        Under the same name, since the container is the same.

    Raises
    ------
    ValueError
        Not a 16-bit datatype, or other bits.

    Examples
    --------
    >>> word = word_in(CI16_LE, bits=12, align="left")
    >>> word.full_scale, word.shift, word.label
    (2048.0, 4, 'ci16_le_12bit_left')
    """
    if not takes_words(datatype) or bits not in WORD_BITS:
        message = f"{datatype.name} holds no words of {bits} bits"
        raise ValueError(message)
    if bits == 16:
        return datatype
    return replace(
        datatype,
        full_scale=float(1 << (bits - 1)),
        n_bits=bits,
        n_container_bits=16,
        shift=16 - bits if align == "left" else 0,
    )


def first_misfit(codes: Codes, datatype: Datatype) -> tuple[int, int] | None:
    """Return sample number and code of the first code that is no word of a padded datatype.

    Parameters
    ----------
    codes : int16 array, shape (n_samples, n_columns)
        As in a file.
    datatype : Datatype
        What they should be.

    Returns
    -------
    (int, int) or None
        None if all fit, or if words fill their container.

    Examples
    --------
    >>> word = word_in(CI16_LE, bits=12, align="left")
    >>> first_misfit(np.array([[0, 16], [32, 33]], np.int16), word)
    (1, 33)
    """
    if not datatype.is_padded or not codes.size:
        return None
    if datatype.shift:
        is_wrong = (codes & ((1 << datatype.shift) - 1)) != 0
    else:
        if codes.min() >= datatype.lowest and codes.max() <= datatype.highest:
            return None
        is_wrong = (codes < datatype.lowest) | (codes > datatype.highest)
    if not is_wrong.any():
        return None
    sample, column = np.unravel_index(int(np.argmax(is_wrong)), codes.shape)
    return int(sample), int(codes[sample, column])


def join_channels(*codes: Codes) -> Codes:
    """Return the codes of coherent channels side by side, as writers take them.

    Parameters
    ----------
    *codes : array, shape (n_samples, n_rails)
        One for each channel, of one datatype.

    Returns
    -------
    array, shape (n_samples, n_rails * n_channels)

    Examples
    --------
    >>> join_channels(np.array([[1, 2]]), np.array([[3, 4]]))
    array([[1, 2, 3, 4]])
    """
    return np.concatenate(codes, axis=1)


def encode(samples: Samples, datatype: Datatype, out: Codes | None = None) -> tuple[Codes, int]:
    """Round samples to codes: half to even, saturating at the ends.

    Parameters
    ----------
    samples : complex64 array, shape (n_samples,)
        Full scale 1.0. Real datatypes take the real part; the imaginary one is left out.
    datatype : Datatype
        What is written.
    out : array of ``datatype.dtype``, shape (n_samples, n_rails), C order, optional
        Where the codes go: reuse one over many blocks (fresh memory costs as much again).

    Returns
    -------
    codes : array of ``datatype.dtype``, shape (n_samples, n_rails)
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
    rails = np.ascontiguousarray(samples.real) if datatype.is_real else samples.view(np.float32)
    if not datatype.is_integer:
        pairs = rails.reshape(-1, datatype.n_rails)
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
                first = start + int(np.argmin(np.isfinite(part)))
                raise _not_finite(first // datatype.n_rails)
            np.rint(work, out=work)
            n_saturated += int(np.count_nonzero(work < low) + np.count_nonzero(work > high))
            np.clip(work, low, high, out=work)
        block = codes[start : start + part.size]
        block[:] = np.rint(work, out=work)
        if datatype.shift:
            np.left_shift(block, datatype.shift, out=block)
    return codes.reshape(-1, datatype.n_rails), n_saturated


def _not_finite(first: int) -> SignalError:
    return SignalError(
        where=f"sample {first} of the block",
        problem="is not a finite number",
        allowed="finite samples",
        remedy="Find the stage that made it, or write a float datatype.",
    )


def encode_held(samples: Samples, datatype: Datatype, gain: float) -> tuple[Codes, int, Samples]:
    """Scale and round samples to codes, and say what the codes stand for.

    Parameters
    ----------
    samples : complex64 array, shape (n_samples,)
        Given up by the caller: the memory is used again for the result.
    datatype : Datatype
        What is written; a complex one.
    gain : float
        Amplitude factor to full scale 1.0, applied in float32.

    Returns
    -------
    codes, n_saturated
        As of :func:`encode`.
    held : complex64 array, shape (n_samples,)
        As :func:`decode` reads the codes.

    Raises
    ------
    SignalError
        As :func:`encode`.
    """
    factor = np.float32(gain)
    if not _fits_kernel(datatype):
        with np.errstate(invalid="ignore", over="ignore"):  # what is not finite is told by name
            samples *= factor
        codes, n_saturated = encode(samples, datatype)
        return codes, n_saturated, decode(codes, datatype)
    rails = np.ascontiguousarray(samples, np.complex64).view(np.float32)
    words = np.empty(rails.size, np.int16)
    n_saturated, bad = round_and_hold(
        rails,
        words,
        gain=factor,
        full_scale=datatype.full_scale,
        lowest=datatype.lowest,
        highest=datatype.highest,
        shift=datatype.shift,
    )
    if bad >= 0:
        raise _not_finite(bad // datatype.n_rails)
    return words.reshape(-1, datatype.n_rails), n_saturated, rails.view(np.complex64)


def _fits_kernel(datatype: Datatype) -> bool:
    """Return whether the rails are 16-bit integers in this machine's byte order."""
    return datatype.dtype == np.dtype(np.int16) and not datatype.offset and not datatype.is_real


def decode(codes: Codes, datatype: Datatype) -> Samples:
    """Return the samples that codes stand for.

    Parameters
    ----------
    codes : array of ``datatype.dtype``, shape (n_samples, n_rails)
        Not modified. A flat array of interleaved rails is taken as well.
    datatype : Datatype
        What was read.

    Returns
    -------
    complex64 array, shape (n_samples,)
        Full scale 1.0; owned by the caller. Real codes give an imaginary part of zero (their
        envelope is :mod:`wavegen.files.analytic`'s business).

    Notes
    -----
    Exact up to 24 bits and for ``cf32_le``; ``ci32_le`` and ``cf64_le`` are rounded to float32.

    Examples
    --------
    >>> decode(np.array([[64, -128]], np.int8), CI8)
    array([0.5-1.j], dtype=complex64)
    """
    flat = np.ascontiguousarray(codes).reshape(-1)
    rails = np.empty(flat.size, np.float32)
    _decode_rails(flat, datatype, rails)
    return rails.astype(np.complex64) if datatype.is_real else rails.view(np.complex64)


def _decode_rails(flat: Codes, datatype: Datatype, rails: NDArray[np.float32]) -> None:
    if not datatype.is_integer:
        with np.errstate(over="ignore", invalid="ignore"):  # beyond float32 reads as infinite
            rails[:] = flat
        return
    offset = np.float32(datatype.offset)
    full_scale = np.float32(datatype.full_scale)
    step = np.float32(1.0 / datatype.full_scale / (1 << datatype.shift))
    for start in range(0, flat.size, 2 * _BLOCK):
        work = rails[start : start + 2 * _BLOCK]
        work[:] = flat[start : start + 2 * _BLOCK]
        if offset:
            work -= offset
            work /= full_scale
        else:
            work *= step  # a power of two, so this is exact, and faster than a division


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
