"""The bench sheet: what to set, what every place will see, and in which order to work."""

from __future__ import annotations

import math
from collections.abc import Collection, Sequence
from typing import Any

from wavegen.core.progress import Progress, silent
from wavegen.core.render import Tap, render, samples_of
from wavegen.core.signal import Signal
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
from wavegen.production.bench_legality import legality
from wavegen.production.bench_mistakes import SheetFacts, edges, mistakes
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
    longest = None
    if bursts is not None:
        longest = max(stop - start for start, stop in bursts.runs) / float(signal.sample_rate_hz)
    return SheetFacts(
        longest_burst_s=longest,
        first_sample_db=_sample_db(signal, 0, mean_power),
        last_sample_db=_sample_db(signal, signal.n_samples - 1, mean_power),
        bandwidth_hz=occupied_bandwidth(found["spectrum"]).width_hz,
        unreduced_papr_db=None if unreduced is None else _papr_db(unreduced, workers, progress),
    )


def _sample_db(signal: Signal, index: int, mean_power: float) -> float | None:
    power = abs(complex(samples_of(signal, index, index + 1)[0])) ** 2
    return 10 * math.log10(power / mean_power) if power > 0 else None


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


def bench_sheet(
    bench: Bench,
    document: dict[str, Any],
    facts: SheetFacts,
    *,
    first: dict[str, Any] | None = None,
) -> dict[str, Any]:
    """Return the sheet of one channel of a stimulus as a document.

    Parameters
    ----------
    bench : Bench
        Of the recipe.
    document : dict
        The sidecar: realised means and peaks are taken from the codes that were written.
    facts : SheetFacts
        The rest.
    first : dict, optional
        The sidecar as it is about the first channel, whose level the bench names.

    Returns
    -------
    dict
        ``set``, ``path``, ``generator``, ``mistakes``, ``edges``, ``sensors``, ``averaging``,
        ``before``, ``after``, ``cautions``.

    Notes
    -----
    Powers are those of the codes; voltages are ``sqrt(2 P R)`` of the peak envelope power. With a
    reflection coefficient ``g`` the voltage on the line reaches ``1 + g`` times that, twice at an
    open end, and ``g^2`` of the power comes back.
    """
    period_db = document["mean_dbfs"]
    on_time = document["on_time"]
    burst_db = on_time["mean_dbfs"] if on_time else period_db
    named_db = _named_db(bench, document)
    channel = document.get("channel")
    levels = path_levels(
        bench,
        document["peak_between_samples_dbfs"] - named_db,
        over_first_db=named_db - _named_db(bench, first) if first else 0.0,
        channel=channel,
        burst_s=facts.longest_burst_s,
        burst_over_average_db=burst_db - named_db,
    )
    source = generator_level(bench, levels)
    period_dbm = source.average_dbm + period_db - named_db
    everywhere = [source, *levels]
    accepted = (document.get("bench") or {}).get("accepted_risks", ())
    return {
        "title": document["title"] or document["recipe"]["name"],
        "channel": channel,
        "file": document["files"][0]["name"],
        "sha512": document["files"][0]["sha512"],
        "averaged_over": bench.averaged_over,
        "impedance_ohm": bench.impedance_ohm,
        "allowances": {
            "level_uncertainty_db": bench.level_uncertainty_db,
            "overshoot_db": bench.overshoot_db,
        },
        "set": {
            "if_it_means_rms_dbm": period_dbm,
            "if_it_means_full_scale_dbm": period_dbm - period_db,
            "back_off_db": -period_db,
            "average_over_period_dbm": period_dbm,
            "average_over_burst_dbm": period_dbm - period_db + burst_db if on_time else None,
            "peak_envelope_dbm": source.peak_envelope_dbm,
        },
        "path": _path(bench, source, levels, accepted),
        "generator": legality(bench.generator or Generator(), document),
        "mistakes": mistakes(facts, everywhere, named_db - period_db, -period_db),
        "edges": edges(facts, levels, named_db - period_db),
        "sensors": _sensors(bench, facts),
        "averaging": _averaging(document, facts),
        "before": list(BEFORE),
        "after": list(AFTER),
        "cautions": list(CAUTIONS),
    }


def _named_db(bench: Bench, document: dict[str, Any]) -> float:
    """Return the mean power that the bench's average is of, dB over full scale."""
    on_time = document["on_time"]
    found: float = document["mean_dbfs"]
    if bench.averaged_over == "burst" and on_time:
        found = on_time["mean_dbfs"]
    return found


def _path(
    bench: Bench, source: PathLevel, levels: Sequence[PathLevel], accepted: Collection[str]
) -> list[dict[str, Any]]:
    """Return the generator's output and the input of every place; a generator has no input."""
    rows = [_place(None, source, bench.impedance_ohm, accepted)]
    for stage, level in zip(bench.path, levels, strict=True):
        row = _place(stage, level, bench.impedance_ohm, accepted)
        if stage.role == "generator":
            rows[0]["ratings"] += row["ratings"]
        else:
            rows.append(row)
    return rows


def _place(
    stage: PathStage | None, level: PathLevel, ohm: float, accepted: Collection[str]
) -> dict[str, Any]:
    volts = peak_volts(level.peak_envelope_dbm, ohm)
    gamma = reflection(stage) if stage is not None else 0.0
    is_stated = stage is not None and stage.vswr is not None
    returned_db = 20 * math.log10(gamma) if gamma else None
    return {
        "name": level.name,
        "role": level.role,
        "at": "output" if stage is None else "input",
        "average_dbm": level.average_dbm,
        "average_w": watts(level.average_dbm),
        "peak_envelope_dbm": level.peak_envelope_dbm,
        "peak_envelope_w": watts(level.peak_envelope_dbm),
        "peak_v": volts,
        "worst_peak_v": volts * (1 + gamma) if is_stated else None,
        "open_peak_v": 2 * volts,
        "reflected_dbm": None if returned_db is None else level.average_dbm + returned_db,
        "reflected_peak_dbm": None
        if returned_db is None
        else level.peak_envelope_dbm + returned_db,
        "ratings": [
            {
                "name": f"{level.name}.{rating.key}",
                "what": rating.what,
                "value": rating.text(rating.value),
                "limit": rating.text(rating.limit),
                "allowance_db": rating.allowance_db,
                "margin_db": rating.margin_db,
                "is_accepted": f"{level.name}.{rating.key}" in accepted,
            }
            for rating in level.ratings
        ],
    }


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
    width_hz = max(facts.bandwidth_hz, 1 / loop_s)
    times = [CLUSTERS / (probability * width_hz) for probability in PROBABILITIES]
    return [
        {"probability": probability, "at_least_s": needed, "is_held_by_loop": needed <= loop_s}
        for probability, needed in zip(PROBABILITIES, times, strict=True)
    ]
