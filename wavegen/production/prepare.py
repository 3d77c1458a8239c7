"""From a loaded recipe to a graph that can be rendered: nothing is computed yet."""

from __future__ import annotations

from dataclasses import dataclass

from wavegen.core.errors import RecipeError
from wavegen.core.evaluate import plan
from wavegen.core.render import IN_FLIGHT_STRIPS, strip_length
from wavegen.core.site import Note, Site
from wavegen.production.graph import Built, build, data_cycle, shortest_cycle
from wavegen.production.length import counts_periods, loop_length
from wavegen.recipe.load import LoadedRecipe

MOST_MEMORY_BYTES = 4_000_000_000
"""Samples in flight beyond this are refused before anything is allocated."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Prepared:
    """A recipe as a graph, with what was rounded on the way.

    Parameters
    ----------
    loaded : LoadedRecipe
        Where it came from.
    built : Built
        The graph.
    cycle_samples : int
        Shortest loop of the signal, samples.
    notes : list of Note
        What was rounded, doubtful or worth knowing.
    site : Site
        Where the signal was built.
    """

    loaded: LoadedRecipe
    built: Built
    cycle_samples: int
    notes: list[Note]
    site: Site


def prepare(loaded: LoadedRecipe) -> Prepared:
    """Find the loop and build the graph.

    Parameters
    ----------
    loaded : LoadedRecipe
        A checked recipe.

    Returns
    -------
    Prepared

    Raises
    ------
    RecipeError
        What cannot be honoured, at ``file:line:column``.
    """
    recipe = loaded.recipe
    try:
        cycle = shortest_cycle(recipe.signal, recipe.sample_rate_hz, "signal", recipe.stages)
        if counts_periods(recipe.duration):
            cycle = data_cycle(
                recipe.signal,
                recipe.sample_rate_hz,
                "signal",
                folder=loaded.folder,
                stages=recipe.stages,
            )
        n_samples, notes = loop_length(recipe.duration, cycle, recipe.sample_rate_hz)
        site = Site(
            sample_rate_hz=recipe.sample_rate_hz,
            n_samples=n_samples,
            seed=recipe.seed,
            label="signal",
            path="signal",
            folder=loaded.folder,
            notes=notes,
        )
        built = build(recipe.signal, recipe.stages, site)
        refuse_too_large(built)
    except RecipeError as error:
        raise loaded.resolve(error) from error
    return Prepared(
        loaded=loaded,
        built=built,
        cycle_samples=cycle.n_samples,
        notes=notes,
        site=site,
    )


def refuse_too_large(built: Built) -> None:
    """Refuse a graph whose strips in flight would not fit in memory.

    Raises
    ------
    RecipeError
        With the estimate.
    """
    signal = built.signal
    strip = min(strip_length(signal), signal.n_samples)
    estimate = plan({signal: (0, strip)}).peak_bytes * IN_FLIGHT_STRIPS
    if estimate > MOST_MEMORY_BYTES:
        raise RecipeError(
            where="signal",
            problem=f"rendering would need about {estimate / 1e9:.1f} GB of memory",
            allowed=f"up to {MOST_MEMORY_BYTES / 1e9:.0f} GB",
            remedy="Use shorter FFTs or filters, rates with a simpler ratio, or fewer parts.",
        )
