"""A stimulus against its sidecar: the hash, then what the file measures as a loop."""

from __future__ import annotations

import math
from contextlib import suppress
from typing import Any, Literal

from wavegen.core.errors import FileError, SignalError
from wavegen.core.progress import Progress, silent
from wavegen.core.units import format_hz
from wavegen.files.analytic import looped
from wavegen.files.digest import sha512_of
from wavegen.files.format import ReadHints, Recording
from wavegen.production.judgement import Question
from wavegen.production.measure import Subject, measure
from wavegen.production.referee import Referee, law_verdicts_of
from wavegen.production.sidecar import FORMAT
from wavegen.production.stimulus import Stimulus, loop_warnings

Verdict = Literal["match", "differ", "undecided"]

TOLERANCE_DB = 0.05
"""Levels of one loop written twice may differ by this.

It is six bins of the power meter (0.0085 dB) and the step of the sidecar's curves. Rounding the
same loop to 8 bits near full scale moves the mean by 0.001 dB and its peak by 0.05 dB (0.71 of
127 codes); to 16 bits, by 0.0002 dB. Power sensors are not that good: a larger difference is none
of rounding, and one that a bench can see.
"""

SAME_WAVEFORM_PERCENT = 10.0
"""A file written anew errs by its rounding: 1 % in 8 bits near full scale, 5 % in 8 bits 14 dB
below it. One with other data, or another constellation, errs by 100 % and more."""

_SAME: dict[str, Any] = {
    "verdict": "match",
    "compared_by": "hash",
    "largest_difference_db": 0.0,
    "mean_difference_db": 0.0,
    "peak_difference_db": 0.0,
    "peak_between_samples_difference_db": 0.0,
    "papr_difference_db": 0.0,
}
"""Equal bytes: no difference, and nothing to measure."""

_MISSING: dict[str, Any] = {
    "hash": "missing",
    "verdict": "undecided",
    "compared_by": None,
    "is_readable": False,
    "reasons": [],
    "largest_difference_db": None,
    "at_probability": None,
    "mean_difference_db": None,
    "peak_difference_db": None,
    "peak_between_samples_difference_db": None,
    "papr_difference_db": None,
    "levels": [],
    "channels": None,
    "against_law": None,
    "waveform": None,
    "warnings": [],
}
"""Nothing known yet."""

_PLAIN = ReadHints()
_FIGURES = ("mean_dbfs", "peak_dbfs", "peak_between_samples_dbfs", "papr_db")


def check(
    stimulus: Stimulus,
    *,
    tolerance_db: float = TOLERANCE_DB,
    question: Question | None = None,
    workers: int = 1,
    progress: Progress = silent,
) -> dict[str, Any]:
    """Compare the files of a stimulus with what its sidecar says of them, and with their law.

    Parameters
    ----------
    stimulus : Stimulus
        Its sidecar, and which of its files are meant.
    tolerance_db : float
        Largest difference of a level that still matches, dB; at least 0.
    question : Question, optional
        What *agrees with the law* means; as the sidecar says if not given.
    workers, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    dict
        JSON values: one entry for each file, and the verdict of all: ``differ`` if one differs,
        else ``undecided`` if one is. ``is_complete`` is False where a file is missing or cannot
        be read. ``against_law`` of each file says how it compares with the law of its recipe, and
        ``differs_from_law`` whether one does.

    Notes
    -----
    A file whose bytes, length, rate and datatype are those of the sidecar matches; nothing is
    measured then. Any other is read as a loop, and its mean, peaks, PAPR and the levels of its
    CCDF are compared. A loop's figures are exact, but a level with fewer than ten samples beyond
    it hangs on those few: it is ``undecided``, and so is the file if only such levels differ.
    What matches so far is held against the samples that its recipe makes, which tell what no power
    statistic can: other data, another constellation.

    The law is that of the recipe in the sidecar. What equal bytes came to stands there already,
    unless another question is asked; everything else is judged from the file.
    """
    referee = Referee.of(stimulus, question, workers=workers, progress=progress)
    files = [
        check_file(
            stimulus,
            item,
            tolerance_db=tolerance_db,
            referee=referee,
            workers=workers,
            progress=progress,
        )
        for item in stimulus.items
    ]
    files += [_check_table(stimulus, item) for item in stimulus.document["side_information"] or ()]
    verdicts = [row["verdict"] for row in files]
    law_verdicts = [verdict for row in files for verdict in law_verdicts_of(row)]
    return {
        "format": f"{FORMAT}.check",
        "version": 1,
        "name": stimulus.document["recipe"]["name"],
        "title": stimulus.document["title"],
        "sidecar": str(stimulus.path),
        "verdict": _worst(verdicts),
        "is_complete": all(row["is_readable"] for row in files),
        "tolerance_db": tolerance_db,
        "differs_from_law": "differs" in law_verdicts,
        "files": files,
    }


