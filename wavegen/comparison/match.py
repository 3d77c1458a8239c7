"""Is the stimulus like the field? One curve against the other, as a document."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

from wavegen.comparison.difference import (
    DOWN_TO,
    TOLERANCE_DB,
    Difference,
    DifferenceRow,
    Needed,
    Verdict,
    as_recorded,
    compare,
)
from wavegen.comparison.look_alike import LookAlike, look_alikes
from wavegen.comparison.sides import Side, SideSettings, open_side
from wavegen.comparison.spectra import (
    SpectrumDifference,
    refuse_too_narrow,
    side_spectrum,
    spectrum_difference,
    spectrum_warnings,
)
from wavegen.comparison.starting_recipe import starting_recipe
from wavegen.core.allocation import keep_large_blocks
from wavegen.core.progress import Progress, silent
from wavegen.production.sidecar import FORMAT, rounded, versions

QUIET = "levels below -20 dB count as -20 dB: how quiet an off-time is does not matter"


@dataclass(frozen=True, slots=True, kw_only=True)
class MatchSettings:
    """What a match means.

    Parameters
    ----------
    tolerance_db : float
        Largest difference of levels that still is a match.
    down_to : float
        Least probability compared.
    looks : bool
        Whether familiar laws near the field's curve are wanted.
    """

    tolerance_db: float = TOLERANCE_DB
    down_to: float = DOWN_TO
    looks: bool = True


DEFAULT = MatchSettings()


def match(
    stimulus: SideSettings,
    field: SideSettings,
    settings: MatchSettings = DEFAULT,
    *,
    workers: int = 1,
    progress: Progress = silent,
) -> dict[str, Any]:
    """Compare the power statistics of a stimulus and of the field.

    Parameters
    ----------
    stimulus, field : SideSettings
        Both sides.
    settings : MatchSettings
        What a match means.
    workers, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    dict
        JSON values; ``verdict`` is ``match``, ``differ`` or ``undecided``. Differences are those
        of the stimulus from the field: positive where the stimulus is the more stressful.

    Raises
    ------
    FileError, RecipeError, SignalError
        A side cannot be read, made or measured, or cannot hold what the other one is.
    ArgumentsError
        A setting that means nothing.
    """
    keep_large_blocks()
    first, second = (
        open_side(side, workers=workers, progress=progress) for side in (stimulus, field)
    )
    found = compare(
        first.curve, second.curve, tolerance_db=settings.tolerance_db, down_to=settings.down_to
    )
    recorded = compare(
        as_recorded(first.curve),
        as_recorded(second.curve),
        tolerance_db=settings.tolerance_db,
        down_to=settings.down_to,
    )
    reason = _fault_reason(first, second, recorded)
    verdict: Verdict = "differ" if reason else found.verdict
    spectra = _spectra((first, second), workers=workers, progress=progress)
    looks: tuple[LookAlike, ...] = ()
    if settings.looks:
        lowest = _lowest(second, settings.down_to)
        looks = look_alikes(second.curve, lowest=lowest) if lowest is not None else ()
    width_hz = spectra.second.occupied.width_hz if spectra else None
    warnings = [
        (name, text)
        for side, name in zip((first, second), _called(first, second), strict=True)
        for text in side.warnings
    ]
    doubts = spectrum_warnings((first, second), spectra) if spectra else []
    doubts += _gate_doubts(first, second)
    warnings += [("comparison", text) for text in doubts]
    return {
        "format": f"{FORMAT}.match",
        "version": 1,
        "verdict": verdict,
        "statement": reason or statement(found, recorded, *_called(first, second)),
        "tolerance_db": found.tolerance_db,
        "down_to": found.down_to,
        "largest_difference_db": _figure(found.largest_db),
        "largest_at": found.largest_at,
        "resolved_to": found.resolved_to,
        "decisive": row_document(found.decisive) if found.decisive else None,
        "levels": [row_document(row) for row in found.rows],
        "levels_are": f"over each side's own mean; {QUIET}",
        "mean_difference": _mean_difference(first, second),
        "as_recorded": {
            "is": "these samples alone, not what they are a sample of",
            "verdict": recorded.verdict,
            "largest_difference_db": _figure(recorded.largest_db),
            "largest_at": recorded.largest_at,
        },
        "needed": needed_document(found.needed) if found.needed and not reason else None,
        "stimulus": side_document(first),
        "field": side_document(second),
        "spectrum": spectrum_document(spectra) if spectra else None,
        "looks_like": [look_document(item, width_hz) for item in looks],
        "versions": versions(),
        "warnings": [{"kind": "warning", "where": where, "text": text} for where, text in warnings],
    }


def statement(found: Difference, recorded: Difference, first: str, second: str) -> str:
    """Return the verdict as a sentence."""
    reach = f"within {found.tolerance_db:g} dB down to {_percent(found.down_to)}"
    row = found.decisive
    if found.verdict == "match" or row is None:
        return f"match: {first} and {second} agree {reach}"
    if found.verdict == "differ":
        side = "above" if row.difference_db > 0 else "below"
        return (
            f"differ: at {_percent(row.probability)} {first} stands "
            f"{abs(row.difference_db):.2f} dB {side} {second}, surely between "
            f"{_bound(row.widest_low_db)} and {_bound(row.widest_high_db)} dB"
        )
    text = f"undecided: whether {first} and {second} agree {reach} cannot be told"
    if recorded.verdict == "differ" and recorded.largest_db is not None:
        text += (
            f"; as recorded they differ by up to {recorded.largest_db:+.2f} dB "
            f"(at {_percent(recorded.largest_at or 0.0)}), "
            "which records of one process this short may do"
        )
    if found.needed is None:
        return text
    more = [
        f"{count:.2g} samples of {name}"
        for count, name in (
            (found.needed.first_samples, first),
            (found.needed.second_samples, second),
        )
        if count is not None
    ]
    return f"{text}; about {' and '.join(more)} more would decide ({found.needed.times:.2g} times)"


def _fault_reason(first: Side, second: Side, recorded: Difference) -> str:
    """Return why fill words make two sides differ; empty if they do not.

    They are no part of the process that a recording samples, so that no interval about it
    allows for them.
    """
    sides = (first, second)
    faulty = max(range(2), key=lambda k: sides[k].fault_db)
    lifted_db = sides[faulty].fault_db
    if recorded.verdict != "differ" or lifted_db <= recorded.tolerance_db:
        return ""
    name = _called(first, second)[faulty]
    largest = f"{recorded.largest_db:+.2f} dB" if recorded.largest_db is not None else "much"
    return (
        f"differ: fill words lift the mean of {name} by {lifted_db:.2f} dB, so that its levels "
        f"are off by as much (largest difference {largest}); leave them out with --from"
    )


def _called(first: Side, second: Side) -> tuple[str, str]:
    """Return what the sides are called: by their names where these tell them apart."""
    if first.name != second.name:
        return first.name, second.name
    return "the stimulus", "the field"


def _percent(probability: float) -> str:
    return f"{100 * float(f'{probability:.2g}'):g} %"


def _bound(level_db: float) -> str:
    return f"{level_db:+.2f}" if math.isfinite(level_db) else "any"


def _lowest(side: Side, down_to: float) -> float | None:
    """Return the least probability of the usual series that one side resolves."""
    rows = compare(side.curve, side.curve, tolerance_db=1.0, down_to=down_to)
    return rows.resolved_to


def _spectra(
    sides: tuple[Side, Side], *, workers: int, progress: Progress
) -> SpectrumDifference | None:
    spectra = [side_spectrum(side, workers=workers, progress=progress) for side in sides]
    if spectra[0] is None or spectra[1] is None:
        return None
    found = spectrum_difference(spectra[0], spectra[1])
    refuse_too_narrow(sides, found)
    return found


def _gate_doubts(first: Side, second: Side) -> list[str]:
    """Return what a gate on one side alone makes doubtful."""
    if (first.duty is None) == (second.duty is None):
        return []
    gated, whole = (first, second) if first.duty is not None else (second, first)
    text = (
        f"of {gated.name} the on-time is compared ({100 * (gated.duty or 0):.3g} % of the time), "
        f"of {whole.name} all of the time"
    )
    return [text]


def _mean_difference(first: Side, second: Side) -> dict[str, Any] | None:
    """Return the difference of the means where both are absolute, with its interval."""
    if first.scale != "dBm" or second.scale != "dBm":
        return None
    means = first.mean_db, second.mean_db
    if means[0] is None or means[1] is None:
        return None
    difference = means[0] - means[1]
    down = math.hypot(
        means[0] - _or(first.mean_low_db, means[0]), _or(second.mean_high_db, means[1]) - means[1]
    )
    up = math.hypot(
        _or(first.mean_high_db, means[0]) - means[0], means[1] - _or(second.mean_low_db, means[1])
    )
    return {
        "difference_db": rounded(difference, 4),
        "low_db": rounded(difference - down, 4),
        "high_db": rounded(difference + up, 4),
    }


def _or(value: float | None, other: float) -> float:
    return other if value is None else value


# Documents --------------------------------------------------------------------------------


def _figure(value: float | None) -> float | None:
    return None if value is None else rounded(value, 4)


def row_document(row: DifferenceRow) -> dict[str, Any]:
    """Return one probability as JSON values; what is not finite is null."""
    return {
        "probability": row.probability,
        "stimulus_db": rounded(row.first_db, 4),
        "field_db": rounded(row.second_db, 4),
        "difference_db": rounded(row.difference_db, 4),
        "low_db": rounded(row.low_db, 4),
        "high_db": rounded(row.high_db, 4),
        "surely_low_db": rounded(row.widest_low_db, 4),
        "surely_high_db": rounded(row.widest_high_db, 4),
        "resolved": row.is_resolved,
        "verdict": row.verdict,
    }


def needed_document(needed: Needed) -> dict[str, Any]:
    """Return how much more is needed as JSON values."""
    return {
        "times": rounded(needed.times, 3),
        "at_probability": needed.at_probability,
        "more_stimulus_samples": needed.first_samples,
        "more_field_samples": needed.second_samples,
    }


def side_document(side: Side) -> dict[str, Any]:
    """Return what one side is as JSON values."""
    unit = side.scale.lower()
    return {
        "name": side.name,
        "is": side.is_,
        "sample_rate_hz": side.sample_rate_hz,
        "n_samples": side.n_samples,
        "duty": side.duty,
        f"mean_{unit}": _figure(side.mean_db),
        f"mean_low_{unit}": _figure(side.mean_low_db),
        f"mean_high_{unit}": _figure(side.mean_high_db),
        f"peak_{unit}": _figure(side.peak_db),
        "is_exact": side.curve.is_exact,
    }


def spectrum_document(found: SpectrumDifference) -> dict[str, Any]:
    """Return two spectra beside each other as JSON values."""
    return {
        "stimulus_occupied_hz": rounded(found.first.occupied.width_hz, 1),
        "field_occupied_hz": rounded(found.second.occupied.width_hz, 1),
        "centre_offset_hz": rounded(found.offset_hz, 1),
        "largest_difference_db": rounded(found.largest_db, 3),
        "band_hz": [round(float(x), 1) for x in found.band_hz],
        "difference_db": [round(float(x), 3) for x in found.difference_db],
        "is": "power in each band over the total, stimulus less field, centre on centre",
    }


def look_document(item: LookAlike, width_hz: float | None) -> dict[str, Any]:
    """Return a familiar law as JSON values, with a recipe to start from."""
    parameter = item.family.parameter
    return {
        "law": item.family.name,
        **({parameter: round(item.value, 2)} if parameter else {}),
        "duty": round(item.duty, 4),
        "largest_deviation_db": rounded(item.largest_deviation_db, 3),
        "at_probability": item.at_probability,
        "is_near": item.is_near,
        "recipe": starting_recipe(item, width_hz=width_hz),
    }
