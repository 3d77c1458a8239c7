"""The on-time of one or several subjects, as JSON values."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

from wavegen.meters.population import merged
from wavegen.meters.power import PowerStatistics
from wavegen.meters.statistic_names import INSTANTANEOUS, gated_name
from wavegen.production import measured_rows as rows
from wavegen.production.measured_population import sampled
from wavegen.production.measured_signal import MeasuredSignal, on_peak_db
from wavegen.production.sidecar import curves, rounded


def on_time_rows(found: Sequence[MeasuredSignal], asked: Sequence[float]) -> dict[str, Any] | None:
    """Return the figures of the on-time, by name; None where no gate was asked for."""
    gates = [item.gate for item in found]
    if not any(gates):
        return None
    measured = [gate for gate in gates if gate is not None and gate.on is not None]
    first = next(gate for gate in gates if gate is not None)
    if len(measured) < len(found):
        missing = next(
            (gate.found.reason for gate in gates if gate is not None and gate.on is None), ""
        )
        return {"is": first.found.label, "n_samples": 0, "reason": missing}
    statistics = merged([gate.on.statistics for gate in measured if gate.on])
    sample = sampled(found, "on")
    label = first.found.label if len(found) == 1 else f"bursts of {len(found)} files"
    peak_db = max((on_peak_db(item) for item in found), default=math.nan)
    document: dict[str, Any] = {
        "is": gated_name(INSTANTANEOUS, label) + "; levels over the mean of that time",
        "gate": label,
        "duty": statistics.n_samples / sum(item.signal.n_samples for item in found),
        "n_samples": statistics.n_samples,
        "mean_dbfs": rounded(statistics.mean_db),
        "peak_dbfs": rounded(statistics.peak_db),
        "papr_db": rounded(statistics.papr_db),
        "papr_between_samples_db": rounded(peak_db - statistics.mean_db),
        "levels": rows.exact_levels(statistics, asked),
        "ccdf": curves(statistics)["ccdf"],
    }
    if sample is not None:
        if any(item.subject.loops for item in found):
            document["process_levels"] = rows.sampled_levels(sample, asked)
        else:
            document["levels"] = rows.sampled_levels(sample, asked)
            document["ccdf"] = rows.sampled_curve(sample)
    if len(found) == 1:
        document |= _search_rows(found[0], asked)
    return document


def _search_rows(measured: MeasuredSignal, asked: Sequence[float]) -> dict[str, Any]:
    """Return how bursts were found, and each of them."""
    gate = measured.gate
    if gate is None or gate.powers is None:
        return {}
    found = gate.found
    document: dict[str, Any] = {
        "guard_samples": found.bursts.ramp_samples if found.bursts else 0,
        "n_cut": found.n_cut,
        "bursts": rows.burst_rows(gate.powers),
    }
    if found.window_samples is not None:
        document["search"] = {
            "window_samples": found.window_samples,
            "floor_dbfs": rounded(found.floor_dbfs or 0.0, 3),
            "top_dbfs": rounded(found.top_dbfs or 0.0, 3),
            "on_level_dbfs": rounded(found.on_level_dbfs or 0.0, 3),
            "threshold_dbfs": rounded(found.threshold_dbfs or 0.0, 3),
            "closing_dbfs": rounded(found.closing_dbfs or 0.0, 3),
        }
    if gate.levelled is not None:
        even: PowerStatistics = gate.levelled.statistics
        document["one_by_one"] = {
            "is": "bursts pooled, each over its own mean",
            "papr_db": rounded(even.papr_db),
            "levels": rows.exact_levels(even, asked),
            "ccdf": curves(even)["ccdf"],
        }
    return document
