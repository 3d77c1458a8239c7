"""A device's gain curve as JSON values."""

from __future__ import annotations

from typing import Any

import numpy as np

from wavegen.comparison.alignment import Alignment
from wavegen.comparison.assumptions import doubts
from wavegen.comparison.device_gain import DeviceGain
from wavegen.comparison.gain import Compression, points_at, resolved_to
from wavegen.comparison.match_document import figure, needed_documents, side_document
from wavegen.comparison.off_times import off_time_doubts
from wavegen.production.sidecar import FORMAT, rounded, versions

RULE_AT = 1e-4
RISE_DB = 0.02
"""No expansion is told that is less than this beyond its interval."""
DECADES = (0.1, 0.01, 1e-3, 1e-4, 1e-5)


def gain_document(found: DeviceGain, *, model: str | None) -> dict[str, Any]:
    """Return a gain curve as JSON values."""
    unit = "dbm" if found.source.scale == "dBm" and found.source.mean_db is not None else "db"
    origin_db = 0.0 if unit == "dbm" else found.means_db[0]
    gain_zero_db = 0.0 if found.is_absolute else found.small.gain_db
    first, third = (_compression_document(item, unit, origin_db) for item in found.falls)
    assumed = found.assumptions
    linearity = found.linearity
    both = found.source, found.output
    needed = needed_documents(found.needed, both, ("input", "output"))
    warnings = [
        (side.name, text) for side in (found.source, found.output) for text in side.warnings
    ]
    warnings += [("gain curve", text) for text in [*doubts(assumed), *off_time_doubts(both)]]
    if (found.source.scale == "dBm") != (found.output.scale == "dBm"):
        text = "one side is in dBm and the other is not: the gain is over that at low levels"
        warnings.append(("gain curve", text))
    return {
        "format": f"{FORMAT}.gain_curve",
        "version": 1,
        "verdict": linearity.verdict,
        "statement": _statement(found),
        "tolerance_db": linearity.tolerance_db,
        "down_to": linearity.down_to,
        "largest_difference_db": figure(linearity.largest_db),
        "needed": needed[0] if needed else None,
        "needed_otherwise": needed[1] if len(needed) > 1 else None,
        f"input_p1db_{unit}": first["input"] if first else None,
        f"input_p3db_{unit}": third["input"] if third else None,
        "compression": [item for item in (first, third) if item],
        "gain_is": "output over input, dB"
        if found.is_absolute
        else "over the gain at low levels, dB",
        "small_signal_gain_db": rounded(found.small.gain_db - gain_zero_db, 4),
        "small_signal_error_db": rounded(found.small.error_db, 4),
        "small_signal_is": "the gain that the curve tends to at low levels",
        "input_is": "levels over the mean input, dB",
        "gain": _gain_rows(found, unit, gain_zero_db),
        "expansion": _expansion(found, unit, origin_db),
        "levels": _level_rows(found),
        "rule_of_thumb": _rule(found),
        "mean_change_db": figure(_mean_compression(found)),
        "over_p1db": _over(found),
        "rapp": _rapp_document(found, origin_db, gain_zero_db),
        "aligned": _aligned_document(found.alignment),
        "assumptions": [
            {"name": item.name, "holds": item.holds, "says": item.says} for item in assumed
        ],
        "phase": "a turn of the phase does not show in power distributions",
        "model": model,
        "input": side_document(found.source),
        "output": side_document(found.output),
        "versions": versions(),
        "warnings": [{"kind": "warning", "where": where, "text": text} for where, text in warnings],
    }


def _statement(found: DeviceGain) -> str:
    verdict, tolerance_db = found.linearity.verdict, found.linearity.tolerance_db
    names = f"{found.source.name} and {found.output.name}"
    if verdict == "match":
        return f"match: the device is linear within {tolerance_db:g} dB ({names})"
    point = found.falls[0]
    if verdict == "differ":
        fall = float(found.small.gain_db - found.points.gain_db[-1])
        word = "compresses" if fall > 0 else "expands"
        text = f"differ: the device {word}, by {abs(fall):.2f} dB at the highest level resolved"
        rise = _rise(found)
        if fall > 0 and rise is not None:
            over_db = found.points.input_db[rise[0]] - found.means_db[0]
            text += f", after a rise of {rise[1]:.2f} dB at {over_db:+.2f} dB over the mean input"
        elif fall <= 0:
            text += "; a device that compresses looks so where input and output are exchanged"
    else:
        text = f"undecided: whether the device is linear within {tolerance_db:g} dB"
        if found.needed:
            text += f" would take about {found.needed[0].times:.2g} times as many samples"
        else:
            text += " cannot be told"
    if point is not None:
        over_db = point.input_db - found.means_db[0]
        text += f"; it is down by 1 dB at {over_db:+.2f} dB over the mean input"
    return text


def _compression_document(
    item: Compression | None, unit: str, origin_db: float
) -> dict[str, Any] | None:
    if item is None:
        return None
    return {
        "fall_db": item.fall_db,
        "input": rounded(item.input_db - origin_db, 4),
        "low": rounded(item.low_db - origin_db, 4),
        "high": rounded(item.high_db - origin_db, 4),
        "unit": "dBm" if unit == "dbm" else "dB over the mean input",
        "output": rounded(item.output_db, 4),
    }


