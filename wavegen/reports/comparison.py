"""Comparisons as tables and sentences."""

from __future__ import annotations

from typing import Any

from wavegen.core.table import Table
from wavegen.core.units import format_hz
from wavegen.reports.tables import fixed, percent

UNKNOWN = "not known"
_LISTED_LOOKS = 3


def match_tables(document: dict[str, Any]) -> list[Table]:
    """Return the tables of a match, in the order of reading."""
    found = [sides_table(document, ("stimulus", "field")), _levels(document)]
    if document["looks_like"]:
        found.append(_looks(document))
    return found


def match_lines(document: dict[str, Any]) -> list[str]:
    """Return the sentences of a match, the verdict last."""
    lines = []
    spectrum = document["spectrum"]
    if spectrum is not None:
        widths = (
            format_hz(spectrum[f"{side}_occupied_hz"], digits=4) for side in ("stimulus", "field")
        )
        lines.append(
            f"Spectrum: 99 % of the power in {' and '.join(widths)}; densities differ by up to "
            f"{spectrum['largest_difference_db']:+.2f} dB in there, centre on centre."
        )
    if document["mean_difference"] is not None:
        mean = document["mean_difference"]
        lines.append(f"Means differ by {interval_words(mean, 'difference_db')}.")
    lines += _looks_lines(document["looks_like"])
    largest = document["largest_difference_db"]
    if largest is not None:
        where = rough_percent(document["largest_at"])
        lines.append(
            f"Largest difference of the curves: {largest:+.2f} dB at {where}, stimulus less field."
        )
    statement = document["statement"]
    lines.append(statement[:1].upper() + statement[1:] + ".")
    return lines


def _looks_lines(looks: list[dict[str, Any]]) -> list[str]:
    """Say what the field's curve looks like: every law that is near, and a recipe of the first."""
    near = [look for look in looks if look["is_near"]]
    if not near:
        return []
    others = "; or ".join(look_words(look) for look in near[1:_LISTED_LOOKS])
    also = f" (as near as can be told: {others})" if others else ""
    said = f"By its levels alone the field looks like: {look_words(near[0])}{also}."
    return [f"{said} A recipe to start from:", *near[0]["recipe"].splitlines()]


def interval_words(row: dict[str, Any], key: str) -> str:
    """Write a figure with its interval: ``+0.12 dB (-0.03 to +0.27)``."""
    if row[key] is None:
        return UNKNOWN
    low, high = row["low_db"], row["high_db"]
    if low is not None and high is not None and high - low < 5e-3:
        return f"{_plain(row[key])} dB"
    ends = " to ".join("any" if end is None else _plain(end) for end in (low, high))
    return f"{_plain(row[key])} dB ({ends})"


def rough_percent(probability: float) -> str:
    """Write a probability that is no round one with two figures.

    Examples
    --------
    >>> rough_percent(0.0012345)
    '0.12 %'
    """
    return percent(float(f"{probability:.2g}"))


def _plain(value: float) -> str:
    return f"{round(value, 2) + 0.0:+.2f}"


def sides_table(document: dict[str, Any], names: tuple[str, str]) -> Table:
    """Return both sides of a comparison, one a row."""
    rows = [(side_name, *_side_row(document[side_name])) for side_name in names]
    return Table(title="Compared", headings=("side", "name", "is", "mean"), rows=tuple(rows))


def _side_row(side: dict[str, Any]) -> tuple[str, str, str]:
    duty = "" if side["duty"] is None else f", on for {100 * side['duty']:.3g} %"
    for unit in ("dbm", "dbfs"):
        mean = side.get(f"mean_{unit}")
        if mean is not None:
            return side["name"], side["is"] + duty, fixed(mean, "dBm" if unit == "dbm" else "dBFS")
    return side["name"], side["is"] + duty, UNKNOWN


def _levels(document: dict[str, Any]) -> Table:
    rows = tuple(
        (
            percent(row["probability"]),
            _level(row["stimulus_db"]),
            _level(row["field_db"]),
            interval_words(row, "difference_db") if row["resolved"] else "too few samples",
            {"match": "match", "differ": "DIFFER", "undecided": "undecided"}[row["verdict"]],
        )
        for row in document["levels"]
    )
    return Table(
        title="Levels over the mean, and their difference (95 %)",
        headings=("probability", "stimulus", "field", "difference", "verdict"),
        rows=rows,
        right=frozenset({0, 1, 2, 3}),
    )


def _level(value: float | None) -> str:
    return "off" if value is None else fixed(value, "dB")


def look_words(look: dict[str, Any]) -> str:
    """Say a familiar law with its number."""
    words = {
        "ceiling_db": "ceiling {:.2f} dB",
        "carrier_to_noise_db": "carrier {:.1f} dB over the noise",
        "roll_off": "roll-off {:.2f}",
        "n_tones": "{:.0f} of them",
    }
    told = [look["law"], *(text.format(look[key]) for key, text in words.items() if key in look)]
    if look["duty"] < 1:
        told.append(f"on for {100 * look['duty']:.3g} % of the time")
    return ", ".join(told)


def _at(difference_db: float, probability: float) -> str:
    return f"{_plain(difference_db)} dB at {rough_percent(probability)}"


def _looks(document: dict[str, Any]) -> Table:
    rows = tuple(
        (
            look_words(look),
            _at(look["largest_deviation_db"], look["at_probability"]),
        )
        for look in document["looks_like"][:_LISTED_LOOKS]
    )
    return Table(
        title="The field's curve beside familiar laws",
        headings=("law", "largest deviation"),
        rows=rows,
        right=frozenset({1}),
    )
