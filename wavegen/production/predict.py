"""What a recipe's power statistics must be, without a sample."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import RecipeError
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw
from wavegen.production.graph import build
from wavegen.production.law_walk import law_of_recipe
from wavegen.production.prepare import find_loop
from wavegen.production.sidecar import (
    FORMAT,
    GRID_STEP_DB,
    LOWEST_PROBABILITY,
    gaussian_reference,
    note_rows,
    rounded,
    versions,
)
from wavegen.recipe.load import LoadedRecipe
from wavegen.stages.chain import source_site

PROBABILITIES = tuple(10.0**-k for k in range(1, 10))
LOWEST_DB = -30.0


def predict(loaded: LoadedRecipe) -> dict[str, Any]:
    """Return the law of a recipe as JSON values.

    Parameters
    ----------
    loaded : LoadedRecipe
        A checked recipe.

    Returns
    -------
    dict
        ``law`` is None where there is none; ``no_law`` then says why, by name.

    Raises
    ------
    RecipeError
        What cannot be honoured, at ``file:line:column``.
    """
    recipe = loaded.recipe
    try:
        _, sites = find_loop(loaded)
        site = sites[0][1]
        build(recipe.signal, (), source_site(recipe.stages, site))  # refuses what cannot be made
        law = law_of_recipe(recipe.signal, recipe.stages, site)
    except RecipeError as error:
        raise loaded.resolve(error) from error
    found = None if isinstance(law, NoLaw) else law_curve(law)
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
        "reference": gaussian_reference(grid(12.0)),
        "rounded": note_rows([note for note in site.notes if note.kind == "rounded"]),
        "warnings": note_rows([note for note in site.notes if note.kind == "warning"]),
        "versions": versions(),
    }


def grid(top_db: float) -> NDArray[np.float64]:
    """Return levels from -30 dB to just over a level, 0.05 dB apart."""
    count = int(np.ceil((top_db - LOWEST_DB) / GRID_STEP_DB)) + 2
    steps: NDArray[np.float64] = np.arange(count, dtype=np.float64)
    return LOWEST_DB + GRID_STEP_DB * steps


def law_curve(law: Law) -> dict[str, Any]:
    """Return a law's levels at 10 % ... 1e-9, its highest peak, and its curve."""
    highest = float(law.level_db(LOWEST_PROBABILITY))
    level = grid(highest)
    return {
        "name": law.name,
        "holds": law.holds,
        "peak_db": rounded(law.peak_db, 4),
        "levels": [
            {"probability": q, "level_db": rounded(float(law.level_db(q)), 4)}
            for q in PROBABILITIES
        ],
        "level_db": [round(float(x), 2) for x in level],
        "probability": [float(x) for x in law.ccdf(level)],
    }
