"""Values with units, read exactly: decimal text and ratios become fractions.

The unit list is closed and case-strict: ``3.84 MHz`` is read, ``3.84 mHz`` is refused with the
look-alike named. ``inf`` and ``nan`` are no numbers here.
"""

from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import dataclass
from fractions import Fraction

from wavegen.core.registry import nearest

_NUMBER = r"[+-]?[0-9]+(?:\.[0-9]+)?(?:[eE][+-]?[0-9]{1,2})?"
_QUANTITY = re.compile(rf"({_NUMBER})(?:/([0-9]+(?:\.[0-9]+)?))?(?:\s*([^\s0-9./][^\s0-9]*))?")

_LONGEST = 64
"""Characters of a number with its unit: no figure needs more, and huge ones cost time."""

_PREFIXES = {
    "G": 9,
    "M": 6,
    "k": 3,
    "m": -3,
    "u": -6,
    "\u00b5": -6,
    "\u03bc": -6,
    "n": -9,
    "p": -12,
}
"""Decimal prefixes; micro is written u, the micro sign or the Greek letter."""


class QuantityError(ValueError):
    """A value that is not what its field needs; the place is added by whoever knows it.

    Parameters
    ----------
    problem, allowed, remedy : str
        As in :class:`wavegen.core.errors.WavegenError`.
    key : str
        Where inside the value, as a recipe path: ``roll_off`` or ``[2]``; empty for all of it.
    """

    def __init__(self, *, problem: str, allowed: str, remedy: str, key: str = "") -> None:
        self.key = key
        self.problem = problem
        self.allowed = allowed
        self.remedy = remedy
        super().__init__(f"{problem}; allowed: {allowed}. {remedy}")


@dataclass(frozen=True, slots=True)
class Dimension:
    """A field suffix and the units that may stand for it.

    Parameters
    ----------
    suffix : str
        End of the field's name in code, such as ``_hz``.
    base : str
        The unit in which the number is kept.
    units : mapping of str to Fraction
        Accepted unit words and their size in the base unit.
    example : str
        A value that is read.
    """

    suffix: str
    base: str
    units: dict[str, Fraction]
    example: str


def _powers(unit: str, prefixes: str) -> dict[str, Fraction]:
    return {unit: Fraction(1)} | {p + unit: Fraction(10) ** _PREFIXES[p] for p in prefixes}


DIMENSIONS: dict[str, Dimension] = {
    item.suffix: item
    for item in (
        Dimension("_hz", "Hz", _powers("Hz", "kMG"), "3.84 MHz"),
        Dimension("_s", "s", _powers("s", "mu\u00b5\u03bcnp"), "10 ms"),
        Dimension("_db", "dB", {"dB": Fraction(1)}, "-3 dB"),
        Dimension("_dbm", "dBm", {"dBm": Fraction(1)}, "-10 dBm"),
        Dimension("_dbfs", "dBFS", {"dBFS": Fraction(1)}, "-1 dBFS"),
        Dimension("_deg", "deg", {"deg": Fraction(1), "°": Fraction(1)}, "45 deg"),
        Dimension("_percent", "%", {"%": Fraction(1)}, "5 %"),
        Dimension("_ppm", "ppm", {"ppm": Fraction(1)}, "20 ppm"),
        Dimension("_j", "J", _powers("J", "mu\u00b5\u03bcnp"), "2 uJ"),
        Dimension("_ohm", "ohm", {"ohm": Fraction(1), "Ω": Fraction(1)}, "50 ohm"),
        Dimension(
            "_samples", "samples", {"samples": Fraction(1), "sample": Fraction(1)}, "16 samples"
        ),
        Dimension(
            "_symbols", "symbols", {"symbols": Fraction(1), "symbol": Fraction(1)}, "64 symbols"
        ),
        Dimension("_fraction", "", {"": Fraction(1)}, "144/2048"),
    )
}
"""The closed list of units, by the suffix of the field that takes them."""


def dimension_of(field: str) -> Dimension | None:
    """Return the dimension that a field's suffix names, or None.

    Examples
    --------
    >>> dimension_of("symbol_rate_hz").example
    '3.84 MHz'
    """
    suffix = "_" + field.rpartition("_")[2] if "_" in field else ""
    return DIMENSIONS.get(suffix)


def key_of(field: str) -> str:
    """Return the recipe key of a field: its name without the unit suffix.

    Examples
    --------
    >>> key_of("symbol_rate_hz"), key_of("roll_off"), key_of("span_symbols")
    ('symbol_rate', 'roll_off', 'span')
    """
    found = dimension_of(field)
    return field.removesuffix(found.suffix) if found else field


