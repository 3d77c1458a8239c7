"""How a file compares with the law of its recipe: agrees, differs, or too little data to tell."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from wavegen.files.datatypes import Datatype
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.law import Law
from wavegen.laws.listed import ListedLaw
from wavegen.laws.periodic import PeriodicLaw
from wavegen.laws.term import NoLaw
from wavegen.meters.equivalence import (
    DOWN_TO,
    SLACK_DB,
    TOLERANCE_DB,
    Comparison,
    check_tolerance,
    probabilities_of,
)
from wavegen.meters.equivalence import compare_with_law as compare_process
from wavegen.meters.intervals import SampledStatistics
from wavegen.meters.power_statistics import PowerStatistics
from wavegen.meters.repetition import data_period
from wavegen.production.export import ChannelCodes, ExportedFile
from wavegen.production.law_walk import law_of_recipe
from wavegen.production.measured_rows import PROCESS
from wavegen.production.prepare import Prepared
from wavegen.production.verify import Verdict, compare_with_loop, rounding_reach

LOOP = "this loop"
WHOLE, ON_TIME = "all of the time, off-times included", "the on-time, ramps excluded"
_EXACT = (ConstantLaw, PeriodicLaw, ListedLaw)


@dataclass(frozen=True, slots=True, kw_only=True)
class Question:
    """What is asked of a file.

    Parameters
    ----------
    tolerance_db : float
        *agrees* means that every level of the process lies within so much of the law's, dB.
    down_to : float
        Least probability compared.
    """

    tolerance_db: float = TOLERANCE_DB
    down_to: float = DOWN_TO


DEFAULT = Question()


def check_question(question: Question) -> None:
    """Refuse a question that means nothing, before anything is made.

    Raises
    ------
    ArgumentsError
        A tolerance that is not above 0, or a probability not above 0 or over 10 %.
    """
    check_tolerance(question.tolerance_db)
    probabilities_of(question.down_to)


@dataclass(frozen=True, slots=True, kw_only=True)
class Judgement:
    """How the codes of one channel compare with a law.

    Parameters
    ----------
    verdict : {"agrees", "differs", "undecided"}
        See :mod:`wavegen.meters.equivalence`.
    statement : str
        The verdict in words, with what gives a difference away.
    about : str
        ``this loop`` of a law that every loop follows exactly, else the process behind it.
    of : str
        All of the time, or the on-time of what is switched on and off.
    down_to : float or None
        Least probability compared; None of a loop, which is compared at every level.
    comparison : Comparison or None
        Levels and moments with their intervals, of a process.
    """

    verdict: Verdict
    statement: str
    about: str = PROCESS
    of: str = WHOLE
    down_to: float | None = None
    comparison: Comparison | None = None


def law_of(prepared: Prepared) -> Law | NoLaw:
    """Return the law of a recipe, or why there is none.

    Parameters
    ----------
    prepared : Prepared
        One channel.
    """
    recipe = prepared.loaded.recipe
    return law_of_recipe(recipe.signal, recipe.stages, prepared.site)


def holds_over_seeds(law: Law | NoLaw) -> bool:
    """Return whether a law is that of a process, so that a file needs intervals to be judged."""
    return not isinstance(law, NoLaw) and law.holds == "over seeds"


def data_samples_of(law: Law | NoLaw, signal: Any, *, workers: int = 1) -> int | None:
    """Return after how many samples the data of a loop come round again.

    Parameters
    ----------
    law : Law or NoLaw
        What it is judged by.
    signal : Signal
        The loop.
    workers : int
        Threads.

    Returns
    -------
    int or None
        None where nobody asks.
    """
    return data_period(signal, workers=workers) if holds_over_seeds(law) else None


def judge(
    law: Law | NoLaw, codes: ChannelCodes, datatype: Datatype, question: Question
) -> Judgement | None:
    """Return how the codes of one channel compare with the law of its recipe.

    Parameters
    ----------
    law : Law or NoLaw
        No law gives None.
    codes : ChannelCodes
        What was measured.
    datatype : Datatype
        How they were rounded.
    question : Question
        Tolerance, and how far down.

    Returns
    -------
    Judgement or None

    Raises
    ------
    ArgumentsError
        A question that cannot be answered.
    """
    if isinstance(law, NoLaw):
        return None
    if isinstance(law, _EXACT) and law.holds == "every loop":
        return _of_loop(law, codes, datatype)
    if codes.sampled is None or law.holds == "every loop":
        text = (
            f"undecided: {law.name} is known over all timings alike, this loop has its own, and "
            "too many samples to list them"
        )
        return Judgement(verdict="undecided", statement=text, about=LOOP)
    return _of_process(law, codes, datatype, question)


def _of_loop(law: Law, codes: ChannelCodes, datatype: Datatype) -> Judgement:
    verdict, deviation = compare_with_loop(law, codes.statistics, datatype)
    text = "agrees at every level" if verdict == "agrees" else f"differs: {deviation}"
    return Judgement(verdict=verdict, statement=text, about=LOOP)


def _of_process(law: Law, codes: ChannelCodes, datatype: Datatype, question: Question) -> Judgement:
    assert codes.sampled is not None  # noqa: S101 - asked above
    on_time: Law | None = getattr(law, "on_time", None)
    is_on = on_time is not None and codes.on_statistics is not None
    if codes.on_statistics is not None and not is_on:
        text = "undecided: the law of the on-time is not known, and the whole is not compared"
        return Judgement(verdict="undecided", statement=text)
    judged = on_time if is_on and on_time is not None else law
    # A pattern of n bits speaks for random data down to 10 / n; close points are rounded off.
    least = float(getattr(judged, "lowest_probability", 0.0))
    down_to = max(question.down_to, least)
    found = compare_process(
        SampledStatistics.of(codes.sampled),
        judged,
        tolerance_db=question.tolerance_db,
        down_to=down_to,
        slack_db=SLACK_DB + rounding_slack_db(codes.sampled.statistics, datatype),
    )
    text = found.statement
    if down_to > question.down_to:
        text += f"; its law speaks down to {100 * least:.3g} %"
    return Judgement(
        verdict=found.verdict,
        statement=text,
        of=ON_TIME if is_on else WHOLE,
        down_to=down_to,
        comparison=found,
    )


def rounding_slack_db(statistics: PowerStatistics, datatype: Datatype) -> float:
    """Return by how much rounding to codes can move a level at or over the mean, dB.

    Notes
    -----
    The envelope moves by no more than the reach of :func:`rounding_reach`, and the mean rises
    by the power of the rounding noise, a sixth of a squared step (W. R. Bennett, 1948).
    """
    reach = rounding_reach(datatype)
    if not reach or not statistics.mean:
        return 0.0
    noise = 1 / datatype.full_scale**2 / 6 / statistics.mean
    return 20 * math.log10(1 + reach / math.sqrt(statistics.mean)) + 10 * math.log10(1 + noise)


def judge_files(
    law: Law | NoLaw, files: Sequence[ExportedFile], channel: int, question: Question
) -> list[Judgement | None]:
    """Return how one channel of each file compares with its law."""
    return [judge(law, file.channels[channel], file.datatype, question) for file in files]


def worst(judgements: Sequence[Judgement | None]) -> Judgement | None:
    """Return the first that differs, else the first that is undecided, else the first.

    Parameters
    ----------
    judgements : sequence of Judgement or None
        At least one; all None where there is no law.
    """
    found = [item for item in judgements if item is not None]
    order = ("differs", "undecided", "agrees")
    return min(found, key=lambda item: order.index(item.verdict), default=None)
