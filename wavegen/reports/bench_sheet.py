"""The bench sheet as tables, and as a page to print and take to the bench."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

from wavegen.core.table import Table
from wavegen.core.units import format_hz, format_s
from wavegen.production.bench import engineering
from wavegen.reports.pages.page import Page, Section
from wavegen.reports.tables import fixed, percent


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
    return Table(
        title="At the generator's output",
        headings=("figure", "value"),
        rows=tuple(rows),
        right=frozenset({1}),
    )


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
    """Return peak voltages, the worst ones too, and what comes back."""
    rows = tuple(
        (
            f"{place['name']}, {place['at']}",
            engineering(place["peak_v"], "V"),
            _or_none(place["worst_peak_v"], lambda value: engineering(value, "V")),
            engineering(place["open_peak_v"], "V"),
            _or_none(place["reflected_dbm"], lambda value: fixed(value, "dBm")),
            _or_none(place["reflected_peak_dbm"], lambda value: fixed(value, "dBm")),
        )
        for place in sheet["path"]
    )
    return Table(
        title=f"Peak voltages at {sheet['impedance_ohm']:g} ohm, and power that comes back",
        headings=(
            "place",
            "matched",
            "stated mismatch",
            "open line",
            "average back",
            "peak back",
        ),
        rows=rows,
        right=frozenset({1, 2, 3, 4, 5}),
    )


def _or_none(value: float | None, write: Callable[[float], str]) -> str:
    return "not stated" if value is None else write(value)


def rating_table(sheet: dict[str, Any]) -> Table | None:
    """Return every rating with its margin, None where nothing is rated."""
    rows = tuple(
        (
            rating["name"],
            rating["value"],
            fixed(rating["allowance_db"], "dB"),
            rating["limit"],
            _margin(rating),
        )
        for place in sheet["path"]
        for rating in place["ratings"]
    )
    if not rows:
        return None
    return Table(
        title="Ratings, and what is left below each",
        headings=("rating", "expected", "allowance", "rated", "margin"),
        rows=rows,
        right=frozenset({1, 2, 3, 4}),
    )


def _margin(rating: dict[str, Any]) -> str:
    if rating["margin_db"] >= 0:
        return fixed(rating["margin_db"], "dB")
    over = f"EXCEEDED by {fixed(-rating['margin_db'], 'dB')}"
    return f"{over}, accepted" if rating["is_accepted"] else over


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


def mistake_table(sheet: dict[str, Any]) -> Table:
    """Return what the device would see if something went wrong."""
    return Table(
        title="At the device, if something goes wrong",
        headings=("what goes wrong", "average", "peak envelope", "over the planned", "exceeds"),
        rows=tuple(
            (
                row["what"],
                fixed(row["average_dbm"], "dBm"),
                fixed(row["peak_envelope_dbm"], "dBm"),
                f"{round(row['over_peak_db'], 2) + 0.0:+.2f} dB",
                ", ".join(row["exceeds"]) or "no rating",
            )
            for row in sheet["mistakes"]
        ),
        right=frozenset({1, 2, 3}),
    )


def edge_words(sheet: dict[str, Any]) -> str:
    """Say at which power a file begins and ends: a start or a stop is a step of that size."""
    first, last = (
        "nothing" if value is None else fixed(value, "dBm")
        for value in (sheet["edges"]["first_dbm"], sheet["edges"]["last_dbm"])
    )
    return (
        f"At the device the file begins at {first} and ends at {last}: a start or a stop while RF "
        "is on is a step of that size. Start playing before RF is on, and stop after it is off."
    )


def allowance_words(sheet: dict[str, Any]) -> str:
    """Say how much is kept free below the ratings."""
    kept = sheet["allowances"]
    level, over = kept["level_uncertainty_db"], kept["overshoot_db"]
    if not level and not over:
        return (
            "No allowance is taken: bench.level_uncertainty and bench.overshoot of the recipe are "
            "not given."
        )
    return (
        f"Allowances: levels may lie {level:g} dB higher than they are set, and peaks overshoot by "
        f"{over:g} dB; margins have them taken off."
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
        mistake_table(sheet),
        legality_table(sheet),
        averaging_table(sheet),
    )
    return [table for table in found if table is not None]


def sections(found: Sequence[dict[str, Any]]) -> list[Section]:
    """Return the sheets of all channels as sections of a page."""
    steps = [
        Table(
            title=title,
            headings=("", "step"),
            rows=tuple((str(number), step) for number, step in enumerate(found[0][key], 1)),
            right=frozenset({0}),
        )
        for key, title in (("before", "To start"), ("after", "To stop"))
    ]
    levels = [
        Section(
            heading="Levels" + _of_channel(sheet),
            paragraphs=(allowance_words(sheet), edge_words(sheet), *sensor_words(sheet)),
            tables=tuple(tables(sheet)),
        )
        for sheet in found
    ]
    return [Section(heading="Order of work", tables=tuple(steps)), *levels]


def _of_channel(sheet: dict[str, Any]) -> str:
    return "" if sheet["channel"] is None else f", channel {sheet['channel']}"


def _setting_words(sheet: dict[str, Any]) -> str:
    wanted = sheet["set"]
    return (
        f"Set {wanted['if_it_means_rms_dbm']:.2f} dBm if the generator's setting is RMS, "
        f"{wanted['if_it_means_full_scale_dbm']:.2f} dBm if it is full scale{_of_channel(sheet)}; "
        f"the peak envelope power is then {wanted['peak_envelope_dbm']:.2f} dBm at its output."
    )


def sheet_page(found: Sequence[dict[str, Any]]) -> Page:
    """Return the page of the sheets of all channels."""
    first = found[0]
    exceeded = [
        f"{rating['name']} is exceeded{_of_channel(sheet)}: {rating['value']} expected, "
        f"{rating['limit']} rated" + (", accepted by name" if rating["is_accepted"] else "")
        for sheet in found
        for place in sheet["path"]
        for rating in place["ratings"]
        if rating["margin_db"] < 0
    ]
    return Page(
        title=f"Bench sheet: {first['title']}",
        summary=tuple(_setting_words(sheet) for sheet in found),
        cautions=(*exceeded, *first["cautions"]),
        sections=tuple(sections(found)),
        origin=(("file", first["file"]), ("SHA-512", first["sha512"])),
    )