def _gain_rows(found: DeviceGain, unit: str, gain_zero_db: float) -> list[dict[str, Any]]:
    points, mean_db = found.points, found.means_db[0]
    # Over the gain at low levels that gain's own error counts too.
    extra = 0.0 if found.is_absolute else found.small.error_db
    low = points.gain_db - np.hypot(points.gain_db - points.low_db, extra)
    high = points.gain_db + np.hypot(points.high_db - points.gain_db, extra)
    return [
        {
            "input_db": rounded(points.input_db[k] - mean_db, 4),
            **({"input_dbm": rounded(points.input_db[k], 4)} if unit == "dbm" else {}),
            "gain_db": rounded(points.gain_db[k] - gain_zero_db, 4),
            "low_db": rounded(low[k] - gain_zero_db, 4),
            "high_db": rounded(high[k] - gain_zero_db, 4),
            "probability": float(points.probability[k]),
        }
        for k in range(points.input_db.size)
    ]


def _expansion(found: DeviceGain, unit: str, origin_db: float) -> dict[str, Any] | None:
    """Return where the gain is highest over that at low levels, if it surely rises."""
    rise = _rise(found)
    if rise is None:
        return None
    place, over_db = rise
    return {
        "gain_db": rounded(over_db, 4),
        f"input_{unit}": rounded(found.points.input_db[place] - origin_db, 4),
        "is": "highest gain over that at low levels",
    }


def _rise(found: DeviceGain) -> tuple[int, float] | None:
    """Return at which point the gain is surely highest, and by how much over that at low levels."""
    over = found.points.gain_db - found.small.gain_db
    error = np.hypot(found.points.error_db, found.small.error_db)
    place = int(np.argmax(over - error))
    return (place, float(over[place])) if over[place] > error[place] + RISE_DB else None


def _mean_compression(found: DeviceGain) -> float:
    """Return by how much the mean gain lies below the gain at low levels, dB.

    Where means are not known, levels over each side's own mean differ at low levels by as much.
    """
    return found.small.gain_db - (found.means_db[1] - found.means_db[0])


def _level_rows(found: DeviceGain) -> list[dict[str, Any]]:
    lowest = resolved_to(*found.curves)
    asked = np.array([q for q in DECADES if lowest is not None and q >= lowest * (1 - 1e-9)])
    if not asked.size:
        return []
    points = points_at(*found.curves, asked)
    means = found.means_db
    return [
        {
            "probability": float(points.probability[k]),
            "input_over_mean_db": rounded(points.input_db[k] - means[0], 4),
            "output_over_mean_db": rounded(points.output_db[k] - means[1], 4),
            "change_db": rounded(points.output_db[k] - means[1] - points.input_db[k] + means[0], 4),
            "compression_db": rounded(found.small.gain_db - points.gain_db[k], 4),
        }
        for k in range(points.input_db.size)
    ]


def _rule(found: DeviceGain) -> dict[str, Any] | None:
    """Return the rule of thumb at 0.01 %, as it is and corrected; None where it is out of reach."""
    row = next(
        (row for row in _level_rows(found) if abs(row["probability"] / RULE_AT - 1) < 1e-6), None
    )
    if row is None:
        return None
    return {
        "probability": RULE_AT,
        "change_db": row["change_db"],
        "mean_compression_db": rounded(_mean_compression(found), 4),
        "corrected_db": rounded(-row["compression_db"], 4),
        "is": "change of the level over the mean, as read off two CCDFs; the mean is compressed "
        "too, which hides as much: corrected, it is the gain at that level over the gain at low "
        "levels",
    }


def _over(found: DeviceGain) -> dict[str, Any] | None:
    """Return for how much of the time the input is over the 1 dB point."""
    point = found.falls[0]
    if point is None:
        return None
    levels = np.array([point.input_db, point.high_db, point.low_db])
    share, low, high = found.curves[0].ccdf(np.minimum(levels, 1e3))
    return {"share": float(share), "low": float(low), "high": float(high)}


def _rapp_document(
    found: DeviceGain, origin_db: float, gain_zero_db: float
) -> dict[str, Any] | None:
    fit = found.fit
    if fit is None:
        return None
    output_origin_db = 0.0 if found.is_absolute else origin_db + gain_zero_db
    return {
        "smoothness": rounded(fit.smoothness, 4),
        "gain_db": rounded(fit.gain_db - gain_zero_db, 4),
        "saturation_dbm" if found.is_absolute else "saturation_over_mean_db": rounded(
            fit.saturation_db - output_origin_db, 4
        ),
        "input_back_off_db": rounded(fit.saturation_db - fit.gain_db - found.means_db[0], 4),
        "rms_deviation_db": rounded(fit.rms_db, 4),
        "largest_deviation_db": rounded(fit.largest_db, 4),
    }


def _aligned_document(alignment: Alignment | None) -> dict[str, Any] | None:
    if alignment is None:
        return None
    return {
        "correlation": rounded(alignment.correlation, 4),
        "delay_samples": rounded(alignment.delay_samples, 3),
        "left_db": rounded(alignment.left_db, 2),
        "memory_db": rounded(alignment.memory_db, 2),
        "has_memory": alignment.has_memory,
        "phase_deg": rounded(
            float(alignment.phase_deg[-1]) if alignment.phase_deg.size else 0.0, 2
        ),
        "phase_is": "turn of the phase from the lowest to the highest level, as aligned in time",
    }
