"""Phase-shift keying."""

from __future__ import annotations

import numpy as np

from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.mapping.square_qam import square_points

_EIGHTHS = (1, 0, 4, 5, 2, 7, 3, 6)
"""Eighths of a turn by label 000, 001 ... 111."""


def bpsk() -> Constellation:
    """Return BPSK: ``((1 - 2b) + j(1 - 2b)) / sqrt(2)``.

    Returns
    -------
    Constellation
        Two points on the diagonal of the I/Q plane; bit 0 at 45 degrees.

    Notes
    -----
    Source: 3GPP TS 38.211 v19, cl. 5.1.2 (from memory).

    Examples
    --------
    >>> bpsk().points.round(3)
    array([ 0.707+0.707j, -0.707-0.707j])
    """
    return Constellation("bpsk", np.array([1 + 1j, -1 - 1j]) / np.sqrt(2.0))


def qpsk() -> Constellation:
    """Return QPSK: ``((1 - 2 b0) + j(1 - 2 b1)) / sqrt(2)``.

    Returns
    -------
    Constellation
        Four points; Gray labels.

    Notes
    -----
    Source: 3GPP TS 38.211 v19, cl. 5.1.3 (from memory; the nesting of cl. 5.1.4 with one bit
    an axis).

    Examples
    --------
    >>> qpsk().points.round(3)
    array([ 0.707+0.707j,  0.707-0.707j, -0.707+0.707j, -0.707-0.707j])
    """
    return Constellation("qpsk", square_points(2))


def psk8() -> Constellation:
    """Return 8PSK with Gray labels.

    Returns
    -------
    Constellation
        Eight points: 000 at 45, 001 at 0, 010 at 180, 011 at 225, 100 at 90, 101 at 315,
        110 at 135, 111 at 270 degrees.

    Notes
    -----
    Source: ETSI EN 302 307-1, cl. 5.4.2, as quoted in public code.

    Examples
    --------
    >>> (np.degrees(np.angle(psk8().points)).round() % 360).astype(int).tolist()
    [45, 0, 180, 225, 90, 315, 135, 270]
    """
    return Constellation("8psk", np.exp(0.25j * np.pi * np.array(_EIGHTHS)))
