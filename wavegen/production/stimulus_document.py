"""The document of a stimulus: what was made, how, and what its codes measure."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import asdict, dataclass
from typing import Any

import numpy as np

from wavegen.files.datatypes import Datatype
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw
from wavegen.meters.power import PowerStatistics
from wavegen.production.bench import PathLevel
from wavegen.production.export import ChannelCodes, ExportedFile
from wavegen.production.judgement import Judgement, worst
from wavegen.production.law_rows import law_document, process_rows
from wavegen.production.prepare import Prepared
from wavegen.production.sidecar import (
    FORMAT,
    PAPR_NOTE,
    SAFETY,
    VERSION,
    gaussian_reference,
    grid_db,
    in_db,
    note_rows,
    on_figures,
    power_figures,
    rounded,
    seam_row,
    versions,
)
from wavegen.production.waveform import Waveform


@dataclass(frozen=True, slots=True, kw_only=True)
class MadeChannel:
    """One channel of a stimulus, for the sidecar.

    Parameters
    ----------
    prepared : Prepared
        Its graph.
    waveform : Waveform
        What was rendered.
    law : Law or NoLaw
        What its power statistics must be, or why nobody can say.
    judgements : tuple of (Judgement or None)
        How each file compares with it.
    """

    prepared: Prepared
    waveform: Waveform
    law: Law | NoLaw
    judgements: tuple[Judgement | None, ...]

    @property
    def no_law(self) -> str | None:
        """Why there is no law."""
        return self.law.reason if isinstance(self.law, NoLaw) else None

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
    exceeded: Sequence[str] = (),
    best_of: dict[str, Any] | None = None,
    side_information: list[dict[str, Any]] | None = None,
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
    exceeded : sequence of str
        Ratings that are exceeded, and accepted.
    best_of : dict, optional
        How its seed was chosen among several.
    side_information : list of dict, optional
        Files beside it that a receiver needs.

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
        "process": process_rows(first),
        "law": law_document(channels[0].law, worst(channels[0].judgements)),
        "no_law": channels[0].no_law,
        "best_of": best_of,
        "side_information": side_information,
        "bench": bench_rows(
            levels, recipe.bench.averaged_over if recipe.bench else "period", exceeded
        ),
        "files": [
            file_row(item, duties, [channel.judgements[number] for channel in channels])
            for number, item in enumerate(files)
        ],
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
        "law": law_document(channel.law, worst(channel.judgements)),
        "no_law": channel.no_law,
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


def bench_rows(
    levels: Sequence[PathLevel], averaged_over: str, exceeded: Sequence[str] = ()
) -> dict[str, Any] | None:
    """Return the levels along the path, None without a bench."""
    if not levels:
        return None
    rows = []
    for level in levels:
        if level.number is None:  # the generator's output, which has a place only if it is rated
            continue
        row = {k: v for k, v in asdict(level).items() if v is not None and k != "number"}
        rows.append({k: rounded(v, 3) if isinstance(v, float) else v for k, v in row.items()})
    return {
        "levels_are": "at the input of each place",
        "averaged_over": averaged_over,
        "path": rows,
        "accepted_risks": list(exceeded),
    }


def file_row(
    item: ExportedFile,
    duties: Sequence[float | None],
    judgements: Sequence[Judgement | None] = (None,),
) -> dict[str, Any]:
    """Return one file's entry; ``channels`` is null where it has one."""
    rows = [
        channel_figures(codes, item.datatype, duty, judgement)
        for codes, duty, judgement in zip(item.channels, duties, judgements, strict=True)
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


def channel_figures(
    item: ChannelCodes, datatype: Datatype, duty: float | None, judgement: Judgement | None
) -> dict[str, Any]:
    """Return the figures of one channel of a file."""
    verdict = None
    if judgement is not None:
        verdict = {"verdict": judgement.verdict, "statement": judgement.statement}
    return {
        "rounding_noise_dbc": rounding_noise_dbc(item.statistics, datatype),
        **power_figures(item.statistics, item.peak),
        "on_time": on_figures(item, duty),
        "process": process_rows(item),
        "against_law": verdict,
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
