"""A recipe's text with some values changed: comments, order and spelling of the rest are kept."""

from __future__ import annotations

import io
import re
from collections.abc import Sequence
from typing import Any

from ruamel.yaml import YAML
from ruamel.yaml.comments import CommentedMap, CommentedSeq

from wavegen.recipe.dump import stage_text

WIDEST = 1 << 16
"""Characters of a line: none is broken."""
_DASH = re.compile(
    r"^( *)[^\s#-][^#\n]*:[ \t]*(?:#[^\n]*)?\n(?:[ \t]*(?:#[^\n]*)?\n)*( *)- ", re.MULTILINE
)
"""A key and the first item of the list under it, blank and comment lines between."""
_STEP = re.compile(r"[^.\[\]]+|\[[0-9]+\]")


def rewrite(text: str, overrides: Sequence[str]) -> str:
    r"""Return the text of a recipe with values set in it.

    Parameters
    ----------
    text : str
        YAML of a recipe that loads with these overrides.
    overrides : sequence of str
        ``path=value`` each, in order, as ``--set`` takes them.

    Returns
    -------
    str
        Comments, blank lines, order and quotes are kept, and so is everything that is not set.
        What is replaced as a whole loses the comments inside it.

    Examples
    --------
    >>> print(rewrite("seed: 3  # of the week\ntitle: x\n", ["seed=4"]), end="")
    seed: 4  # of the week
    title: x
    """
    yaml = _yaml(text)
    document = yaml.load(text)
    for override in overrides:
        path, _, value = override.partition("=")
        _put(document, _STEP.findall(path.strip()), _yaml("").load(value))
    return _written(yaml, document)


def insert_stage(text: str, index: int, stage: Any) -> str:
    """Return the text of a recipe with one stage more at the top level.

    Parameters
    ----------
    text : str
        YAML of a recipe.
    index : int
        Its number among the stages.
    stage : stage settings
        What is inserted.
    """
    yaml = _yaml(text)
    document = yaml.load(text)
    stages = document.get("stages")
    if not stages:
        stages = CommentedSeq()
        document.pop("stages", None)
        document.insert([*document].index("signal") + 1, "stages", stages)
    stages.insert(index, _yaml("").load(stage_text(stage)))
    return _written(yaml, document)


def replace_stage(text: str, index: int, old: Any, new: Any) -> str:
    """Return the text of a recipe with another stage in one place of the top level.

    Parameters
    ----------
    text : str
        YAML of a recipe.
    index : int
        Number of the stage.
    old, new : stage settings
        What stands there, and what shall: of the same kind only what differs is written.
    """
    before, after = (_yaml("").load(stage_text(stage)) for stage in (old, new))
    if before["kind"] != after["kind"] or not set(before) <= set(after):
        return rewrite(text, [f"stages[{index}]={stage_text(new)}"])
    yaml = _yaml(text)
    document = yaml.load(text)
    stage = document["stages"][index]
    for key, value in after.items():
        if key not in before or before[key] != value:
            stage[key] = value
    return _written(yaml, document)


def _yaml(text: str) -> YAML:
    """Return a reader and writer that keeps what a person wrote, the indents of lists too."""
    yaml = YAML(typ="rt", pure=True)
    yaml.preserve_quotes = True
    yaml.width = WIDEST
    found = _DASH.search(text)
    offset = len(found[2]) - len(found[1]) if found else 2
    yaml.indent(mapping=2, sequence=max(offset, 0) + 2, offset=max(offset, 0))
    return yaml


def _written(yaml: YAML, document: Any) -> str:
    page = io.StringIO()
    yaml.dump(document, page)
    return page.getvalue()


def _put(document: Any, steps: list[str], value: Any) -> None:
    """Set one value, making the mappings and lists on the way."""
    node = document
    for number, step in enumerate(steps):
        is_last = number + 1 == len(steps)
        key: Any = int(step[1:-1]) if step.startswith("[") else step
        is_new = key == len(node) if isinstance(key, int) else node.get(key) is None
        if not is_last and not is_new:
            node = node[key]
            continue
        made = value
        if not is_last:
            made = CommentedSeq() if steps[number + 1].startswith("[") else CommentedMap()
        if isinstance(key, int) and is_new:
            node.append(made)
        else:
            node[key] = made
        node = made