def _worst(verdicts: list[Verdict]) -> Verdict:
    order: tuple[Verdict, ...] = ("differ", "undecided")
    return next((verdict for verdict in order if verdict in verdicts), "match")


def check_file(
    stimulus: Stimulus,
    item: dict[str, Any],
    *,
    tolerance_db: float,
    referee: Referee,
    workers: int = 1,
    progress: Progress = silent,
) -> dict[str, Any]:
    """Compare one file with its entry in the sidecar.

    Parameters
    ----------
    stimulus : Stimulus
        Its sidecar.
    item : dict
        The entry.
    tolerance_db, workers, progress
        As in :func:`check`.
    referee : Referee
        Judges it by its law.

    Returns
    -------
    dict
        JSON values; differences are those of the file from the sidecar, dB.
    """
    row = _MISSING | {"name": item["name"]}
    path = stimulus.path.parent / item["name"]
    try:
        is_equal = sha512_of(path, progress) == item["sha512"]
        row["hash"] = "equal" if is_equal else "differs"
        row["verdict"] = "undecided" if is_equal else "differ"
        recordings = [stimulus.open(item, hints) for hints in _hints(item)]
    except FileError as error:
        return row | {"reasons": [str(error)]}
    recording = recordings[0]
    row |= {"is_readable": True, "warnings": loop_warnings(recording)}
    facts = _other_facts(recording, stimulus.document, item)
    if facts:
        return row | {"verdict": "differ", "compared_by": "facts", "reasons": facts}
    is_same = is_equal and recording.datatype.name == item["datatype"]
    with suppress(SignalError, FileError):  # what cannot be measured is told below
        row["against_law"] = referee.judge(item, recordings, is_same=is_same)
    if is_same:
        return row | _SAME
    stated = item["channels"] or [item]
    found = [
        _measured(one, figures, tolerance_db, workers, progress)
        for one, figures in zip(recordings, stated, strict=True)
    ]
    row |= _together(found)
    if row["verdict"] == "match":
        with suppress(SignalError, FileError):
            row |= _against_recipe([referee.waveform(*pair) for pair in _numbered(recordings)])
    return row


def _numbered(recordings: list[Recording]) -> list[tuple[Recording, int]]:
    return [(recording, number) for number, recording in enumerate(recordings)]


def _against_recipe(found: list[dict[str, Any] | None]) -> dict[str, Any]:
    """Return what the samples themselves tell that no power statistic can.

    Other data, or QPSK where 64QAM is meant, leave the CCDF as it is.
    """
    errors = [item["error_percent"] for item in found if item is not None]
    row: dict[str, Any] = {"waveform": found if errors else None}
    worst = max(errors, default=0.0)
    if worst <= SAME_WAVEFORM_PERCENT:
        return row
    evm = [one["percent"] for item in found if item is not None for one in item["evm"]]
    text = (
        "its power statistics match, its samples are not those of its recipe: error of the "
        f"waveform {worst:.3g} %, the gain fitted"
    )
    text += f", EVM of the symbols up to {max(evm):.3g} %" if evm else ""
    return row | {"verdict": "differ", "compared_by": "waveform", "reasons": [text]}


def _check_table(stimulus: Stimulus, item: dict[str, Any]) -> dict[str, Any]:
    """Compare a table of side information with its entry: by its bytes alone."""
    row = _MISSING | {"name": item["name"]}
    try:
        is_equal = sha512_of(stimulus.path.parent / item["name"]) == item["sha512"]
    except FileError as error:
        return row | {"reasons": [str(error)]}
    row |= {"is_readable": True, "compared_by": "hash"}
    if is_equal:
        return row | {"hash": "equal", "verdict": "match"}
    reasons = ["it is not the table that was written with the stimulus"]
    return row | {"hash": "differs", "verdict": "differ", "reasons": reasons}


def _hints(item: dict[str, Any]) -> list[ReadHints]:
    """Return how each channel of a file is read."""
    channels = item["channels"]
    return [ReadHints(channel=number) for number in range(len(channels))] if channels else [_PLAIN]


def _together(found: list[dict[str, Any]]) -> dict[str, Any]:
    """Return the comparison of a file from those of its channels; the worst stands for both."""
    if len(found) == 1:
        return found[0]
    order = {verdict: rank for rank, verdict in enumerate(("differ", "undecided", "match"))}
    worst = min(found, key=lambda row: order[row.get("verdict", "undecided")])
    reasons = [
        f"channel {number}: {reason}"
        for number, row in enumerate(found)
        for reason in row["reasons"]
    ]
    return worst | {"reasons": reasons, "channels": found}


