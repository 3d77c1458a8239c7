"""The sidecar of a stimulus: what was made, how, and what its codes measure."""

from __future__ import annotations

import csv
import io
import json
import math
import platform
import re
from collections.abc import Sequence
from dataclasses import asdict, dataclass
from functools import cache
from importlib import metadata, resources
from typing import Any

import numpy as np
from numpy.typing import NDArray

from wavegen import __version__
from wavegen.core.site import Note
from wavegen.core.units import format_hz
from wavegen.files.datatypes import Datatype
from wavegen.laws.law import Law
from wavegen.meters.peak import BetweenSamplesPeak
from wavegen.meters.power import PowerStatistics
from wavegen.meters.seam import SeamFigure
from wavegen.production.bench import PathLevel
from wavegen.production.export import ChannelCodes, ExportedFile
from wavegen.production.prepare import Prepared
from wavegen.production.waveform import Waveform

FORMAT = "wavegen.ccdf"
VERSION = 1
GRID_STEP_DB = 0.05
LOWEST_PROBABILITY = 1e-9
PROBABILITIES = (0.1, 0.01, 1e-3, 1e-4, 1e-5, 1e-6)
PAPR_NOTE = "of the complex envelope: an unmodulated carrier reads 0 dB"
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


def law_document(law: Law | None, verdict: str) -> dict[str, Any] | None:
    """Return a law's curve on a 0.05 dB grid down to 1e-9, and how the file compares."""
    if law is None:
        return None
    high = float(law.level_db(LOWEST_PROBABILITY))
    count = int(np.ceil((high + 30) / GRID_STEP_DB)) + 2
    level = -30 + np.arange(count) * GRID_STEP_DB
    return {
        "name": law.name,
        "holds": law.holds,
        "n_instants": getattr(law, "n_instants", None),
        "level_db": [round(float(x), 2) for x in level],
        "probability": [float(x) for x in law.ccdf(level)],
        "levels": [
            {"probability": q, "level_db": rounded(float(law.level_db(q)), 4)}
            for q in PROBABILITIES
        ],
        "verdict": verdict,
    }


def note_rows(notes: Sequence[Note]) -> list[dict[str, Any]]:
    """Return notes as rows without empty cells."""
    return [{k: v for k, v in asdict(note).items() if v is not None} for note in notes]


def versions() -> dict[str, str]:
    """Return the versions of the program, Python and the libraries that shape the bytes."""
    found = {"wavegen": __version__, "python": platform.python_version()}
    return found | {name: metadata.version(name) for name in LIBRARIES}


@dataclass(frozen=True, slots=True, kw_only=True)
class MadeChannel:
    """One channel of a stimulus, for the sidecar.

    Parameters
    ----------
    prepared : Prepared
        Its graph.
    waveform : Waveform
        What was rendered.
    law : Law or None
        Exact curve where there is one.
    verdict : {"agrees", "differs", "undecided"}
        How the files compare with it: one that differs makes it ``differs``.
    """

    prepared: Prepared
    waveform: Waveform
    law: Law | None
    verdict: str

    @property
    def duty(self) -> float | None:
        """On-time over the loop, None for what is never off."""
        bursts = self.waveform.bursts
        return float(bursts.duty) if bursts else None


def stimulus_document(
    channels: Sequence[MadeChannel],
    *,
    files: Sequence[ExportedFile],
    gain: float,
    levels: Sequence[PathLevel],
) -> dict[str, Any]:
    """Return the sidecar of a stimulus as JSON values.

    Parameters
    ----------
    channels : sequence of MadeChannel
        One or two. The top level is about the first; ``second_channel`` holds what is about the
        second alone, and ``channels`` of each file the figures of both.
    files : sequence of ExportedFile
        At least one; its figures stand at the top level too.
    gain : float
        Amplitude factor from unit mean power to full scale, of both channels.
    levels : sequence of PathLevel
        Along the bench's path; empty without a bench.

    Returns
    -------
    dict
        Valid by :func:`schema`.
    """
    prepared, waveform = channels[0].prepared, channels[0].waveform
    loaded = prepared.loaded
    recipe = loaded.recipe
    rate = recipe.sample_rate_hz
    first = files[0].channels[0]
    duties = [channel.duty for channel in channels]
    second = channel_rows(channels[1], gain) if len(channels) > 1 else None
    return {
        "format": FORMAT,
        "version": VERSION,
        "title": recipe.title,
        "recipe": {
            "name": loaded.name,
            "sha256": loaded.sha256,
            "text": loaded.text,
            "overrides": list(loaded.overrides),
        },
        "seed": recipe.seed,
        "versions": versions(),
        "sample_rate_hz": float(rate),
        "sample_rate_exact_hz": str(rate),
        "n_samples": waveform.statistics.n_samples,
        "duration_s": float(waveform.statistics.n_samples / rate),
        "full_scale": "0 dBFS is an envelope equal to one rail's full scale",
        "papr_is": PAPR_NOTE,
        "loop": {
            "cycle_samples": prepared.cycle_samples,
            "seam": seam_row(waveform.seam),
        },
        "mean": mean_rows(prepared, waveform),
        "scaling": scaling_rows(waveform, gain),
        "second_channel": second,
        "rounded": note_rows([n for n in prepared.notes if n.kind == "rounded"]),
        "warnings": note_rows([n for n in prepared.notes if n.kind == "warning"]),
        "notes": note_rows([n for n in prepared.notes if n.kind == "info"]),
        **power_figures(first.statistics, first.peak),
        "on_time": on_figures(first, duties[0]),
        "reference": gaussian_reference(grid_db(first.statistics)),
        "law": law_document(channels[0].law, channels[0].verdict),
        "bench": bench_rows(levels, recipe.bench.averaged_over if recipe.bench else "period"),
        "files": [file_row(item, duties) for item in files],
        "safety": SAFETY,
    }


