"""The sidecar of a stimulus: what was made, how, and what its codes measure."""

from __future__ import annotations

import csv
import io
import json
import math
import platform
import re
from collections.abc import Sequence
from dataclasses import asdict
from functools import cache
from importlib import metadata, resources
from typing import Any

import numpy as np
from numpy.typing import NDArray

from wavegen import __version__
from wavegen.core.site import Note
from wavegen.core.units import format_hz
from wavegen.meters.peak import BetweenSamplesPeak
from wavegen.meters.power import PowerStatistics
from wavegen.meters.seam import SeamFigure
from wavegen.production.export import ChannelCodes
from wavegen.production.prepare import Prepared

FORMAT = "wavegen.ccdf"
VERSION = 1
GRID_STEP_DB = 0.05
LOWEST_PROBABILITY = 1e-9
PROBABILITIES = (0.1, 0.01, 1e-3, 1e-4, 1e-5, 1e-6)
PAPR_NOTE = "of the complex envelope: an unmodulated carrier reads 0 dB"
TWO_CHANNELS = "; two coherent channels"
"""Ends the description of such a stimulus."""
_NUMBERS = re.compile(r"\[[-+0-9.eE,\s]+\]")
LIBRARIES = ("numpy", "scipy", "sigmf", "soundfile", "pydantic", "ruamel.yaml")
SAFETY = (
    "Check the peak envelope power against every rating in the path, use a load or an "
    "attenuator, radiate only with a licence and under local rules, keep within the exposure "
    "limits that apply, and leave the decision to qualified people."
)


@cache
def schema() -> dict[str, Any]:
    """Return the JSON Schema of a sidecar, as shipped in the package."""
    text = resources.files("wavegen.production").joinpath("sidecar.schema.json").read_text()
    found: dict[str, Any] = json.loads(text)
    return found


def rounded(value: float, digits: int = 6) -> float | None:
    """Return a figure for JSON: finite and rounded, None if there is none."""
    return round(float(value), digits) if np.isfinite(value) else None


def in_db(power: float | None) -> float | None:
    """Return a power for JSON in dB; None where there is none, or none is known."""
    return rounded(10 * np.log10(power)) if power else None


def level_rows(statistics: PowerStatistics) -> list[dict[str, Any]]:
    """Return the levels at 10 % ... 0.0001 %, dB over the mean."""
    return [
        {
            "probability": row.probability,
            "level_db": rounded(row.level_db, 4),
            "resolved": bool(row.resolved),
        }
        for row in statistics.levels(PROBABILITIES)
    ]


def grid_db(statistics: PowerStatistics) -> NDArray[np.float64]:
    """Return the level grid of a curve: 0.05 dB, from -30 dB to just over the peak."""
    top = int(np.ceil(statistics.papr_db / GRID_STEP_DB)) + 1
    low = round(-30 / GRID_STEP_DB)
    steps: NDArray[np.float64] = np.arange(low, max(top, low + 1) + 1, dtype=np.float64)
    return steps * GRID_STEP_DB


def curves(statistics: PowerStatistics) -> dict[str, Any]:
    """Return PDF, CDF and CCDF on the level grid.

    Notes
    -----
    The PDF is the share of time between one level and the next, per dB, so that it adds up to
    what lies on the grid; the CDF is ``1 - CCDF`` and counts exact zeros.
    """
    level = grid_db(statistics)
    ccdf = statistics.ccdf(level)
    pdf = -np.diff(ccdf, append=0.0) / GRID_STEP_DB
    at = [round(float(x), 2) for x in level]
    return {
        "ccdf": {"level_db": at, "probability": [float(x) for x in ccdf]},
        "cdf": {"level_db": at, "probability": [float(x) for x in 1 - ccdf]},
        "pdf": {"level_db": at, "per_db": [float(x) + 0.0 for x in pdf]},
    }


