"""Cross-shaped quadrature amplitude modulation: odd numbers of bits a symbol."""

from __future__ import annotations

import numpy as np

from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.mapping.square_qam import axis_levels, split_bits


def cross_qam(n_bits: int) -> Constellation:
    """Return a cross QAM: a square without its corners.

    Parameters
    ----------
    n_bits : int
        Bits a symbol, odd, 5 or more.

    Returns
    -------
    Constellation
        Odd integers on both axes up to ``3 s - 1`` with ``s = 2^((n_bits - 3) / 2)``, without
        the four corners of ``s^2 / 4`` points each; unit mean power.

    Notes
    -----
    Labelling: the bits are dealt to the axes in turn as for square QAM (I takes one more), and
    each axis is Gray-coded by the same nesting. That makes a rectangle of ``4s`` by ``2s``
    levels; its outer columns, ``|I| > 3 s``, are then folded above and below: ``|Q| > s`` goes
    to ``(|I| - 2s, 4s - |Q|)``, the rest to ``(4s - |I|, |Q| + 2s)``, signs kept. Neighbours
    are one bit apart within the part that stayed; a perfect Gray labelling of a cross does not
    exist.
    Source: J. G. Smith, "Odd-bit quadrature amplitude-shift keying", IEEE Trans. Commun.
    23(3), 1975 (shape and folding, from memory); no standard's bit order is claimed.

    Examples
    --------
    >>> made = cross_qam(5)
    >>> round(float(10 * np.log10(np.max(np.abs(made.points) ** 2))), 4)
    2.3045
    """
    in_phase, quadrature = (axis_levels(bits) for bits in split_bits(n_bits))
    s = 2.0 ** ((n_bits - 3) // 2)
    across, up = np.abs(in_phase), np.abs(quadrature)
    is_outer = across > 3 * s
    is_high = up > s
    folded_across = np.where(is_high, across - 2 * s, 4 * s - across)
    folded_up = np.where(is_high, 4 * s - up, up + 2 * s)
    across = np.where(is_outer, folded_across, across)
    up = np.where(is_outer, folded_up, up)
    points = np.sign(in_phase) * across + 1j * np.sign(quadrature) * up
    return Constellation(f"{1 << n_bits}qam", points / np.sqrt(np.mean(np.abs(points) ** 2)))


def qam32() -> Constellation:
    """Return cross 32QAM: 6 by 6 without the corners."""
    return cross_qam(5)


def qam128() -> Constellation:
    """Return cross 128QAM: 12 by 12 without 2 by 2 at the corners."""
    return cross_qam(7)


def qam512() -> Constellation:
    """Return cross 512QAM: 24 by 24 without 4 by 4 at the corners."""
    return cross_qam(9)
