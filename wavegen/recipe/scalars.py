"""What YAML 1.2 makes of a plain scalar, and which habits of older YAML it does not."""

from __future__ import annotations

import math
import re
from typing import Literal

from wavegen.core.units import QuantityError
from wavegen.recipe.tree import Items, Node, Scalar

Kind = Literal["null", "bool", "int", "float", "text"]

_NULL = frozenset({"", "~", "null", "Null", "NULL"})
_TRUE = frozenset({"true", "True", "TRUE"})
_FALSE = frozenset({"false", "False", "FALSE"})
_OLD_BOOL = {
    word: meaning
    for meaning, words in (("true", ("yes", "on", "y")), ("false", ("no", "off", "n")))
    for word in words
}
_INT = re.compile(r"[-+]?[0-9]+|0o[0-7]+|0x[0-9a-fA-F]+")
_FLOAT = re.compile(
    r"[-+]?(?:\.[0-9]+|[0-9]+(?:\.[0-9]*)?)(?:[eE][-+]?[0-9]+)?"
    r"|[-+]?\.(?:inf|Inf|INF)|\.(?:nan|NaN|NAN)"
)
_LONGEST = 64


def kind_of(node: Scalar) -> Kind:
    """Return what a scalar is under the core schema of YAML 1.2 (section 10.3.2)."""
    text = node.text
    if not node.is_plain:
        return "text"
    if text in _NULL:
        return "null"
    if text in _TRUE or text in _FALSE:
        return "bool"
    if _INT.fullmatch(text):
        return "int"
    return "float" if _FLOAT.fullmatch(text) else "text"


def is_null(node: Node) -> bool:
    """Return whether a node is null: written as such, or nothing after the colon."""
    return isinstance(node, Scalar) and kind_of(node) == "null"


def boolean(node: Scalar) -> bool:
    """Read true or false.

    Raises
    ------
    QuantityError
        Anything else; ``yes``, ``no``, ``on`` and ``off`` are text in YAML 1.2.
    """
    if kind_of(node) == "bool":
        return node.text in _TRUE
    meaning = _OLD_BOOL.get(node.text.casefold())
    raise QuantityError(
        problem=f"{shown(node.text)} is neither true nor false",
        allowed="true or false",
        remedy=f"Write {meaning}." if meaning else "Write true or false, without quotes.",
    )


def refuse_odd_number(text: str) -> None:
    """Refuse number notations that readers of YAML disagree on.

    Raises
    ------
    QuantityError
        Octal, hexadecimal, sexagesimal, underscores, a leading zero, a bare decimal point,
        infinity and not-a-number.
    """
    for pattern, problem, remedy in _ODD:
        if pattern.fullmatch(text):
            raise QuantityError(
                problem=f"{shown(text)} {problem}",
                allowed="decimal numbers such as 12, 0.22 or 1e6",
                remedy=remedy,
            )


_ODD = tuple(
    (re.compile(pattern), problem, remedy)
    for pattern, problem, remedy in (
        (
            r"[-+]?0[oO]?[0-9]+",
            "may be read as octal",
            "Write it in decimal, no leading zero; in quotes if digits are meant.",
        ),
        (
            r"[-+]?0[xXbB][0-9a-fA-F]*",
            "is not decimal",
            "Write it in decimal, or in quotes if text is meant.",
        ),
        (r"[-+]?[0-9]+(?::[0-9.]+)+", "is a time of day to some", "Write one decimal number."),
        (r"[-+]?[0-9]+(?:[_,'][0-9]+)+(?:\.[0-9]+)?", "groups its digits", "Leave them ungrouped."),
        (r"[-+]?\.[0-9]+(?:[eE].*)?", "starts with the point", "Write a 0 before the point."),
        (r"[-+]?[0-9]+\.(?:[eE].*)?", "ends with the point", "Leave the point out."),
        (
            r"[-+]?\.?(?:[iI][nN][fF](?:inity)?|[nN][aA][nN])",
            "is no finite number",
            "Write a finite number.",
        ),
    )
)


def plain(node: Node) -> object:
    """Return a node as Python values, for classes that read a notation of their own.

    Parameters
    ----------
    node : Node
        Any part of a recipe.

    Returns
    -------
    object
        None, bool, int, float (finite), str, list or dict of these. What YAML calls text stays
        text: ``160/2048`` and ``6 x 144/2048`` arrive as they are written.

    Raises
    ------
    QuantityError
        A number that is not finite or not decimal.
    """
    if isinstance(node, Items):
        return [plain(item) for item in node.nodes]
    if not isinstance(node, Scalar):
        return {entry.key: plain(entry.node) for entry in node.entries}
    kind = kind_of(node)
    if kind == "text":
        return node.text
    if kind in {"null", "bool"}:
        return None if kind == "null" else node.text in _TRUE
    return _plain_number(node.text, kind)


def _plain_number(text: str, kind: Kind) -> int | float:
    refuse_odd_number(text)
    if len(text) > _LONGEST:
        raise QuantityError(
            problem=f"{shown(text)} is {len(text)} characters long",
            allowed=f"numbers of up to {_LONGEST} characters",
            remedy="Write fewer digits.",
        )
    number = int(text) if kind == "int" else float(text)
    if not math.isfinite(number):
        raise QuantityError(
            problem=f"{shown(text)} is too large",
            allowed="numbers up to 1e99",
            remedy="Correct the exponent.",
        )
    return number


def shown(text: str) -> str:
    """Return text in quotes, cut where long, for a message."""
    return repr(text) if len(text) <= 60 else repr(text[:57]) + "..."
