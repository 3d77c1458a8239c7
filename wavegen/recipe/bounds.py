"""Bounds of settings fields, checked through pydantic and put in words."""

from __future__ import annotations

from fractions import Fraction
from functools import cache
from typing import Annotated, Any, get_args

import annotated_types
from pydantic import ConfigDict, TypeAdapter, ValidationError


def bounds_broken(made: Any, hint: Any, unit: str) -> str | None:
    """Return what a field allows, if a value lies outside.

    Parameters
    ----------
    made : object
        The value, of the field's type.
    hint : Annotated
        The field's annotation.
    unit : str
        Base unit of the field; may be empty.

    Returns
    -------
    str or None
        Such as ``at least 0 and at most 1``; None where the value is within.
    """
    marks = _bounds(hint)
    if not marks:
        return None
    kind: Any = type(made)
    try:
        _adapter(kind, marks).validate_python(made)
    except ValidationError:
        unit = f" {unit}" if unit else ""
        known = " and ".join(filter(None, (_bound(mark, unit) for mark in marks)))
        return known or "values within the bounds of this key"
    return None


@cache
def _bounds(hint: Any) -> tuple[Any, ...]:
    marks: list[Any] = []
    for mark in get_args(hint)[1:]:
        if isinstance(mark, annotated_types.GroupedMetadata):
            marks.extend(mark)
        elif isinstance(mark, annotated_types.BaseMetadata):
            marks.append(mark)
    return tuple(marks)


@cache
def _adapter(kind: Any, bounds: tuple[Any, ...]) -> TypeAdapter[Any]:
    hint: Any = Annotated[(kind, *bounds)]
    if kind not in {int, float, Fraction, str, bool, tuple}:
        return TypeAdapter(hint, config=ConfigDict(arbitrary_types_allowed=True, strict=True))
    return TypeAdapter(hint, config=ConfigDict(strict=kind is not Fraction))


_WORDS = (
    (annotated_types.Gt, "gt", "above"),
    (annotated_types.Ge, "ge", "at least"),
    (annotated_types.Lt, "lt", "below"),
    (annotated_types.Le, "le", "at most"),
    (annotated_types.MultipleOf, "multiple_of", "a multiple of"),
    (annotated_types.MinLen, "min_length", "a length of at least"),
    (annotated_types.MaxLen, "max_length", "a length of at most"),
)


def _bound(mark: object, unit: str) -> str | None:
    for kind, name, word in _WORDS:
        if isinstance(mark, kind):
            return f"{word} {getattr(mark, name)}{'' if 'length' in name else unit}"
    return None
