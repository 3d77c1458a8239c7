"""Documents as tables for people."""

from __future__ import annotations

import math
from typing import Any

from wavegen.core.table import Table
from wavegen.core.units import format_hz, format_s

NO_PEAK = "none: a power series has no phase"


def percent(probability: float) -> str:
    """Write a probability as the trade does.

    Examples
    --------
    >>> percent(0.001)
    '0.1 %'
    """
    return f"{100 * float(f'{probability:.3g}'):.10f}".rstrip("0").rstrip(".") + " %"


def fixed(value: float, unit: str) -> str:
    """Write a level with two decimals, never as a negative zero.

    Examples
    --------
    >>> fixed(-0.001, "dBFS")
    '0.00 dBFS'
    """
    return f"{round(value, 2) + 0.0:.2f} {unit}"


def length_words(duration_s: float, n_samples: int) -> str:
    """Write a length as time and samples.

    Examples
    --------
    >>> length_words(1e-6, 1)
    '1 µs, 1 sample'
    """
    return f"{format_s(duration_s)}, {n_samples} sample{'s' if n_samples != 1 else ''}"


def law_words(law: dict[str, Any]) -> str:
    """Say how a file compares with its law."""
    verdict = law["verdict"]
    instants = law.get("n_instants")
    where = f", at the {instants} different instants of this loop" if instants else ""
    detail = law.get("statement", verdict).removeprefix(verdict)
    verb = {"agrees": "agrees with it", "differs": "DIFFERS FROM it"}.get(verdict)
    if verb is None:
        said = "there is not enough to tell whether the file follows it"
        return f"Law: {law['name']}; {said}{detail}."
    return f"Law: {law['name']}; the file {verb}{detail}{where}."


def verdict_lines(document: dict[str, Any]) -> list[str]:
    """Say how a stimulus compares with its law, or why it has none, and how its seed was chosen."""
    lines = []
    best = document.get("best_of")
    if best:
        last = best["first_seed"] + best["n_tried"] - 1
        lines.append(
            f"Seed {best['chosen_seed']} of {best['first_seed']} to {last}: its levels lie within "
            f"{best['deviation_db']:.3f} dB of the law's down to {percent(best['down_to'])}; "
            f"half of these seeds reach {best['median_deviation_db']:.3f} dB."
        )
    second = document.get("second_channel")
    for name, part in (("", document), ("Channel 1: ", second)):
        if not part:
            continue
        no_law = part.get("no_law") or "none is known"
        lines.append(name + (law_words(part["law"]) if part["law"] else f"No law: {no_law}."))
    if document["law"]:
        for item in document["files"][1:]:
            against = item.get("against_law")
            if against and against["statement"] != document["law"]["statement"]:
                lines.append(f"{item['name']}: {against['statement']}.")
    return lines


def process_table(law: dict[str, Any] | None) -> Table | None:
    """Return the levels of the process behind a loop against its law; None where none is judged."""
    if not law or not law.get("compared"):
        return None
    rows = tuple(
        (
            percent(row["probability"]),
            _level(row["law_db"]),
            _level(row["level_db"]),
            f"{_level(row['low_db'])} to {_level(row['high_db'])}",
            "" if row["detectable_db"] is None else f"{row['detectable_db']:.2f} dB",
        )
        for row in law["compared"]
    )
    of = "" if law["of"].startswith("all of the time") else f" ({law['of']})"
    return Table(
        title=f"The process that this loop samples{of}",
        headings=("probability", "law", "this loop", "process, 95 % jointly", "finds a fault of"),
        rows=rows,
        right=frozenset(range(5)),
    )


def _level(level_db: float | None) -> str:
    return "open" if level_db is None else fixed(level_db, "dB")


