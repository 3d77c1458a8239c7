"""The bench sheet as tables, and as a page to print and take to the bench."""

from __future__ import annotations

import math
from typing import Any

from wavegen.core.table import Table
from wavegen.core.units import format_hz, format_s
from wavegen.reports.pages.page import Page, Section
from wavegen.reports.tables import fixed, percent


def engineering(value: float, unit: str) -> str:
    """Write a value with three digits and a decimal prefix.

    Examples
    --------
    >>> engineering(0.00398, "W"), engineering(19.95, "V"), engineering(0.0, "W")
    ('3.98 mW', '19.9 V', '0 W')
    """
    if not value:
        return f"0 {unit}"
    power = min(max(math.floor(math.log10(abs(value)) / 3), -4), 2)
    prefix = {-4: "p", -3: "n", -2: "µ", -1: "m", 0: "", 1: "k", 2: "M"}[power]
    return f"{value / 1000.0**power:.3g} {prefix}{unit}"


def setting_table(sheet: dict[str, Any]) -> Table:
    """Return what to set at the generator, under both conventions in use."""
    wanted = sheet["set"]
    rows = [
        ("level, if the setting means RMS", fixed(wanted["if_it_means_rms_dbm"], "dBm")),
        ("level, if it means full scale", fixed(wanted["if_it_means_full_scale_dbm"], "dBm")),
        ("back-off of the file between the two", fixed(wanted["back_off_db"], "dB")),
        ("average over the period there", fixed(wanted["average_over_period_dbm"], "dBm")),
    ]
    if wanted["average_over_burst_dbm"] is not None:
        rows.append(
            ("average of the on-time there", fixed(wanted["average_over_burst_dbm"], "dBm"))
        )
    rows.append(("peak envelope power there", fixed(wanted["peak_envelope_dbm"], "dBm")))
    return Table(title="At the generator's output", headings=("figure", "value"), rows=tuple(rows))


def power_table(sheet: dict[str, Any]) -> Table:
    """Return average and peak at every place, as powers and as voltages."""
    rows = tuple(
        (
            f"{place['name']}, {place['at']}",
            fixed(place["average_dbm"], "dBm"),
            engineering(place["average_w"], "W"),
            fixed(place["peak_envelope_dbm"], "dBm"),
            engineering(place["peak_envelope_w"], "W"),
        )
        for place in sheet["path"]
    )
    return Table(
        title=f"Powers along the path (average over the {sheet['averaged_over']})",
        headings=("place", "average", "", "peak envelope", ""),
        rows=rows,
        right=frozenset({1, 2, 3, 4}),
    )


def voltage_table(sheet: dict[str, Any]) -> Table:
    """Return peak voltages, the worst ones too."""
    rows = tuple(
        (
            f"{place['name']}, {place['at']}",
            engineering(place["peak_v"], "V"),
            engineering(place["worst_peak_v"], "V"),
            engineering(place["open_peak_v"], "V"),
            "-" if place["reflected_dbm"] is None else fixed(place["reflected_dbm"], "dBm"),
        )
        for place in sheet["path"]
    )
    return Table(
        title=f"Peak voltages at {sheet['impedance_ohm']:g} ohm",
        headings=("place", "matched", "stated mismatch", "open line", "reflected average"),
        rows=rows,
        right=frozenset({1, 2, 3, 4}),
    )


def rating_table(sheet: dict[str, Any]) -> Table | None:
    """Return every rating with its margin, None where nothing is rated."""
    rows = tuple(
        (
            rating["name"],
            rating["value"],
            rating["limit"],
            "EXCEEDED" if rating["margin_db"] < 0 else fixed(rating["margin_db"], "dB"),
        )
        for place in sheet["path"]
        for rating in place["ratings"]
    )
    if not rows:
        return None
    return Table(
        title="Ratings (the margin has the allowances taken off)",
        headings=("rating", "expected", "rated", "margin"),
        rows=rows,
        right=frozenset({1, 2, 3}),
    )


def legality_table(sheet: dict[str, Any]) -> Table:
    """Return what of the file the generator takes."""
    return Table(
        title="The file and the generator",
        headings=("what", "file", "generator", ""),
        rows=tuple(
            (
                row["what"],
                row["value"],
                row["allowed"] or "not stated",
                "" if row["is_met"] else "NOT LEGAL",
            )
            for row in sheet["generator"]
        ),
    )


def mistake_table(sheet: dict[str, Any]) -> Table | None:
    """Return what the device would see if something went wrong."""
    if not sheet["mistakes"]:
        return None
    return Table(
        title="At the device, if",
        headings=("what goes wrong", "peak envelope", "over the planned peak"),
        rows=tuple(
            (row["what"], fixed(row["peak_envelope_dbm"], "dBm"), fixed(row["over_db"], "dB"))
            for row in sheet["mistakes"]
        ),
        right=frozenset({1, 2}),
    )


def averaging_table(sheet: dict[str, Any]) -> Table:
    """Return how long to watch for each probability."""
    return Table(
        title="How long to measure for ten separate peaks",
        headings=("probability", "at least", "in this loop"),
        rows=tuple(
            (
                percent(row["probability"]),
                format_s(float(f"{row['at_least_s']:.2g}")),
                "yes: average over whole loops"
                if row["is_held_by_loop"]
                else "too few: the loop repeats the same peaks",
            )
            for row in sheet["averaging"]
        ),
        right=frozenset({0, 1}),
    )


def sensor_words(sheet: dict[str, Any]) -> list[str]:
    """Say which sensors cannot follow the signal."""
    said = []
    for row in sheet["sensors"]:
        wide = format_hz(float(f"{row['signal_bandwidth_hz']:.3g}"))
        verdict = "it follows" if row["follows"] else "it reads peaks too low: trust its average"
        own = format_hz(row["video_bandwidth_hz"])
        said.append(f"{row['name']} follows {own}, the signal is {wide} wide: {verdict}.")
    return said


def tables(sheet: dict[str, Any]) -> list[Table]:
    """Return all tables of a sheet, in the order of use."""
    found = (
        setting_table(sheet),
        power_table(sheet),
        rating_table(sheet),
        voltage_table(sheet),
        legality_table(sheet),
        mistake_table(sheet),
        averaging_table(sheet),
    )
    return [table for table in found if table is not None]


def sections(sheet: dict[str, Any]) -> list[Section]:
    """Return a sheet as sections of a page."""
    steps = [
        Table(
            title=title,
            headings=("", "step"),
            rows=tuple((str(number), step) for number, step in enumerate(sheet[key], 1)),
            right=frozenset({0}),
        )
        for key, title in (("before", "To start"), ("after", "To stop"))
    ]
    return [
        Section(heading="Order of work", tables=tuple(steps)),
        Section(
            heading="Levels", paragraphs=tuple(sensor_words(sheet)), tables=tuple(tables(sheet))
        ),
    ]


def sheet_page(sheet: dict[str, Any]) -> Page:
    """Return the page of a sheet."""
    wanted = sheet["set"]
    return Page(
        title=f"Bench sheet: {sheet['title']}",
        summary=(
            (
                f"Set {wanted['if_it_means_rms_dbm']:.2f} dBm if the generator's setting is RMS, "
                f"{wanted['if_it_means_full_scale_dbm']:.2f} dBm if it is full scale; the peak "
                f"envelope power is then {wanted['peak_envelope_dbm']:.2f} dBm at its output."
            ),
        ),
        cautions=tuple(sheet["cautions"]),
        sections=tuple(sections(sheet)),
        origin=(("file", sheet["file"]), ("SHA-512", sheet["sha512"])),
    )
