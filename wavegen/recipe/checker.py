"""The walk from a tree of text to settings, by the type hints of the settings classes.

Every fault is collected; a settings object is made only where its whole mapping is sound.
"""

from __future__ import annotations

import dataclasses
import types
from collections.abc import Callable, Iterator
from functools import cache
from typing import Annotated, Any, Final, Literal, Union, get_args, get_origin, get_type_hints

from wavegen.core.errors import RecipeError
from wavegen.core.registry import Member, nearest
from wavegen.core.units import (
    Dimension,
    QuantityError,
    dimension_of,
    key_of,
)
from wavegen.recipe import scalars
from wavegen.recipe.bounds import bounds_broken
from wavegen.recipe.names import check_text
from wavegen.recipe.scalars import kind_of, shown
from wavegen.recipe.tables import DEFAULT_KINDS, TABLES, Tables, members
from wavegen.recipe.tree import Fault, Items, Node, Place, Scalar, Table
from wavegen.recipe.values import (
    NUMBERS,
    describe_node,
    example_of,
    read_number,
    read_text,
    wanted,
)


class _Faulty:
    """Stands for a value that could not be made; its fault is recorded."""


_FAULTY: Final = _Faulty()


def check(
    node: Node, settings: type[Any], *, tables: Tables = TABLES, path: str = ""
) -> tuple[Any, list[Fault]]:
    """Make settings from a node.

    Parameters
    ----------
    node : Node
        The mapping.
    settings : type
        A settings dataclass.
    tables : mapping
        Where ``kind:`` is looked up.
    path : str
        Recipe path of the node.

    Returns
    -------
    settings : object or None
        None if there are faults.
    faults : list of Fault
        In the order found.
    """
    walk = _Walk(tables)
    made = walk.settings(node, settings, path)
    return (None if walk.faults else made), walk.faults


def fields_of(settings: Any) -> dict[str, tuple[dataclasses.Field[Any], Any]]:
    """Return the fields of a settings class by recipe key, each with its resolved hint."""
    return _fields(settings)


@cache
def _fields(settings: Any) -> dict[str, tuple[dataclasses.Field[Any], Any]]:
    hints = get_type_hints(settings, include_extras=True)
    return {
        key_of(item.name): (item, hints[item.name])
        for item in dataclasses.fields(settings)
        if item.init
    }


