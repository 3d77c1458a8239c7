"""Recipes by path or by the name of one that is shipped."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

from wavegen.core.errors import RecipeError
from wavegen.core.registry import nearest
from wavegen.recipe.reader import read_tree
from wavegen.recipe.tree import FaultError, Scalar, Table


def shipped_folder() -> Path:
    """Return the folder of shipped recipes: in the package, or beside it in a checkout."""
    package = Path(__file__).resolve().parents[1]
    inside = package / "recipes"
    return inside if inside.is_dir() else package.parent / "recipes"


def shipped_paths() -> dict[str, Path]:
    """Return the path of every shipped recipe, by name: none is read."""
    return {path.stem: path for path in sorted(shipped_folder().glob("*.yaml"))}


def shipped_recipes() -> list[tuple[str, str, Path]]:
    """Return name, title and path of every shipped recipe, by name."""
    return [(name, _title(path), path) for name, path in shipped_paths().items()]


def find_recipe(name_or_path: str | Path) -> Path:
    """Return the file of a recipe.

    Parameters
    ----------
    name_or_path : str or Path
        A path, else the name of a shipped recipe, with or without ``.yaml``.

    Returns
    -------
    Path

    Raises
    ------
    RecipeError
        Neither; the nearest shipped name is given.
    """
    path = Path(name_or_path)
    if is_file(path):
        return path
    shipped = shipped_paths()
    wanted = str(name_or_path).removesuffix(".yaml")
    if wanted in shipped:
        return shipped[wanted]
    beside = path.with_name(f"{path.name}.yaml") if path.name else path
    if is_file(beside):
        raise RecipeError(
            where=wanted[:200],
            problem="is neither a path nor a shipped recipe",
            allowed="a path, or the name of a shipped recipe",
            remedy=f"Did you mean {beside}?",
        )
    raise _no_such(str(name_or_path), shipped, "a path, or a shipped recipe: ", "Check the path.")


def is_file(path: Path) -> bool:
    """Return whether there is such a file; what cannot be a name is none."""
    try:
        return path.is_file()
    except (OSError, ValueError):  # too long or with a zero byte
        return False


def find_shipped(name: str) -> Path:
    """Return the file of a shipped recipe.

    Parameters
    ----------
    name : str
        Its name, with or without ``.yaml``; a file of that name elsewhere is not looked at.

    Returns
    -------
    Path

    Raises
    ------
    RecipeError
        No recipe of that name is shipped; the nearest name is given.
    """
    shipped = shipped_paths()
    wanted = name.removesuffix(".yaml")
    if wanted in shipped:
        return shipped[wanted]
    raise _no_such(name, shipped, "a shipped recipe: ", "See `wavegen list recipes`.")


def _no_such(name: str, shipped: Mapping[str, Path], allowed: str, remedy: str) -> RecipeError:
    guess = nearest(name.rpartition("/")[2].removesuffix(".yaml")[:200], shipped)
    return RecipeError(
        where=name[:200],
        problem="there is no such recipe",
        allowed=allowed + (", ".join(shipped) or "none"),
        remedy=f"Did you mean {guess}?" if guess else remedy,
    )


def _title(path: Path) -> str:
    """Return the title without checking the rest; empty if it cannot be read."""
    try:
        tree, _ = read_tree(path.read_text(encoding="utf-8"))
    except (OSError, UnicodeDecodeError, FaultError):
        return ""
    title = tree.get("title") if isinstance(tree, Table) else None
    return title.text if isinstance(title, Scalar) else ""
