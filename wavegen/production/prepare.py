"""From a loaded recipe to a graph that can be rendered: nothing is computed yet."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from fractions import Fraction

import numpy as np

from wavegen.core.errors import RecipeError
from wavegen.core.evaluate import plan
from wavegen.core.render import IN_FLIGHT_STRIPS, strip_length
from wavegen.core.signal import Samples, Signal
from wavegen.core.site import Cycle, Note, Site, common_cycle
from wavegen.production.graph import Built, build, check_names, data_cycle, shortest_cycle
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
    second : Prepared or None
        The second channel as a recipe of its own, on the same loop, with the same notes.
    """

    loaded: LoadedRecipe
    built: Built
    cycle_samples: int
    notes: list[Note]
    site: Site
    second: Prepared | None = None

    @property
    def channels(self) -> tuple[Prepared, ...]:
        """Itself, and the second channel where there is one."""
        return (self,) if self.second is None else (self, self.second)


@dataclass(frozen=True, eq=False, kw_only=True)
class Levelled(Signal):
    """A signal at another level.

    Parameters
    ----------
    gain : float
        Amplitude factor.
    """

    gain: float

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Scale the samples."""
        return arrays[0] * np.float32(self.gain)


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
    try:
        cycle, sites = find_loop(loaded)
        made = [_build(channel, cycle.n_samples, site) for channel, site in sites]
    except RecipeError as error:
        raise loaded.resolve(error) from error
    if len(made) == 1:
        return made[0]
    return replace(made[0], second=_at_level(made[1], loaded))


def find_loop(loaded: LoadedRecipe) -> tuple[Cycle, list[tuple[LoadedRecipe, Site]]]:
    """Find the loop of a recipe, and where each of its channels is built.

    Parameters
    ----------
    loaded : LoadedRecipe
        A checked recipe.

    Returns
    -------
    cycle : Cycle
        Shortest loop of all channels.
    sites : list of (LoadedRecipe, Site)
        Each channel as a recipe of its own, and its site; all share the list of notes.

    Raises
    ------
    RecipeError
        What cannot be honoured, at its path in the recipe.
    """
    each = {"signal": loaded}
    if loaded.recipe.second_channel is not None:
        each["second_channel.signal"] = _alone(loaded)
    check_names({path: channel.recipe.signal for path, channel in each.items()})
    cycle = _common([_cycle_of(channel, path) for path, channel in each.items()])
    recipe = loaded.recipe
    n_samples, notes = loop_length(recipe.duration, cycle, recipe.sample_rate_hz)
    sites = [
        Site(
            sample_rate_hz=recipe.sample_rate_hz,
            n_samples=n_samples,
            seed=recipe.seed,
            label=path,
            path=path,
            folder=loaded.folder,
            notes=notes,
        )
        for path in each
    ]
    return cycle, list(zip(each.values(), sites, strict=True))


def _alone(loaded: LoadedRecipe) -> LoadedRecipe:
    """Return the second channel as a recipe of its own."""
    second = loaded.recipe.second_channel
    assert second is not None  # noqa: S101 - asked for where there is one
    recipe = replace(loaded.recipe, signal=second.signal, stages=second.stages, second_channel=None)
    return replace(loaded, recipe=recipe)


def _at_level(channel: Prepared, loaded: LoadedRecipe) -> Prepared:
    """Return the second channel at its level over the first."""
    second = loaded.recipe.second_channel
    if second is None or not second.level_db:
        return channel
    signal = channel.built.signal
    power = 10 ** (second.level_db / 10)
    levelled = Levelled(
        sample_rate_hz=signal.sample_rate_hz,
        n_samples=signal.n_samples,
        inputs=(signal,),
        mean_power=None if signal.mean_power is None else signal.mean_power * power,
        gain=math.sqrt(power),
    )
    return replace(channel, built=replace(channel.built, signal=levelled))


def _cycle_of(loaded: LoadedRecipe, path: str) -> Cycle:
    recipe = loaded.recipe
    stages_path = path.removesuffix("signal") + "stages"
    if counts_periods(recipe.duration):
        return data_cycle(
            recipe.signal,
            recipe.sample_rate_hz,
            path,
            folder=loaded.folder,
            stages=recipe.stages,
            stages_path=stages_path,
        )
    return shortest_cycle(recipe.signal, recipe.sample_rate_hz, path, recipe.stages, stages_path)


def _common(cycles: list[Cycle]) -> Cycle:
    """Return the shortest loop of both channels; symbols and periods are those of the first."""
    n_samples = common_cycle([cycle.n_samples for cycle in cycles])
    longer = n_samples // cycles[0].n_samples
    rates = {Fraction(cycle.n_symbols, cycle.n_samples) for cycle in cycles}
    return Cycle(
        n_samples=n_samples,
        n_symbols=cycles[0].n_symbols * longer if len(rates) == 1 else 0,
        n_data_periods=cycles[0].n_data_periods * longer,
    )


def _build(loaded: LoadedRecipe, cycle_samples: int, site: Site) -> Prepared:
    built = build(loaded.recipe.signal, loaded.recipe.stages, site)
    refuse_too_large(built, site.path)
    return Prepared(
        loaded=loaded, built=built, cycle_samples=cycle_samples, notes=site.notes, site=site
    )


def refuse_too_large(built: Built, path: str = "signal") -> None:
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
            where=path,
            problem=f"rendering would need about {estimate / 1e9:.1f} GB of memory",
            allowed=f"up to {MOST_MEMORY_BYTES / 1e9:.0f} GB",
            remedy="Use shorter FFTs or filters, rates with a simpler ratio, or fewer parts.",
        )