class _Walk:
    def __init__(self, tables: Tables) -> None:
        self.tables = tables
        self.faults: list[Fault] = []

    def fault(self, place: Place, path: str, *, problem: str, allowed: str, remedy: str) -> _Faulty:
        self.faults.append(Fault(place, path, problem, allowed, remedy))
        return _FAULTY

    def told(self, node: Node, path: str, error: QuantityError) -> _Faulty:
        """Record what a parser said, at the part of the value that it named."""
        place = _below(node, error.key).place if error.key else node.place
        return self.fault(
            place,
            join(path, error.key),
            problem=error.problem,
            allowed=error.allowed,
            remedy=error.remedy,
        )

    # Mappings -----------------------------------------------------------------------------

    def settings(
        self, node: Node, settings: type[Any], path: str, kinds: tuple[str, ...] = ()
    ) -> Any:
        """Make settings; ``kinds`` is ("kind",) where the mapping may also hold that key."""
        fields = fields_of(settings)
        if not isinstance(node, Table):
            return self.fault(
                node.place,
                path or "the recipe",
                problem=f"{describe_node(node)} where a mapping is needed",
                allowed="a mapping with the keys: " + ", ".join(fields),
                remedy=f"Write keys and values, such as {next(iter(fields), 'key')}: ...",
            )
        before = len(self.faults)
        values = {}
        for entry in node.entries:
            if entry.key in kinds:
                continue
            if entry.key not in fields:
                self.unknown(entry.key, entry.place, path, settings)
                continue
            item, hint = fields[entry.key]
            values[item.name] = self.value(
                entry.node, hint, join(path, entry.key), dimension_of(item.name)
            )
        self.missing(node, fields, path)
        if len(self.faults) > before:
            return _FAULTY
        try:
            return settings(**values)
        except QuantityError as error:
            return self.told(node, path, error)
        except RecipeError as error:
            inner = error.where.removeprefix(path).removeprefix(".")
            return self.fault(
                _below(node, inner).place,
                join(path, inner),
                problem=error.problem,
                allowed=error.allowed,
                remedy=error.remedy,
            )

    def unknown(self, key: str, place: Place, path: str, settings: type[Any]) -> None:
        fields = fields_of(settings)
        by_field = {item.name: known for known, (item, _) in fields.items()}
        guess = by_field.get(key) or nearest(key, list(fields))
        self.fault(
            place,
            join(path, key),
            problem=f"unknown key {shown(key)}",
            allowed="the keys " + ", ".join(fields) if fields else "no keys",
            remedy=f"Did you mean {guess}?" if guess else "Remove it, or correct its name.",
        )

    def missing(
        self, node: Table, fields: dict[str, tuple[dataclasses.Field[Any], Any]], path: str
    ) -> None:
        given = {entry.key for entry in node.entries}
        for key, (item, hint) in fields.items():
            if key in given or not _is_required(item):
                continue
            example = example_of(hint, dimension_of(item.name), self.tables)
            self.fault(
                node.place,
                join(path, key),
                problem=f"the key {key} is missing",
                allowed="the required keys "
                + ", ".join(k for k, (other, _) in fields.items() if _is_required(other)),
                remedy=f"Add {key}: {example}",
            )

    def member(self, node: Node, member: Member, path: str) -> Any:
        """Make one member of a table, from a mapping with ``kind:`` or a bare name."""
        known = members(self.tables, member.tables)
        called = " or ".join(member.tables)
        if isinstance(node, Items):
            return self.fault(
                node.place,
                path,
                problem=f"a list where one {called} is needed",
                allowed="a mapping with kind: " + ", ".join(known),
                remedy="Write one mapping with a kind.",
            )
        chosen: Node | None = node
        if isinstance(node, Table):
            chosen = node.get("kind")
            usual = member.default or DEFAULT_KINDS.get(member.tables[0])
            if chosen is None and usual in known:
                return self.settings(node, known[usual].load(usual), path)
        if chosen is None or scalars.is_null(chosen):
            return self.fault(
                node.place if chosen is None else chosen.place,
                join(path, "kind") if isinstance(node, Table) else path,
                problem="the key kind is missing"
                if isinstance(node, Table)
                else f"no {called} is given",
                allowed="kind: " + ", ".join(known),
                remedy=f"Add kind: {next(iter(known))}, or another of these.",
            )
        where = join(path, "kind") if isinstance(node, Table) else path
        if not isinstance(chosen, Scalar) or chosen.text not in known:
            name = chosen.text if isinstance(chosen, Scalar) else ""
            guess = nearest(name, known)
            return self.fault(
                chosen.place,
                where,
                problem=f"unknown {called} {shown(name)}"
                if isinstance(chosen, Scalar)
                else f"{describe_node(chosen)} where the name of a {called} is needed",
                allowed=", ".join(known),
                remedy=f"Did you mean {guess}?" if guess else "Choose one of these.",
            )
        made = known[chosen.text].load(chosen.text)
        if isinstance(node, Scalar):
            node = Table((), node.place)
        return self.settings(node, made, path, ("kind",))

    # Values -------------------------------------------------------------------------------

    def value(  # noqa: PLR0911 # one return a kind of hint
        self, node: Node, hint: Any, path: str, dimension: Dimension | None
    ) -> Any:
        """Make one value of a type hint."""
        origin = get_origin(hint)
        if origin is Annotated:
            base, *marks = get_args(hint)
            chosen = next((mark for mark in marks if isinstance(mark, Member)), None)
            if chosen is not None:
                return self.member(node, chosen, path)
            made = self.value(node, base, path, dimension)
            return self.bounded(node, made, hint, path, dimension)
        if origin in {Union, types.UnionType}:
            return self.union(node, get_args(hint), path, dimension)
        if scalars.is_null(node) and not _takes_null(hint):
            return self.fault(
                node.place,
                path,
                problem="there is no value",
                allowed=wanted(hint, dimension),
                remedy=f"Write {example_of(hint, dimension)}, or remove the key.",
            )
        if origin is Literal:
            return self.literal(node, get_args(hint), path)
        if origin is tuple or hint is tuple:
            return self.items(node, get_args(hint), path, dimension)
        parse = getattr(hint, "parse", None)
        if parse is not None:
            return self.parsed(node, parse, path)
        if dataclasses.is_dataclass(hint) and isinstance(hint, type):
            return self.settings(node, hint, path)
        return self.scalar(node, hint, path, dimension)

    def union(
        self, node: Node, arms: tuple[Any, ...], path: str, dimension: Dimension | None
    ) -> Any:
        """Make the first arm that takes the node; complain as the first one does."""
        if type(None) in arms and scalars.is_null(node):
            return None
        first: list[Fault] = []
        before = len(self.faults)
        for arm in arms:
            if arm is type(None):
                continue
            made = self.value(node, arm, path, dimension)
            if len(self.faults) == before:
                return made
            first = first or self.faults[before:]
            del self.faults[before:]
        self.faults.extend(first)
        return _FAULTY

    def literal(self, node: Node, choices: tuple[Any, ...], path: str) -> Any:
        if isinstance(node, Scalar):
            is_number = kind_of(node) in {"int", "float"}
            for choice in choices:
                if str(choice) == node.text and isinstance(choice, int) <= is_number:
                    return choice
        names = [str(choice) for choice in choices]
        guess = nearest(node.text, names) if isinstance(node, Scalar) else None
        is_quoted = isinstance(node, Scalar) and guess == node.text
        quotes = "Remove the quotes." if is_quoted else None
        return self.fault(
            node.place,
            path,
            problem=f"{describe_node(node)} is none of the choices",
            allowed=", ".join(names),
            remedy=quotes or (f"Did you mean {guess}?" if guess else f"Write {names[0]}."),
        )

    def items(
        self, node: Node, hints: tuple[Any, ...], path: str, dimension: Dimension | None
    ) -> Any:
        """Make a tuple from a list; ``tuple[X, ...]`` of any length, ``tuple[X, Y]`` of two."""
        is_open = len(hints) == 2 and hints[1] is Ellipsis
        if not isinstance(node, Items) or (not is_open and len(node.nodes) != len(hints)):
            count = "" if is_open else f" of {len(hints)}"
            return self.fault(
                node.place,
                path,
                problem=f"{describe_node(node)} where a list{count} is needed",
                allowed=f"a list{count}: {wanted(hints[0], dimension)}",
                remedy=f"Write it in brackets, like [{example_of(hints[0], dimension)}].",
            )
        inner = [hints[0]] * len(node.nodes) if is_open else list(hints)
        made = tuple(
            self.value(item, hint, f"{path}[{index}]", dimension)
            for index, (item, hint) in enumerate(zip(node.nodes, inner, strict=True))
        )
        return _FAULTY if any(item is _FAULTY for item in made) else made

    def parsed(self, node: Node, parse: Callable[[object], Any], path: str) -> Any:
        """Let a class read its own notation."""
        for part in _scalars(node):
            if kind_of(part) == "text":
                try:
                    check_text(part.text)
                except QuantityError as error:
                    return self.told(part, path, error)
        try:
            return parse(scalars.plain(node))
        except QuantityError as error:
            return self.told(node, path, error)

    def scalar(self, node: Node, hint: Any, path: str, dimension: Dimension | None) -> Any:
        if not isinstance(node, Scalar):
            return self.fault(
                node.place,
                path,
                problem=f"{describe_node(node)} where one value is needed",
                allowed=wanted(hint, dimension),
                remedy=f"Write {example_of(hint, dimension)}.",
            )
        try:
            if hint is bool:
                return scalars.boolean(node)
            if hint is str:
                return read_text(node, path.rpartition(".")[2])
            if hint in NUMBERS:
                return read_number(node, hint, dimension)
            if hint is Any or hint is object:
                return scalars.plain(node)
        except QuantityError as error:
            return self.told(node, path, error)
        message = f"{path}: settings of type {hint!r} have no place in a recipe"
        raise TypeError(message)

    def bounded(
        self, node: Node, made: Any, hint: Any, path: str, dimension: Dimension | None
    ) -> Any:
        """Check the bounds of an annotation through pydantic."""
        if made is _FAULTY or made is None:
            return made
        allowed = bounds_broken(made, hint, dimension.base if dimension else "")
        if allowed is not None:
            given = node.text if isinstance(node, Scalar) else describe_node(node)
            return self.fault(
                node.place,
                path,
                problem=f"{given} is out of bounds",
                allowed=allowed,
                remedy="Choose a value within these bounds.",
            )
        return made


