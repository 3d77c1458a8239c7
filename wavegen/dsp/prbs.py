"""Pseudo-random binary sequences of ITU-T O.150, at any position without running from the start."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

_SUPPRESSED_ZEROS = 14
"""Zeros in a row before which the zero-suppressed sequence sends a one (O.150 cl. 5.5)."""


@dataclass(frozen=True, kw_only=True)
class Prbs:
    """A maximum-length sequence: ``s[i] = s[i - order] xor s[i - tap]``, all ones before bit 0.

    Parameters
    ----------
    order : int
        Stages of the register; the period is ``2**order - 1`` bits.
    tap : int
        Second stage fed back, below ``order``.
    is_inverted : bool
        Whether the output is the complement.
    suppresses_zeros : bool
        Whether a bit followed by 14 zeros is sent as a one.

    Notes
    -----
    Bits 0 to ``order - 1`` are those of a register filled with ones. A bit at any position is
    found through ``x**position`` modulo the polynomial ``x**order + x**(order - tap) + 1``; from
    there on bytes are made by the recurrence of the ``2**k``-th power of the polynomial, ``s[i] =
    s[i - 2**k order] xor s[i - 2**k tap]`` (squaring is linear over GF(2)), in steps that grow
    with what is there.
    Source: ITU-T O.150 (05/96), clause 5; jump and powers by derivation, tested against the
    register in ``tests/dsp/test_prbs.py``.
    """

    order: int
    tap: int
    is_inverted: bool = False
    suppresses_zeros: bool = False

    @property
    def period(self) -> int:
        """Return the bits of one period."""
        return (1 << self.order) - 1

    def bits(self, first: int, count: int) -> NDArray[np.uint8]:
        """Return bits ``[first, first + count)``.

        Parameters
        ----------
        first, count : int
            Bit range of the endless sequence; ``first >= 0``.

        Returns
        -------
        uint8 array, shape (count,)
            Zeros and ones.
        """
        ahead = _SUPPRESSED_ZEROS if self.suppresses_zeros else 0
        packed = self._packed(first % self.period, count + ahead)
        if self.is_inverted and not ahead:
            np.invert(packed, out=packed)
        bits = np.unpackbits(packed, count=count + ahead)
        if not ahead:
            return bits
        one = np.uint8(1)
        two = bits[:-1] | bits[1:]
        four = two[:-2] | two[2:]
        eight = four[:-4] | four[4:]
        fourteen = eight[:-6] | eight[6:]  # of bits i ... i + 13
        sent: NDArray[np.uint8] = bits[:count] | (fourteen[1 : count + 1] ^ one)
        return sent ^ one if self.is_inverted else sent

    def _packed(self, position: int, count: int) -> NDArray[np.uint8]:
        """Return bytes that hold the plain register's bits from a position, first bit highest."""
        n_bytes = -(-count // 8)
        out = np.empty(max(n_bytes, self.order), np.uint8)
        out[: self.order] = np.frombuffer(self._begin(position), np.uint8)
        have, power = self.order, 1  # bytes made; the lags below are in bytes: 2**3 and up
        while have < n_bytes:
            while 2 * power * self.order <= have:
                power *= 2
            stop = min(have + power * self.tap, n_bytes)
            late, early = have - power * self.tap, have - power * self.order
            size = stop - have
            np.bitwise_xor(out[late : late + size], out[early : early + size], out=out[have:stop])
            have = stop
        return out[:n_bytes]

    def _begin(self, position: int) -> bytes:
        """Return the first ``8 * order`` bits from a position, packed."""
        state = 0  # bit j of it is bit j from the position on
        power = self._power(position)
        for j in range(self.order):
            state |= ((power & (self._head >> j)).bit_count() & 1) << j
        n, tap = self.order, self.tap
        for i in range(n, 8 * n):
            state |= ((state >> (i - n) ^ state >> (i - tap)) & 1) << i
        return int(f"{state:0{8 * n}b}"[::-1], 2).to_bytes(n, "big")

    @cached_property
    def _head(self) -> int:
        """The first ``2 * order`` bits, bit i of the sequence at place i."""
        head = (1 << self.order) - 1
        for i in range(self.order, 2 * self.order):
            head |= ((head >> (i - self.order) ^ head >> (i - self.tap)) & 1) << i
        return head

    def _power(self, exponent: int) -> int:
        """Return ``x**exponent`` modulo the polynomial, its coefficients as bits."""
        result = 1
        for digit in f"{exponent:b}":
            result = self._reduce(_square(result) << (digit == "1"))
        return result

    def _reduce(self, value: int) -> int:
        n, low = self.order, (1 << self.order) - 1
        while value > low:
            high = value >> n
            value = (value & low) ^ high ^ (high << (n - self.tap))
        return value


def _square(value: int) -> int:
    """Square a polynomial over GF(2): a zero goes between its bits."""
    return int(f"{value:b}", 4)


PRBS: dict[str, Prbs] = {
    "pn9": Prbs(order=9, tap=5),
    "pn11": Prbs(order=11, tap=9),
    "pn15": Prbs(order=15, tap=14, is_inverted=True),
    "pn20": Prbs(order=20, tap=3),
    "pn20_zs": Prbs(order=20, tap=17, suppresses_zeros=True),
    "pn23": Prbs(order=23, tap=18, is_inverted=True),
    "pn29": Prbs(order=29, tap=27, is_inverted=True),
    "pn31": Prbs(order=31, tap=28, is_inverted=True),
}
"""The sequences of ITU-T O.150 (05/96), clauses 5.1 to 5.8, with its inversions."""