def split_quantity(text: str) -> tuple[Fraction, str]:
    """Split text into an exact number and its unit word.

    Parameters
    ----------
    text : str
        Decimal number or ratio, then a unit or nothing: ``1625/6 kHz``, ``-3 dB``, ``0.25``.

    Returns
    -------
    number : Fraction
    unit : str
        Empty if none.

    Raises
    ------
    QuantityError
        Not of that form, a zero denominator, or ``inf`` or ``nan``.

    Examples
    --------
    >>> split_quantity("1625/6 kHz")
    (Fraction(1625, 6), 'kHz')
    """
    if len(text) > _LONGEST:
        raise QuantityError(
            problem=f"{text[:20]!r}... is {len(text)} characters long",
            allowed=f"numbers of up to {_LONGEST} characters",
            remedy="Write fewer digits.",
        )
    found = _QUANTITY.fullmatch(text.strip())
    if found is None:
        raise QuantityError(
            problem=f"{text!r} is not a number with a unit",
            allowed="a decimal number or a ratio of two, then a unit",
            remedy="Write it like 3.84 MHz or 1625/6 kHz.",
        )
    number, divisor, unit = found.groups()
    value = Fraction(number)
    if divisor is not None:
        below = Fraction(divisor)
        if not below:
            raise QuantityError(
                problem=f"{text!r} divides by zero",
                allowed="ratios with a denominator above zero",
                remedy="Correct the denominator.",
            )
        value /= below
    return value, unit or ""


def parse_quantity(text: str, dimension: Dimension) -> Fraction:
    """Read a value of one dimension exactly, in its base unit.

    Parameters
    ----------
    text : str
        Number and unit.
    dimension : Dimension
        What is wanted.

    Returns
    -------
    Fraction
        In ``dimension.base``.

    Raises
    ------
    QuantityError
        No number, no unit, or a unit of another dimension; look-alikes are named.

    Examples
    --------
    >>> parse_quantity("1625/6 kHz", DIMENSIONS["_hz"])
    Fraction(812500, 3)
    """
    number, unit = split_quantity(text)
    if unit in dimension.units:
        return number * dimension.units[unit]
    if not dimension.base:
        raise QuantityError(
            problem=f"{text!r} has the unit {unit!r}",
            allowed="a number or a ratio without a unit",
            remedy=f"Write it like {dimension.example}.",
        )
    allowed = ", ".join(dimension.units)
    if not unit:
        raise QuantityError(
            problem=f"{text!r} has no unit",
            allowed=f"a number with one of: {allowed}",
            remedy=f"Write {text.strip()} {dimension.base} if that is meant, "
            f"or as in {dimension.example}.",
        )
    guess = _look_alike(unit, dimension)
    raise QuantityError(
        problem=f"{text!r} has the unknown unit {unit!r}",
        allowed=f"one of: {allowed}",
        remedy=f"Did you mean {guess}?" if guess else f"Write it like {dimension.example}.",
    )


def quantity_pattern(units: Iterable[str], *, sign: str = "[+-]?") -> str:
    """Return a regular expression of the text that is read as a number with one of some units.

    Parameters
    ----------
    units : iterable of str
        Unit words; the empty one stands for none.
    sign : str
        Regular expression of what may stand before the digits.

    Returns
    -------
    str
        Anchored at both ends, in the syntax that Python and ECMA 262 share, for JSON Schema.

    Examples
    --------
    >>> found = re.compile(quantity_pattern(["Hz", "kHz"]))
    >>> bool(found.search("1625/6 kHz")), bool(found.search("1625/6"))
    (True, False)
    """
    words = "|".join(map(re.escape, units))
    digits = r"[0-9]+(?:\.[0-9]+)?"
    exponent = "(?:[eE][+-]?[0-9]{1,2})?"
    return rf"^\s*{sign}{digits}{exponent}(?:/{digits})?\s*(?:{words})\s*$"


def _look_alike(unit: str, dimension: Dimension) -> str | None:
    folded = {word.casefold(): word for word in dimension.units}
    return folded.get(unit.casefold()) or nearest(unit, list(dimension.units))


def format_hz(value: Fraction | float, *, digits: int = 10) -> str:
    """Write a frequency as the trade does; a measured one to as many digits as it is worth.

    Examples
    --------
    >>> format_hz(3840000), format_hz(-1500), format_hz(0), format_hz(15377885.3, digits=4)
    ('3.84 MHz', '-1.5 kHz', '0 Hz', '15.38 MHz')
    """
    return _scaled(value, digits, "Hz", ((1e9, "G"), (1e6, "M"), (1e3, "k"), (1.0, "")))


def format_s(value: Fraction | float, *, digits: int = 10) -> str:
    """Write a duration as the trade does; a measured one to as many digits as it is worth.

    Examples
    --------
    >>> format_s(0.01), format_s(2.5e-6), format_s(0.002537792969, digits=4)
    ('10 ms', '2.5 µs', '2.538 ms')
    """
    return _scaled(value, digits, "s", ((1.0, ""), (1e-3, "m"), (1e-6, "µ"), (1e-9, "n")))


def _scaled(
    exact: Fraction | float, digits: int, unit: str, scales: tuple[tuple[float, str], ...]
) -> str:
    value = float(f"{float(exact):.{digits}g}")
    size = abs(value)
    for factor, prefix in scales:
        if size >= factor:
            return f"{value / factor:.10g} {prefix}{unit}"
    return f"{value:.10g} {unit}"
