"""JSON Schema of recipes, made from the settings classes: editors complete, explain and check.

It walks the type hints that :mod:`wavegen.recipe.checker` walks. What a recipe is judged by is the
checker; the schema refuses nothing that the checker takes, and takes some things that it refuses:
rules between fields, and notations of a class that does not describe them.
"""

from __future__ import annotations

import dataclasses
import inspect
import re
import types
from collections.abc import Callable, Mapping
from fractions import Fraction
from functools import cache
from math import inf
from typing import Annotated, Any, Literal, Union, get_args, get_origin

import annotated_types

from wavegen.core.registry import Member
from wavegen.core.units import DIMENSIONS, Dimension, dimension_of, quantity_pattern
from wavegen.files import FORMATS
from wavegen.files.datatypes import ALIGNMENTS, WORD_BITS
from wavegen.recipe.checker import fields_of
from wavegen.recipe.format_request import FormatRequest, RealOutput
from wavegen.recipe.names import LONGEST, NAME_FIELDS
from wavegen.recipe.settings import Duration, Extent, Recipe
from wavegen.recipe.tables import DEFAULT_KINDS, TABLES, Tables, members

DIALECT = "https://json-schema.org/draft/2020-12/schema"

Schema = dict[str, Any]

_ZERO = r"0+(?:\.0+)?(?:[^0-9.]|$)"
_HEADING = re.compile(r"^[A-Z][A-Za-z ]*\n-+$", re.MULTILINE)


def recipe_schema(tables: Tables = TABLES) -> Schema:
    """Return the JSON Schema (draft 2020-12) of a recipe.

    Parameters
    ----------
    tables : mapping
        Where ``kind:`` is looked up.

    Returns
    -------
    dict
        JSON values. It speaks of a recipe as a reader of YAML 1.2 hands it on: quantities are
        text with a unit, and bare numbers are numbers.

    Notes
    -----
    A class with a notation of its own may describe it in a class method ``json_schema()``, which
    returns JSON values; one without is let pass, with its docstring as the description.
    """
    walk = _Walk(tables)
    top = walk.settings(Recipe)
    return {"$schema": DIALECT, "title": "Recipe of a stimulus", **top, "$defs": walk.made()}


def quantity_schema(dimension: Dimension, marks: tuple[Any, ...] = ()) -> Schema:
    """Return the schema of a number with its unit, as text.

    Parameters
    ----------
    dimension : Dimension
        Which units.
    marks : tuple
        Bounds of the field: its sign is part of the pattern, so far as they fix it.

    Examples
    --------
    >>> found = quantity_schema(DIMENSIONS["_ppm"])
    >>> bool(re.search(found["pattern"], "-20 ppm")), bool(re.search(found["pattern"], "20"))
    (True, False)
    """
    return {
        "type": "string",
        "pattern": quantity_pattern(dimension.units, sign=_sign(marks)),
        "examples": [dimension.example],
    }


def _sign(marks: tuple[Any, ...]) -> str:
    """Return the pattern of what may stand before the digits, as far as bounds fix the sign."""
    bounds = _bounds(marks)
    above, below = bounds.get("exclusiveMinimum"), bounds.get("exclusiveMaximum")
    low = max(bounds.get("minimum", -inf), -inf if above is None else above)
    high = min(bounds.get("maximum", inf), inf if below is None else below)
    is_nonzero = 0 in {above, below} or low > 0 or high < 0
    guard = rf"(?![+-]?{_ZERO})" if is_nonzero else ""
    if low >= 0:
        return rf"{guard}(?:[+]?|-(?={_ZERO}))"
    if high <= 0:
        return rf"{guard}(?:-|[+]?(?={_ZERO}))"
    return f"{guard}[+-]?"


def _bounds(marks: tuple[Any, ...]) -> dict[str, int | float]:
    """Return bounds by their words in JSON Schema."""
    found = {
        word: getattr(mark, name)
        for mark in marks
        for kind, name, word in _BOUNDS
        if isinstance(mark, kind)
    }
    return {
        word: bound if isinstance(bound, int) else float(bound) for word, bound in found.items()
    }


def _lengths(marks: tuple[Any, ...], noun: str) -> Schema:
    """Return bounds of a length by their words in JSON Schema; ``noun`` is Items or Length."""
    return {
        word + noun: getattr(mark, name)
        for mark in marks
        for kind, name, word in _LENGTHS
        if isinstance(mark, kind)
    }


_RATIO: Schema = {"type": "string", "pattern": quantity_pattern([""])}
"""A number written as text: ``13/48``."""

_BOUNDS: tuple[tuple[type, str, str], ...] = (
    (annotated_types.Gt, "gt", "exclusiveMinimum"),
    (annotated_types.Ge, "ge", "minimum"),
    (annotated_types.Lt, "lt", "exclusiveMaximum"),
    (annotated_types.Le, "le", "maximum"),
)
_LENGTHS: tuple[tuple[type, str, str], ...] = (
    (annotated_types.MinLen, "min_length", "min"),
    (annotated_types.MaxLen, "max_length", "max"),
)


