"""The fixed values that pilots carry, beside the notation of sets of subcarriers."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Self

import numpy as np
from numpy.typing import NDArray

from wavegen.core.index_set import IndexSet, SymbolSet
from wavegen.core.units import QuantityError
from wavegen.sources.mapping.constellation import Constellation

__all__ = ["IndexSet", "PilotValues", "SymbolSet"]


@dataclass(frozen=True, slots=True)
class PilotValues:
    """Values of pilots, the same in every symbol: a sequence, or one drawn from the seed.

    Parameters
    ----------
    sequence : tuple of complex
        Values on any scale, repeated over the subcarriers as often as needed; empty if drawn.
    drawn_from : Constellation or None
        One point is drawn for each subcarrier.
    """

    sequence: tuple[complex, ...] = ()
    drawn_from: Constellation | None = None

    @classmethod
    def parse(cls, value: object) -> Self:
        """Read a list of values, or ``{random: CONSTELLATION}``.

        Parameters
        ----------
        value : object
            ``[1, 1, 1, -1]``, ``[[0.7, 0.7], [0.7, -0.7]]`` (real and imaginary part), or
            ``{random: qpsk}``.

        Returns
        -------
        PilotValues

        Raises
        ------
        QuantityError
            Not of that form, a number that is not finite, or nothing but zeros.
        """
        if isinstance(value, Mapping) and list(value) == ["random"]:
            return cls(drawn_from=Constellation.parse(value["random"]))
        items = value if isinstance(value, list | tuple) else ()
        sequence = tuple(_number(item) for item in items)
        if not any(sequence):
            raise QuantityError(
                problem=f"{value!r} gives no pilot values",
                allowed="a list of numbers or of pairs [re, im], not all zero, or {random: qpsk}",
                remedy="Write it like [1, 1, 1, -1].",
            )
        return cls(sequence)

    @classmethod
    def json_schema(cls) -> dict[str, object]:
        """Return the JSON Schema of what :meth:`parse` reads."""
        pair = {"type": "array", "items": {"type": "number"}, "minItems": 1, "maxItems": 2}
        drawn = {
            "type": "object",
            "properties": {"random": Constellation.json_schema()},
            "required": ["random"],
            "additionalProperties": False,
        }
        value = {"anyOf": [{"type": "number"}, pair]}
        listed = {"type": "array", "items": value, "minItems": 1}
        return {"anyOf": [listed, drawn], "examples": [[1, 1, 1, -1], {"random": "qpsk"}]}

    def text(self) -> object:
        """Return the value as a recipe writes it."""
        if self.drawn_from is not None:
            return {"random": self.drawn_from.text()}
        return [[value.real, value.imag] if value.imag else value.real for value in self.sequence]

    def over(self, n: int, words: NDArray[np.unsignedinteger]) -> NDArray[np.complex128]:
        """Return the values of ``n`` subcarriers, scaled to unit mean power over them.

        Parameters
        ----------
        n : int
            Subcarriers.
        words : unsigned integer array, shape (n,)
            Random words; read where the values are drawn.

        Returns
        -------
        complex128 array, shape (n,)
            All zero if the first ``n`` values of the sequence are.
        """
        if self.drawn_from is not None:
            values = self.drawn_from.points[words & (self.drawn_from.points.size - 1)]
        else:
            values = np.resize(np.array(self.sequence, np.complex128), n)
        power = float(np.mean(values.real**2 + values.imag**2))
        scaled: NDArray[np.complex128] = values / math.sqrt(power) if power else values
        return scaled


def _number(item: object) -> complex:
    parts = item if isinstance(item, list | tuple) else [item]
    numbers = [float(x) for x in parts if isinstance(x, int | float) and not isinstance(x, bool)]
    is_sound = len(numbers) == len(parts) in (1, 2) and all(map(math.isfinite, numbers))
    if not is_sound or any(abs(x) > 1e6 for x in numbers):
        raise QuantityError(
            problem=f"{item!r} is no pilot value",
            allowed="a finite number or a pair [re, im], up to 1e6",
            remedy="Write it like 1 or [0.7, -0.7].",
        )
    return complex(*numbers)
