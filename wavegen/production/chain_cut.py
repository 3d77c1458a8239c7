"""A recipe's chain of stages cut at one place, so that the stage there can be exchanged."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

from wavegen.core.signal import Signal
from wavegen.core.site import Note, Site, StageSettings
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw
from wavegen.production.graph import build
from wavegen.production.prepare import find_loop
from wavegen.recipe.load import LoadedRecipe
from wavegen.stages.chain import build_chain, source_site

CREST, DEVICE, CONVERTER = "crest", "device", "converter"


def shelf_of(stage: StageSettings) -> str:
    """Return the shelf of a stage: ``crest``, ``device``, ``converter``, ``channel``."""
    return type(stage).__module__.split(".")[2]


def crest_place(stages: Sequence[StageSettings]) -> tuple[int, bool]:
    """Return where the reduction of peaks stands in a chain, or where it would belong.

    Parameters
    ----------
    stages : sequence of stage settings
        In the order of the signal.

    Returns
    -------
    index : int
        Of the last method of crest-factor reduction; else of the first device or converter, or
        the end.
    is_there : bool
        Whether a method stands there.
    """
    shelves = [shelf_of(stage) for stage in stages]
    if CREST in shelves:
        return len(shelves) - 1 - shelves[::-1].index(CREST), True
    late = [index for index, shelf in enumerate(shelves) if shelf in {DEVICE, CONVERTER}]
    return (late[0] if late else len(stages)), False


def without_distortion(stages: Sequence[StageSettings]) -> tuple[StageSettings, ...]:
    """Return a chain without its crest-factor reduction, devices and converters."""
    return tuple(stage for stage in stages if shelf_of(stage) not in {CREST, DEVICE, CONVERTER})


@dataclass(frozen=True, slots=True, kw_only=True)
class Passing:
    """A stage that does nothing: it keeps the numbers of those behind it."""

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the source."""
        return source

    def law(self, site: Site, source: Law) -> Law | NoLaw:
        """Return the law."""
        return source


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class ChainCut:
    """The first channel of a recipe, built up to one place of its chain.

    Parameters
    ----------
    site : Site
        Of the end of the chain.
    source : Signal
        What comes to that place.
    index : int
        Number of the place among the stages.
    later : tuple of stage settings
        What follows.
    """

    site: Site
    source: Signal
    index: int
    later: tuple[StageSettings, ...]

    def build(self, stage: StageSettings | None) -> tuple[Signal, list[Note]]:
        """Return the whole signal with a stage at that place, and what it noted.

        Parameters
        ----------
        stage : stage settings or None
            None: nothing.

        Raises
        ------
        RecipeError
            As raised by a stage, at its path in the recipe.
        """
        chain: list[Any] = [Passing()] * self.index + [stage or Passing(), *self.later]
        site = replace(self.site, notes=[])
        path = self.site.path.removesuffix("signal") + "stages"
        return build_chain(chain, site, self.source, path), site.notes


def cut_chain(loaded: LoadedRecipe, *, index: int, skips: int) -> ChainCut:
    """Build a recipe up to a place of its chain.

    Parameters
    ----------
    loaded : LoadedRecipe
        A checked recipe; of two channels the first counts.
    index : int
        Of the place.
    skips : int
        How many stages from there on are left out: 1 where the one there is exchanged, else 0.

    Returns
    -------
    ChainCut

    Raises
    ------
    RecipeError
        What cannot be honoured.
    """
    _, sites = find_loop(loaded)
    channel, site = sites[0]
    stages = channel.recipe.stages
    later = tuple(stages[index + skips :])
    built = build(channel.recipe.signal, tuple(stages[:index]), source_site(later, site))
    return ChainCut(site=site, source=built.signal, index=index, later=later)
