"""A shaped stimulus in words and tables."""

from __future__ import annotations

from typing import Any

from wavegen.core.table import Table
from wavegen.core.units import format_hz
from wavegen.reports.tables import fixed, percent


def tables(document: dict[str, Any]) -> list[Table]:
    """Return both sides' levels, and the files."""
    levels = Table(
        title=f"Levels over the mean, {document['levels_are']}",
        headings=("probability", "stimulus", "field", "difference"),
        rows=tuple(
            (
                percent(row["probability"]),
                *(
                    "none" if row[key] is None else fixed(row[key], "dB")
                    for key in ("stimulus_db", "field_db")
                ),
                "none" if row["difference_db"] is None else f"{row['difference_db']:+.3f} dB",
            )
            for row in document["levels"]
        ),
        right=frozenset({0, 1, 2, 3}),
    )
    files = Table(
        title="Files",
        headings=("name", "what"),
        rows=(
            (document["recipe"], "the recipe, to edit or make again"),
            *((item["name"], f"{item['format']} {item['datatype']}") for item in document["files"]),
        ),
    )
    return [levels, files]


def lines(document: dict[str, Any]) -> list[str]:
    """Return what came of it in sentences."""
    largest = document["largest_difference_db"]
    said = []
    if document["skipped_samples"]:
        said.append(f"The first {document['skipped_samples']} samples are faults, and left out.")
    if largest is None:
        said.append("DIFFER: no level can be compared.")
    elif document["verdict"] == "match":
        said.append(
            f"match: every level down to {percent(document['down_to'])} lies within "
            f"{largest:.3f} dB of the field's (tolerance {document['tolerance_db']:g} dB)."
        )
    else:
        said.append(
            f"DIFFER: the nearest that was found is off by {largest:.3f} dB (tolerance "
            f"{document['tolerance_db']:g} dB): no signal with this spectrum and this curve was "
            "found."
        )
    spectrum = document["spectrum"]
    if spectrum is not None:
        wide = format_hz(spectrum["occupied_bandwidth_hz"], digits=4)
        said.append(
            f"Its spectrum lies within {abs(spectrum['largest_difference_db']):.2f} dB of "
            f"{spectrum['is_over']} over {wide}."
        )
    gate = document["gate"]
    if gate is not None:
        said.append(
            f"The gate is {gate['is']}: on for {percent(round(gate['duty'], 5))} of "
            f"{gate['period_samples']} samples."
        )
    return said
