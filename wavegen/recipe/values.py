"""One scalar to one value of a type, and the words for what a type wants."""

from __future__ import annotations

from fractions import Fraction
from typing import Annotated, Any, Literal, get_args, get_origin

from wavegen.core.registry import Member
from wavegen.core.units import Dimension, QuantityError, parse_quantity, split_quantity
from wavegen.recipe import scalars
from wavegen.recipe.names import NAME_FIELDS, check_name, check_text, check_title
from wavegen.recipe.scalars import kind_of, shown
from wavegen.recipe.tables import TABLES, Tables, members
from wavegen.recipe.tree import Items, Node, Place, Scalar

NUMBERS = (Fraction, float, int)


def read_text(node: Scalar, field: str) -> str:
    """Return text; what YAML reads as a number or truth is refused, names are checked as such.

    Raises
    ------
    QuantityError
        No text, or characters that it may not hold.
    """
    kind = kind_of(node)
    if kind != "text":
        raise QuantityError(
            problem=f"{shown(node.text)} is read as {_KINDS[kind]} where text is needed",
            allowed="text",
            remedy=f'Put it in quotes: "{node.text[:40]}".',
        )
    if field in NAME_FIELDS:
        check_name(node.text)
    elif field == "title":
        check_title(node.text)
    else:
        check_text(node.text)
    return node.text


_KINDS = {
    "null": "nothing",
    "bool": "true or false",
    "int": "a number",
    "float": "a number",
    "text": "text",
}


def read_number(
    node: Scalar, hint: type[Any], dimension: Dimension | None
) -> Fraction | float | int:
    """Return a number of the type asked for, exact where that is Fraction or int.

    Parameters
    ----------
    node : Scalar
        Its text.
    hint : type
        Fraction, float or int.
    dimension : Dimension, optional
        Units to accept; none for a bare number or ratio.

    Raises
    ------
    QuantityError
        No number, a unit missing or out of place, quotes, or not whole where int is asked.
    """
    kind = kind_of(node)
    example = dimension.example if dimension else _EXAMPLES.get(hint, "0.22")
    if kind == "bool":
        raise QuantityError(
            problem=f"{node.text} is true or false, not a number",
            allowed=wanted(hint, dimension),
            remedy=f"Write it like {example}.",
        )
    scalars.refuse_odd_number(node.text)
    if dimension is not None:
        value = parse_quantity(node.text, dimension)
    else:
        value, unit = split_quantity(node.text)
        if unit:
            raise QuantityError(
                problem=f"{shown(node.text)} has the unit {unit!r}",
                allowed="a number without a unit",
                remedy=f"Remove the unit: write {node.text.removesuffix(unit).strip()}.",
            )
    if not node.is_plain and _is_decimal(node.text):
        raise QuantityError(
            problem=f"{shown(node.text)} is text in quotes where a number is needed",
            allowed=wanted(hint, dimension),
            remedy="Remove the quotes.",
        )
    if hint is int:
        if value.denominator != 1:
            raise QuantityError(
                problem=f"{shown(node.text)} is not whole",
                allowed="whole numbers",
                remedy=f"Write {round(value)}, if that is meant.",
            )
        return int(value)
    return value if hint is Fraction else float(value)


_EXAMPLES: dict[Any, str] = {int: "12", float: "0.22", Fraction: "13/48", bool: "true"}


def _is_decimal(text: str) -> bool:
    return kind_of(Scalar(text, True, Place(1, 1))) in {"int", "float"}  # noqa: FBT003 # a record


def describe_node(node: Node) -> str:
    """Return what a node is, for a message."""
    if isinstance(node, Scalar):
        return shown(node.text) if node.text else "nothing"
    return f"a list of {len(node.nodes)}" if isinstance(node, Items) else "a mapping"


def wanted(hint: Any, dimension: Dimension | None) -> str:
    """Return what a type takes, for a message."""
    if get_origin(hint) is Annotated:
        return wanted(get_args(hint)[0], dimension)
    if get_origin(hint) is Literal:
        return ", ".join(str(choice) for choice in get_args(hint))
    if get_origin(hint) is tuple:
        return "a list"
    if hint in NUMBERS and dimension is not None and dimension.base:
        return f"a number with a unit, such as {dimension.example}"
    return {
        int: "a whole number",
        float: "a number",
        Fraction: "a number or a ratio",
        bool: "true or false",
        str: "text",
    }.get(hint, "a value")


def example_of(hint: Any, dimension: Dimension | None, tables: Tables = TABLES) -> str:
    """Return a value that a type takes, as a recipe writes it."""
    if get_origin(hint) is Annotated:
        base, *marks = get_args(hint)
        chosen = next((mark for mark in marks if isinstance(mark, Member)), None)
        if chosen is not None:
            return f"{{kind: {next(iter(members(tables, chosen.tables)), '...')}}}"
        return example_of(base, dimension, tables)
    if hint in NUMBERS and dimension is not None:
        return dimension.example
    if get_origin(hint) is Literal:
        return str(get_args(hint)[0])
    if get_origin(hint) is tuple:
        return f"[{example_of(get_args(hint)[0], dimension, tables)}]"
    shown_by_class = getattr(hint, "example", None)  # classes with a notation may show it
    return shown_by_class if isinstance(shown_by_class, str) else _EXAMPLES.get(hint, "...")
