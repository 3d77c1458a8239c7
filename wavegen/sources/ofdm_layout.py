"""Prefixes and edges of OFDM symbols in whole samples."""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction
from typing import Self

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import RecipeError
from wavegen.core.units import QuantityError, format_hz, quantity_pattern, split_quantity

LARGEST_FFT = 1 << 20
MOST_SYMBOLS = 10_000
"""Longest pattern of prefixes, symbols."""

_SAMPLE_WORDS = ("sample", "samples")


@dataclass(frozen=True, slots=True)
class Stretch:
    """A length in samples, or as a fraction of the useful symbol.

    Parameters
    ----------
    value : Fraction
        Samples, or useful symbols.
    in_samples : bool
        Which of the two.
    """

    value: Fraction
    in_samples: bool = False

    def __str__(self) -> str:
        return f"{self.value} samples" if self.in_samples else str(self.value)

    @classmethod
    def parse(cls, value: object) -> Self:
        """Read ``16 samples``, or a fraction of the useful symbol: ``144/2048``, ``0.25``.

        Parameters
        ----------
        value : object
            Text or number as YAML gives it.

        Returns
        -------
        Stretch

        Raises
        ------
        QuantityError
            Not of that form, negative, or more than the useful symbol.

        Examples
        --------
        >>> Stretch.parse("144/2048").samples(1024)
        Fraction(72, 1)
        >>> Stretch.parse("16 samples").samples(1024)
        Fraction(16, 1)
        """
        if isinstance(value, bool) or not isinstance(value, str | int | float):
            raise _refuse_stretch(problem=f"{value!r} is no length")
        number, unit = split_quantity(str(value))
        if unit and unit not in _SAMPLE_WORDS:
            raise _refuse_stretch(problem=f"{value!r} has the unknown unit {unit!r}")
        if number < 0 or (not unit and number > 1) or number > LARGEST_FFT:
            raise _refuse_stretch(problem=f"{value!r} does not lie within the useful symbol")
        if unit and number.denominator != 1:
            raise _refuse_stretch(problem=f"{value!r} is not a whole number of samples")
        return cls(number, in_samples=bool(unit))

    @classmethod
    def json_schema(cls) -> dict[str, object]:
        """Return the JSON Schema of what :meth:`parse` reads."""
        return {
            "anyOf": [
                {"type": "number", "minimum": 0, "maximum": 1},
                {"type": "string", "pattern": quantity_pattern(("", *_SAMPLE_WORDS), sign="[+]?")},
            ],
            "examples": ["144/2048", "16 samples"],
        }

    def samples(self, n_fft: int) -> Fraction:
        """Return the length in samples, perhaps not a whole number."""
        return self.value if self.in_samples else self.value * n_fft


def _refuse_stretch(*, problem: str) -> QuantityError:
    return QuantityError(
        problem=problem,
        allowed="whole samples, or a fraction of the useful symbol, 0 to 1",
        remedy="Write it like 16 samples or 144/2048.",
    )


@dataclass(frozen=True, slots=True)
class CyclicPrefix:
    """Lengths of the prefixes of successive symbols: a pattern that repeats.

    Parameters
    ----------
    runs : tuple of (int, Stretch)
        So many symbols with prefixes of that length, and so on.
    """

    runs: tuple[tuple[int, Stretch], ...]

    @property
    def n_symbols(self) -> int:
        """Symbols in the pattern as listed."""
        return sum(count for count, _ in self.runs)

    def __str__(self) -> str:
        return ", ".join(str(length) if n == 1 else f"{n} x {length}" for n, length in self.runs)

    @classmethod
    def parse(cls, value: object) -> Self:
        """Read one length for all symbols, or a repeating list.

        Parameters
        ----------
        value : object
            ``16 samples``, ``144/2048`` (of the useful symbol), or a list of these, each
            perhaps with a count: ``[160/2048, 6 x 144/2048]``. Text with commas reads as a
            list does.

        Returns
        -------
        CyclicPrefix

        Raises
        ------
        QuantityError
            Not of that form, an empty list, or more than 10000 symbols.
        """
        parts = value if isinstance(value, list | tuple) else [value]
        runs = tuple(run for part in parts for run in _runs_of(part))
        if not 1 <= sum(count for count, _ in runs) <= MOST_SYMBOLS:
            raise QuantityError(
                problem=f"{value!r} is no pattern of prefixes",
                allowed=f"prefixes of 1 to {MOST_SYMBOLS} symbols",
                remedy="Write it like [160/2048, 6 x 144/2048].",
            )
        return cls(runs)

    @classmethod
    def json_schema(cls) -> dict[str, object]:
        """Return the JSON Schema of what :meth:`parse` reads."""
        length = quantity_pattern(("", *_SAMPLE_WORDS), sign="[+]?")
        length = length.removeprefix("^").removesuffix("$")
        run = rf"(?:\s*[0-9]+\s*x)?{length}"
        one: list[object] = [
            {"type": "number", "minimum": 0, "maximum": 1},
            {"type": "string", "pattern": f"^{run}(?:,{run})*$"},
        ]
        listed = {"type": "array", "items": {"anyOf": one}, "minItems": 1}
        return {"anyOf": [*one, listed], "examples": [["160/2048", "6 x 144/2048"]]}


