"""The tuned recipe as text: the original with its comments, and the method that was found."""

from __future__ import annotations

import os
from collections.abc import Iterator
from dataclasses import fields, is_dataclass, replace
from pathlib import Path
from typing import Any

from wavegen.core.errors import RecipeError
from wavegen.core.site import StageSettings
from wavegen.recipe.dump import dump
from wavegen.recipe.load import LoadedRecipe, load_text
from wavegen.recipe.rewrite import insert_stage, replace_stage, rewrite

FILE_FIELD = "path"
"""Name of the fields that hold a file's path, relative to the recipe."""


def tuned_text(
    loaded: LoadedRecipe, stage: StageSettings, place: tuple[int, bool], *, folder: Path
) -> str:
    """Return the text of a recipe with a method in its place.

    Parameters
    ----------
    loaded : LoadedRecipe
        The original; what was set on top of it is written too.
    stage : stage settings
        The method.
    place : (int, bool)
        Where it stands among the stages, and whether it takes the place of another.
    folder : Path
        Where the text will lie: paths in it are made relative to that.

    Returns
    -------
    str
        With the comments of the original; without them where the text cannot hold them, such as
        where an anchor stands for the stage elsewhere too.
    """
    index, is_there = place
    moved = list(_moved(loaded, folder))
    overrides = [*loaded.overrides, *moved]
    stages = list(loaded.recipe.stages)
    text = rewrite(loaded.text, overrides)
    if is_there:
        text = replace_stage(text, index, stages[index], stage)
    else:
        text = insert_stage(text, index, stage)
    stages[index : index + is_there] = [stage]
    wanted = _with_paths(loaded, moved, tuple(stages))
    try:
        if load_text(text, folder=folder).recipe == wanted:
            return text
    except RecipeError:
        pass
    return dump(wanted)


def _with_paths(loaded: LoadedRecipe, moved: list[str], stages: tuple[Any, ...]) -> Any:
    """Return the recipe that is meant: new stages, and paths from the new folder."""
    recipe = loaded.recipe
    if moved:
        recipe = load_text(
            loaded.text, overrides=[*loaded.overrides, *moved], folder=loaded.folder
        ).recipe
    return replace(recipe, stages=stages)


def _moved(loaded: LoadedRecipe, folder: Path) -> Iterator[str]:
    """Return an override for every path that means another file from the new folder."""
    recipe = loaded.recipe
    places: list[tuple[str, Any]] = [("signal", recipe.signal), ("stages", recipe.stages)]
    places.append(("second_channel", recipe.second_channel))
    for where, value in places:
        for path, text in _files(value, where):
            file = Path(text)
            if file.is_absolute():
                continue
            target = (loaded.folder / file).resolve()
            new = os.path.relpath(target, folder.resolve())
            if new != text:
                yield f"{path}={new}"


def _files(value: Any, path: str) -> Iterator[tuple[str, str]]:
    if isinstance(value, tuple):
        for number, item in enumerate(value):
            yield from _files(item, f"{path}[{number}]")
    elif is_dataclass(value):
        for item in fields(value):
            inner = getattr(value, item.name)
            if item.name == FILE_FIELD and isinstance(inner, str):
                yield f"{path}.{item.name}", inner
            else:
                yield from _files(inner, f"{path}.{item.name}")