def channel_rows(channel: MadeChannel, gain: float) -> dict[str, Any]:
    """Return what is about one channel alone, apart from its figures in each file."""
    return {
        "loop": {
            "cycle_samples": channel.prepared.cycle_samples,
            "seam": seam_row(channel.waveform.seam),
        },
        "mean": mean_rows(channel.prepared, channel.waveform),
        "scaling": scaling_rows(channel.waveform, gain),
        "law": law_document(channel.law, channel.verdict),
    }


def mean_rows(prepared: Prepared, waveform: Waveform) -> dict[str, Any]:
    """Return nominal and realised mean, dB over unit power; of the parts too."""
    return {
        "nominal_db": in_db(prepared.built.signal.mean_power),
        "realised_db": rounded(waveform.statistics.mean_db),
        "parts": part_rows(prepared, waveform),
    }


def scaling_rows(waveform: Waveform, gain: float) -> dict[str, Any]:
    """Return the gain to full scale and where it puts peaks and average."""
    return {
        "gain_db": rounded(20 * np.log10(gain)),
        "peak_dbfs": rounded(20 * np.log10(gain) + 10 * np.log10(waveform.peak.power)),
        "average_dbfs": rounded(20 * np.log10(gain) + waveform.statistics.mean_db),
        "i_peak_dbfs": in_db(gain**2 * waveform.rails.i),
        "q_peak_dbfs": in_db(gain**2 * waveform.rails.q),
    }


def seam_row(seam: SeamFigure) -> dict[str, Any]:
    """Return the loop-seam figure as JSON values."""
    figures = asdict(seam) | {"excess_db": seam.excess_db, "is_clean": seam.is_clean}
    return {
        key: rounded(value, 2) if isinstance(value, float) else value
        for key, value in figures.items()
    }


def part_rows(prepared: Prepared, waveform: Waveform) -> list[dict[str, Any]]:
    """Return nominal and realised mean of each part, dB over unit power."""
    return [
        {
            "path": part.path,
            "name": part.name,
            "nominal_db": in_db(part.signal.mean_power),
            "realised_db": in_db(waveform.part_means[part.path]),
        }
        for part in prepared.built.parts
    ]


def bench_rows(levels: Sequence[PathLevel], averaged_over: str) -> dict[str, Any] | None:
    """Return the levels along the path, None without a bench."""
    if not levels:
        return None
    rows = []
    for level in levels:
        row = {k: v for k, v in asdict(level).items() if v is not None}
        rows.append({k: rounded(v, 3) if isinstance(v, float) else v for k, v in row.items()})
    return {
        "levels_are": "at the input of each place",
        "averaged_over": averaged_over,
        "path": rows,
    }


def file_row(item: ExportedFile, duties: Sequence[float | None]) -> dict[str, Any]:
    """Return one file's entry; ``channels`` is null where it has one."""
    rows = [
        channel_figures(codes, item.datatype, duty)
        for codes, duty in zip(item.channels, duties, strict=True)
    ]
    datatype, centre_hz = item.datatype, item.centre_hz
    return {
        "name": item.names[0],
        "all_names": list(item.names),
        "format": item.format,
        "datatype": datatype.name,
        "bits": datatype.n_bits if datatype.is_padded else None,
        "align": datatype.align,
        "real": None if centre_hz is None else {"centre_hz": float(centre_hz)},
        "sha512": item.sha512,
        "n_saturated": item.n_saturated,
        **rows[0],
        "channels": rows if len(rows) > 1 else None,
    }


def channel_figures(item: ChannelCodes, datatype: Datatype, duty: float | None) -> dict[str, Any]:
    """Return the figures of one channel of a file."""
    return {
        "rounding_noise_dbc": rounding_noise_dbc(item.statistics, datatype),
        **power_figures(item.statistics, item.peak),
        "on_time": on_figures(item, duty),
    }


def rounding_noise_dbc(statistics: PowerStatistics, datatype: Datatype) -> float | None:
    """Return the power of rounding to codes over the mean power, dB; None for float codes.

    Notes
    -----
    A twelfth of a squared step on each rail, white: W. R. Bennett, Bell Syst. Tech. J. 27, 1948
    (from memory). It holds where the signal crosses many codes. The analytic signal of real
    samples has the noise of its one rail in both.
    """
    if not datatype.is_integer:
        return None
    step = 1.0 / datatype.full_scale
    return in_db(step**2 / 6 / statistics.mean)


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
    channels = "; two coherent channels" if prepared.second else ""
    name = recipe.title or prepared.loaded.name
    return f"{name}; loops; {format_hz(recipe.sample_rate_hz)}{channels}"
