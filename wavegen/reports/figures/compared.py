"""The pictures of comparisons, shaped stimuli, devices and tunings."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import numpy as np

from wavegen.reports.figures.picture import Picture
from wavegen.reports.figures.power import CcdfCurve, ccdf_figure
from wavegen.reports.figures.trade import Front, front_figure, gain_figure
from wavegen.reports.tables import percent


def match_pictures(document: dict[str, Any]) -> list[Picture]:
    """Return both curves of a match."""
    names = (document["stimulus"]["name"], document["field"]["name"])
    return [_levels_picture(document["levels"], names, "Stimulus against field")]


def shape_pictures(document: dict[str, Any]) -> list[Picture]:
    """Return both curves of a shaped stimulus and its field."""
    names = (document["name"], document["field"])
    return [_levels_picture(document["levels"], names, "Shaped stimulus against field")]


def _levels_picture(rows: Sequence[dict[str, Any]], names: tuple[str, str], title: str) -> Picture:
    curves = []
    for key, name in zip(("stimulus_db", "field_db"), names, strict=True):
        used = [row for row in rows if row[key] is not None]
        level = np.array([row[key] for row in used], np.float64)
        share = np.array([row["probability"] for row in used], np.float64)
        curves.append(CcdfCurve(name=name, level_db=level, probability=share))
    differences = [
        f"{percent(row['probability'])}: {row['difference_db']:+.2f} dB"
        for row in rows
        if row["difference_db"] is not None
    ]
    least = min(row["probability"] for row in rows)
    return Picture(
        name="ccdf",
        figure=ccdf_figure(
            curves, title=title, marks=(), least=10.0 ** math.floor(math.log10(least))
        ),
        caption="CCDFs of both sides, each over its own mean.",
        alternative=f"Two curves. Stimulus less field: {', '.join(differences)}.",
    )


def gain_pictures(document: dict[str, Any]) -> list[Picture]:
    """Return the gain curve of a device."""
    rows = [row for row in document["gain"] if row["gain_db"] is not None]
    if not rows:
        return []
    is_absolute = document.get("input_p1db_dbm") is not None or document.get("unit") == "dBm"
    where = "dBm" if is_absolute else "dB over the input mean"
    point = document.get("input_p1db_dbm", document.get("input_p1db_db"))
    low, high = rows[0], rows[-1]
    return [
        Picture(
            name="gain",
            figure=gain_figure(
                rows,
                title="Gain of the device",
                input_name=f"input level, {where}",
                compression_db=point,
            ),
            caption="Gain against input level, quantile to quantile, with its interval.",
            alternative=(
                f"Curve from {low['gain_db']:.2f} dB at {low['input_db']:.1f} to "
                f"{high['gain_db']:.2f} dB at {high['input_db']:.1f}."
            ),
        )
    ]


def tune_pictures(document: dict[str, Any]) -> list[Picture]:
    """Return the trade-off of a tuning: level against EVM of every setting tried."""
    tried: dict[str, list[dict[str, Any]]] = {}
    for item in document["evaluations"]:
        if item["evm_percent"] is not None and item["level_db"] is not None and item["method"]:
            tried.setdefault(item["method"], []).append(item)
    if not tried:
        return []
    bound = document.get("reference")
    fronts = [_front(name, items) for name, items in tried.items() if name != "projection"]
    own = tried.get("projection", [])
    if bound and bound.get("evm_percent") is not None and not own:
        own = [bound]
    best = document.get("best")
    return [
        Picture(
            name="trade-off",
            figure=front_figure(
                fronts or [_front("projection", own)],
                title="What a lower level costs",
                level_name=f"level at {percent(document['probability'])}, dB over the mean",
                bound=_front("least-distortion projection", own) if own and fronts else None,
                evm_limit_percent=document["limits"]["evm_percent"],
            ),
            caption="Every setting that was tried: level against EVM.",
            alternative=f"Points of {len(tried)} methods. "
            + (
                f"The best, {best['method']}: {best['level_db']:.2f} dB at EVM "
                f"{best['evm_percent']:.2f} %."
                if best
                else "None keeps the limits."
            ),
        )
    ]


def _front(name: str, items: Sequence[dict[str, Any]]) -> Front:
    return Front(
        name=name,
        evm_percent=np.array([item["evm_percent"] for item in items], np.float64),
        level_db=np.array([item["level_db"] for item in items], np.float64),
    )