def _runs_of(part: object) -> list[tuple[int, Stretch]]:
    if not isinstance(part, str):
        return [(1, Stretch.parse(part))]
    runs = []
    for item in part.split(","):
        count, times, length = item.partition("x")
        if not times:
            runs.append((1, Stretch.parse(item)))
        elif count.strip().isdecimal() and 1 <= int(count) <= MOST_SYMBOLS:
            runs.append((int(count), Stretch.parse(length)))
        else:
            raise QuantityError(
                problem=f"{item.strip()!r} does not say how many symbols",
                allowed=f"a count of 1 to {MOST_SYMBOLS}, then x, then the length",
                remedy="Write it like 6 x 144/2048.",
            )
    return runs


@dataclass(frozen=True, slots=True, kw_only=True)
class Layout:
    """One pattern of OFDM symbols in whole samples.

    Parameters
    ----------
    n_fft : int
        Useful samples of a symbol.
    prefixes : tuple of int
        Prefix of each symbol of the pattern, samples.
    edge : int
        Samples at the start of each prefix in which the symbol before fades out; no longer
        than the shortest prefix.
    """

    n_fft: int
    prefixes: tuple[int, ...]
    edge: int = 0

    @property
    def n_symbols(self) -> int:
        """Symbols in the pattern."""
        return len(self.prefixes)

    @property
    def n_samples(self) -> int:
        """Samples in the pattern."""
        return self.n_symbols * self.n_fft + sum(self.prefixes)

    @property
    def rising(self) -> NDArray[np.float64]:
        """Amplitude of the incoming symbol over the edge; the outgoing one has the rest.

        Returns
        -------
        float64 array, shape (edge,)
            Raised cosine, sampled between its ends: ``sin^2(pi (t + 1/2) / 2 edge)``.
        """
        t = np.arange(self.edge) + 0.5
        return 0.5 - 0.5 * np.cos(np.pi * t / max(self.edge, 1))


def fft_length(*, sample_rate_hz: Fraction, spacing_hz: Fraction, where: str) -> int:
    """Return sample rate over subcarrier spacing.

    Raises
    ------
    RecipeError
        Not an integer, or out of bounds.
    """
    ratio = sample_rate_hz / spacing_hz
    if ratio.denominator == 1 and 2 <= ratio <= LARGEST_FFT:
        return int(ratio)
    below = min(max(math.floor(ratio), 2), LARGEST_FFT)
    above = min(max(math.ceil(ratio), 2), LARGEST_FFT)
    rates = " or ".join(format_hz(n * spacing_hz) for n in dict.fromkeys((below, above)))
    raise RecipeError(
        where=where,
        problem=f"{format_hz(sample_rate_hz)} over {format_hz(spacing_hz)} is an FFT length of "
        f"{float(ratio):.10g}",
        allowed=f"whole FFT lengths from 2 to {LARGEST_FFT}",
        remedy=f"The nearest sample rates that fit are {rates}.",
    )


def lay_out(*, n_fft: int, prefix: CyclicPrefix, edge: Stretch, path: str) -> Layout:
    """Return the pattern in whole samples, as short as it repeats.

    Parameters
    ----------
    n_fft : int
        FFT length.
    prefix : CyclicPrefix
        As asked.
    edge : Stretch
        As asked.
    path : str
        Path of the settings in the recipe, for messages.

    Raises
    ------
    RecipeError
        A length is not a whole number of samples, a prefix is longer than the symbol, or the
        edge longer than the shortest prefix.
    """
    where = f"{path}.cyclic_prefix"
    lengths = [(count, _whole(part, n_fft, where)) for count, part in prefix.runs]
    prefixes = tuple(n for count, n in lengths for _ in range(count))
    if max(prefixes) > n_fft:
        raise RecipeError(
            where=where,
            problem=f"{max(prefixes)} samples are more than the useful symbol",
            allowed=f"up to the FFT length, {n_fft} samples",
            remedy="Shorten the prefix, or raise the sample rate.",
        )
    where = f"{path}.edge_window"
    n_edge = _whole(edge, n_fft, where)
    if n_edge > min(prefixes):
        raise RecipeError(
            where=where,
            problem=f"an edge of {n_edge} samples reaches beyond the prefix it lies in",
            allowed=f"up to the shortest prefix, {min(prefixes)} samples",
            remedy="Shorten the edge, or lengthen the prefix.",
        )
    return Layout(n_fft=n_fft, prefixes=_shortest(prefixes), edge=n_edge)


def _whole(part: Stretch, n_fft: int, where: str) -> int:
    exact = part.samples(n_fft)
    if exact.denominator == 1:
        return int(exact)
    below = math.floor(exact)
    raise RecipeError(
        where=where,
        problem=f"{part} of {n_fft} useful samples is {float(exact):.6g} samples",
        allowed=f"whole samples, here {below} samples or {below + 1} samples",
        remedy="Ask for one of these, or for a sample rate at which the FFT length is a "
        f"multiple of {part.value.denominator}.",
    )


def _shortest(pattern: tuple[int, ...]) -> tuple[int, ...]:
    """Return the shortest pattern whose repetition is the given one."""
    n = len(pattern)
    return next(
        pattern[:k] for k in range(1, n + 1) if n % k == 0 and pattern[:k] * (n // k) == pattern
    )
