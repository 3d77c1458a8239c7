"""Settings to the YAML that loads back to equal settings."""

from __future__ import annotations

import dataclasses
import re
from collections.abc import Iterator
from fractions import Fraction
from typing import Annotated, Any, get_args, get_origin

from wavegen.core.errors import RecipeError
from wavegen.core.registry import Member
from wavegen.core.units import Dimension, dimension_of
from wavegen.recipe.checker import fields_of, join
from wavegen.recipe.exact import write_number, write_quantity
from wavegen.recipe.scalars import kind_of
from wavegen.recipe.tables import TABLES, Tables, kind_of_class
from wavegen.recipe.tree import Place, Scalar

_ALWAYS = frozenset({"wavegen", "seed", "output"})
"""Keys that are written even where they hold their default: a reader looks for them."""

_SAFE = re.compile(
    r"[A-Za-z][A-Za-z0-9_.]*(?: [A-Za-z0-9_.]+)*"  # words
    r"|-?[0-9]+(?:\.[0-9]+)?(?:e[-+]?[0-9]+)?(?:/[0-9]+)?(?: [A-Za-z%]+)?"  # quantities
)


_WIDEST = 72
"""Characters of a mapping that is written on one line."""


class _Number(str):
    """Text of a number, written without quotes."""

    __slots__ = ()


def dump(settings: Any, *, tables: Tables = TABLES) -> str:
    """Write settings as YAML.

    Parameters
    ----------
    settings : settings dataclass
        A :class:`wavegen.recipe.settings.Recipe`, or any settings by themselves.
    tables : mapping
        Where the ``kind:`` of members is looked up.

    Returns
    -------
    str
        Exact values with their units; keys that hold their default are left out, but for
        ``wavegen``, ``seed`` and ``output``.

    Raises
    ------
    RecipeError
        A value that no recipe can hold.
    """
    return "".join(f"{line}\n" for line in _block(_settings(settings, tables, ""), ""))


def stage_text(stage: Any, *, tables: Tables = TABLES) -> str:
    """Write a stage as a flow mapping on one line: ``{kind: clip, ceiling: 7 dB}``.

    Parameters
    ----------
    stage : settings dataclass
        A member of the table of stages.
    tables : mapping
        Where its ``kind:`` is looked up.

    Returns
    -------
    str

    Raises
    ------
    RecipeError
        A value that no recipe can hold.
    """
    kind = kind_of_class(tables, ("stage",), type(stage))
    return _flow({"kind": kind, **_settings(stage, tables, "stage")})


def _settings(settings: Any, tables: Tables, path: str) -> dict[str, object]:
    written: dict[str, object] = {}
    for key, (item, hint) in fields_of(type(settings)).items():
        value = getattr(settings, item.name)
        dimension = dimension_of(item.name)
        made = _value(value, hint, dimension, tables, join(path, key))
        if not path and key in _ALWAYS:
            written[key] = made
            continue
        default = _default(item)
        if default is dataclasses.MISSING or (
            made != _value(default, hint, dimension, tables, join(path, key))
        ):
            written[key] = made
    return written


def _default(item: dataclasses.Field[Any]) -> Any:
    if item.default_factory is not dataclasses.MISSING:
        return item.default_factory()
    return item.default


