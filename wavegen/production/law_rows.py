"""A law, and how files compare with it, as JSON values."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

import numpy as np
from numpy.typing import NDArray

from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw
from wavegen.meters.intervals import CONFIDENCE, SampledStatistics
from wavegen.production.export import ChannelCodes
from wavegen.production.judgement import ON_TIME, WHOLE, Judgement
from wavegen.production.measured_rows import PROCESS, sampled_levels
from wavegen.production.sidecar import (
    GRID_STEP_DB,
    LOWEST_PROBABILITY,
    PROBABILITIES,
    rounded,
)

LOWEST_DB = -30.0


def law_document(law: Law | NoLaw, judgement: Judgement | None) -> dict[str, Any] | None:
    """Return a law's curve on a 0.05 dB grid down to 1e-9, and how the files compare.

    Parameters
    ----------
    law : Law or NoLaw
        No law gives None.
    judgement : Judgement or None
        Of the file that stands for all.
    """
    if isinstance(law, NoLaw) or judgement is None:
        return None
    return {
        **curve_rows(law, PROBABILITIES),
        "n_instants": getattr(law, "n_instants", None),
        **judgement_rows(judgement),
    }


def curve_rows(law: Law, probabilities: Iterable[float]) -> dict[str, Any]:
    """Return a law's name, levels and highest peak, and its curve from -30 dB down to 1e-9."""
    levels = [float(law.level_db(q)) for q in probabilities]
    grid = level_grid(float(law.level_db(LOWEST_PROBABILITY)))
    return {
        "name": law.name,
        "holds": law.holds,
        "peak_db": rounded(law.peak_db, 4),
        "lowest_probability": float(getattr(law, "lowest_probability", 0.0)),
        "levels": [
            {"probability": q, "level_db": rounded(level, 4)}
            for q, level in zip(probabilities, levels, strict=True)
        ],
        "level_db": [round(float(x), 2) for x in grid],
        "probability": [float(x) for x in law.ccdf(grid)],
    }


def level_grid(top_db: float) -> NDArray[np.float64]:
    """Return levels from -30 dB to just over a level, 0.05 dB apart."""
    count = int(np.ceil((top_db - LOWEST_DB) / GRID_STEP_DB)) + 2
    steps: NDArray[np.float64] = np.arange(count, dtype=np.float64)
    return LOWEST_DB + GRID_STEP_DB * steps


def judgement_rows(judgement: Judgement) -> dict[str, Any]:
    """Return a verdict as JSON values, with what it rests on."""
    found = judgement.comparison
    return {
        "verdict": judgement.verdict,
        "statement": judgement.statement,
        "about": judgement.about,
        "of": judgement.of,
        "tolerance_db": None if found is None else found.tolerance_db,
        "down_to": judgement.down_to,
        "needed_samples": None if found is None else found.needed_samples,
        "compared": []
        if found is None
        else [
            {
                "probability": row.probability,
                "law_db": rounded(row.law_level_db, 4),
                "level_db": rounded(row.level_db, 4),
                "low_db": rounded(row.low_db, 4),
                "high_db": rounded(row.high_db, 4),
                "is_within": row.is_within,
                "detectable_db": rounded(row.detectable_db, 4),
            }
            for row in found.levels
        ],
        "moments": []
        if found is None
        else [
            {
                "order": row.order,
                "law": rounded(row.law_value),
                "value": rounded(row.value),
                "low": rounded(row.low),
                "high": rounded(row.high),
                "detectable_percent": rounded(row.detectable_percent, 4),
            }
            for row in found.moments
        ],
    }


def process_rows(item: ChannelCodes) -> dict[str, Any] | None:
    """Return what the codes tell of the process behind them, None where that was not asked.

    Of what is switched on and off, of its on-time.
    """
    if item.sampled is None:
        return None
    sample = SampledStatistics.of(item.sampled)
    return {
        "is": PROCESS,
        "of": WHOLE if item.on_statistics is None else ON_TIME,
        "confidence": CONFIDENCE,
        "n_samples": item.sampled.statistics.n_samples,
        "levels": sampled_levels(sample, PROBABILITIES),
    }
