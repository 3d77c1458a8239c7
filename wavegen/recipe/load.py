"""A recipe file to checked settings, with every fault at its line and column."""

from __future__ import annotations

import hashlib
import html
import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from pathlib import Path

from wavegen.core.errors import RecipeError, RecipeFaults
from wavegen.core.units import QuantityError
from wavegen.recipe.checker import check, join
from wavegen.recipe.names import check_name
from wavegen.recipe.overrides import apply_override
from wavegen.recipe.reader import read_tree
from wavegen.recipe.settings import Recipe
from wavegen.recipe.tables import TABLES, Tables
from wavegen.recipe.tree import (
    Fault,
    FaultError,
    Items,
    Node,
    Place,
    Table,
    describe,
)

LARGEST_BYTES = 128 * 1024
"""Size of a recipe file; the shipped ones have one or two kB."""

MOST_FAULTS = 100
"""Faults that are written out."""


@dataclass(frozen=True, slots=True, kw_only=True)
class LoadedRecipe:
    """A checked recipe and where it came from.

    Parameters
    ----------
    recipe : Recipe
        The settings.
    text : str
        The file, as it was written.
    sha256 : str
        Of the bytes of the file, hexadecimal.
    overrides : tuple of str
        What ``--set`` put on top, in order.
    folder : Path
        Folder that paths in the recipe are relative to.
    name : str
        Stem of the file: names the output.
    file : str
        The file as messages name it.
    places : mapping of str to Place
        Recipe path to line and column.
    """

    recipe: Recipe
    text: str
    sha256: str
    overrides: tuple[str, ...]
    folder: Path
    name: str
    file: str
    places: Mapping[str, Place]

    def __str__(self) -> str:
        """Return it as plain text: its title, where it is from, what is changed, the file."""
        changed = [f"changed: {override}" for override in self.overrides]
        heading = [self.recipe.title or self.name, f"from {self.file}", *changed]
        return "\n".join([*heading, "", self.text.rstrip()])

    def _repr_html_(self) -> str:
        """Return it as a notebook shows it; every text is escaped."""
        changed = "".join(f"<br>changed: {html.escape(item)}" for item in self.overrides)
        return (
            f"<p><strong>{html.escape(self.recipe.title or self.name)}</strong><br>"
            f"from {html.escape(self.file)}{changed}</p><pre>{html.escape(self.text)}</pre>"
        )

    def place(self, path: str) -> Place:
        """Return where a path stands, or where its nearest ancestor does."""
        while path and path not in self.places:
            path = _parent(path)
        return self.places[path]

    def resolve(self, error: RecipeError) -> RecipeError:
        """Return an error with ``file:line:column`` before its recipe path.

        Parameters
        ----------
        error : RecipeError
            Raised while building: ``where`` is a recipe path. One that has its place already is
            returned unchanged; of :class:`RecipeFaults` each is resolved.

        Returns
        -------
        RecipeError
        """
        if isinstance(error, RecipeFaults):
            return RecipeFaults([self.resolve(fault) for fault in error.faults])
        if error.where.startswith((f"{self.file}:", "--set ")):
            return error
        return RecipeError(
            where=describe(self.place(error.where), error.where, self.file),
            problem=error.problem,
            allowed=error.allowed,
            remedy=error.remedy,
        )


def load_recipe(path: str | Path, *, overrides: Iterable[str] = ()) -> LoadedRecipe:
    """Read and check a recipe file.

    Parameters
    ----------
    path : str or Path
        The file; names of shipped recipes are for :func:`wavegen.recipe.find.find_recipe`.
    overrides : iterable of str
        ``path=value`` each, as ``--set`` takes them.

    Returns
    -------
    LoadedRecipe

    Raises
    ------
    RecipeError
        Missing, unreadable, too large or not UTF-8.
    RecipeFaults
        Every fault in it, in the order of the file.
    """
    path = Path(path)
    file = str(path)
    try:
        with path.open("rb") as handle:
            data = handle.read(LARGEST_BYTES + 1)
    except (OSError, ValueError) as error:
        raise RecipeError(
            where=file,
            problem=f"cannot be read: {getattr(error, 'strerror', None) or error}",
            allowed="a recipe file that exists",
            remedy="Check the path.",
        ) from error
    if len(data) > LARGEST_BYTES:
        raise RecipeError(
            where=file,
            problem=f"the file is larger than {LARGEST_BYTES // 1024} kB",
            allowed=f"recipes up to {LARGEST_BYTES // 1024} kB",
            remedy="Is it a recipe? Put long tables into files of their own.",
        )
    return _load(
        data, file=file, name=path.stem, folder=path.parent, overrides=overrides, tables=TABLES
    )


