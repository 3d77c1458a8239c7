"""Tables of checks, and of what files and recipes say about themselves."""

from __future__ import annotations

from typing import Any

from wavegen.core.table import Table
from wavegen.core.units import format_hz
from wavegen.reports.tables import fixed, length_words, percent, seam_words

_HASH = {"equal": "equal", "differs": "DIFFERS", "missing": "no file"}
_VERDICT = {"match": "match", "differ": "DIFFER", "undecided": "undecided"}


def check_table(document: dict[str, Any]) -> Table:
    """Return what a check found, one row a file."""
    rows = tuple(
        (
            row["name"],
            _HASH[row["hash"]],
            _difference(row["mean_difference_db"]),
            _largest(row),
            _VERDICT[row["verdict"]] if row["is_readable"] else "not readable",
        )
        for row in document["files"]
    )
    return Table(
        title=f"{document['title'] or document['name']}: files against their sidecar",
        headings=("file", "SHA-512", "mean", "largest level", "verdict"),
        rows=rows,
        right=frozenset({2, 3}),
    )


def _largest(row: dict[str, Any]) -> str:
    words = _difference(row["largest_difference_db"])
    at = row["at_probability"]
    return f"{words} at {percent(at)}" if at is not None else words


def _difference(value_db: float | None) -> str:
    return "" if value_db is None else f"{round(value_db, 3) + 0.0:+.3f} dB"


def law_lines(document: dict[str, Any]) -> list[str]:
    """Say how each file compares with the law of its recipe."""
    lines = []
    for row in document["files"]:
        found = row["against_law"]
        for number, item in enumerate(found["channels"] if found else ()):
            if item is not None:
                channel = f", channel {number}" if len(found["channels"]) > 1 else ""
                lines.append(
                    f"{row['name']}{channel}: against its law, {found['from']}: "
                    f"{item['statement']}."
                )
    return lines


def verdict_words(document: dict[str, Any]) -> str:
    """Say what a check came to."""
    if document["verdict"] == "differ":
        return "Differ: do not use these files for what the sidecar says."
    if document["verdict"] == "undecided":
        return "Undecided: too few samples, or a file that could not be compared."
    if all(row["hash"] == "equal" for row in document["files"]):
        return "Match: every SHA-512 is equal."
    within = f"within {document['tolerance_db']:g} dB"
    return f"Match: bytes differ, but the levels of the loop agree {within}."


# What a file or a recipe says ----------------------------------------------------------------

_HASHES = {
    "equal": "SHA-512 equal: the bytes that were described",
    "differs": "SHA-512 DIFFERS: not the bytes that were described",
    "none stated": "no SHA-512 is stated",
}
_LAWS = {"agrees": "agrees", "differs": "DIFFERS", "undecided": "undecided"}


def facts_table(document: dict[str, Any]) -> Table:
    """Return the facts of a description of any kind, one a row."""
    makers = {
        "recording": _recording_rows,
        "stimulus": _recording_rows,
        "sidecar": _sidecar_rows,
        "recipe": _recipe_rows,
        "ccdf curve": _curve_rows,
    }
    rows = tuple((what, said) for what, said in makers[document["is"]](document) if said)
    title = f"{document['name']} ({document['is']})"
    return Table(title=title, headings=("what", "says"), rows=rows)


def _rate_rows(document: dict[str, Any]) -> list[tuple[str, str]]:
    return [
        ("sample rate", format_hz(document["sample_rate_hz"])),
        ("length", length_words(document["duration_s"], document["n_samples"])),
    ]


def _level_rows(level: dict[str, Any] | None) -> list[tuple[str, str]]:
    if not level:
        return [("level", "not stated: see `wavegen measure`")]
    names = {
        "mean_dbfs": ("mean", "dBFS"),
        "peak_dbfs": ("peak at samples", "dBFS"),
        "peak_between_samples_dbfs": ("peak between samples", "dBFS"),
        "papr_db": ("PAPR at samples", "dB"),
    }
    return [
        (words, fixed(level[key], unit))
        for key, (words, unit) in names.items()
        if level.get(key) is not None
    ]


def _law_words(law: dict[str, Any] | None) -> str:
    return f"{law['name']}: {_LAWS[law['verdict']]}" if law else "none stated"


def _recording_rows(document: dict[str, Any]) -> list[tuple[str, str]]:
    word = f", {document['bits']} bits, {document['align']}" if document["bits"] else ""
    level_from = document["level_from"]
    marks = ", ".join(f"{count} {label or 'without a label'}" for label, count in _labels(document))
    centre = document["centre_frequency_hz"]
    channels = document["n_channels"]
    return [
        ("title", document["title"]),
        ("about", document["description"]),
        ("format", f"{document['file_format']} {document['datatype']}{word}"),
        ("holds", _content(document)),
        ("channels", f"{channels}; this is {document['channel']}" if channels > 1 else ""),
        *_rate_rows(document),
        ("centre frequency", "" if centre is None else format_hz(centre)),
        *_level_rows(document["level"]),
        ("levels are", f"those of its {level_from}" if level_from else ""),
        ("annotations", marks or "none"),
        ("sidecar", document["sidecar"] or "none beside it: it is read as a recording"),
        ("bytes", _HASHES[document["hash"]]),
        ("law", _law_words(document["law"]) if document["sidecar"] else ""),
    ]