def summary_table(document: dict[str, Any], *, title: str) -> Table:
    """Return the main figures of a measurement or sidecar."""
    peak, papr = document["peak_between_samples_dbfs"], document["papr_between_samples_db"]
    rows = [
        ("sample rate", format_hz(document["sample_rate_hz"])),
        ("length", length_words(document["duration_s"], document["n_samples"])),
        ("mean", fixed(document["mean_dbfs"], "dBFS")),
        ("peak at samples", fixed(document["peak_dbfs"], "dBFS")),
        ("peak between samples", NO_PEAK if peak is None else fixed(peak, "dBFS")),
        ("PAPR at samples", fixed(document["papr_db"], "dB")),
        ("PAPR between samples", NO_PEAK if papr is None else fixed(papr, "dB")),
    ]
    if "mean_dbm" in document:
        of = ", of the largest sample" if peak is None else ""
        rows.append(("mean", fixed(document["mean_dbm"], "dBm")))
        rows.append(("peak envelope power", fixed(document["peak_envelope_dbm"], "dBm") + of))
    on_time = document.get("on_time")
    if on_time:
        rows.append(("mean of the on-time", fixed(on_time["mean_dbfs"], "dBFS")))
        rows.append(("PAPR of the on-time", fixed(on_time["papr_between_samples_db"], "dB")))
        rows.append(("duty", f"{100 * on_time['duty']:.4g} %"))
    if document["n_zeros"]:
        count = document["n_zeros"]
        rows.append(("exact zeros", f"{count} sample{'s' if count > 1 else ''}"))
    seam = document.get("seam") or document.get("loop", {}).get("seam")
    if seam:
        rows.append(("loop seam", seam_words(seam)))
    return Table(title=title, headings=("figure", "value"), rows=tuple(rows))


def seam_words(seam: dict[str, Any]) -> str:
    """Say how a loop closes."""
    if not seam["n_stretches"]:
        return "not tested, the loop is too short"
    state = "clean" if seam["is_clean"] else "BROKEN"
    return f"{state}, {seam['at_seam_dbc']:.1f} dBc out of band there"


def level_table(document: dict[str, Any]) -> Table:
    """Return the CCDF's levels beside on-time, complex Gaussian and law."""
    law, on_time = document.get("law"), document.get("on_time")
    columns = {"level over mean": _levels(document, document)}
    if on_time:
        columns["over on-time mean"] = _levels(on_time, document)
    columns["complex Gaussian"] = [
        fixed(complex_gaussian_db(row["probability"]), "dB") for row in document["levels"]
    ]
    if law:
        exact = {row["probability"]: row["level_db"] for row in law["levels"]}
        columns["law"] = [fixed(exact[row["probability"]], "dB") for row in document["levels"]]
    probabilities = [percent(row["probability"]) for row in document["levels"]]
    return Table(
        title="Instantaneous power exceeds its mean by",
        headings=("probability", *columns),
        rows=tuple(zip(probabilities, *columns.values(), strict=True)),
        right=frozenset(range(len(columns) + 1)),
    )


def _levels(figures: dict[str, Any], document: dict[str, Any]) -> list[str]:
    is_loop = document.get("is") != "a recording"
    cells = []
    for row in figures["levels"]:
        if row["level_db"] is None or (not row["resolved"] and not is_loop):
            cells.append("too few samples")
        elif row["probability"] * figures["n_samples"] < 1:
            cells.append("loop too short")
        else:
            cells.append(fixed(row["level_db"], "dB"))
    return cells


def law_table(law: dict[str, Any], *, title: str) -> Table:
    """Return a law's levels beside the complex Gaussian, and its highest peak.

    Levels that are rarer than the law speaks for are marked ``about``.
    """
    lowest = law["lowest_probability"] * (1 - 1e-9)
    rows = [
        (
            percent(row["probability"]),
            ("" if row["probability"] >= lowest else "about ") + fixed(row["level_db"], "dB"),
            fixed(complex_gaussian_db(row["probability"]), "dB"),
        )
        for row in law["levels"]
    ]
    peak = "no bound" if law["peak_db"] is None else fixed(law["peak_db"], "dB")
    rows.append(("highest peak", peak, "no bound"))
    return Table(
        title=f"{title}: {law['name']} ({law['holds']})",
        headings=("probability", "level over mean", "complex Gaussian"),
        rows=tuple(rows),
        right=frozenset({0, 1, 2}),
    )


def lowest_words(law: dict[str, Any]) -> str | None:
    """Say down to where a law speaks; None if at every probability."""
    lowest = law["lowest_probability"]
    if not lowest:
        return None
    return (
        f"Below {percent(lowest)} the levels are about right only: the data of this recipe repeat "
        "too soon, or its sums take too few values, for the law to speak of rarer events."
    )