def _marks_of(hint: Any) -> tuple[Any, ...]:
    marks: list[Any] = []
    for mark in get_args(hint)[1:]:
        if isinstance(mark, annotated_types.GroupedMetadata):
            marks.extend(mark)
        else:
            marks.append(mark)
    return tuple(marks)


class _Walk:
    """One walk over the settings; classes and tables are described once, and referred to."""

    def __init__(self, tables: Tables) -> None:
        self.tables = tables
        self.defs: dict[str, Schema] = {}
        self.names: dict[Any, str] = {}

    def made(self) -> dict[str, Schema]:
        return dict(sorted(self.defs.items()))

    def refer(self, key: Any, name: str, make: Callable[[], Schema]) -> Schema:
        """Return a reference to a definition; it is made at its first use."""
        if key not in self.names:
            free = name
            while free in self.defs:
                free += "_"
            self.names[key] = free
            self.defs[free] = {}  # what refers to itself finds its name taken
            self.defs[free] = make()
        return {"$ref": f"#/$defs/{self.names[key]}"}

    # Mappings -----------------------------------------------------------------------------

    def settings(self, settings: Any, kind: str | None = None, *, is_usual: bool = False) -> Schema:
        """Describe a settings class; ``kind`` is its name in a table, if it stands in one."""
        words = _descriptions(settings)
        properties: dict[str, Schema] = {}
        required: list[str] = []
        if kind is not None:
            properties["kind"] = {"const": kind}
            required += [] if is_usual else ["kind"]
        for key, (item, hint) in fields_of(settings).items():
            made = self.value(hint, item.name, dimension_of(item.name))
            about = words.get(item.name, "")
            properties[key] = {"description": about, **made} if about else made
            if item.default is item.default_factory is dataclasses.MISSING:
                required.append(key)
        return {
            "description": _summary(settings),
            "type": "object",
            "properties": properties,
            "required": required,
            "additionalProperties": False,
        }

    def member(self, member: Member) -> Schema:
        """Refer to one member of some tables, chosen by ``kind:`` or by its bare name."""
        usual = member.default or DEFAULT_KINDS.get(member.tables[0])
        name = "_or_".join(member.tables) + (f"_else_{member.default}" if member.default else "")

        def make() -> Schema:
            known = members(self.tables, member.tables)
            loaded: dict[str, Any] = {kind: table.load(kind) for kind, table in known.items()}
            bare = [kind for kind, made in loaded.items() if not _requires(made)]
            arms = [self.kind(made, kind, is_usual=kind == usual) for kind, made in loaded.items()]
            names: list[Schema] = []
            if bare:
                names = [{"description": "A kind by its name alone.", "enum": bare}]
            return {"oneOf": arms + names}

        return self.refer(member, name, make)

    def kind(self, settings: Any, kind: str, *, is_usual: bool) -> Schema:
        """Refer to a member of a table; the usual one may leave out its kind."""
        name = f"kind.{kind}" + (".usual" if is_usual else "")
        return self.refer(
            (settings, kind, is_usual),
            name,
            lambda: self.settings(settings, kind, is_usual=is_usual),
        )

    # Values -------------------------------------------------------------------------------

    def value(  # noqa: PLR0911 # one return a kind of hint
        self, hint: Any, field: str, dimension: Dimension | None, marks: tuple[Any, ...] = ()
    ) -> Schema:
        """Describe one value of a type hint."""
        origin = get_origin(hint)
        if origin is Annotated:
            marks = _marks_of(hint)
            chosen = next((mark for mark in marks if isinstance(mark, Member)), None)
            if chosen is not None:
                return self.member(chosen)
            return self.value(get_args(hint)[0], field, dimension, marks)
        if origin in {Union, types.UnionType}:
            arms = get_args(hint)
            return {"anyOf": [self.value(arm, field, dimension, marks) for arm in arms]}
        if hint is type(None):
            return {"type": "null"}
        if origin is Literal:
            return {"enum": list(get_args(hint))}
        if origin is tuple:
            return self.items(get_args(hint), field, dimension, marks)
        if hasattr(hint, "parse"):
            return self.refer(hint, hint.__name__, lambda: _notation(hint))
        if dataclasses.is_dataclass(hint) and isinstance(hint, type):
            return self.refer(hint, hint.__name__, lambda: self.settings(hint))
        return _scalar(hint, field, dimension, marks)

    def items(
        self,
        hints: tuple[Any, ...],
        field: str,
        dimension: Dimension | None,
        marks: tuple[Any, ...],
    ) -> Schema:
        if len(hints) == 2 and hints[1] is Ellipsis:
            one = self.value(hints[0], field, dimension)
            return {"type": "array", "items": one, **_lengths(marks, "Items")}
        return {
            "type": "array",
            "prefixItems": [self.value(hint, field, dimension) for hint in hints],
            "minItems": len(hints),
            "maxItems": len(hints),
        }


