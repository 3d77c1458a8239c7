"""A length of time that a recipe gives in seconds or in samples."""

from __future__ import annotations

from dataclasses import dataclass
from decimal import Decimal
from fractions import Fraction
from typing import ClassVar, Literal, Self

from wavegen.core.registry import nearest
from wavegen.core.units import DIMENSIONS, QuantityError, quantity_pattern, split_quantity

LONGEST = 10**12
"""Seconds or samples; far beyond any loop."""
_EXAMPLE = "2.5 us or 16 samples"
_SUFFIX = {"s": "_s", "samples": "_samples"}
_WRITTEN = ("s", "ms", "us", "ns", "ps")


@dataclass(frozen=True, slots=True)
class TimeSpan:
    """A length of time, exact, in the unit it was given in; negative where that has a meaning.

    Parameters
    ----------
    value : Fraction
        Seconds or samples, not necessarily whole.
    unit : {"s", "samples"}
        Which of the two.
    """

    example: ClassVar[str] = "2.5 us"
    value: Fraction
    unit: Literal["s", "samples"]

    @classmethod
    def parse(cls, value: object) -> Self:
        """Read ``2.5 us``, ``1/3 ms``, ``-4 ns`` or ``12.5 samples``.

        Parameters
        ----------
        value : object
            Text as YAML gives it.

        Returns
        -------
        TimeSpan

        Raises
        ------
        QuantityError
            No number with such a unit, or more than 10^12 of it.

        Examples
        --------
        >>> TimeSpan.parse("2.5 us").samples(Fraction(2_000_000))
        Fraction(5, 1)
        """
        if isinstance(value, bool) or not isinstance(value, str | int | float):
            raise _refuse(problem=f"{str(value)[:40]!r} is no length of time")
        number, word = split_quantity(str(value))
        for unit, suffix in _SUFFIX.items():
            size = DIMENSIONS[suffix].units.get(word)
            if size is not None:
                if abs(number * size) > LONGEST:
                    raise _refuse(problem=f"{value!r} is too long")
                return cls(number * size, "s" if unit == "s" else "samples")
        known = [word for suffix in _SUFFIX.values() for word in DIMENSIONS[suffix].units]
        guess = {each.casefold(): each for each in known}.get(word.casefold())
        guess = guess or (nearest(word, known) if word else None)
        raise _refuse(
            problem=f"{value!r} has the unknown unit {word!r}" if word else f"{value!r}: no unit",
            remedy=f"Did you mean {guess}?" if guess else f"Write it like {_EXAMPLE}.",
        )

    @classmethod
    def json_schema(cls) -> dict[str, object]:
        """Return the JSON Schema of what :meth:`parse` reads."""
        units = [word for suffix in _SUFFIX.values() for word in DIMENSIONS[suffix].units]
        return {
            "type": "string",
            "pattern": quantity_pattern(units),
            "examples": ["2.5 us", "16 samples"],
        }

    def text(self) -> str:
        """Return the value as a recipe writes it: the shortest that reads back exactly.

        Examples
        --------
        >>> TimeSpan.parse("0.25 ms").text(), TimeSpan(Fraction(25, 2), "samples").text()
        ('250 us', '12.5 samples')
        """
        if self.unit == "samples":
            return f"{_number(self.value)} samples"
        units = DIMENSIONS["_s"].units
        texts = [f"{_number(self.value / units[word])} {word}" for word in _WRITTEN]
        return min(texts, key=lambda text: ("/" in text, len(text)))

    def __str__(self) -> str:
        """Read as a recipe writes it."""
        return self.text()

    def samples(self, sample_rate_hz: Fraction) -> Fraction:
        """Return the length in samples, perhaps not a whole number.

        Parameters
        ----------
        sample_rate_hz : Fraction
            Hz.
        """
        return self.value if self.unit == "samples" else self.value * sample_rate_hz


def _number(value: Fraction) -> str:
    """Return a decimal number where one is exact and not long, else a ratio."""
    text = f"{Decimal(value.numerator) / Decimal(value.denominator):f}"
    return text if Fraction(text) == value else str(value)


def _refuse(*, problem: str, remedy: str = f"Write it like {_EXAMPLE}.") -> QuantityError:
    return QuantityError(
        problem=problem, allowed="a time with its unit, or a number of samples", remedy=remedy
    )
