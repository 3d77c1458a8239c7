"""Gain curves as tables and sentences."""

from __future__ import annotations

from typing import Any

from wavegen.core.table import Table
from wavegen.reports.comparison import interval_words, rough_percent, sides_table
from wavegen.reports.tables import fixed, percent

_ROWS = 24
_HOLDS = {True: "holds", False: "DOES NOT HOLD", None: "not known"}


def gain_tables(document: dict[str, Any]) -> list[Table]:
    """Return the tables of a gain curve, in the order of reading."""
    found = [sides_table(document, ("input", "output")), _gain(document)]
    if document["levels"]:
        found.append(_levels(document))
    return found


def _gain(document: dict[str, Any]) -> Table:
    rows = document["gain"]
    step = -(-len(rows) // _ROWS)
    shown = sorted({*range(0, len(rows), step), len(rows) - 1})
    has_dbm = "input_dbm" in rows[0]
    cells = []
    for k in shown:
        row = rows[k]
        absolute = (fixed(row["input_dbm"], "dBm"),) if has_dbm else ()
        level = fixed(row["input_db"], "dB")
        cells.append(
            (level, *absolute, interval_words(row, "gain_db"), rough_percent(row["probability"]))
        )
    headings = ("input over mean", *(("input",) if has_dbm else ()), "gain (95 %)", "exceeded")
    return Table(
        title=f"Gain against input level: {document['gain_is']}",
        headings=headings,
        rows=tuple(cells),
        right=frozenset(range(len(headings))),
    )


def _levels(document: dict[str, Any]) -> Table:
    rows = tuple(
        (
            percent(row["probability"]),
            fixed(row["input_over_mean_db"], "dB"),
            fixed(row["output_over_mean_db"], "dB"),
            fixed(row["change_db"], "dB"),
            fixed(row["compression_db"], "dB"),
        )
        for row in document["levels"]
    )
    return Table(
        title="Levels over each side's own mean, and the compression there",
        headings=("probability", "input", "output", "change", "compression"),
        rows=rows,
        right=frozenset(range(5)),
    )


def gain_lines(document: dict[str, Any]) -> list[str]:
    """Return the sentences of a gain curve, the verdict last."""
    lines = [_compression_line(item) for item in document["compression"]]
    over = document["over_p1db"]
    if over is not None:
        ends = tuple(rough_percent(over[key]) for key in ("low", "high"))
        told = "" if ends[0] == ends[1] else f" ({ends[0]} to {ends[1]})"
        lines.append(
            f"The input is over the 1 dB point for {rough_percent(over['share'])} of the "
            f"time{told}."
        )
    expansion = document["expansion"]
    if expansion is not None:
        lines.append(
            f"The gain expands: by up to {expansion['gain_db']:.2f} dB over that at low levels."
        )
    rule = document["rule_of_thumb"]
    if rule is not None:
        lines.append(
            f"Level at {percent(rule['probability'])}: {rule['change_db']:+.2f} dB over the mean "
            f"from input to output, as two CCDFs show it; the mean itself is compressed by "
            f"{rule['mean_compression_db']:.2f} dB, so that the gain there has changed by "
            f"{rule['corrected_db']:+.2f} dB."
        )
    fit = document["rapp"]
    if fit is not None:
        lines.append(
            f"Nearest Rapp curve: p = {fit['smoothness']:.2f}, driven "
            f"{fit['input_back_off_db']:.2f} dB below saturation; off by "
            f"{fit['largest_deviation_db']:.2f} dB at most."
        )
    lines += [
        f"{item['name'].replace('_', ' ').capitalize()}: {_HOLDS[item['holds']]}: {item['says']}."
        for item in document["assumptions"]
    ]
    phase = document["phase"]
    if document["aligned"] is not None:
        phase += f"; aligned in time it turns by {document['aligned']['phase_deg']:+.2f} degrees"
    lines.append(phase[:1].upper() + phase[1:] + ".")
    if document["model"] is not None:
        lines.append(f"Written: {document['model']}.")
    statement = document["statement"]
    lines.append(statement[:1].upper() + statement[1:] + ".")
    return lines


def _compression_line(item: dict[str, Any]) -> str:
    unit = "dBm" if item["unit"] == "dBm" else "dB"
    where = "" if unit == "dBm" else " over the mean input"
    low, high = (
        "any" if end is None else f"{round(end, 2) + 0.0:.2f}"
        for end in (item["low"], item["high"])
    )
    text = f"Gain down by {item['fall_db']:g} dB at {item['input']:.2f} {unit}{where}"
    return f"{text}." if low == high else f"{text} ({low} to {high})."
