"""The most representative loop: of several seeds, the one whose curve lies nearest the law."""

from __future__ import annotations

from concurrent.futures import Executor
from dataclasses import dataclass
from typing import Any

import numpy as np

from wavegen.core.errors import ArgumentsError
from wavegen.core.progress import Progress, silent
from wavegen.core.render import Tap, render
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw
from wavegen.meters.equivalence import probabilities_of
from wavegen.meters.gated import GatedPowerMeter
from wavegen.meters.power import PowerMeter, PowerStatistics
from wavegen.production.judgement import holds_over_seeds, law_of
from wavegen.production.prepare import Prepared, prepare
from wavegen.production.sidecar import rounded
from wavegen.recipe.load import LoadedRecipe, load_text
from wavegen.stages.channel.gate import on_time

MOST_TRIES = 10_000


@dataclass(frozen=True, slots=True, kw_only=True)
class BestLoop:
    """What was chosen.

    Parameters
    ----------
    loaded : LoadedRecipe
        The recipe with the seed that was chosen.
    rows : dict
        How it was chosen, for the sidecar.
    """

    loaded: LoadedRecipe
    rows: dict[str, Any]


def best_loop(
    loaded: LoadedRecipe,
    *,
    n_tries: int,
    down_to: float,
    workers: int = 1,
    executor: Executor | None = None,
    progress: Progress = silent,
) -> BestLoop:
    """Try seeds one after the other and return the recipe with the best.

    Parameters
    ----------
    loaded : LoadedRecipe
        Its own seed is tried first, then the next ones.
    n_tries : int
        How many, 2 or more.
    down_to : float
        Levels are compared at whole and half decades from 10 % down to this probability.
    workers, executor, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    BestLoop
        The seed whose largest deviation is smallest; the first of equals.

    Raises
    ------
    ArgumentsError
        No channel has a law over seeds, or the loop is too short for the probability.
    RecipeError
        As in :func:`wavegen.production.prepare.prepare`.
    """
    first = loaded.recipe.seed
    laws = [_judged(law_of(channel)) for channel in prepare(loaded).channels]
    if not any(laws):
        _refuse(loaded)
    found: list[float] = []
    for seed in range(first, first + n_tries):
        prepared = prepare(reseeded(loaded, seed))
        deviations = [
            _deviation_db(channel, law, down_to, workers, executor)
            for channel, law in zip(prepared.channels, laws, strict=True)
            if law is not None
        ]
        found.append(max(deviations))
        progress(f"seeds: {seed} tried", len(found), n_tries)
    best = int(np.argmin(found))
    return BestLoop(
        loaded=reseeded(loaded, first + best),
        rows={
            "n_tried": n_tries,
            "first_seed": first,
            "chosen_seed": first + best,
            "down_to": down_to,
            "deviation_is": "largest difference of a level from the law's, at half decades",
            "deviation_db": rounded(found[best], 4),
            "first_deviation_db": rounded(found[0], 4),
            "median_deviation_db": rounded(float(np.median(found)), 4),
        },
    )


def reseeded(loaded: LoadedRecipe, seed: int) -> LoadedRecipe:
    """Return a recipe with another seed; its overrides say so."""
    if seed == loaded.recipe.seed:
        return loaded
    return load_text(
        loaded.text,
        name=loaded.name,
        overrides=(*loaded.overrides, f"seed={seed}"),
        folder=loaded.folder,
    )


def _judged(law: Law | NoLaw) -> Law | None:
    """Return the law that a loop may be more or less near to: of the on-time, if it is gated."""
    if isinstance(law, NoLaw) or not holds_over_seeds(law):
        return None
    on: Law | None = getattr(law, "on_time", None)
    return law if on is None else on


def _refuse(loaded: LoadedRecipe) -> None:
    law = law_of(prepare(loaded))
    why = law.reason if isinstance(law, NoLaw) else f"{law.name} is the same for every seed"
    raise ArgumentsError(
        where="--best-of",
        problem=f"{loaded.name} has no law that a loop could be more or less near to: {why}",
        allowed="recipes whose law holds over seeds, as `wavegen predict` says",
        remedy="Leave it out.",
    )


def _deviation_db(
    prepared: Prepared, law: Law, down_to: float, workers: int, executor: Executor | None
) -> float:
    """Return the largest difference of a level of one loop from the law's."""
    signal = prepared.built.signal
    bursts = on_time(signal)
    meter = PowerMeter() if bursts is None else GatedPowerMeter(bursts=bursts)
    tap = Tap(name="power", signal=signal, meter=meter)
    statistics: PowerStatistics = render(signal, taps=(tap,), workers=workers, executor=executor)[
        "power"
    ]
    if statistics.n_samples * down_to < 1:
        raise ArgumentsError(
            where="--down-to",
            problem=f"a loop of {statistics.n_samples} samples has none beyond {down_to:g}",
            allowed=f"from {1 / statistics.n_samples:.2g} on for this loop",
            remedy="Compare less far down, or lengthen the loop.",
        )
    asked = np.concatenate(probabilities_of(down_to))
    wanted = law.level_db(asked)
    used = np.isfinite(wanted)
    return float(np.max(np.abs(statistics.level_db(asked[used]) - wanted[used])))