def _takes_null(hint: Any) -> bool:
    return hint in {Any, object, type(None)}


def _is_required(item: dataclasses.Field[Any]) -> bool:
    return item.default is dataclasses.MISSING and item.default_factory is dataclasses.MISSING


def _scalars(node: Node) -> Iterator[Scalar]:
    if isinstance(node, Scalar):
        yield node
    elif isinstance(node, Items):
        for item in node.nodes:
            yield from _scalars(item)
    else:
        for entry in node.entries:
            yield Scalar(entry.key, False, entry.place)  # noqa: FBT003 # a record
            yield from _scalars(entry.node)


# Paths ------------------------------------------------------------------------------------


def join(path: str, key: str) -> str:
    """Return the path of a key below a path.

    Examples
    --------
    >>> join("signal", "kind"), join("", "seed"), join("stages", "[0]")
    ('signal.kind', 'seed', 'stages[0]')
    """
    if not path or not key:
        return path or key
    return path + key if key.startswith("[") else f"{path}.{key}"


def _below(node: Node, path: str) -> Node:
    """Return the deepest node that a path below a node reaches."""
    for step in path.replace("[", ".[").split("."):
        if isinstance(node, Table):
            node = node.get(step) or node
        elif isinstance(node, Items) and step[1:-1].isdigit() and int(step[1:-1]) < len(node.nodes):
            node = node.nodes[int(step[1:-1])]
    return node