def _scalar(hint: Any, field: str, dimension: Dimension | None, marks: tuple[Any, ...]) -> Schema:
    if hint is bool:
        return {"type": "boolean"}
    if hint is str:
        return _text(field, marks)
    if hint in {int, float, Fraction}:
        if dimension is not None and dimension.base:
            return quantity_schema(dimension, marks)
        bounds = _bounds(marks)
        if hint is int:
            return {"type": "integer", **bounds}
        return {"anyOf": [{"type": "number", **bounds}, _RATIO]}
    return {}


def _text(field: str, marks: tuple[Any, ...]) -> Schema:
    lengths = _lengths(marks, "Length")
    if field in NAME_FIELDS:
        return {"type": "string", "pattern": r"^[^/\\\n\t]+$", "maxLength": LONGEST, **lengths}
    if field == "title":
        return {"type": "string", "pattern": r"^[^\n\t]*$", "maxLength": LONGEST}
    return {"type": "string", **lengths}


def _notation(kind: Any) -> Schema:
    """Describe a class that reads its own notation: as it says itself, else by its docstring."""
    described = _OWN.get(kind) or getattr(kind, "json_schema", None)
    if described is not None:
        return {"description": _summary(kind), **described()}
    about = " ".join(part for part in (_summary(kind), _summary(kind.parse)) if part)
    example = getattr(kind, "example", None)
    shown: Schema = {"examples": [example]} if isinstance(example, str) else {}
    return {"description": about, **shown}


def _extent() -> Schema:
    units = [word for suffix in ("_s", "_symbols", "_samples") for word in DIMENSIONS[suffix].units]
    return {
        "type": "string",
        "pattern": quantity_pattern(units, sign=rf"(?![+]?{_ZERO})[+]?"),
        "examples": ["10 ms", "140 symbols", "12288 samples"],
    }


def _duration() -> Schema:
    keys = [item.name for item in dataclasses.fields(Duration)]
    properties = {
        key: {"description": _descriptions(Duration).get(key, ""), **_extent()} for key in keys
    }
    mapping = {
        "type": "object",
        "properties": properties,
        "required": ["at"],
        "additionalProperties": False,
    }
    return {"anyOf": [_extent(), mapping]}


def _format_request() -> Schema:
    words = _descriptions(FormatRequest)
    properties: Schema = {
        item.name: {"description": words.get(item.name, "")}
        for item in dataclasses.fields(FormatRequest)
    }
    properties["format"] |= {"enum": list(FORMATS)}
    properties["name"] |= {"anyOf": [_text("name", ()), {"type": "null"}]}
    properties["bits"] |= {"enum": [*WORD_BITS, None]}
    properties["align"] |= {"enum": [*ALIGNMENTS, None]}
    centre = {
        "description": _descriptions(RealOutput)["centre_hz"],
        **quantity_schema(DIMENSIONS["_hz"], (annotated_types.Gt(0),)),
    }
    frequency = {
        "type": "object",
        "properties": {"centre": centre},
        "required": ["centre"],
        "additionalProperties": False,
    }
    properties["real"] |= {"anyOf": [frequency, {"type": "null"}]}
    mapping = {
        "type": "object",
        "properties": properties,
        "required": ["format"],
        "additionalProperties": False,
        "allOf": [
            {
                "if": {"properties": {"format": {"const": name}}},
                "then": {
                    "properties": {"datatype": {"enum": [*FORMATS.load(name).datatypes, None]}}
                },
            }
            for name in FORMATS
        ],
    }
    return {"anyOf": [{"enum": list(FORMATS)}, mapping]}


_OWN: Mapping[Any, Callable[[], Schema]] = {
    Extent: _extent,
    Duration: _duration,
    FormatRequest: _format_request,
}
"""Notations of this room."""


def _requires(settings: Any) -> bool:
    return any(
        item.default is item.default_factory is dataclasses.MISSING
        for item, _ in fields_of(settings).values()
    )


# Docstrings -------------------------------------------------------------------------------


def _summary(described: Any) -> str:
    """Return the first paragraph of a docstring on one line."""
    text = inspect.getdoc(described) or ""
    return _one_line(text.partition("\n\n")[0])


@cache
def _descriptions(settings: Any) -> Mapping[str, str]:
    """Return what the docstring of a class says about each field, on one line."""
    text = inspect.getdoc(settings) or ""
    section = text.partition("Parameters\n----------\n")[2]
    section = _HEADING.split(section, maxsplit=1)[0]
    found: dict[str, str] = {}
    names: list[str] = []
    for line in section.splitlines():
        if line and not line.startswith(" "):
            names = [name.strip() for name in line.partition(" : ")[0].split(",")]
            found |= dict.fromkeys(names, "")
        elif line.strip():
            for name in names:
                found[name] += f" {line.strip()}"
    return {name: _one_line(about) for name, about in found.items()}


def _one_line(text: str) -> str:
    text = re.sub(r":[a-z]+:`[~.]?([^`]*)`", r"\1", text)
    return " ".join(text.replace("``", "").split())
