"""Exact numbers to the text that reads back to them."""

from __future__ import annotations

from fractions import Fraction

from wavegen.core.units import Dimension, parse_quantity, split_quantity


def write_number(value: Fraction | float) -> str:
    """Return a number without a unit as text that is read back exactly.

    Parameters
    ----------
    value : Fraction, float or int
        Finite.

    Returns
    -------
    str
        A decimal number where one is exact, else a ratio.

    Raises
    ------
    ValueError
        It needs more characters or another exponent than a recipe takes.

    Examples
    --------
    >>> write_number(Fraction(812500, 3)), write_number(Fraction(1, 8)), write_number(0.1)
    ('812500/3', '0.125', '0.1')
    """
    text = repr(value).removesuffix(".0") if isinstance(value, float) else _number(value)
    if split_quantity(text)[0] != _meant(value):
        message = f"{value!r} has no exact text"
        raise ValueError(message)
    return text


def write_quantity(value: Fraction | float, dimension: Dimension) -> str:
    """Return a value with its unit as text that is read back exactly.

    Parameters
    ----------
    value : Fraction, float or int
        In the dimension's base unit; finite.
    dimension : Dimension
        Chooses the unit: the shortest text wins.

    Returns
    -------
    str

    Raises
    ------
    ValueError
        It needs more characters or another exponent than a recipe takes.

    Examples
    --------
    >>> from wavegen.core.units import DIMENSIONS
    >>> write_quantity(Fraction(812500, 3), DIMENSIONS["_hz"])
    '1625/6 kHz'
    >>> write_quantity(Fraction(1, 100), DIMENSIONS["_s"])
    '10 ms'
    """
    meant = _meant(value)
    if not dimension.base:
        return write_number(value)
    texts = []
    for word, size in dimension.units.items():
        if not word.isascii() and len(dimension.units) > 2:
            continue  # micro signs: u says it on every keyboard
        number = meant / size
        texts.append((_cost(number), f"{_number(number)} {word}"))
    text = min(texts)[1]
    if not meant or dimension.suffix in {"_samples", "_symbols"}:
        text = f"{_number(meant)} {dimension.base}"
    if parse_quantity(text, dimension) != meant:
        message = f"{value!r} {dimension.base} has no exact text"
        raise ValueError(message)
    return text


def _meant(value: Fraction | float) -> Fraction:
    """Return the decimal that a float stands for: the shortest that rounds to it."""
    return value if isinstance(value, Fraction) else Fraction(repr(value))


def _cost(number: Fraction) -> tuple[int, int]:
    text = _number(number)
    return (2 * ("/" in text) + (number != 0 and abs(number) < 1), len(text))


def _number(value: Fraction | float) -> str:
    exact = _meant(value)
    below = exact.denominator
    twos = fives = 0
    while below % 2 == 0:
        below //= 2
        twos += 1
    while below % 5 == 0:
        below //= 5
        fives += 1
    if below != 1:
        return f"{exact.numerator}/{exact.denominator}"
    places = max(twos, fives)
    digits = str(abs(exact.numerator) * 10**places // exact.denominator)
    sign = "-" if exact < 0 else ""
    stripped = digits.rstrip("0") or "0"
    exponent = len(digits) - len(stripped) - places
    if places == 0 and len(digits) <= 24:
        return sign + digits
    if places and places <= 24:
        padded = digits.rjust(places + 1, "0")
        return f"{sign}{padded[:-places]}.{padded[-places:]}"
    return f"{sign}{stripped}e{exponent}"
