"""``--set path=value``: a piece of YAML put into the tree before it is checked."""

from __future__ import annotations

import re
from dataclasses import replace

from wavegen.core.registry import nearest
from wavegen.recipe.checker import join
from wavegen.recipe.reader import read_tree
from wavegen.recipe.scalars import is_null, shown
from wavegen.recipe.tree import (
    Entry,
    Fault,
    FaultError,
    Items,
    Node,
    Place,
    Scalar,
    Table,
)

_PATH = re.compile(r"[^.\[\]\s=]+(?:\[[0-9]{1,6}\])*(?:\.[^.\[\]\s=]+(?:\[[0-9]{1,6}\])*)*")
_STEP = re.compile(r"[^.\[\]]+|\[[0-9]+\]")


def apply_override(root: Node, override: str, order: int) -> tuple[Node, list[Fault]]:
    """Return the tree with one value set.

    Parameters
    ----------
    root : Node
        The recipe; it is left as it is.
    override : str
        ``path=value``: ``seed=3``, ``signal.symbol_rate=1 MHz``, ``stages[0].ceiling=7 dB``. The
        value is a YAML scalar or flow collection. A mapping that is not there yet is made; one
        item may be added to the end of a list.
    order : int
        Counts the overrides, so that faults come in their order.

    Returns
    -------
    tree : Node
        Sharing what is unchanged.
    faults : list of Fault
        Duplicate keys in the value.

    Raises
    ------
    FaultError
        No such form, no YAML, or a path that leads nowhere.
    """
    path, equals, text = override.partition("=")
    path = path.strip()
    if not equals or not _PATH.fullmatch(path):
        raise FaultError(
            Fault(
                Place(1, 1, path[:60] or "(nothing)"),
                "",
                f"{shown(override)} is not of the form path=value",
                "a recipe path, =, and a value",
                "Write it like signal.symbol_rate='1 MHz' or stages[0].ceiling='7 dB'.",
            )
        )
    place = Place(order, 1, path)
    value, faults = (
        read_tree(text, override=path) if text.strip() else (Scalar("", True, place), [])  # noqa: FBT003 # a record
    )
    return _put(root, _STEP.findall(path), value, "", place), faults


def _put(node: Node | None, steps: list[str], value: Node, path: str, place: Place) -> Node:
    if not steps:
        return value
    step, rest = steps[0], steps[1:]
    here = join(path, step)
    if node is None or (is_null(node) and path):
        node = Items((), place) if step.startswith("[") else Table((), place)
    if isinstance(node, Table) and not step.startswith("["):
        made = _put(node.get(step), rest, value, here, place)
        if node.get(step) is None:
            return replace(node, entries=(*node.entries, Entry(step, place, made)))
        entries = (
            Entry(step, place if not rest else entry.place, made) if entry.key == step else entry
            for entry in node.entries
        )
        return replace(node, entries=tuple(entries))
    if isinstance(node, Items) and step.startswith("["):
        index = int(step[1:-1])
        if index <= len(node.nodes):
            old = node.nodes[index] if index < len(node.nodes) else None
            made = _put(old, rest, value, here, place)
            return replace(node, nodes=(*node.nodes[:index], made, *node.nodes[index + 1 :]))
    raise FaultError(_nowhere(node, step, path, place))


def _nowhere(node: Node, step: str, path: str, place: Place) -> Fault:
    name = path or "the recipe"
    if isinstance(node, Items):
        count = len(node.nodes)
        return Fault(
            place,
            "",
            f"{name} is a list of {count}; there is no {step}",
            f"{path}[0] to {path}[{count}], the last of which adds one",
            f"Write {path}[{max(count - 1, 0)}].",
        )
    if isinstance(node, Table):
        keys = [entry.key for entry in node.entries]
        guess = nearest(step.strip("[]"), keys) or (keys[0] if keys else "key")
        return Fault(
            place,
            "",
            f"{name} is a mapping; there is no {step}",
            "the keys " + ", ".join(keys),
            f"Write {join(path, guess)}.",
        )
    return Fault(
        place,
        "",
        f"{name} is the value {shown(node.text)}; there is no {step} in it",
        f"{path} as a whole",
        f"Set all of it, like {path}='{{kind: {node.text[:40]}, {step.strip('[]')}: ...}}'.",
    )
