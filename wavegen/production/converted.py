"""The sidecar of a stimulus that was converted: what stays, what changes, what is checked anew."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import Any

from wavegen.core.errors import FileError, RecipeError, SignalError
from wavegen.core.site import Note
from wavegen.dsp.bursts import Bursts
from wavegen.files.format import Recording
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw
from wavegen.meters.seam import SeamFigure
from wavegen.production.bench import PathLevel, refuse_overload
from wavegen.production.export import ChannelCodes, ExportedFile
from wavegen.production.judgement import DEFAULT, Judgement, judge, law_of
from wavegen.production.law_rows import law_document, process_rows
from wavegen.production.prepare import prepare
from wavegen.production.sidecar import (
    gaussian_reference,
    grid_db,
    note_rows,
    on_figures,
    power_figures,
    rounded,
    seam_row,
    versions,
)
from wavegen.production.stimulus_document import file_row
from wavegen.recipe.load import load_text
from wavegen.stages.channel.gate import on_time

NO_RECIPE = NoLaw(reason="the file has no recipe")


@dataclass(frozen=True, slots=True, kw_only=True)
class Origin:
    """What the recipe in a sidecar still tells of the loop that is converted.

    Parameters
    ----------
    law : Law or NoLaw
        What the power statistics must be; none by name after a change of rate.
    bursts : Bursts or None
        When the loop is on, at its new rate; None if it is never off.
    notes : tuple of str
        What could not be carried over.
    """

    law: Law | NoLaw = NO_RECIPE
    bursts: Bursts | None = None
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Change:
    """What a conversion does to the samples.

    Parameters
    ----------
    source : Recording
        What was read.
    sha512 : str
        Of its data file.
    rate_factor : Fraction
        New rate over old.
    gain_db : float
        Power ratio, dB.
    channel : int or None
        Which channel was taken where there were two; None where all were.
    from_hz, to_hz : Fraction or None
        Intermediate frequency of the real samples that were read and written, Hz; None where
        they are complex, or where it is not known.
    """

    source: Recording
    sha512: str
    rate_factor: Fraction
    gain_db: float
    channel: int | None = None
    from_hz: Fraction | None = None
    to_hz: Fraction | None = None

    def document(self, earlier: dict[str, Any] | None) -> dict[str, Any]:
        """Return it as JSON values, with what an earlier conversion did."""
        source = self.source
        return {
            "from": source.path.name,
            "format": source.format,
            "datatype": source.datatype.name,
            "sha512": self.sha512,
            "sample_rate_hz": float(source.sample_rate_hz),
            "n_samples": source.n_samples,
            "rate_factor": str(self.rate_factor),
            "gain_db": rounded(self.gain_db),
            "channel": self.channel,
            "real": {"from_hz": _hz(self.from_hz), "to_hz": _hz(self.to_hz)},
            "before": earlier,
        }


def _hz(frequency_hz: Fraction | None) -> float | None:
    return None if frequency_hz is None else float(frequency_hz)


def channel_document(
    document: dict[str, Any], item: dict[str, Any], channel: int
) -> dict[str, Any]:
    """Return a sidecar as if it were of one channel alone.

    Parameters
    ----------
    document : dict
        A sidecar.
    item : dict
        The entry of the file that is read.
    channel : int
        Which of its channels.
    """
    figures = item["channels"][channel] if item["channels"] else item
    own = (document["second_channel"] if channel else None) or {}
    bench = document["bench"]
    if bench is not None:
        places = [row for row in bench["path"] if row.get("channel", channel) == channel]
        rows = [{key: value for key, value in row.items() if key != "channel"} for row in places]
        bench = bench | {"path": rows}
    alone = {"on_time": figures["on_time"], "second_channel": None, "bench": bench}
    return document | own | alone


def origin_of(
    document: dict[str, Any], *, folder: Path, rate_factor: Fraction, channel: int = 0
) -> Origin:
    """Read the recipe in a sidecar again, for what is compared anew.

    Parameters
    ----------
    document : dict
        The sidecar of the source.
    folder : Path
        Where its data files may be found.
    rate_factor : Fraction
        New rate over old.
    channel : int
        Which channel of its recipe it is.

    Returns
    -------
    Origin
    """
    recipe = document["recipe"]
    has_law, is_gated = document["law"] is not None, document["on_time"] is not None
    notes = []
    if has_law and rate_factor != 1:
        notes.append("the law of the recipe is not compared after a change of rate")
    if has_law and rate_factor != 1:
        none = NoLaw(reason="the law of the recipe is not compared after a change of rate")
    else:
        none = NoLaw(reason=document["no_law"] or "the law could not be carried over")
    if not is_gated and (not has_law or rate_factor != 1):
        return Origin(law=none, notes=tuple(notes))
    try:
        loaded = load_text(
            recipe["text"], name=recipe["name"], overrides=recipe["overrides"], folder=folder
        )
        prepared = prepare(loaded).channels[channel]
        law = law_of(prepared)
        bursts = on_time(prepared.built.signal)
    except (RecipeError, FileError, SignalError, IndexError) as error:
        lost = [
            word
            for word, is_lost in (("law", has_law and rate_factor == 1), ("on-time", is_gated))
            if is_lost
        ]
        notes.append(
            f"the {' and the '.join(lost)} could not be carried over: the recipe in the sidecar "
            f"cannot be built here ({error})"
        )
        return Origin(law=none, notes=tuple(notes))
    for earlier in _earlier_factors(document):
        rate_factor *= earlier
    if rate_factor != 1:
        moved = bursts.resampled(rate_factor) if bursts else None
        return Origin(law=none, bursts=moved, notes=tuple(notes))
    return Origin(law=law if has_law else none, bursts=bursts)


def _earlier_factors(document: dict[str, Any]) -> list[Fraction]:
    found = []
    converted = document.get("converted")
    while converted:
        found.append(Fraction(converted["rate_factor"]))
        converted = converted["before"]
    return found


@dataclass(frozen=True, slots=True, kw_only=True)
class ChannelOrigin:
    """What a sidecar says of one channel, and what its written codes are judged by.

    Parameters
    ----------
    before : dict
        The sidecar, as if it were of this channel alone.
    origin : Origin
        From :func:`origin_of`.
    seam : SeamFigure
        Of the written codes.
    """

    before: dict[str, Any]
    origin: Origin
    seam: SeamFigure

    @property
    def duty(self) -> float | None:
        """On-time over the loop, None for what is never off."""
        bursts = self.origin.bursts
        return float(bursts.duty) if bursts else None

    def rows(self, codes: ChannelCodes, judgement: Judgement | None, change: Change) -> Any:
        """Return what is about this channel alone, apart from its figures in the file."""
        law = self.origin.law
        cycle = self.before["loop"]["cycle_samples"] * change.rate_factor
        return {
            "loop": {"cycle_samples": cycle.numerator, "seam": seam_row(self.seam)},
            "mean": self.before["mean"],
            "scaling": _scaling(self.before["scaling"], codes, change),
            "law": law_document(law, judgement),
            "no_law": law.reason if isinstance(law, NoLaw) else None,
        }


def converted_document(
    before: dict[str, Any],
    file: ExportedFile,
    change: Change,
    *,
    channels: Sequence[ChannelOrigin],
    notes: list[Note],
) -> dict[str, Any]:
    """Return the sidecar of a converted stimulus.

    Parameters
    ----------
    before : dict
        The sidecar of the source.
    file : ExportedFile
        What was written; everything measured is measured on its codes.
    change : Change
        What was done.
    channels : sequence of ChannelOrigin
        One for each channel that was written.
    notes : list of Note
        What is doubtful about the conversion.

    Returns
    -------
    dict
        Valid by :func:`wavegen.production.sidecar.schema`.

    Raises
    ------
    TargetMissed
        A rating of the bench would be exceeded.
    """
    codes = file.channels[0]
    judgements = [
        judge(one.origin.law, found, file.datatype, DEFAULT)
        for one, found in zip(channels, file.channels, strict=True)
    ]
    rows = [
        one.rows(found, judgement, change)
        for one, found, judgement in zip(channels, file.channels, judgements, strict=True)
    ]
    duties = [one.duty for one in channels]
    rate_hz = change.source.sample_rate_hz * change.rate_factor
    notes = [*notes, *_left_behind(before)]
    return before | {
        "versions": versions(),
        "sample_rate_hz": float(rate_hz),
        "sample_rate_exact_hz": str(rate_hz),
        "n_samples": codes.statistics.n_samples,
        "duration_s": float(codes.statistics.n_samples / rate_hz),
        **rows[0],
        "second_channel": rows[1] if len(rows) > 1 else None,
        "side_information": None,
        "rounded": before["rounded"] + note_rows([n for n in notes if n.kind == "rounded"]),
        "warnings": before["warnings"] + note_rows([n for n in notes if n.kind == "warning"]),
        "notes": before["notes"] + note_rows([n for n in notes if n.kind == "info"]),
        **power_figures(codes.statistics, codes.peak),
        "on_time": on_figures(codes, duties[0]),
        "reference": gaussian_reference(grid_db(codes.statistics)),
        "process": process_rows(codes),
        "bench": _bench([one.before["bench"] for one in channels], file),
        "files": [file_row(file, duties, judgements)],
        "converted": change.document(before.get("converted")),
    }


def _left_behind(before: dict[str, Any]) -> list[Note]:
    """Note the tables of side information, which stay beside the source."""
    names = [item["name"] for item in before["side_information"] or ()]
    if not names:
        return []
    text = f"receivers still need {' and '.join(names)}, which stay beside the source"
    return [Note(kind="info", where="side_information", text=text)]


def _scaling(before: dict[str, Any], codes: ChannelCodes, change: Change) -> dict[str, Any]:
    """Return where the peaks and the average stand now; rails after a change of rate unknown."""
    peak_db = 10 * math.log10(codes.peak.power)
    is_same_rate = change.rate_factor == 1
    rails = {
        key: rounded(before[key] + change.gain_db)
        if is_same_rate and before[key] is not None
        else None
        for key in ("i_peak_dbfs", "q_peak_dbfs")
    }
    return {
        "gain_db": rounded(before["gain_db"] + change.gain_db),
        "peak_dbfs": rounded(peak_db),
        "average_dbfs": rounded(codes.statistics.mean_db),
        **rails,
    }


def _no_limits(row: dict[str, Any]) -> dict[str, Any]:
    """Return the ratings that every place is asked for, where a row leaves them out."""
    return {key: None for key in ("average_limit_dbm", "peak_limit_dbm") if key not in row}


def _bench(before: Sequence[dict[str, Any] | None], file: ExportedFile) -> dict[str, Any] | None:
    """Return the levels along the path of each channel with the peaks of what was written."""
    first = before[0]
    if first is None:
        return None
    found: list[dict[str, Any]] = []
    levels: list[PathLevel] = []
    for channel, (bench, codes) in enumerate(zip(before, file.channels, strict=True)):
        assert bench is not None  # noqa: S101 - both channels have it, or none
        named = {"channel": channel} if len(before) > 1 else {}
        rows = [row | named for row in _path_rows(bench, codes)]
        levels += [
            PathLevel(**row, **_no_limits(row), number=number) for number, row in enumerate(rows)
        ]
        found += rows
    refuse_overload(levels, accepted=first.get("accepted_risks", ()))
    return first | {"path": found}


def _path_rows(bench: dict[str, Any], codes: ChannelCodes) -> list[dict[str, Any]]:
    """Return the levels along the path of one channel, with the peak of what was written."""
    is_burst = bench["averaged_over"] == "burst" and codes.on_statistics is not None
    statistics = codes.on_statistics if is_burst else codes.statistics
    assert statistics is not None  # noqa: S101 - asked above
    papr_db = 10 * math.log10(codes.peak.power) - statistics.mean_db
    rows = []
    for row in bench["path"]:
        peak_dbm = rounded(row["average_dbm"] + papr_db, 3)
        moved = {"peak_envelope_dbm": peak_dbm}
        if "mixer_peak_dbm" in row:
            rise = peak_dbm - row["peak_envelope_dbm"]
            moved["mixer_peak_dbm"] = rounded(row["mixer_peak_dbm"] + rise, 3)
        rows.append(row | moved)
    return rows