def load_text(
    text: str,
    *,
    overrides: Iterable[str] = (),
    name: str = "recipe",
    folder: Path | None = None,
    tables: Tables = TABLES,
) -> LoadedRecipe:
    """Check the text of a recipe.

    Parameters
    ----------
    text : str
        YAML.
    overrides : iterable of str
        As in :func:`load_recipe`.
    name : str
        Names the output; messages call the text ``name.yaml``.
    folder : Path, optional
        What paths in the recipe are relative to; the current folder if not given.
    tables : mapping
        Where ``kind:`` is looked up.

    Returns
    -------
    LoadedRecipe

    Raises
    ------
    RecipeFaults
        Every fault in it.
    """
    data = text.encode("utf-8", "surrogatepass")
    return _load(
        data,
        file=f"{name}.yaml",
        name=name,
        folder=folder or Path(),
        overrides=overrides,
        tables=tables,
    )


def _load(
    data: bytes, *, file: str, name: str, folder: Path, overrides: Iterable[str], tables: Tables
) -> LoadedRecipe:
    try:
        check_name(name)
    except QuantityError as error:
        raise RecipeError(
            where=file, problem=error.problem, allowed=error.allowed, remedy="Rename the file."
        ) from error
    overrides = tuple(overrides)
    try:
        text = _decode(data)
        tree, faults = read_tree(text)
        for order, override in enumerate(overrides, start=1):
            tree, more = apply_override(tree, override, order)
            faults.extend(more)
    except FaultError as error:
        raise RecipeFaults([error.fault.error(file)]) from error
    recipe, found = check(tree, Recipe, tables=tables)
    faults = sorted((*faults, *found), key=_order)
    if faults:
        errors = [fault.error(file) for fault in faults[:MOST_FAULTS]]
        if len(faults) > MOST_FAULTS:
            errors.append(_more(len(faults) - MOST_FAULTS, file))
        raise RecipeFaults(errors)
    return LoadedRecipe(
        recipe=recipe,
        text=text,
        sha256=hashlib.sha256(data).hexdigest(),
        overrides=overrides,
        folder=folder,
        name=name,
        file=file,
        places=_places(tree),
    )


def _more(count: int, file: str) -> RecipeError:
    return RecipeError(
        where=file,
        problem=f"{count} more faults",
        allowed="a recipe without faults",
        remedy="Correct the first ones and try again.",
    )


def _order(fault: Fault) -> tuple[bool, int, int]:
    """File first, then overrides as they were given."""
    return bool(fault.place.override), fault.place.line, fault.place.column


def _decode(data: bytes) -> str:
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        before = data[: error.start].decode("utf-8", "replace")
        place = Place(before.count("\n") + 1, len(before) - before.rfind("\n"))
        raise FaultError(
            Fault(
                place,
                "",
                f"the byte 0x{data[error.start]:02x} is not UTF-8",
                "text in UTF-8",
                "Save the file as UTF-8.",
            )
        ) from error


def _places(root: Node) -> dict[str, Place]:
    """Return the place of every path of a tree."""
    places: dict[str, Place] = {}
    stack: list[tuple[str, Node]] = [("", root)]
    while stack:
        path, node = stack.pop()
        places[path] = node.place
        if isinstance(node, Items):
            stack.extend((f"{path}[{index}]", item) for index, item in enumerate(node.nodes))
        elif isinstance(node, Table):
            stack.extend((join(path, entry.key), entry.node) for entry in node.entries)
    return places


_LAST = re.compile(r"\.?[^.\[\]]*$|\[[^\[\]]*\]$")


def _parent(path: str) -> str:
    """Return the path one step up.

    Examples
    --------
    >>> _parent("signal.parts[0]"), _parent("signal.parts"), _parent("signal")
    ('signal.parts', 'signal', '')
    """
    shorter = _LAST.sub("", path, count=1)
    return shorter if len(shorter) < len(path) else path[:-1]
