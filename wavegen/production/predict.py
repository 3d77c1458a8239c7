"""What a recipe's power statistics must be, without a sample."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from wavegen.core.errors import RecipeError
from wavegen.core.site import Site
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw
from wavegen.production.fault_length import fault_rows
from wavegen.production.graph import build
from wavegen.production.law_rows import curve_rows, level_grid
from wavegen.production.law_walk import law_of_recipe
from wavegen.production.predicted_distortion import distortion_rows, steps_before
from wavegen.production.prepare import find_loop
from wavegen.production.sidecar import (
    FORMAT,
    gaussian_reference,
    note_rows,
    versions,
)
from wavegen.recipe.load import LoadedRecipe
from wavegen.recipe.settings import Recipe
from wavegen.stages.chain import source_site

PROBABILITIES = tuple(10.0**-k for k in range(1, 10))


def predict(loaded: LoadedRecipe, *, fault: tuple[float, float] | None = None) -> dict[str, Any]:
    """Return the law of a recipe as JSON values.

    Parameters
    ----------
    loaded : LoadedRecipe
        A checked recipe.
    fault : (float, float), optional
        Shift of a level, dB, and the probability at which it is taken: then it is said how long
        a loop must be to show it.

    Returns
    -------
    dict
        ``law`` is None where there is none; ``no_law`` then says why, by name. ``distortion``
        holds EVM, ACLR and the shift of the mean behind memoryless steps, None without them.

    Raises
    ------
    ArgumentsError
        A fault that nobody can look for.
    RecipeError
        What cannot be honoured, at ``file:line:column``.
    """
    recipe = loaded.recipe
    try:
        _, sites = find_loop(loaded)
        site = sites[0][1]
        build(recipe.signal, (), source_site(recipe.stages, site))  # refuses what cannot be made
        law = law_of_recipe(recipe.signal, recipe.stages, site)
        whole = build(recipe.signal, recipe.stages, site).signal if fault else None
        distortion = _distortion(recipe, site, law)
    except RecipeError as error:
        raise loaded.resolve(error) from error
    asked = None
    if fault is not None and whole is not None and not isinstance(law, NoLaw):
        asked = fault_rows(law, whole, fault_db=fault[0], probability=fault[1])
    found = None if isinstance(law, NoLaw) else curve_rows(law, PROBABILITIES)
    return {
        "format": f"{FORMAT}.prediction",
        "version": 1,
        "name": loaded.name,
        "title": recipe.title,
        "sample_rate_hz": float(recipe.sample_rate_hz),
        "n_samples": site.n_samples,
        "duration_s": float(site.n_samples / recipe.sample_rate_hz),
        "law": found,
        "no_law": law.reason if isinstance(law, NoLaw) else None,
        "distortion": distortion,
        "fault": asked,
        "reference": gaussian_reference(level_grid(12.0)),
        "rounded": note_rows([note for note in site.notes if note.kind == "rounded"]),
        "warnings": note_rows([note for note in site.notes if note.kind == "warning"]),
        "versions": versions(),
    }


def _distortion(recipe: Recipe, site: Site, law: Law | NoLaw) -> dict[str, Any] | None:
    """Return what the memoryless steps of a recipe do, None where it has none."""
    first = steps_before(recipe.stages, site)
    if first is None:
        return None
    before, after = recipe.stages[:first], recipe.stages[first:]
    quiet = replace(site, notes=[])
    undistorted = build(recipe.signal, before, source_site(after, quiet)).signal
    return distortion_rows(law, undistorted, quiet)
