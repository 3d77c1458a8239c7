"""The pictures of comparisons, shaped stimuli, devices and tunings."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import numpy as np

from wavegen.reports.figures.picture import Picture
from wavegen.reports.figures.power import CcdfCurve, ccdf_figure, gaussian_curve
from wavegen.reports.figures.trade import Front, difference_figure, front_figure, gain_figure
from wavegen.reports.tables import percent


def match_pictures(document: dict[str, Any]) -> list[Picture]:
    """Return both curves of a match, and their difference."""
    names = (document["stimulus"]["name"], document["field"]["name"])
    return _against(document, names, "Stimulus against field")


def shape_pictures(document: dict[str, Any]) -> list[Picture]:
    """Return both curves of a shaped stimulus and its field, and their difference."""
    names = (document["name"], document["field"])
    return _against(document, names, "Shaped stimulus against field")


def _against(document: dict[str, Any], names: tuple[str, str], title: str) -> list[Picture]:
    rows = document["levels"]
    told = [row for row in rows if row["difference_db"] is not None]
    differences = [f"{percent(row['probability'])}: {row['difference_db']:+.2f} dB" for row in told]
    said = f"Stimulus less field: {', '.join(differences) or 'not known'}."
    curves = [
        _curve(rows, key, name)
        for key, name in zip(("stimulus_db", "field_db"), names, strict=True)
    ]
    found = [
        Picture(
            name="ccdf",
            figure=ccdf_figure(
                [*curves, gaussian_curve()], title=title, marks=(), least=_decade_below(rows)
            ),
            caption="CCDFs of both sides, each over its own mean.",
            alternative=f"Two curves. {said}",
        )
    ]
    if told:
        found.append(
            Picture(
                name="difference",
                figure=difference_figure(
                    told,
                    title=title,
                    name="stimulus less field, dB",
                    tolerance_db=document["tolerance_db"],
                ),
                caption="Difference of the levels at each probability, with its interval, and the "
                "tolerance.",
                alternative=f"Points with intervals. {said}",
            )
        )
    return found


def _curve(rows: Sequence[dict[str, Any]], key: str, name: str) -> CcdfCurve:
    """Return the curve through the levels that rows tell."""
    used = [row for row in rows if row[key] is not None]
    return CcdfCurve(
        name=name,
        level_db=np.array([row[key] for row in used], np.float64),
        probability=np.array([row["probability"] for row in used], np.float64),
        has_marks=True,
    )


def _decade_below(rows: Sequence[dict[str, Any]]) -> float:
    least = min(row["probability"] for row in rows)
    return float(10.0 ** math.floor(math.log10(least) + 1e-9))


def gain_pictures(document: dict[str, Any]) -> list[Picture]:
    """Return the gain curve of a device, and the CCDFs of its input and output."""
    rows = [row for row in document["gain"] if row["gain_db"] is not None]
    found = []
    if rows:
        found.append(_gain(document, rows))
    levels = document["levels"]
    if rows and levels:
        curves = _input_and_output(document, rows, levels[0])
        changes = [f"{percent(row['probability'])}: {row['change_db']:+.2f} dB" for row in levels]
        found.append(
            Picture(
                name="ccdf",
                figure=ccdf_figure(
                    [*curves, gaussian_curve()],
                    title="Input and output of the device",
                    marks=(),
                    least=_decade_below(levels),
                ),
                caption="CCDFs of input and output, each over its own mean.",
                alternative=f"Two curves. Output less input: {', '.join(changes)}.",
            )
        )
    return found


def _input_and_output(
    document: dict[str, Any], rows: Sequence[dict[str, Any]], level: dict[str, Any]
) -> list[CcdfCurve]:
    """Return both curves, each over its own mean, by the gain at each quantile.

    The mean gain follows from any level that is told over both means.
    """
    gain_there = document["small_signal_gain_db"] - level["compression_db"]
    mean_gain = gain_there - level["change_db"]
    share = np.array([row["probability"] for row in rows], np.float64)
    before = np.array([row["input_db"] for row in rows], np.float64)
    gain = np.array([row["gain_db"] for row in rows], np.float64)
    return [
        CcdfCurve(name=f"{side}: {document[side]['name']}", level_db=over, probability=share)
        for side, over in (("input", before), ("output", before + gain - mean_gain))
    ]


def _gain(document: dict[str, Any], rows: Sequence[dict[str, Any]]) -> Picture:
    is_absolute = "input_dbm" in rows[0]
    key, unit = ("input_dbm", "dBm") if is_absolute else ("input_db", "dB")
    point = document.get("input_p1db_dbm" if is_absolute else "input_p1db_db")
    low, high = rows[0], rows[-1]
    said = document["gain_is"]
    return Picture(
        name="gain",
        figure=gain_figure(
            rows,
            title="Gain of the device",
            input_name="input level, dBm" if is_absolute else "input level over the input mean, dB",
            input_key=key,
            compression_db=point,
            unit=unit,
            gain_name=said if said.startswith("output") else f"gain {said}",
        ),
        caption="Gain against input level, quantile to quantile, with its interval.",
        alternative=(
            f"Curve from {low['gain_db']:.2f} dB at {low[key]:.1f} {unit} to "
            f"{high['gain_db']:.2f} dB at {high[key]:.1f} {unit}."
            + ("" if point is None else f" Down by 1 dB at {point:.2f} {unit}.")
        ),
    )


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
                bound=_front("projection, the reference", own) if own and fronts else None,
                evm_limit_percent=document["limits"]["evm_percent"],
                points=_points(document),
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


def _points(document: dict[str, Any]) -> list[Front]:
    """Return the signal as it is, and the best that keeps the limits."""
    told = (("as it is", document.get("before")), ("the best that was found", document.get("best")))
    return [
        _front(name, [item])
        for name, item in told
        if item and item["level_db"] is not None and item["evm_percent"] is not None
    ]


def _front(name: str, items: Sequence[dict[str, Any]]) -> Front:
    return Front(
        name=name,
        evm_percent=np.array([item["evm_percent"] for item in items], np.float64),
        level_db=np.array([item["level_db"] for item in items], np.float64),
    )
