"""Where the points of a constellation may go without coming nearer to any other."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from wavegen.core.signal import Samples
from wavegen.dsp.compiled import compiled, numba_types

TOLERANCE_RAD = 1e-4
"""Angles closer than this are the same: tables of points are in single precision."""


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Cones:
    """A cone of allowed moves for each of several points.

    Parameters
    ----------
    axis : complex64 array
        Direction of its middle; 0 where no move is allowed.
    cosine, sine : float32 array, same shape
        Of half its opening: 1 and 0 for a ray, 0 and 1 for a half plane.
    """

    axis: NDArray[np.complex64]
    cosine: NDArray[np.float32]
    sine: NDArray[np.float32]

    def of(self, numbers: NDArray[np.integer]) -> Cones:
        """Return the cones of points by their numbers, in the shape of those."""
        return Cones(
            axis=self.axis.take(numbers),
            cosine=self.cosine.take(numbers),
            sine=self.sine.take(numbers),
        )


def cones_of(points: NDArray[np.complexfloating]) -> Cones:
    """Return for each point the moves that take it away from, or along, every other.

    Parameters
    ----------
    points : complex array, shape (order,)
        Constellation on any scale.

    Returns
    -------
    Cones
        Of shape (order,).

    Notes
    -----
    A move ``d`` of a point ``p`` is allowed if ``Re(d conj(p - q)) >= 0`` for every other point
    ``q``. Where both ends of a pair keep to that, ``|p + d - q - e|^2`` is
    ``|p - q|^2 + 2 Re((d - e) conj(p - q)) + |d - e|^2``, no less than ``|p - q|^2``: the least
    distance is never reduced, whatever the others do. The cone is the dual of that which the
    directions ``p - q`` span. Corners of square QAM may go into a quarter plane, points on its
    edges straight outwards, those within nowhere, as Krongold and Jones (2003) have it; those of
    PSK into a wedge of 360 degrees over their number.
    """
    exact = np.asarray(points, np.complex128)
    axis = np.zeros(exact.size, np.complex128)
    half = np.zeros(exact.size)
    size = float(np.abs(exact).max()) or 1.0
    for number, point in enumerate(exact):
        apart = point - exact
        apart = apart[np.abs(apart) > 1e-6 * size]
        if not apart.size:
            continue
        angles = np.sort(np.angle(apart))
        gaps = np.diff(np.append(angles, angles[0] + 2 * np.pi))
        widest = int(np.argmax(gaps))
        span = 2 * np.pi - gaps[widest]
        if span <= np.pi + TOLERANCE_RAD:
            middle = angles[(widest + 1) % angles.size] + span / 2
            axis[number] = np.exp(1j * middle)
            half[number] = max(np.pi / 2 - span / 2, 0.0)
    half[half < TOLERANCE_RAD] = 0.0
    return Cones(
        axis=axis.astype(np.complex64),
        cosine=np.cos(half).astype(np.float32),
        sine=np.sin(half).astype(np.float32),
    )


def into_cones(moves: Samples, cones: Cones) -> Samples:
    """Return the nearest allowed moves.

    Parameters
    ----------
    moves : complex64 array
        Wanted; not changed.
    cones : Cones
        Of the same shape.

    Returns
    -------
    complex64 array, same shape

    Examples
    --------
    >>> corner = cones_of(np.array([1 + 1j, 1 - 1j, -1 + 1j, -1 - 1j])).of(np.zeros(3, int))
    >>> moved = into_cones(np.array([2 + 1j, -1 + 3j, -1 - 1j], np.complex64), corner)
    >>> np.round(moved, 5).tolist()
    [(2+1j), 3j, 0j]
    """
    kernel = _compile()
    if kernel is None:
        return into_cones_by_numpy(moves, cones)
    made = np.empty_like(moves)
    planes = (moves, cones.axis, made)
    flat = [np.ascontiguousarray(each).reshape(-1).view(np.float32) for each in planes]
    kernel(*flat, cones.cosine.reshape(-1), cones.sine.reshape(-1))
    return made


def into_cones_by_numpy(moves: Samples, cones: Cones) -> Samples:
    """Do what :func:`into_cones` does, without a compiler; same parameters, same bits."""
    real, imag = cones.axis.real, cones.axis.imag
    along = moves.real * real + moves.imag * imag
    across = moves.imag * real - moves.real * imag
    aside = np.abs(across)
    reach = np.maximum(along * cones.cosine + aside * cones.sine, np.float32(0))
    is_inside = aside * cones.cosine <= along * cones.sine
    along = np.where(is_inside, along, reach * cones.cosine)
    across = np.where(is_inside, across, np.copysign(reach * cones.sine, across))
    made = np.empty_like(moves)
    made.real = along * real - across * imag
    made.imag = along * imag + across * real
    return made


@cache
def _compile() -> Callable[..., None] | None:
    """Return the compiled loop, or None where numba is missing or switched off."""
    kinds = numba_types()
    if kinds is None:
        return None
    line = kinds.Array(kinds.float32, 1, "C")
    held = kinds.Array(kinds.float32, 1, "C", readonly=True)
    signature = kinds.void(held, held, line, held, held)
    return compiled(signature, _into)


def _into(
    moves: NDArray[np.float32],
    axis: NDArray[np.float32],
    made: NDArray[np.float32],
    cosine: NDArray[np.float32],
    sine: NDArray[np.float32],
) -> None:
    zero = np.float32(0)
    for k in range(cosine.size):
        real, imag = axis[2 * k], axis[2 * k + 1]
        along = moves[2 * k] * real + moves[2 * k + 1] * imag
        across = moves[2 * k + 1] * real - moves[2 * k] * imag
        aside = np.abs(across)
        if aside * cosine[k] > along * sine[k]:
            reach = max(along * cosine[k] + aside * sine[k], zero)
            along = reach * cosine[k]
            across = np.copysign(reach * sine[k], across)
        made[2 * k] = along * real - across * imag
        made[2 * k + 1] = along * imag + across * real
