"""What a comparison found, as JSON values; what is not finite is null."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from wavegen.comparison.difference import Difference, DifferenceRow
from wavegen.comparison.look_alike import LookAlike
from wavegen.comparison.needed_samples import Needed
from wavegen.comparison.side import Side
from wavegen.comparison.spectra import SpectrumDifference
from wavegen.comparison.starting_recipe import starting_recipe
from wavegen.production.sidecar import rounded


def figure(value: float | None) -> float | None:
    """Return a level in dB to four places."""
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


def recorded_document(recorded: Difference) -> dict[str, Any]:
    """Return how two records differ as they stand."""
    row = recorded.decisive
    return {
        "is": "these samples alone, not what they are a sample of",
        "verdict": recorded.verdict,
        "difference_db": figure(row.difference_db) if row else None,
        "at_probability": row.probability if row else None,
        "largest_difference_db": figure(recorded.largest_db),
        "largest_at": recorded.largest_at,
    }


def needed_documents(
    plans: Sequence[Needed], sides: tuple[Side, Side], names: tuple[str, str]
) -> list[dict[str, Any]]:
    """Return how much more would give which verdict, the more likely one first.

    Parameters
    ----------
    plans : sequence of Needed
        At most one for each verdict.
    sides : (Side, Side)
        Both.
    names : (str, str)
        What the sides are called in keys.
    """
    return [_needed_document(plan, sides, names) for plan in plans]


def _needed_document(
    plan: Needed, sides: tuple[Side, Side], names: tuple[str, str]
) -> dict[str, Any]:
    found: dict[str, Any] = {
        "shows": plan.shows,
        "if": "they are alike" if plan.shows == "match" else "the difference is not by chance",
        "times": rounded(plan.times, 3),
        "at_probability": plan.at_probability,
        "difference_db": figure(plan.difference_db),
    }
    for name, side, count in zip(
        names, sides, (plan.first_samples, plan.second_samples), strict=True
    ):
        rate_hz = side.sample_rate_hz
        found[f"more_{name}_samples"] = count
        found[f"more_{name}_s"] = count / rate_hz if count is not None and rate_hz else None
    return found


def side_document(side: Side) -> dict[str, Any]:
    """Return what one side is as JSON values."""
    unit = side.scale.lower()
    return {
        "name": side.name,
        "is": side.is_,
        "sample_rate_hz": side.sample_rate_hz,
        "n_samples": side.n_samples,
        "duty": side.duty,
        f"mean_{unit}": figure(side.mean_db),
        f"mean_low_{unit}": figure(side.mean_low_db),
        f"mean_high_{unit}": figure(side.mean_high_db),
        f"peak_{unit}": figure(side.peak_db),
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