def distortion_table(found: dict[str, Any]) -> Table:
    """Return what memoryless steps do to a signal like complex Gaussian noise."""
    rows = [
        ("EVM within the band, gain fitted", f"{found['evm_in_band_percent']:.3f} %"),
        ("EVM in all bandwidth, gain fitted", f"{found['evm_percent']:.3f} %"),
        ("error in all bandwidth, nothing fitted", f"{found['evm_unfitted_percent']:.3f} %"),
        *(
            (
                f"ACLR at {format_hz(round(row['offset_hz']))}",
                "nothing" if row["aclr_db"] is None else fixed(row["aclr_db"], "dB"),
            )
            for row in found["aclr"]
        ),
        ("change of the mean by the curve, undone", f"{found['mean_shift_db']:+.3f} dB"),
    ]
    return Table(
        title=f"The steps, {found['is']} ({found['channels']})",
        headings=("figure", "predicted"),
        rows=tuple(rows),
        right=frozenset({1}),
    )


def fault_words(fault: dict[str, Any]) -> str:
    """Say how long a loop must be to show a fault."""
    what = f"A fault of {fault['fault_db']:g} dB at {percent(fault['probability'])}"
    if fault["n_samples"] is None:
        return f"{what}: any loop shows it, since all are alike."
    length = float(f"{fault['n_samples']:.2g}")
    duration_s = float(f"{fault['duration_s']:.2g}")
    return (
        f"{what} is found in {100 * fault['found_in']:g} % of loops of about {length:.0f} samples "
        f"({format_s(duration_s)}), off-times included."
    )


def complex_gaussian_db(probability: float) -> float:
    """Return the level that a complex Gaussian signal exceeds with a probability, dB."""
    return 10 * math.log10(-math.log(probability))


def bench_table(document: dict[str, Any]) -> Table | None:
    """Return average and peak envelope power along the path, None without a bench."""
    bench = document.get("bench")
    if not bench:
        return None
    rows = tuple(
        (
            place["name"] + (f", channel {place['channel']}" if "channel" in place else ""),
            fixed(place["average_dbm"], "dBm"),
            fixed(place["peak_envelope_dbm"], "dBm"),
            _rating(place),
        )
        for place in bench["path"]
    )
    return Table(
        title="Levels at the input of each place",
        headings=("place", "average", "peak envelope", "ratings"),
        rows=rows,
        right=frozenset({1, 2}),
    )


def _rating(place: dict[str, Any]) -> str:
    found = []
    if "average_limit_dbm" in place:
        found.append(f"average {place['average_limit_dbm']:g} dBm")
    if "peak_limit_dbm" in place:
        found.append(f"peak {place['peak_limit_dbm']:g} dBm")
    return ", ".join(found) or "none given"


def file_table(document: dict[str, Any]) -> Table:
    """Return the files of a stimulus."""
    rows = tuple(
        (name, _coding(item) if name == item["name"] else "")
        for item in document["files"]
        for name in item["all_names"]
    )
    return Table(title="Files", headings=("name", "format"), rows=rows)


def _coding(item: dict[str, Any]) -> str:
    """Say how a file holds its samples."""
    words = [f"{item['format']} {item['datatype']}"]
    if item.get("bits"):
        words.append(f"{item['bits']} bits at the {item['align']}")
    if item.get("real"):
        words.append(f"around {format_hz(item['real']['centre_hz'])}")
    if item.get("channels"):
        words.append(f"{len(item['channels'])} channels")
    return ", ".join(words)


def channel_table(document: dict[str, Any]) -> Table | None:
    """Return the main figures of both channels of the first file, None where it has one."""
    channels = document["files"][0].get("channels")
    if not channels:
        return None
    rows = tuple(
        (title, *(fixed(figures[key], unit) for figures in channels))
        for title, key, unit in (
            ("mean", "mean_dbfs", "dBFS"),
            ("peak at samples", "peak_dbfs", "dBFS"),
            ("peak between samples", "peak_between_samples_dbfs", "dBFS"),
            ("PAPR at samples", "papr_db", "dB"),
            ("PAPR between samples", "papr_between_samples_db", "dB"),
        )
    )
    return Table(
        title="Both channels",
        headings=("figure", *(f"channel {number}" for number in range(len(channels)))),
        rows=rows,
        right=frozenset(range(1, len(channels) + 1)),
    )
