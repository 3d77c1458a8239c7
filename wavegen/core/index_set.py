"""Sets of subcarriers and of symbols as recipes write them: integers and ranges."""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import Literal, Self

from wavegen.core.units import QuantityError

LARGEST_INDEX = 1 << 20
"""Bound of a subcarrier index, so that a slip of the pen cannot fill the memory."""

_PART = re.compile(r"([+-]?[0-9]{1,9})(?:\s*\.\.\s*([+-]?[0-9]{1,9})(?:\s+by\s+([0-9]{1,9}))?)?")
_EXAMPLES = {
    "subcarrier": "Write it like '-600..-1, 1..600' or '0..1200 by 4'.",
    "symbol": "Write it like '0, 4, 7, 11' or '0..13 by 2'.",
}

Run = tuple[int, int, int]
"""First, last and step; the last one belongs to the run."""


def _refuse(*, noun: str, problem: str, allowed: str) -> QuantityError:
    return QuantityError(problem=problem, allowed=allowed, remedy=_EXAMPLES[noun])


@dataclass(frozen=True, slots=True)
class IndexSet:
    """Subcarrier indices in the order in which they are listed; 0 is the centre.

    Parameters
    ----------
    runs : tuple of (first, last, step)
        Each run holds ``first, first + step, ...`` up to ``last``, which belongs to the run.
    """

    runs: tuple[Run, ...]

    @property
    def indices(self) -> tuple[int, ...]:
        """Every index, in the order listed."""
        return tuple(k for low, high, step in self.runs for k in range(low, high + 1, step))

    def __len__(self) -> int:
        return sum((high - low) // step + 1 for low, high, step in self.runs)

    def __str__(self) -> str:
        return ", ".join(_text(*run) for run in self.runs)

    @classmethod
    def parse(cls, value: object) -> Self:
        """Read indices and ranges.

        Parameters
        ----------
        value : object
            Text such as ``-600..-1, 1..600`` (both ends belong to a range) or
            ``0..1200 by 4`` (every fourth), a single integer, or a list of these.

        Returns
        -------
        IndexSet

        Raises
        ------
        QuantityError
            Not of that form, empty, a range that runs downwards, or an index beyond 2^20.

        Examples
        --------
        >>> IndexSet.parse("-2..-1, 4..10 by 3").indices
        (-2, -1, 4, 7, 10)
        """
        return cls(read_runs(value, noun="subcarrier"))

    @classmethod
    def json_schema(cls) -> dict[str, object]:
        """Return the JSON Schema of what :meth:`parse` reads."""
        return _runs_schema("[+-]?", "-600..-1, 1..600", "0..1200 by 4")


@dataclass(frozen=True, slots=True)
class SymbolSet:
    """Symbols of a frame, counted from 0.

    Parameters
    ----------
    runs : tuple of (first, last, step)
        Each run holds ``first, first + step, ...`` up to ``last``, which belongs to the run.
    """

    runs: tuple[Run, ...]

    @property
    def numbers(self) -> tuple[int, ...]:
        """Every symbol, in the order listed."""
        return tuple(k for low, high, step in self.runs for k in range(low, high + 1, step))

    def __str__(self) -> str:
        return ", ".join(_text(*run) for run in self.runs)

    @classmethod
    def parse(cls, value: object) -> Self:
        """Read symbols and ranges, in the notation of :class:`IndexSet`.

        Parameters
        ----------
        value : object
            Text such as ``0, 4, 7, 11`` or ``0..13 by 2``, a single integer, or a list.

        Returns
        -------
        SymbolSet

        Raises
        ------
        QuantityError
            Not of that form, empty, negative, or a range that runs downwards.

        Examples
        --------
        >>> SymbolSet.parse("3, 0..13 by 4").numbers
        (3, 0, 4, 8, 12)
        """
        runs = read_runs(value, noun="symbol")
        lowest = min(run[0] for run in runs)
        if lowest < 0:
            raise _refuse(
                noun="symbol",
                problem=f"symbol {lowest} lies before the frame",
                allowed="0, the first symbol of the frame, and up",
            )
        return cls(runs)

    @classmethod
    def json_schema(cls) -> dict[str, object]:
        """Return the JSON Schema of what :meth:`parse` reads."""
        return _runs_schema(r"[+]?", "0, 4, 7, 11", "0..13 by 2")


def _runs_schema(sign: str, *examples: str) -> dict[str, object]:
    number = rf"{sign}[0-9]{{1,9}}"
    run = rf"\s*{number}(?:\s*\.\.\s*{number}(?:\s+by\s+[0-9]{{1,9}})?)?\s*"
    one = {"anyOf": [{"type": "integer"}, {"type": "string", "pattern": f"^{run}(?:,{run})*$"}]}
    listed = {"type": "array", "items": one, "minItems": 1}
    return {"anyOf": [*one["anyOf"], listed], "examples": list(examples)}


def read_runs(value: object, *, noun: Literal["subcarrier", "symbol"]) -> tuple[Run, ...]:
    """Read integers and ranges, not yet expanded.

    Parameters
    ----------
    value : object
        Text, an integer, or a list of these.
    noun : {"subcarrier", "symbol"}
        What they number, for messages.

    Returns
    -------
    tuple of (first, last, step)

    Raises
    ------
    QuantityError
        Not of that form, empty, a range that runs downwards, or a number beyond 2^20.
    """
    parts = value if isinstance(value, list | tuple) else [value]
    runs = tuple(run for part in parts for run in _runs_of(part, noun))
    if not runs:
        raise _refuse(noun=noun, problem=f"no {noun}s are listed", allowed=f"at least one {noun}")
    return runs


def _text(first: int, last: int, step: int) -> str:
    if first == last:
        return str(first)
    return f"{first}..{last}" if step == 1 else f"{first}..{last} by {step}"


def _runs_of(part: object, noun: str) -> list[Run]:
    """Read one item of a list: an integer, or text with ranges between commas."""
    if isinstance(part, bool) or not isinstance(part, int | str):
        raise _refuse(
            noun=noun, problem=f"{part!r} is no {noun} index", allowed="integers and ranges"
        )
    text = str(part).strip()
    return [_run_of(item.strip(), noun) for item in text.split(",")] if text else []


def _run_of(text: str, noun: str) -> Run:
    found = _PART.fullmatch(text)
    if found is None:
        raise _refuse(
            noun=noun,
            problem=f"{text!r} is no {noun} index or range",
            allowed="integers and ranges",
        )
    first = int(found[1])
    last = first if found[2] is None else int(found[2])
    step = 1 if found[3] is None else int(found[3])
    if max(abs(first), abs(last)) > LARGEST_INDEX:
        raise _refuse(
            noun=noun,
            problem=f"{text!r} goes far out",
            allowed=f"indices within ±{LARGEST_INDEX}",
        )
    if last < first or not step:
        raise _refuse(
            noun=noun,
            problem=f"the range {text!r} holds nothing",
            allowed="ranges from low to high, with a step of 1 or more",
        )
    return first, first + (last - first) // step * step, step
