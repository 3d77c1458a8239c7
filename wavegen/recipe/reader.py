"""YAML to a tree of text; nothing is interpreted yet.

Events are read one at a time, so that every guard acts before anything large is built: nesting,
what aliases expand to, tags, merge keys, several documents.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field, replace
from typing import Any

from ruamel.yaml import YAML
from ruamel.yaml.error import MarkedYAMLError, YAMLError

from wavegen.recipe.tree import Entry, Fault, FaultError, Items, Node, Place, Scalar, Table

DEEPEST = 40
"""Levels of nesting; the shipped recipes use eight."""

MOST_NODES = 20_000
"""Values in a recipe once its aliases are written out."""


@dataclass(slots=True)
class _Open:
    """A collection being filled."""

    is_table: bool
    place: Place
    anchor: str | None
    nodes: list[Node] = field(default_factory=list)
    entries: dict[str, Entry] = field(default_factory=dict)
    key: Scalar | None = None
    size: int = 1
    height: int = 1


@dataclass(slots=True)
class _Anchored:
    node: Node
    size: int
    height: int


class _Reader:
    def __init__(self, override: str) -> None:
        self.override = override
        self.faults: list[Fault] = []
        self.stack: list[_Open] = []
        self.anchors: dict[str, _Anchored] = {}
        self.root: Node | None = None
        self.n_nodes = 0

    def place(self, mark: Any) -> Place:
        return Place(mark.line + 1, mark.column + 1, self.override)

    def stop(self, place: Place, problem: str, allowed: str, remedy: str) -> FaultError:
        return FaultError(Fault(place, "", problem, allowed, remedy))

    def count(self, size: int, place: Place) -> None:
        self.n_nodes += size
        if self.n_nodes > MOST_NODES:
            raise self.stop(
                place,
                f"the recipe holds more than {MOST_NODES} values once its aliases are written out",
                f"up to {MOST_NODES} values",
                "Use fewer aliases or shorter lists.",
            )

    def deepen(self, height: int, place: Place) -> None:
        if len(self.stack) + height > DEEPEST:
            raise self.stop(
                place,
                f"nested more than {DEEPEST} levels deep",
                f"up to {DEEPEST} levels",
                "Close a bracket, or flatten the recipe.",
            )

    def read(self, event: Any) -> None:
        kind = type(event).__name__
        if kind == "DocumentStartEvent":
            self.document(event)
            return
        if kind in {"StreamStartEvent", "StreamEndEvent", "DocumentEndEvent"}:
            return
        if kind in {"MappingEndEvent", "SequenceEndEvent"}:
            self.close()
            return
        place = self.place(event.start_mark)
        if kind == "AliasEvent":
            self.alias(event.anchor, place)
            return
        if event.tag is not None:
            raise self.stop(
                place,
                f"the tag {str(event.tag)!r}",
                "plain values, lists and mappings without tags",
                "Remove the tag (the word after the exclamation mark).",
            )
        if kind == "ScalarEvent":
            self.count(1, place)
            is_plain = event.implicit[0]
            if is_plain and not event.value and self.stack and self.stack[-1].key is not None:
                place = self.stack[-1].key.place  # nothing stands nowhere: its key says more
            node = Scalar(event.value, is_plain, place)
            if event.anchor is not None:
                self.anchors[event.anchor] = _Anchored(node, 1, 0)
            self.add(node, 1, 0)
            return
        self.open(event, place, is_table=kind == "MappingStartEvent")

    def document(self, event: Any) -> None:
        place = self.place(event.start_mark)
        if event.version is not None and tuple(event.version) != (1, 2):
            raise self.stop(
                place,
                "a directive asks for another version of YAML",
                "YAML 1.2",
                "Remove the line that starts with %YAML.",
            )
        if self.root is not None:
            raise self.stop(
                place,
                "a second document starts here",
                "one recipe a file",
                "Remove the line --- or split the file.",
            )

    def alias(self, name: str, place: Place) -> None:
        found = self.anchors.get(name)
        if found is None:
            inside = any(held.anchor == name for held in self.stack)
            raise self.stop(
                place,
                f"the alias *{name} stands inside what it names"
                if inside
                else f"the alias *{name} names nothing above it",
                "aliases of a whole value that ended above",
                f"Write the value out, or mark it with &{name} before it is used.",
            )
        self.count(found.size, place)
        self.deepen(found.height, place)
        self.add(found.node, found.size, found.height)

    def open(self, event: Any, place: Place, *, is_table: bool) -> None:
        self.deepen(1, place)
        self.count(1, place)
        parent = self.stack[-1] if self.stack else None
        if parent is not None and parent.is_table and parent.key is None:
            raise self.stop(
                place, "a list or mapping as a key", "keys of plain text", "Name the key in text."
            )
        if parent is not None and parent.key is not None and not event.flow_style:
            place = parent.key.place  # a block starts a line below: its key says more
        self.anchors.pop(event.anchor, None)
        self.stack.append(_Open(is_table, place, event.anchor))

    def close(self) -> None:
        done = self.stack.pop()
        node: Node = (
            Table(tuple(done.entries.values()), done.place)
            if done.is_table
            else Items(tuple(done.nodes), done.place)
        )
        if done.anchor is not None:
            self.anchors[done.anchor] = _Anchored(node, done.size, done.height)
        self.add(node, done.size, done.height)

    def add(self, node: Node, size: int, height: int) -> None:
        if not self.stack:
            self.root = node
            return
        parent = self.stack[-1]
        parent.size += size
        parent.height = max(parent.height, height + 1)
        if not parent.is_table:
            parent.nodes.append(node)
        elif parent.key is None:
            parent.key = self.key(node)
        else:
            self.entry(parent, parent.key, node)
            parent.key = None

    def key(self, node: Node) -> Scalar:
        if not isinstance(node, Scalar):
            raise self.stop(
                node.place,
                "a list or mapping as a key",
                "keys of plain text",
                "Name the key in text.",
            )
        if node.text == "<<" and node.is_plain:
            raise self.stop(
                node.place,
                "a merge key <<",
                "keys written out; an alias may stand for a whole value",
                "Write the merged keys out here.",
            )
        return node

    def entry(self, parent: _Open, key: Scalar, node: Node) -> None:
        first = parent.entries.get(key.text)
        if first is None:
            parent.entries[key.text] = Entry(key.text, key.place, node)
            return
        self.faults.append(
            Fault(
                key.place,
                "",
                f"the key {key.text[:40]!r} is given twice, first on line {first.place.line}",
                "each key once in a mapping",
                "Remove one of the two.",
            )
        )


def read_tree(text: str, *, override: str = "") -> tuple[Node, list[Fault]]:
    """Read YAML text to a tree.

    Parameters
    ----------
    text : str
        One YAML 1.2 document.
    override : str
        Path of the ``--set`` that the text belongs to; empty for a file.

    Returns
    -------
    tree : Node
        Values as text with places; an alias is the very node it names.
    faults : list of Fault
        Duplicate keys (the first of them is kept).

    Raises
    ------
    FaultError
        No YAML, nothing in it, or refused: tags, merge keys, several documents, too deep,
        too large once written out.
    """
    reader = _Reader(override)
    for event in _events(text, override):
        reader.read(event)
    if reader.root is None:
        raise FaultError(
            Fault(
                Place(1, 1, override),
                "",
                "there is nothing in it",
                "a mapping with the keys of a recipe",
                "Start it with the line wavegen: 1.",
            )
        )
    return reader.root, reader.faults


def _events(text: str, override: str) -> Iterator[Any]:
    """Yield YAML events; whatever the parser says becomes a fault with its place."""
    last = Place(1, 1, override)
    try:
        for event in YAML(typ="safe", pure=True).parse(text):
            mark = event.start_mark
            last = Place(mark.line + 1, mark.column + 1, override)
            yield event
    except MarkedYAMLError as error:
        mark = error.problem_mark or error.context_mark
        if "quoted scalar" in str(error.context) and "end of stream" in str(error.problem):
            mark = error.context_mark  # where the quotes open
        place = replace(last, line=mark.line + 1, column=mark.column + 1) if mark else last
        fault = _not_yaml(place, error.problem or "it cannot be read")
        if error.context_mark is not None and "while parsing a flow" in str(error.context):
            line = error.context_mark.line + 1
            fault = replace(fault, remedy=f"Close the bracket that opens on line {line}.")
        raise FaultError(fault) from error
    except (
        YAMLError,
        ValueError,
        ArithmeticError,
        LookupError,
        TypeError,
        AttributeError,
    ) as error:
        # besides its own errors the parser fails on its own account at damaged escapes
        offset = getattr(error, "position", None)
        place = _place_at(text, offset, override) if isinstance(offset, int) else last
        raise FaultError(_not_yaml(place, _first_line(error))) from error


def _place_at(text: str, offset: int, override: str) -> Place:
    before = text[:offset]
    return Place(before.count("\n") + 1, offset - (before.rfind("\n") + 1) + 1, override)


def _first_line(error: Exception) -> str:
    return (str(error).strip() or "it cannot be read").splitlines()[0]


def _not_yaml(place: Place, reason: str) -> Fault:
    remedy = "Correct the text at this place; look at the line above too."
    if "\\t" in reason:
        remedy = "Indent with spaces, not tabs."
    elif "mapping values are not allowed" in reason:
        remedy = "Put text with a colon in quotes, or start a new line for the key."
    return Fault(place, "", f"no YAML: {reason}", "one YAML 1.2 document", remedy)
