"""A constellation: symbol numbers to points of unit mean power."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from importlib import import_module
from numbers import Real
from typing import Any, Self

import numpy as np
from numpy.typing import NDArray

from wavegen.core.registry import nearest
from wavegen.core.units import QuantityError
from wavegen.sources.mapping import MAPPINGS

LARGEST = 1 << 16
_UNIT = 1e-12
"""Points this close to unit power are kept bit for bit, so that writing them loses nothing."""


@dataclass(frozen=True, eq=False)
class Constellation:
    """Points by symbol number, scaled to unit mean power.

    Parameters
    ----------
    name : str
        Name in recipes, or ``points``.
    points : complex128 array, shape (order,)
        Entry ``i`` is the point of the symbol whose bits, first bit most significant, read
        ``i``. Unit mean power.
    notation : object
        What a recipe writes for it, where that is neither the name nor the list of points.
    """

    name: str
    points: NDArray[np.complex128]
    notation: object = None

    def __eq__(self, other: object) -> bool:
        """Return whether name and points are the same."""
        if not isinstance(other, Constellation):
            return NotImplemented
        return self.name == other.name and np.array_equal(self.points, other.points)

    def __hash__(self) -> int:
        """Agree with equality."""
        return hash((self.name, self.points.size))

    def text(self) -> object:
        """Return the value as a recipe writes it: the name, the rings, or the list of points."""
        if self.notation is not None:
            return self.notation
        if self.name.partition(" ")[0] in MAPPINGS:
            return self.name
        return [[float(point.real), float(point.imag)] for point in self.points]

    @property
    def n_bits(self) -> int:
        """Bits a symbol: the logarithm to base 2 of the order."""
        return int(self.points.size - 1).bit_length()

    @cached_property
    def wide(self) -> NDArray[np.complex64]:
        """Points for every byte (up to 8 bits a symbol) or 16-bit word: the table repeats."""
        size = 256 if self.n_bits <= 8 else 65536
        return np.tile(self.points, size // self.points.size).astype(np.complex64)

    def __getstate__(self) -> dict[str, Any]:
        """Leave out the wide table, which is made again: workers get a small description."""
        return {"name": self.name, "points": self.points, "notation": self.notation}

    @classmethod
    def parse(cls, value: object) -> Self:
        """Read a name such as ``64qam``, rings, or a list of points ``[[re, im], ...]``.

        Parameters
        ----------
        value : object
            Text, mapping or list as YAML gives it: ``16apsk 2/3`` names a code rate too,
            ``{rings: [4, 12], ratios: [2.85], phases: [45 deg, 15 deg]}`` is read by
            :func:`wavegen.sources.mapping.apsk.from_rings`.

        Returns
        -------
        Constellation

        Raises
        ------
        QuantityError
            Unknown name, or points that make no constellation.
        """
        apsk = import_module("wavegen.sources.mapping.apsk")  # it imports this module
        made: Self
        if isinstance(value, Mapping):
            made = apsk.from_rings(value)
            return made
        if isinstance(value, str):
            if value not in MAPPINGS:
                rated: Self | None = apsk.at_code_rate(value)
                if rated is not None:
                    return rated
                guess = nearest(value, MAPPINGS)
                raise QuantityError(
                    problem=f"unknown constellation {value!r}",
                    allowed=", ".join(MAPPINGS) + ", rings, or a list of points",
                    remedy=f"Did you mean {guess}?" if guess else "Choose one of these.",
                )
            made = MAPPINGS.load(value)()
            return made
        return cls.of_points(value)

    @classmethod
    def json_schema(cls) -> dict[str, object]:
        """Return the JSON Schema of what :meth:`parse` reads: names, rings or points."""
        pair = {"type": "array", "items": {"type": "number"}, "minItems": 2, "maxItems": 2}
        return {
            "anyOf": [
                {"enum": list(MAPPINGS)},
                {"type": "string", "pattern": "^[0-9]+apsk [0-9]+/[0-9]+$"},
                {"type": "object", "required": ["rings"]},
                {"type": "array", "items": pair, "minItems": 2, "maxItems": LARGEST},
            ],
            "examples": ["64qam", "16apsk 2/3"],
        }

    @classmethod
    def of_points(cls, value: object) -> Self:
        """Make a constellation from points on any scale.

        Parameters
        ----------
        value : object
            ``[[re, im], ...]``: 2, 4, 8 ... 65536 pairs of finite numbers, not all zero.

        Returns
        -------
        Constellation

        Raises
        ------
        QuantityError
            Not such a list.
        """
        try:
            pairs = np.array(value, dtype=np.float64) if _is_numeric(value) else np.empty(0)
        except (TypeError, ValueError, OverflowError):
            pairs = np.empty(0)
        count = pairs.shape[0] if pairs.ndim == 2 else 0
        is_sound = pairs.ndim == 2 and pairs.shape[1] == 2 and bool(np.isfinite(pairs).all())
        if not is_sound or not 2 <= count <= LARGEST or count & (count - 1) or not pairs.any():
            raise QuantityError(
                problem="the points make no constellation",
                allowed="2, 4, 8 ... 65536 pairs [re, im] of finite numbers, not all zero",
                remedy="Write it like [[1, 1], [-1, 1], [-1, -1], [1, -1]].",
            )
        points = pairs[:, 0] + 1j * pairs[:, 1]
        if abs(np.mean(pairs[:, 0] ** 2 + pairs[:, 1] ** 2) - 1) < _UNIT:
            return cls("points", points)
        points = points / np.sqrt(np.mean(np.abs(points / np.abs(points).max()) ** 2))
        points = points / np.sqrt(np.mean(np.abs(points) ** 2))
        return cls("points", points)


def _is_numeric(value: object) -> bool:
    """Return whether a list of lists holds numbers alone: no text, no true or false."""
    if isinstance(value, np.ndarray):
        return value.dtype.kind in "iuf"
    if not isinstance(value, list | tuple):
        return False
    inner = [item for row in value if isinstance(row, list | tuple) for item in row]
    return all(isinstance(item, Real) and not isinstance(item, bool) for item in inner)