def power_figures(statistics: PowerStatistics, peak: BetweenSamplesPeak | None) -> dict[str, Any]:
    """Return mean, peaks, levels and curves of one set of codes.

    Parameters
    ----------
    statistics : PowerStatistics
        Of the codes.
    peak : BetweenSamplesPeak or None
        None where there is nothing between samples, as in a power series.
    """
    between_db = math.nan if peak is None else 10 * float(np.log10(peak.power))
    return {
        "mean_dbfs": rounded(statistics.mean_db),
        "peak_dbfs": rounded(statistics.peak_db),
        "peak_between_samples_dbfs": rounded(between_db),
        "papr_db": rounded(statistics.papr_db),
        "papr_between_samples_db": rounded(between_db - statistics.mean_db),
        "n_samples": statistics.n_samples,
        "n_zeros": statistics.n_zeros,
        "levels": level_rows(statistics),
        **curves(statistics),
    }


def on_figures(item: ChannelCodes, duty: float | None) -> dict[str, Any] | None:
    """Return the figures of the on-time, ramps excluded; None for what is never off."""
    statistics = item.on_statistics
    if statistics is None:
        return None
    return {
        "is": "while the signal is fully on, ramps excluded; levels over the mean of that time",
        "duty": duty,
        "n_samples": statistics.n_samples,
        "mean_dbfs": rounded(statistics.mean_db),
        "papr_db": rounded(statistics.papr_db),
        "papr_between_samples_db": rounded(10 * np.log10(item.peak.power) - statistics.mean_db),
        "levels": level_rows(statistics),
        "ccdf": curves(statistics)["ccdf"],
    }


def gaussian_reference(level_db: NDArray[np.float64]) -> dict[str, Any]:
    """Return the complex Gaussian's CCDF on a grid: ``exp(-x)``, x the power over the mean."""
    probability = np.exp(-(10 ** (level_db / 10)))
    return {
        "name": "complex Gaussian",
        "level_db": [round(float(x), 2) for x in level_db],
        "probability": [float(x) for x in probability],
    }


def note_rows(notes: Sequence[Note]) -> list[dict[str, Any]]:
    """Return notes as rows without empty cells."""
    return [{k: v for k, v in asdict(note).items() if v is not None} for note in notes]


def versions() -> dict[str, str]:
    """Return the versions of the program, Python and the libraries that shape the bytes."""
    found = {"wavegen": __version__, "python": platform.python_version()}
    return found | {name: metadata.version(name) for name in LIBRARIES}


def seam_row(seam: SeamFigure) -> dict[str, Any]:
    """Return the loop-seam figure as JSON values."""
    figures = asdict(seam) | {"excess_db": seam.excess_db, "is_clean": seam.is_clean}
    return {
        key: rounded(value, 2) if isinstance(value, float) else value
        for key, value in figures.items()
    }


def as_json(document: dict[str, Any]) -> str:
    """Return the sidecar's text: strict JSON, arrays of numbers on one line each."""
    plain = json.dumps(document, ensure_ascii=False, allow_nan=False, indent=1)
    return _NUMBERS.sub(lambda found: " ".join(found.group().split()), plain) + "\n"


def as_csv(document: dict[str, Any]) -> str:
    """Return the curves of the first file as comma-separated columns."""
    text = io.StringIO()
    rows = csv.writer(text, lineterminator="\n")
    rows.writerow(["level_db", "ccdf", "cdf", "pdf_per_db", "complex_gaussian_ccdf"])
    rows.writerows(
        zip(
            document["ccdf"]["level_db"],
            document["ccdf"]["probability"],
            document["cdf"]["probability"],
            document["pdf"]["per_db"],
            document["reference"]["probability"],
            strict=True,
        )
    )
    return text.getvalue()


def describe(prepared: Prepared) -> str:
    """Return one sentence about a stimulus, for formats with room for it."""
    recipe = prepared.loaded.recipe
    channels = TWO_CHANNELS if prepared.second else ""
    name = recipe.title or prepared.loaded.name
    return f"{name}; loops; {format_hz(recipe.sample_rate_hz)}{channels}"