def _value(  # noqa: PLR0911 # one return a kind of value
    value: Any, hint: Any, dimension: Dimension | None, tables: Tables, path: str
) -> object:
    if value is None or isinstance(value, bool):
        return value
    if isinstance(value, str):
        return str(value)
    if isinstance(value, int | float | Fraction):
        try:
            number = write_quantity(value, dimension) if dimension else write_number(value)
        except ValueError as error:
            raise _no_text(path, error) from error
        return _Number(number)
    if isinstance(value, tuple):
        return [
            _value(item, _inner(hint, index), dimension, tables, f"{path}[{index}]")
            for index, item in enumerate(value)
        ]
    if callable(getattr(type(value), "text", None)):  # a field of that name is no method
        made: object = value.text()
        return made
    if hasattr(type(value), "parse") and "__str__" in vars(type(value)):
        return str(value)
    if not dataclasses.is_dataclass(value) or hasattr(type(value), "parse"):
        message = f"{path}: {type(value).__name__} has no text for a recipe"
        raise TypeError(message)
    written = _settings(value, tables, path)
    member = _member(hint)
    if member is None:
        return written
    kind = kind_of_class(tables, member.tables, type(value))
    if kind is None:
        message = f"{path}: {type(value).__name__} is in none of the tables {member.tables}"
        raise TypeError(message)
    return {"kind": kind, **written}


def _no_text(path: str, error: ValueError) -> RecipeError:
    return RecipeError(
        where=path,
        problem=str(error),
        allowed="numbers of up to 64 characters",
        remedy="Round the value.",
    )


def _inner(hint: Any, index: int) -> Any:
    """Return the hint of a tuple's item, through Annotated and unions."""
    origin = get_origin(hint)
    args = get_args(hint)
    if origin is tuple:
        return args[0] if args[-1] is Ellipsis else args[index]
    if origin is Annotated:
        return _inner(args[0], index)
    return next((made for made in (_inner(arm, index) for arm in args) if made is not None), None)


def _member(hint: Any) -> Member | None:
    """Return the table mark of a hint, through unions."""
    if get_origin(hint) is Annotated:
        return next((mark for mark in get_args(hint)[1:] if isinstance(mark, Member)), None)
    if get_origin(hint) is tuple:
        return None
    return next((mark for mark in map(_member, get_args(hint)) if mark is not None), None)


# YAML -------------------------------------------------------------------------------------


def _block(value: dict[str, object], indent: str) -> Iterator[str]:
    """Write a mapping: what holds only scalars on one line, the rest as blocks."""
    for key, item in value.items():
        start = f"{indent}{_scalar(key)}:"
        if isinstance(item, dict) and item and not _is_short(item):
            yield start
            yield from _block(item, indent + "  ")
        elif isinstance(item, list) and any(isinstance(one, dict) for one in item):
            yield start
            for one in item:
                if isinstance(one, dict) and one and not _is_short(one):
                    first, *rest = _block(one, indent + "    ")
                    yield f"{indent}  - {first.strip()}"
                    yield from rest
                else:
                    yield f"{indent}  - {_flow(one)}"
        else:
            yield f"{start} {_flow(item)}"


def _is_short(value: dict[str, object]) -> bool:
    flat = not any(isinstance(item, dict | list) for item in value.values())
    return flat and len(_flow(value)) <= _WIDEST


def _flow(value: object) -> str:
    if isinstance(value, dict):
        pairs = (f"{_scalar(key)}: {_flow(item)}" for key, item in value.items())
        return "{" + ", ".join(pairs) + "}"
    if isinstance(value, list | tuple):
        return "[" + ", ".join(map(_flow, value)) + "]"
    return _scalar(value)


def _scalar(value: object) -> str:
    if value is None:
        return "null"
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, _Number):
        return str(value)
    if isinstance(value, str):
        is_text = kind_of(Scalar(value, True, Place(1, 1))) == "text"  # noqa: FBT003 # a record
        return value if is_text and _SAFE.fullmatch(value) else _quoted(value)
    if isinstance(value, int | float | Fraction):
        return write_number(value)
    message = f"{type(value).__name__} is nothing that YAML holds"
    raise TypeError(message)


def _quoted(text: str) -> str:
    """Write text in double quotes; whatever is not plainly printable as an escape."""
    return '"' + "".join(map(_escaped, text)) + '"'


def _escaped(character: str) -> str:
    if character in '"\\':
        return "\\" + character
    if character.isprintable():
        return character
    return f"\\U{ord(character):08X}"