def _content(document: dict[str, Any]) -> str:
    if document["is_power"]:
        return "power against time"
    if not document["is_real"]:
        return ""
    centre_hz = document["real_centre_hz"]
    around = "" if centre_hz is None else f" around {format_hz(centre_hz)}"
    return f"real samples{around}, read as their analytic signal"


def _labels(document: dict[str, Any]) -> list[tuple[str, int]]:
    found = sorted(document["labels"].items(), key=lambda pair: -pair[1])
    if len(found) <= 5:
        return found
    return [*found[:4], ("others", sum(count for _, count in found[4:]))]


def _sidecar_rows(document: dict[str, Any]) -> list[tuple[str, str]]:
    converted = document["converted"]
    zeros = document["n_zeros"]
    return [
        ("title", document["title"]),
        ("recipe", f"{document['recipe']}, seed {document['seed']}"),
        ("converted", converted_words(converted) if converted else ""),
        *_rate_rows(document),
        *_level_rows(document),
        ("PAPR between samples", fixed(document["papr_between_samples_db"], "dB")),
        ("exact zeros", f"{zeros} samples" if zeros else ""),
        ("loop", f"cycle of {document['loop']['cycle_samples']} samples"),
        ("loop seam", seam_words(document["loop"]["seam"])),
        ("law", _law_words(document["law"])),
    ]


def converted_words(converted: dict[str, Any]) -> str:
    """Say what a conversion changed."""
    changes = [f"from {converted['from']} ({converted['format']} {converted['datatype']})"]
    if converted.get("channel") is not None:
        changes.append(f"channel {converted['channel']}")
    real = converted.get("real") or {"from_hz": None, "to_hz": None}
    if real["from_hz"] != real["to_hz"]:
        changes.append(f"{_place(real['from_hz'])} to {_place(real['to_hz'])}")
    if converted["rate_factor"] != "1":
        changes.append(f"rate x {converted['rate_factor']}")
    if converted["gain_db"]:
        changes.append(f"gain {converted['gain_db']:+.3f} dB")
    return ", ".join(changes)


def _place(centre_hz: float | None) -> str:
    return "complex" if centre_hz is None else f"real around {format_hz(centre_hz)}"


def _recipe_rows(document: dict[str, Any]) -> list[tuple[str, str]]:
    count = document["n_cycles"]
    cycle = length_words(
        document["cycle_samples"] / document["sample_rate_hz"], document["cycle_samples"]
    )
    return [
        ("title", document["title"]),
        ("file", document["file"]),
        ("set", ", ".join(document["overrides"])),
        ("seed", str(document["seed"])),
        *_rate_rows(document),
        ("shortest loop", f"{cycle}; {count} of it" if count > 1 else cycle),
    ]


def _curve_rows(document: dict[str, Any]) -> list[tuple[str, str]]:
    low, high = document["lowest_level_db"], document["highest_level_db"]
    lowest = document["lowest_probability"]
    measured = document["n_samples"]
    least = f" down to {lowest:.3g}" if lowest is not None else ""
    return [
        ("holds", f"CCDF of {document['n_points']} points, levels over the mean power"),
        ("levels", f"{low:g} dB to {high:g} dB"),
        ("probabilities", f"{document['highest_probability']:.3g}{least}"),
        ("measured on", f"{measured} samples" if measured else "not stated"),
    ]


def tree_table(document: dict[str, Any]) -> Table | None:
    """Return the parts of a recipe, inner ones further right; None for anything else."""
    if "tree" not in document:
        return None
    rows = tuple(
        (
            "  " * row["depth"] + (f"{row['kind']} {row['name']}" if row["name"] else row["kind"]),
            row["says"],
        )
        for row in document["tree"]
    )
    return Table(title="Signal and stages, in order", headings=("kind", "settings"), rows=rows)


def listed_files(document: dict[str, Any]) -> Table | None:
    """Return the files of a sidecar or a recipe; None for anything else."""
    if "files" not in document:
        return None
    if document["is"] == "recipe":
        rows = tuple(
            (item["name"] or document["name"], f"{item['format']} {item['datatype']}")
            for item in document["files"]
        )
        return Table(title="Files that it asks for", headings=("name", "format"), rows=rows)
    found = tuple(
        (
            item["name"],
            f"{item['format']} {item['datatype']}",
            "there" if item["is_there"] else "MISSING",
        )
        for item in document["files"]
    )
    return Table(title="Files", headings=("name", "format", "is"), rows=found)
