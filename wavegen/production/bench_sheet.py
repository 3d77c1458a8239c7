"""The bench sheet: what to set, what every place will see, and in which order to work."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from wavegen.core.progress import Progress, silent
from wavegen.core.render import Tap, render, samples_of
from wavegen.core.signal import Signal
from wavegen.core.units import format_hz, format_s
from wavegen.dsp.bursts import Bursts
from wavegen.meters.occupied_bandwidth import occupied_bandwidth
from wavegen.meters.peak import peak_between_samples
from wavegen.meters.power import PowerMeter
from wavegen.meters.spectrum import SpectrumMeter
from wavegen.production.bench import (
    PathLevel,
    generator_level,
    path_levels,
    peak_volts,
    reflection,
    watts,
)
from wavegen.recipe.bench import Bench, Generator, PathStage

PROBABILITIES = (0.1, 0.01, 0.001, 1e-4, 1e-5)
CLUSTERS = 10
"""Separate peaks that must be caught before a share of time can be trusted."""
CAUTIONS = (
    "Peaks destroy: the peak envelope power decides, not the average.",
    "Check it against every rating in the path, those of cables, connectors and loads too.",
    "Work into a load or through an attenuator; an open or shorted line reflects the power.",
    "Radiate only with a licence and under local rules, within the exposure limits that apply.",
    "Where a level can destroy a device or hurt someone, qualified people decide.",
)
BEFORE = (
    "RF off. Read the ratings of everything in the path and enter them in the recipe's bench.",
    "Load the file and compare its SHA-512 with the one on this sheet.",
    "Connect the load or the attenuation first, the generator last.",
    "Set the clock; set the level 20 dB below the one on this sheet.",
    "RF on. Raise the level in steps while watching average and peak at the last place.",
    "Stop where a reading leaves this sheet by more than its allowance, and find out why.",
)
AFTER = (
    "Lower the level by 20 dB or more.",
    "RF off; only then stop playing, so that no last sample is held at power.",
    "Disconnect the generator first, the load last.",
)


@dataclass(frozen=True, slots=True, kw_only=True)
class SheetFacts:
    """What a sheet needs beyond a sidecar.

    Parameters
    ----------
    longest_burst_s : float or None
        Longest on-time, s; None for a signal that is on all the time.
    last_sample_db : float or None
        Power of the last sample over the mean of the loop, dB; None if it is zero.
    bandwidth_hz : float
        That holds 99 % of the power, Hz.
    unreduced_papr_db : float or None
        PAPR between samples, over the loop's mean, of the same recipe without crest-factor
        reduction, dB; None if there is none in it.
    """

    longest_burst_s: float | None
    last_sample_db: float | None
    bandwidth_hz: float
    unreduced_papr_db: float | None


def sheet_facts(
    signal: Signal,
    *,
    mean_power: float,
    bursts: Bursts | None = None,
    unreduced: Signal | None = None,
    workers: int = 1,
    progress: Progress = silent,
) -> SheetFacts:
    """Measure what a sheet needs beyond a sidecar.

    Parameters
    ----------
    signal : Signal
        The loop.
    mean_power : float
        Its mean, on its own scale.
    bursts : Bursts, optional
        When it is on.
    unreduced : Signal, optional
        The same without crest-factor reduction.
    workers, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    SheetFacts

    Raises
    ------
    SignalError
        There is no power in the loop.
    """
    meter = SpectrumMeter(n_fft=1 << max(min(12, (signal.n_samples // 8).bit_length() - 1), 3))
    found = render(
        signal,
        taps=(Tap(name="spectrum", signal=signal, meter=meter),),
        workers=workers,
        progress=progress,
        task="reading for the bench sheet",
    )
    last = abs(complex(samples_of(signal, signal.n_samples - 1, signal.n_samples)[0])) ** 2
    longest = None
    if bursts is not None:
        longest = max(stop - start for start, stop in bursts.runs) / float(signal.sample_rate_hz)
    return SheetFacts(
        longest_burst_s=longest,
        last_sample_db=10 * math.log10(last / mean_power) if last > 0 else None,
        bandwidth_hz=occupied_bandwidth(found["spectrum"]).width_hz,
        unreduced_papr_db=None if unreduced is None else _papr_db(unreduced, workers, progress),
    )


def _papr_db(signal: Signal, workers: int, progress: Progress) -> float:
    found = render(
        signal,
        taps=(Tap(name="power", signal=signal, meter=PowerMeter()),),
        workers=workers,
        progress=progress,
        task="without crest reduction",
    )
    statistics = found["power"]
    peak = peak_between_samples(signal, statistics)
    return 10 * math.log10(peak.power) - float(statistics.mean_db)


def bench_sheet(bench: Bench, document: dict[str, Any], facts: SheetFacts) -> dict[str, Any]:
    """Return the sheet of one stimulus as a document.

    Parameters
    ----------
    bench : Bench
        Of the recipe.
    document : dict
        The sidecar: realised means and peaks are taken from the codes that were written.
    facts : SheetFacts
        The rest.

    Returns
    -------
    dict
        ``set``, ``path``, ``generator``, ``mistakes``, ``sensors``, ``averaging``, ``before``,
        ``after``, ``cautions``.

    Notes
    -----
    Powers are those of the codes; voltages are ``sqrt(2 P R)`` of the peak envelope power. With a
    reflection coefficient ``g`` the voltage on the line reaches ``1 + g`` times that, twice at an
    open end, and ``g^2`` of the power comes back.
    """
    period_db = document["mean_dbfs"]
    on_time = document["on_time"]
    burst_db = on_time["mean_dbfs"] if on_time else period_db
    named_db = burst_db if bench.averaged_over == "burst" else period_db
    papr_db = document["peak_between_samples_dbfs"] - named_db
    levels = path_levels(
        bench,
        papr_db,
        burst_s=facts.longest_burst_s,
        burst_over_average_db=burst_db - named_db,
    )
    source = generator_level(bench, levels)
    period_dbm = source.average_dbm + period_db - named_db
    places: list[tuple[PathStage | None, PathLevel]] = [(None, source)]
    places += zip(bench.path, levels, strict=True)
    return {
        "title": document["title"] or document["recipe"]["name"],
        "file": document["files"][0]["name"],
        "sha512": document["files"][0]["sha512"],
        "averaged_over": bench.averaged_over,
        "impedance_ohm": bench.impedance_ohm,
        "set": {
            "if_it_means_rms_dbm": period_dbm,
            "if_it_means_full_scale_dbm": period_dbm - period_db,
            "back_off_db": -period_db,
            "average_over_period_dbm": period_dbm,
            "average_over_burst_dbm": period_dbm - period_db + burst_db if on_time else None,
            "peak_envelope_dbm": source.peak_envelope_dbm,
        },
        "path": [_place(stage, level, bench.impedance_ohm) for stage, level in places],
        "generator": _legality(bench.generator or Generator(), document),
        "mistakes": _mistakes(facts, levels, named_db - period_db),
        "sensors": _sensors(bench, facts),
        "averaging": _averaging(document, facts),
        "before": list(BEFORE),
        "after": list(AFTER),
        "cautions": list(CAUTIONS),
    }


def _place(stage: PathStage | None, level: PathLevel, ohm: float) -> dict[str, Any]:
    volts = peak_volts(level.peak_envelope_dbm, ohm)
    gamma = reflection(stage) if stage is not None else 0.0
    returned = level.average_dbm + 20 * math.log10(gamma) if gamma else None
    return {
        "name": level.name,
        "role": level.role,
        "at": "output" if stage is None else "input",
        "average_dbm": level.average_dbm,
        "average_w": watts(level.average_dbm),
        "peak_envelope_dbm": level.peak_envelope_dbm,
        "peak_envelope_w": watts(level.peak_envelope_dbm),
        "peak_v": volts,
        "worst_peak_v": volts * (1 + gamma),
        "open_peak_v": 2 * volts,
        "reflected_dbm": returned,
        "ratings": [
            {
                "name": f"{level.name}.{rating.key}",
                "what": rating.what,
                "value": rating.text(rating.value),
                "limit": rating.text(rating.limit),
                "margin_db": rating.margin_db,
            }
            for rating in level.ratings
        ],
    }


def _legality(limits: Generator, document: dict[str, Any]) -> list[dict[str, Any]]:
    """Return what of the file the generator takes, and what would be legal instead."""
    rate, n_samples = document["sample_rate_hz"], document["n_samples"]
    bits = {item["bits"] or _bits(item["datatype"]) for item in document["files"]}
    rows = [
        _row("duration", format_s(document["duration_s"]), "", is_met=True),
        _row("data", f"{n_samples * 4 / 1e6:.6g} MB as 16-bit I and Q", "", is_met=True),
    ]
    least, most = limits.clock_least_hz, limits.clock_most_hz
    if least is not None or most is not None:
        span = (
            f"{format_hz(least or 0)} to {format_hz(most)}"
            if most
            else f"from {format_hz(least or 0)}"
        )
        is_met = (least or 0) <= rate <= (most or math.inf)
        rows.append(_row("clock", format_hz(rate), span, is_met=is_met))
    if limits.memory_samples is not None or limits.least_samples > 1:
        high = limits.memory_samples
        span = (
            f"{limits.least_samples} to {high} samples"
            if high
            else f"from {limits.least_samples} samples"
        )
        is_met = limits.least_samples <= n_samples <= (high or n_samples)
        rows.append(_row("length", f"{n_samples} samples", span, is_met=is_met))
    if limits.granularity_samples > 1:
        step = limits.granularity_samples
        over = n_samples % step
        near = f"{n_samples - over} or {n_samples - over + step}" if over else ""
        instead = f"a multiple of {step}" + (f": {near} samples" if near else "")
        rows.append(_row("granularity", f"{n_samples} samples", instead, is_met=not over))
    if limits.word_bits is not None:
        widest = max(bits)
        rows.append(
            _row(
                "word",
                f"{widest} bits",
                f"{limits.word_bits} bits are converted",
                is_met=widest >= limits.word_bits,
            )
        )
    return rows


def _bits(datatype: str) -> int:
    digits = "".join(character for character in datatype.partition("_")[0] if character.isdigit())
    return int(digits) if digits else 16


def _row(what: str, value: str, allowed: str, *, is_met: bool) -> dict[str, Any]:
    return {"what": what, "value": value, "allowed": allowed, "is_met": is_met}


def _mistakes(
    facts: SheetFacts, levels: Sequence[PathLevel], named_over_period_db: float
) -> list[dict[str, Any]]:
    """Return what the device would see if something went wrong."""
    device = next(level for level in levels if level.role == "device")
    period_dbm = device.average_dbm - named_over_period_db
    found = []
    if facts.unreduced_papr_db is not None:
        peak = period_dbm + facts.unreduced_papr_db
        found.append(
            {
                "what": "the file without crest-factor reduction is loaded",
                "peak_envelope_dbm": peak,
                "over_db": peak - device.peak_envelope_dbm,
            }
        )
    if facts.last_sample_db is not None:
        held = period_dbm + facts.last_sample_db
        found.append(
            {
                "what": "playing stops and the last sample is held: a carrier",
                "peak_envelope_dbm": held,
                "over_db": held - device.peak_envelope_dbm,
            }
        )
    return found


def _sensors(bench: Bench, facts: SheetFacts) -> list[dict[str, Any]]:
    return [
        {
            "name": stage.name,
            "video_bandwidth_hz": stage.video_bandwidth_hz,
            "signal_bandwidth_hz": facts.bandwidth_hz,
            "follows": stage.video_bandwidth_hz >= facts.bandwidth_hz,
        }
        for stage in bench.path
        if stage.video_bandwidth_hz is not None
    ]


def _averaging(document: dict[str, Any], facts: SheetFacts) -> list[dict[str, Any]]:
    """Return how long a signal must be watched until ten separate peaks have passed.

    A signal has about as many independent values a second as it has bandwidth (common practice).
    A loop that is shorter brings no new peaks when it is played again.
    """
    loop_s = document["duration_s"]
    times = [CLUSTERS / (probability * facts.bandwidth_hz) for probability in PROBABILITIES]
    return [
        {"probability": probability, "at_least_s": needed, "is_held_by_loop": needed <= loop_s}
        for probability, needed in zip(PROBABILITIES, times, strict=True)
    ]