def _other_facts(recording: Recording, document: dict[str, Any], item: dict[str, Any]) -> list[str]:
    found = []
    if recording.n_samples != item["n_samples"]:
        found.append(f"has {recording.n_samples} samples, the sidecar says {item['n_samples']}")
    if float(recording.sample_rate_hz) != document["sample_rate_hz"]:
        stated = format_hz(document["sample_rate_hz"])
        found.append(f"has the rate {format_hz(recording.sample_rate_hz)}, stated is {stated}")
    return found


def _measured(
    recording: Recording,
    item: dict[str, Any],
    tolerance_db: float,
    workers: int,
    progress: Progress,
) -> dict[str, Any]:
    subject = Subject(name=recording.path.name, signal=looped(recording), loops=True)
    try:
        found = measure(subject, workers=workers, progress=progress)
    except SignalError as error:
        reasons = [f"is no signal any more: {error.problem}"]
        return {"verdict": "differ", "compared_by": "statistics", "reasons": reasons}
    except FileError as error:
        return {"is_readable": False, "reasons": [str(error)]}
    return compare_figures(item, found, tolerance_db=tolerance_db)


def compare_figures(
    stated: dict[str, Any], found: dict[str, Any], *, tolerance_db: float
) -> dict[str, Any]:
    """Compare two sets of figures of loops of one length.

    Parameters
    ----------
    stated, found : dict
        As :func:`wavegen.production.sidecar.power_figures` gives them.
    tolerance_db : float
        Largest difference that still matches, dB.

    Returns
    -------
    dict
        ``verdict``, reasons, and every difference (``found`` less ``stated``), dB.
    """
    levels = _compare_levels(stated, found, tolerance_db)
    single = {key: round(found[key] - stated[key], 6) for key in _FIGURES}
    resolved = [row for row in levels if row["verdict"] != "undecided"]
    reasons = [
        f"{words} differs by {single[key]:+.3f} dB"
        for key, words in zip(
            _FIGURES, ("the mean", "the peak", "the peak between samples", "the PAPR"), strict=True
        )
        if abs(single[key]) > tolerance_db
    ]
    reasons += [
        f"the level at {row['probability']:g} differs" + _by(row["difference_db"])
        for row in resolved
        if row["verdict"] == "differ"
    ]
    verdict: Verdict = "differ" if reasons else "match"
    doubtful = [row for row in levels if row["verdict"] == "undecided" and row["is_beyond"]]
    if verdict == "match" and (doubtful or not resolved):
        verdict = "undecided"
        reasons = [
            f"the level at {row['probability']:g} differs{_by(row['difference_db'])}, with fewer "
            "than ten samples beyond it"
            for row in doubtful
        ] or ["the loop is so short that no level has ten samples beyond it"]
    largest = max(resolved, key=_size, default=None)
    return {
        "verdict": verdict,
        "compared_by": "statistics",
        "reasons": reasons,
        "largest_difference_db": largest["difference_db"] if largest else None,
        "at_probability": largest["probability"] if largest else None,
        "mean_difference_db": single["mean_dbfs"],
        "peak_difference_db": single["peak_dbfs"],
        "peak_between_samples_difference_db": single["peak_between_samples_dbfs"],
        "papr_difference_db": single["papr_db"],
        "levels": [{k: v for k, v in row.items() if k != "is_beyond"} for row in levels],
    }


def _compare_levels(
    stated: dict[str, Any], found: dict[str, Any], tolerance_db: float
) -> list[dict[str, Any]]:
    others = {row["probability"]: row for row in found["levels"]}
    rows = []
    for row in stated["levels"]:
        other = others.get(row["probability"])
        if other is None:
            continue
        difference = _difference(row["level_db"], other["level_db"])
        is_beyond = difference is None or abs(difference) > tolerance_db
        is_resolved = row["resolved"] and other["resolved"]
        rows.append(
            {
                "probability": row["probability"],
                "stated_db": row["level_db"],
                "found_db": other["level_db"],
                "difference_db": difference,
                "verdict": ("differ" if is_beyond else "match") if is_resolved else "undecided",
                "is_beyond": is_beyond,
            }
        )
    return rows


def _difference(stated_db: float | None, found_db: float | None) -> float | None:
    """Return the difference of two levels; None where one of them alone is minus infinity."""
    if stated_db is None or found_db is None:
        return 0.0 if stated_db is found_db else None
    return round(found_db - stated_db, 4)


def _size(row: dict[str, Any]) -> float:
    difference = row["difference_db"]
    return math.inf if difference is None else abs(difference)


def _by(difference_db: float | None) -> str:
    return " without bound" if difference_db is None else f" by {difference_db:+.3f} dB"
