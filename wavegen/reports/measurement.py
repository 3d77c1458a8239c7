"""A measurement as tables and sentences, each statistic under its own name."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any

from wavegen.core.table import Table
from wavegen.core.units import format_hz, format_s
from wavegen.reports.tables import (
    complex_gaussian_db,
    fixed,
    percent,
    summary_table,
)

TOO_FEW = "too few samples"
_MOST_ROWS = 20


def tables(document: dict[str, Any]) -> list[Table]:
    """Return the tables of a measurement, in the order of reading."""
    found = [_summary(document), _levels(document)]
    makers = {
        "on_time": _on_time,
        "time_shares": _time_shares,
        "rf": _rf,
        "sensor": _sensor,
        "per_symbol": _per_symbol,
        "files": _files,
    }
    for key, make in makers.items():
        if document.get(key):
            found += make(document)
    return found


def _is_loop(document: dict[str, Any]) -> bool:
    return bool(document["is"] == "this loop")


def _is_exact(document: dict[str, Any]) -> bool:
    """Whether the levels at the top are stated without intervals."""
    return not any("low_db" in row for row in document["levels"])


def _summary(document: dict[str, Any]) -> Table:
    kind = ""
    if "file_format" in document:
        coded = "power series" if document["is_power"] else document["datatype"]
        kind = f"{document['file_format']} {coded}, "
    if "channel" in document:
        kind += f"channel {document['channel']}, "
    title = f"{document['name']} ({kind}{document['is']})"
    plain = {key: value for key, value in document.items() if key != "on_time"}
    table = summary_table(plain, title=title)
    rows = [*table.rows, *_further_rows(document)]
    return replace(table, rows=tuple(rows))


def _further_rows(document: dict[str, Any]) -> list[tuple[str, str]]:
    found = []
    expected = document.get("record_peak")
    if expected:
        span = f"{expected['low_db']:.2f} to {expected['high_db']:.2f} dB"
        found.append(("PAPR of such a record, noise-like", span))
    if "rf" in document:
        found.append(("PAPR of the RF waveform", fixed(document["rf"]["papr_db"], "dB")))
    averages = document["averages"]
    of_db, of_volts = averages["of_decibels_db"], averages["of_volts_db"]
    if min(of_db, of_volts) <= -0.01:
        words = f"{of_db:+.2f} dB, {of_volts:+.2f} dB over the mean"
        found.append(("average of dB, of volts", words))
    removed = document.get("removed_offset")
    if removed:
        found.append(("DC offset taken off", f"{removed['over_signal_db']:.2f} dB over the rest"))
    return found


def _levels(document: dict[str, Any]) -> Table:
    rows = document["levels"]
    process = document.get("process") or {}
    columns = {_statement(document): _cells(rows, document)}
    if process.get("levels"):
        columns["process, 95 %"] = [_interval(row) for row in process["levels"]]
    absolute = document.get("absolute")
    if absolute:
        columns["level"] = [
            "" if row["level_dbm"] is None else fixed(row["level_dbm"], "dBm")
            for row in absolute["levels"]
        ]
    columns["complex Gaussian"] = [
        fixed(complex_gaussian_db(row["probability"]), "dB") for row in rows
    ]
    return _level_table(f"{document['statistic']} exceeds its mean by", rows, columns)


def _level_table(
    title: str, rows: Sequence[dict[str, Any]], columns: dict[str, list[str]]
) -> Table:
    return Table(
        title=title,
        headings=("probability", *columns),
        rows=tuple(
            zip((percent(row["probability"]) for row in rows), *columns.values(), strict=True)
        ),
        right=frozenset(range(len(columns) + 1)),
    )


def _statement(document: dict[str, Any]) -> str:
    if document["is"].startswith("a population"):
        return "these files"
    return "this loop" if _is_loop(document) else "this record"


def _cells(rows: Sequence[dict[str, Any]], document: dict[str, Any]) -> list[str]:
    cells = []
    for row in rows:
        if row["level_db"] is None or (not row["resolved"] and not _is_loop(document)):
            cells.append(TOO_FEW)
        elif row["probability"] * document["n_samples"] < 1:
            cells.append("loop too short")
        else:
            cells.append(fixed(row["level_db"], "dB"))
    return cells


def _interval(row: dict[str, Any]) -> str:
    low, high = row["low_db"], row["high_db"]
    if low is None and high is None:
        return "unknown"
    if low is None:
        return f"up to {high:.2f} dB"
    return f"from {low:.2f} dB" if high is None else f"{low:.2f} to {high:.2f} dB"


def _on_time(document: dict[str, Any]) -> list[Table]:
    on = document["on_time"]
    if not on["n_samples"]:
        return []
    between = on["papr_between_samples_db"]
    facts = [
        ("duty", f"{100 * on['duty']:.4g} %"),
        ("mean", fixed(on["mean_dbfs"], "dBFS")),
        ("PAPR at samples", fixed(on["papr_db"], "dB")),
    ]
    if between is not None:
        facts.append(("PAPR between samples", fixed(between, "dB")))
    bursts = on.get("bursts")
    if bursts:
        facts.append(("bursts", _burst_words(bursts)))
    if "search" in on:
        search = on["search"]
        words = f"threshold {search['threshold_dbfs']:.2f} dBFS, "
        words += f"closing {search['closing_dbfs']:.2f} dBFS"
        facts += [("found by", words), ("window", f"{search['window_samples']} samples")]
    facts.append(("guard at both ends", f"{on.get('guard_samples', 0)} samples"))
    rows = on["levels"]
    columns = {"over its mean": _cells(rows, document | {"n_samples": on["n_samples"]})}
    intervals = on.get("process_levels") or (rows if "low_db" in rows[0] else None)
    if intervals:
        columns["process, 95 %"] = [_interval(row) for row in intervals]
    if "one_by_one" in on:
        even = on["one_by_one"]["levels"]
        columns["each over its own"] = _cells(even, document | {"n_samples": on["n_samples"]})
    found = [
        Table(title=f"The on-time: {on['gate']}", headings=("figure", "value"), rows=tuple(facts)),
        _level_table("Its instantaneous envelope power exceeds its mean by", rows, columns),
    ]
    if "one_by_one" in on and bursts:
        found.append(_burst_table(bursts))
    return found


def _burst_words(bursts: dict[str, Any]) -> str:
    groups = bursts["at_one_level"]
    median = f"{bursts['n_bursts']}, half of them over {bursts['median_samples']:.0f} samples"
    if len(groups) < 2:
        return median
    levels = ", ".join(f"{group['n_bursts']} at {group['mean_dbfs']:.1f} dBFS" for group in groups)
    return f"{median}; {levels}"


def _burst_table(bursts: dict[str, Any]) -> Table:
    shown = bursts["each"][:_MOST_ROWS]
    more = bursts["n_bursts"] - len(shown)
    title = "Bursts one by one" + (f" (the first {len(shown)}; {more} more)" if more else "")
    return Table(
        title=title,
        headings=("samples", "mean", "PAPR"),
        rows=tuple(
            (
                f"{row['start_sample']} to {row['stop_sample'] - 1}",
                "silent" if row["mean_dbfs"] is None else fixed(row["mean_dbfs"], "dBFS"),
                fixed(row["papr_db"], "dB"),
            )
            for row in shown
        ),
        right=frozenset({1, 2}),
    )


def _time_shares(document: dict[str, Any]) -> list[Table]:
    rows = []
    for row in document["time_shares"]:
        level = f"{row['level_db']:.2f} dB over the mean, {row['level_dbfs']:.2f} dBFS"
        if row["level_dbm"] is not None:
            level += f", {row['level_dbm']:.2f} dBm"
        above = f"{row['above_percent']:.4g} %"
        if "above_low_percent" in row:
            above += f" ({row['above_low_percent']:.3g} to {row['above_high_percent']:.3g})"
        rows.append((level, above, f"{row['below_percent']:.6g} %"))
    has_process = any("above_low_percent" in row for row in document["time_shares"])
    return [
        Table(
            title="Share of the time"
            + (" (in brackets that of the process, 95 %)" if has_process else ""),
            headings=("level", "above", "at or below"),
            rows=tuple(rows),
            right=frozenset({1, 2}),
        )
    ]


def _rf(document: dict[str, Any]) -> list[Table]:
    rf, rows = document["rf"], document["rf"]["levels"]
    columns = {
        "RF over its mean": [fixed(row["level_db"], "dB") for row in rows],
        "over the envelope's": [
            "" if mine["level_db"] is None else f"{row['level_db'] - mine['level_db']:+.2f} dB"
            for row, mine in zip(rows, document["levels"], strict=True)
        ],
    }
    return [_level_table(f"{rf['is']}, carrier phase random, exceeds its mean by", rows, columns)]


def _sensor(document: dict[str, Any]) -> list[Table]:
    sensor, rows = document["sensor"], document["sensor"]["levels"]
    settings = []
    if sensor["video_bandwidth_hz"] is not None:
        width = format_hz(sensor["video_bandwidth_hz"])
        settings.append(f"video bandwidth {width}, {sensor['shape'].replace('_', ' ')}")
    if sensor["sensor_rate_hz"] is not None:
        settings.append(f"readings at {format_hz(sensor['sensor_rate_hz'])}")
    columns = {"reading": _cells(rows, document | {"n_samples": sensor["n_samples"]})}
    intervals = sensor.get("process_levels") or (rows if "low_db" in rows[0] else None)
    if intervals:
        columns["process, 95 %"] = [_interval(row) for row in intervals]
    columns["reads low by"] = [
        "" if row["shortfall_db"] is None else fixed(row["shortfall_db"], "dB") for row in rows
    ]
    peak = f"its peak reads {sensor['peak_shortfall_db']:.2f} dB low"
    title = f"{sensor['is']} ({', '.join(settings)}); {peak}"
    return [_level_table(title, rows, columns)]


def _per_symbol(document: dict[str, Any]) -> list[Table]:
    found = document["per_symbol"]
    means = {"ensemble": "over the mean of all", "symbol": "over each one's own"}
    columns = {
        means[item["mean"]]: [
            fixed(row["papr_db"], "dB") if row["resolved"] else "too few symbols"
            for row in item["levels"]
        ]
        for item in found["over"]
    }
    if found["law"]:
        columns["law"] = [fixed(row["papr_db"], "dB") for row in found["law"]["levels"]]
    shares = [percent(row["share_of_symbols"]) for row in found["over"][0]["levels"]]
    return [
        Table(
            title=f"{found['is']} ({found['n_symbols']} symbols; not that of the power above)",
            headings=("share of symbols", *columns),
            rows=tuple(zip(shares, *columns.values(), strict=True)),
            right=frozenset(range(len(columns) + 1)),
        )
    ]


def _files(document: dict[str, Any]) -> list[Table]:
    return [
        Table(
            title="Files of the population",
            headings=("name", "is", "samples", "mean", "PAPR at samples"),
            rows=tuple(
                (
                    row["name"],
                    row["is"],
                    str(row["n_samples"]),
                    fixed(row["mean_dbfs"], "dBFS"),
                    fixed(row["papr_db"], "dB"),
                )
                for row in document["files"]
            ),
            right=frozenset({2, 3, 4}),
        )
    ]


def lines(document: dict[str, Any]) -> list[str]:
    """Return what is said in sentences: what the figures are of, and how sure they are."""
    process = document.get("process")
    if not process:
        return []
    if process.get("says"):
        return [f"The process it samples: {process['says']}."]
    found = []
    periods = process["n_data_periods"]
    if periods and periods > 1:
        found.append(
            f"The data repeat after {process['n_samples']} samples: the loop holds them {periods} "
            "times, and for the process they count once."
        )
    needed = process["next_decade"]
    if needed:
        length = f"{format_s(needed['duration_s'], digits=4)}, {needed['n_samples']} samples,"
        found.append(
            f"For {percent(needed['probability'])} a record of {length} would be needed, "
            f"{needed['times']:.3g} times this one: a level is resolved from 10 clusters up."
        )
    elif not _is_exact(document) or _is_loop(document):
        found.append("No decade of probability has 10 clusters beyond its level.")
    return found
