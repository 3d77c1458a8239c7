"""What was measured, as JSON values: levels with their intervals, and views apart."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from typing import Any

import numpy as np

from wavegen.core.errors import ArgumentsError
from wavegen.laws.papr_symbol import LevelCrossing
from wavegen.meters.averaging import average_offset_db
from wavegen.meters.burst_powers import BurstPowers
from wavegen.meters.faults import RecordCheck
from wavegen.meters.intervals import CONFIDENCE, SampledStatistics
from wavegen.meters.passband import PEAK_OVER_ENVELOPE_DB, PassbandStatistics
from wavegen.meters.power_statistics import PROBABILITIES, PowerStatistics
from wavegen.meters.record_peak import record_peak
from wavegen.meters.statistic_names import PASSBAND, PER_SYMBOL, SENSOR
from wavegen.meters.symbol_papr import SymbolPaprStatistics
from wavegen.meters.time_share import time_share, time_share_absolute
from wavegen.production.measure_settings import AskedLevel, SensorSettings
from wavegen.production.sidecar import curves, grid_db, rounded

PROCESS = "the process it samples"
MOST_BURSTS = 1000
"""Bursts that are written out one by one."""
SYMBOL_SHARES = (0.1, 0.01, 1e-3, 1e-4)
FEWEST_SYMBOLS = 10
"""Beyond a level from which it counts as resolved."""


def asked_probabilities(probabilities: Iterable[float]) -> tuple[float, ...]:
    """Return the usual probabilities and those asked for, falling."""
    return tuple(sorted({*PROBABILITIES, *probabilities}, reverse=True))


def exact_levels(
    statistics: PowerStatistics, probabilities: Iterable[float]
) -> list[dict[str, Any]]:
    """Return levels of these very samples, dB over their mean; resolved from 10 samples beyond."""
    return [
        {
            "probability": row.probability,
            "level_db": rounded(row.level_db, 4),
            "resolved": bool(row.resolved),
        }
        for row in statistics.levels(probabilities)
    ]


def sampled_levels(
    sample: SampledStatistics, probabilities: Iterable[float]
) -> list[dict[str, Any]]:
    """Return levels with their intervals; resolved from 10 clusters beyond, null where open."""
    return [
        {
            "probability": row.probability,
            "level_db": rounded(row.level_db, 4),
            "low_db": rounded(row.low_db, 4),
            "high_db": rounded(row.high_db, 4),
            "resolved": row.resolved and not sample.says_nothing,
        }
        for row in sample.levels(probabilities)
    ]


def sampled_curve(sample: SampledStatistics) -> dict[str, Any]:
    """Return the CCDF with its intervals on the level grid."""
    level = grid_db(sample.statistics)
    low, high = sample.ccdf_interval(level)
    return {
        "level_db": [round(float(x), 2) for x in level],
        "probability": [float(x) for x in sample.statistics.ccdf(level)],
        "low": [float(x) for x in low],
        "high": [float(x) for x in high],
    }


def process_rows(
    sample: SampledStatistics,
    *,
    n_samples: int,
    n_turns: int | None,
    sample_rate_hz: float,
    probabilities: Iterable[float],
) -> dict[str, Any]:
    """Return the statement about the process behind a record, or behind a loop's data.

    Parameters
    ----------
    sample : SampledStatistics
        Of a recording, or of one data period of a loop.
    n_samples : int
        Length of that, off-times included.
    n_turns : int or None
        How often a loop holds its data period; None for recordings.
    sample_rate_hz : float
        Hz.
    probabilities : iterable of float
        Of the levels.
    """
    low_db, high_db = sample.mean_interval_db()
    needed = sample.next_decade()
    document: dict[str, Any] = {
        "is": PROCESS,
        "confidence": CONFIDENCE,
        "n_samples": n_samples,
        "n_data_periods": n_turns,
        "says": "too short to tell anything" if sample.says_nothing else None,
        "mean_low_dbfs": rounded(low_db, 4),
        "mean_high_dbfs": rounded(high_db, 4),
        "likeness_of_neighbours": rounded(sample.drift, 4),
        "levels": sampled_levels(sample, probabilities),
        "next_decade": None,
    }
    if n_turns is not None:
        document["ccdf"] = sampled_curve(sample)
    if needed is not None and not sample.says_nothing:
        times = needed.times
        document["next_decade"] = {
            "probability": needed.probability,
            "n_samples": math.ceil(n_samples * times),
            "duration_s": n_samples * times / sample_rate_hz,
            "times": rounded(times, 3),
        }
    return document


def time_rows(
    asked: Sequence[AskedLevel],
    statistics: PowerStatistics,
    sample: SampledStatistics | None,
    reference_level_dbm: float | None,
) -> list[dict[str, Any]]:
    """Return the share of time above and below each level asked for.

    Raises
    ------
    ArgumentsError
        A level in dBm where 0 dBFS has none.
    """
    rows = []
    for item in asked:
        if item.unit == "dB":
            share = time_share(statistics, item.level_db, reference_level_dbm=reference_level_dbm)
        elif item.unit == "dBm" and reference_level_dbm is None:
            raise ArgumentsError(
                where="--above",
                problem=f"{item.level_db:g} dBm is asked, and nothing says how much 0 dBFS is",
                allowed="dB over the mean, or dBFS; dBm with --reference-level",
                remedy="Add --reference-level, such as --reference-level -20dBm.",
            )
        else:
            over = reference_level_dbm or 0.0 if item.unit == "dBm" else 0.0
            share = time_share_absolute(
                statistics, item.level_db - over, reference_level_dbm=reference_level_dbm
            )
        row = share.row()
        if sample is not None:
            low, high = sample.ccdf_interval(share.level_db)
            n_runs = float(sample.n_runs(share.level_db)[0])
            row |= {
                "above_low_percent": 100 * float(low[0]),
                "above_high_percent": 100 * float(high[0]),
                "resolved": share.resolved and n_runs >= 1 and not sample.says_nothing,
            }
        rows.append(row)
    return rows


def averages(statistics: PowerStatistics) -> dict[str, Any]:
    """Return what averages of another kind read over the mean power, dB."""
    return {
        "is": "what an average of decibels or of volts would read over the mean power, dB",
        "of_decibels_db": rounded(average_offset_db(statistics, "log"), 3),
        "of_volts_db": rounded(average_offset_db(statistics, "voltage"), 3),
    }


def peak_rows(*, duration_s: float, bandwidth_hz: float | None) -> dict[str, Any] | None:
    """Return where the peak of a noise-like record of this length lies; None if too short."""
    if not bandwidth_hz or duration_s * bandwidth_hz < 10:
        return None
    found = record_peak(time_bandwidth=duration_s * bandwidth_hz)
    return {
        "is": "peak of 95 % of noise-like records of this length and bandwidth, dB over the mean",
        "bandwidth_hz": rounded(bandwidth_hz, 1),
        "time_bandwidth": rounded(found.time_bandwidth, 1),
        "low_db": rounded(found.low_db, 3),
        "median_db": rounded(found.median_db, 3),
        "high_db": rounded(found.high_db, 3),
    }


def rf_rows(statistics: PowerStatistics, probabilities: Iterable[float]) -> dict[str, Any]:
    """Return the levels of the RF waveform itself, which are not those of its envelope."""
    rf = PassbandStatistics(envelope=statistics)
    asked = np.array([*probabilities])
    return {
        "is": PASSBAND,
        "papr_db": rounded(rf.papr_db),
        "peak_over_envelope_db": rounded(PEAK_OVER_ENVELOPE_DB, 4),
        "levels": [
            {"probability": float(q), "level_db": rounded(level, 4)}
            for q, level in zip(asked, rf.level_db(asked), strict=True)
        ],
    }


def sensor_rows(
    seen: PowerStatistics,
    signal: PowerStatistics,
    sensor: SensorSettings,
    probabilities: Iterable[float],
    *,
    sample: SampledStatistics | None = None,
    loops: bool = False,
) -> dict[str, Any]:
    """Return what a sensor reads, and by how much it reads low.

    Parameters
    ----------
    seen, signal : PowerStatistics
        Of the readings, and of the signal itself.
    sensor : SensorSettings
        What the sensor is.
    probabilities : iterable of float
        Of the levels.
    sample : SampledStatistics, optional
        What the readings tell of the process: of a recording in ``levels`` and ``ccdf``, of a
        loop in ``process_levels``.
    loops : bool
        Whether a loop is among what was measured.
    """
    rate_hz, asked = sensor.sensor_rate_hz, tuple(probabilities)
    of_record = sample if not loops else None
    rows = sampled_levels(of_record, asked) if of_record else exact_levels(seen, asked)
    for row in rows:
        true_db = float(signal.level_db(row["probability"]))
        row["shortfall_db"] = (
            None if row["level_db"] is None else rounded(true_db - row["level_db"], 4)
        )
    document = {
        "is": SENSOR,
        "video_bandwidth_hz": sensor.video_bandwidth_hz,
        "shape": sensor.shape if sensor.video_bandwidth_hz is not None else None,
        "sensor_rate_hz": None if rate_hz is None else float(rate_hz),
        "n_samples": seen.n_samples,
        "papr_db": rounded(seen.papr_db),
        "peak_shortfall_db": rounded(signal.papr_db - seen.papr_db, 4),
        "levels": rows,
        "ccdf": sampled_curve(of_record) if of_record else curves(seen)["ccdf"],
    }
    if sample is not None:
        document["confidence"] = CONFIDENCE
        if loops:
            document["process_levels"] = sampled_levels(sample, asked)
    return document


def symbol_rows(
    found: Sequence[SymbolPaprStatistics], law: LevelCrossing | None
) -> dict[str, Any] | None:
    """Return the PAPR per symbol: a statistic of symbols, never one of instantaneous power."""
    if not found:
        return None
    means = {"ensemble": "the mean power of all symbols", "symbol": "the symbol's own mean power"}
    return {
        "is": PER_SYMBOL,
        "n_symbols": found[0].n_symbols,
        "n_silent": found[0].n_silent,
        "interpolation": found[0].interpolation,
        "over": [
            {
                "mean": item.reference,
                "is": f"highest power within each useful symbol over {means[item.reference]}",
                "highest_db": rounded(item.highest_db, 4),
                "levels": [
                    {
                        "share_of_symbols": share,
                        "papr_db": rounded(float(item.papr_db(share)), 3),
                        "resolved": share * item.n_symbols >= FEWEST_SYMBOLS,
                    }
                    for share in SYMBOL_SHARES
                ],
            }
            for item in found
        ],
        "law": None
        if law is None
        else {
            "name": law.name,
            "levels": [
                {"share_of_symbols": share, "papr_db": rounded(float(law.papr_db(share)), 4)}
                for share in SYMBOL_SHARES
            ],
        },
    }


def burst_rows(powers: BurstPowers) -> dict[str, Any]:
    """Return the bursts that share a level, the highest first, and each by itself."""
    with np.errstate(divide="ignore"):
        mean_db = 10 * np.log10(powers.mean)
        peak_db = 10 * np.log10(powers.peak)
    groups = []
    for members in powers.levels():
        weights = powers.n_samples[members]
        mean = float(np.sum(weights * powers.mean[members]) / np.sum(weights))
        groups.append(
            {
                "mean_dbfs": rounded(10 * math.log10(mean) if mean > 0 else -math.inf, 4),
                "papr_db": rounded(float(powers.papr_db[members].max()), 4),
                "n_bursts": int(members.size),
                "n_samples": int(np.sum(weights)),
            }
        )
    shown = range(min(powers.mean.size, MOST_BURSTS))
    return {
        "n_bursts": int(powers.mean.size),
        "median_samples": float(np.median(powers.stop_sample - powers.start_sample)),
        "at_one_level": groups[:MOST_BURSTS],
        "each": [
            {
                "start_sample": int(powers.start_sample[k]),
                "stop_sample": int(powers.stop_sample[k]),
                "n_samples": int(powers.n_samples[k]),
                "mean_dbfs": rounded(float(mean_db[k]), 4),
                "peak_dbfs": rounded(float(peak_db[k]), 4),
                "papr_db": rounded(float(powers.papr_db[k]), 4),
            }
            for k in shown
        ],
    }


def fault_rows(check: RecordCheck | None) -> list[dict[str, Any]]:
    """Return the faults of a record, each with its place, effect and remedy."""
    return [] if check is None else [fault.row() for fault in check.faults]


def fault_text(row: dict[str, Any]) -> str:
    """Say a fault in one line."""
    size = f"{row['size']:.4g} {row['unit']}"
    return f"{row['fault']} ({row['where']}, {size}): {row['effect']}. {row['remedy']}"
