"""The verbs from Python: each returns a document that shows itself."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path
from typing import TYPE_CHECKING, Any

from wavegen.core.allocation import keep_large_blocks
from wavegen.core.errors import ArgumentsError
from wavegen.core.progress import Progress, silent
from wavegen.recipe.find import find_recipe
from wavegen.recipe.load import LoadedRecipe
from wavegen.recipe.load import load_recipe as load_file
from wavegen.reports.result import Result

if TYPE_CHECKING:
    from wavegen.comparison.match import MatchSettings
    from wavegen.comparison.side import SideSettings
    from wavegen.files.format import ReadHints
    from wavegen.production.measure_settings import MeasureSettings
    from wavegen.tuning.request import TuneRequest

RecipeLike = str | Path | LoadedRecipe
"""A recipe that was loaded, a file, or the name of one that is shipped."""


def load_recipe(recipe: str | Path, overrides: Iterable[str] = ()) -> LoadedRecipe:
    """Load and check a recipe.

    Parameters
    ----------
    recipe : str or Path
        A file, or the name of a shipped recipe.
    overrides : iterable of str
        ``path=value``, as after ``--set``.

    Returns
    -------
    LoadedRecipe

    Raises
    ------
    RecipeError
        It is missing or wrong, with the place.
    """
    return load_file(find_recipe(recipe), overrides=tuple(overrides))


def _loaded(recipe: RecipeLike, overrides: Iterable[str]) -> LoadedRecipe:
    if isinstance(recipe, LoadedRecipe):
        return recipe
    return load_recipe(recipe, overrides)


def make(
    recipe: RecipeLike,
    *,
    out: str | Path = "output",
    overrides: Iterable[str] = (),
    overwrite: bool = False,
    best_of: int = 1,
    workers: int = 1,
    progress: Progress = silent,
) -> Result:
    """Make the files of a recipe, as `wavegen make` does.

    Parameters
    ----------
    recipe : LoadedRecipe, str or Path
        See :data:`RecipeLike`.
    out : str or Path
        Everything goes to ``out/NAME``.
    overrides : iterable of str
        ``path=value``; of a recipe that is not loaded yet.
    overwrite : bool
        Whether files that exist are replaced.
    best_of : int
        Seeds to try; the loop whose curve lies nearest its law is kept.
    workers : int
        Threads.
    progress : Progress
        Called with task, done and total.

    Returns
    -------
    Result
        The sidecar's document, and ``folder``.

    Raises
    ------
    WavegenError
        As on the command line.
    """
    from wavegen.production.make import make as run
    from wavegen.reports import tables

    keep_large_blocks()
    made = run(
        _loaded(recipe, overrides),
        out=Path(out),
        overwrite=overwrite,
        best_of=best_of,
        workers=workers,
        progress=progress,
    )
    document = {"folder": str(made.folder), **made.document}
    title = document["title"] or document["recipe"]["name"]
    return Result(
        document,
        lambda: [
            tables.summary_table(document, title=title),
            tables.level_table(document),
            tables.file_table(document),
        ],
        lambda: [tables.law_words(document["law"])] if document["law"] else [],
    )


def measure(
    *subjects: str | Path | LoadedRecipe,
    settings: MeasureSettings | None = None,
    hints: ReadHints | None = None,
    workers: int = 1,
    progress: Progress = silent,
) -> Result:
    """Measure data files as one population, or a recipe, as `wavegen measure` does.

    Parameters
    ----------
    *subjects : str, Path or LoadedRecipe
        One file or more, or one recipe: the loop that it makes.
    settings : MeasureSettings, optional
        What is wanted besides.
    hints : ReadHints, optional
        How files without a header are read.
    workers, progress
        As in :func:`make`.

    Returns
    -------
    Result

    Raises
    ------
    WavegenError
        As on the command line.
    """
    from wavegen.production.measure import DEFAULT, measure_recipe
    from wavegen.production.measure import measure as run
    from wavegen.production.prepare import prepare
    from wavegen.production.subject_files import open_subject
    from wavegen.reports import measurement

    keep_large_blocks()
    wanted: dict[str, Any] = {
        "settings": settings or DEFAULT,
        "workers": workers,
        "progress": progress,
    }
    recipes = [item for item in subjects if isinstance(item, LoadedRecipe)]
    if recipes and len(subjects) > 1:
        raise ArgumentsError(
            where="measure",
            problem="a recipe and other subjects are to be measured together",
            allowed="one recipe, or data files as one population",
            remedy="Measure the recipe by itself.",
        )
    if recipes:
        document = measure_recipe(prepare(recipes[0]), **wanted)
    else:
        files = [open_subject(Path(str(item)), hints) for item in subjects]
        document = run(*files, **wanted)
    return Result(
        document, lambda: measurement.tables(document), lambda: measurement.lines(document)
    )


def predict(recipe: RecipeLike, *, overrides: Iterable[str] = ()) -> Result:
    """Return what the law of a recipe says, as `wavegen predict` does; no sample is made.

    Parameters
    ----------
    recipe, overrides
        As in :func:`make`.

    Raises
    ------
    WavegenError
        As on the command line.
    """
    from wavegen.production.predict import predict as run
    from wavegen.reports import tables

    document = run(_loaded(recipe, overrides))
    title = str(document["title"] or document["name"])
    if document["law"] is None:
        return Result(document, list, lambda: [f"{title}: no law. {document['no_law']}."])
    return Result(document, lambda: [tables.law_table(document["law"], title=title)])


def match(
    stimulus: str | Path | SideSettings,
    field: str | Path | SideSettings,
    *,
    settings: MatchSettings | None = None,
    workers: int = 1,
    progress: Progress = silent,
) -> Result:
    """Compare the power statistics of two sides, as `wavegen match` does.

    Parameters
    ----------
    stimulus, field : str, Path or SideSettings
        A data file, a sidecar or a curve in CSV; with SideSettings also a recipe, a gate, a part.
    settings : MatchSettings, optional
        What a match means.
    workers, progress
        As in :func:`make`.

    Raises
    ------
    WavegenError
        As on the command line.
    """
    from wavegen.comparison.match import DEFAULT
    from wavegen.comparison.match import match as run
    from wavegen.comparison.side import SideSettings
    from wavegen.reports import comparison

    first, second = (
        item if isinstance(item, SideSettings) else SideSettings(subject=str(item))
        for item in (stimulus, field)
    )
    document = run(first, second, settings or DEFAULT, workers=workers, progress=progress)
    return Result(
        document,
        lambda: comparison.match_tables(document),
        lambda: comparison.match_lines(document),
    )


def tune(
    recipe: RecipeLike,
    request: TuneRequest,
    *,
    out: str | Path = "output",
    overrides: Iterable[str] = (),
    overwrite: bool = False,
    workers: int = 1,
) -> Result:
    """Search crest-factor reduction within limits, as `wavegen tune` does.

    Parameters
    ----------
    recipe, out, overrides, overwrite, workers
        As in :func:`make`.
    request : TuneRequest
        Limits, objective, methods, time.

    Raises
    ------
    WavegenError
        As on the command line.
    """
    from wavegen.reports import tuning
    from wavegen.tuning.tune import tune as run

    keep_large_blocks()
    found = run(
        _loaded(recipe, overrides),
        request,
        out=Path(out),
        overwrite=overwrite,
        workers=workers,
    )
    document: dict[str, Any] = {
        **found.document(),
        "evaluations": [item.row() for item in found.evaluations],
    }
    title = document["title"] or document["name"]
    return Result(
        document,
        lambda: [tuning.method_table(document, title=title)],
        lambda: tuning.outcome_words(document),
    )
