"""An angle by which each point is turned over the one before: pi/4-DQPSK, pi/2-BPSK and kin."""

from __future__ import annotations

import re
from dataclasses import dataclass
from fractions import Fraction
from typing import ClassVar, Self

import numpy as np
from numpy.typing import NDArray

from wavegen.core.units import QuantityError, quantity_pattern, split_quantity

LARGEST_PERIOD = 4096
"""Points after which a rotation must have come round."""

_MULTIPLE = re.compile(r"([+-]?)\s*([0-9]{1,4})?\s*\*?\s*pi(?:\s*/\s*([0-9]{1,4}))?")
_LONGEST = 32


@dataclass(frozen=True, slots=True)
class Rotation:
    """A turn from each point to the next: point ``i`` stands at ``i`` times the angle.

    Parameters
    ----------
    turns : Fraction
        Angle over a full turn, above -1/2 and up to 1/2: ``pi/4`` is 1/8.
    """

    turns: Fraction
    example: ClassVar[str] = "pi/4"

    def __str__(self) -> str:
        if not self.turns:
            return "0"
        half = 2 * self.turns
        size = abs(half.numerator)
        head = "-" if half < 0 else ""
        tail = "" if half.denominator == 1 else f"/{half.denominator}"
        return f"{head}{'' if size == 1 else f'{size} '}pi{tail}"

    @classmethod
    def parse(cls, value: object) -> Self:
        """Read ``pi/4``, ``3 pi/8``, ``-pi/2``, ``45 deg`` or 0.

        Parameters
        ----------
        value : object
            Text or number as YAML gives it.

        Returns
        -------
        Rotation

        Raises
        ------
        QuantityError
            Not of that form, or a rotation that has not come round after 4096 points.

        Examples
        --------
        >>> Rotation.parse("3 pi/8").turns, str(Rotation.parse("-90 deg"))
        (Fraction(3, 16), '-pi/2')
        """
        try:
            turns = _turns(value)
        except QuantityError:  # speaks of quantities in general
            turns = None
        if turns is None:
            raise _refuse(problem=f"{value!r} is no rotation")
        turns %= 1
        if turns > Fraction(1, 2):
            turns -= 1
        if turns.denominator > LARGEST_PERIOD:
            raise _refuse(problem=f"{value!r} comes round after {turns.denominator} points only")
        return cls(turns)

    @classmethod
    def json_schema(cls) -> dict[str, object]:
        """Return the JSON Schema of what :meth:`parse` reads."""
        multiple = r"[+-]?\s*(?:[0-9]{1,4})?\s*\*?\s*pi(?:\s*/\s*[0-9]{1,4})?"
        degrees = quantity_pattern(("deg", "°")).removeprefix("^").removesuffix("$")
        text = {"type": "string", "pattern": rf"^(?:\s*{multiple}\s*|{degrees})$"}
        return {"anyOf": [{"enum": [0, "0"]}, text], "examples": ["pi/4", "45 deg"]}

    @property
    def period(self) -> int:
        """Points after which the rotation has come round."""
        return self.turns.denominator

    @property
    def factors(self) -> NDArray[np.complex128]:
        """Unit factors of one period, shape (period,); quarter turns are exact."""
        made = np.empty(self.period, np.complex128)
        for i in range(self.period):
            quarters, rest = divmod(4 * ((i * self.turns) % 1), 1)
            angle = 0.5 * np.pi * float(rest)
            made[i] = (1, 1j, -1, -1j)[int(quarters)] * complex(np.cos(angle), np.sin(angle))
        return made

    def over(self, n: int) -> NDArray[np.complex128]:
        """Return the factors of points 0 ... n - 1, shape (n,)."""
        return np.resize(self.factors, n)


def _turns(value: object) -> Fraction | None:
    if isinstance(value, bool) or not isinstance(value, str | int | float):
        return None
    text = str(value).strip()
    if len(text) > _LONGEST:
        return None
    found = _MULTIPLE.fullmatch(text)
    if found is not None:
        sign, factor, divisor = found.groups()
        if divisor is not None and not int(divisor):
            return None
        half = Fraction(int(factor or 1), int(divisor or 1))
        return (-half if sign == "-" else half) / 2
    number, unit = split_quantity(text)
    if unit in {"deg", "°"}:
        return number / 360
    return None if unit or number else Fraction(0)


def _refuse(*, problem: str) -> QuantityError:
    return QuantityError(
        problem=problem,
        allowed=f"multiples of pi/n or of degrees that come round within {LARGEST_PERIOD} points",
        remedy="Write it like pi/4, 3 pi/8 or 45 deg.",
    )
