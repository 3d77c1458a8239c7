"""Figures of fidelity as tables for people."""

from __future__ import annotations

from typing import Any

from wavegen.core.table import Table
from wavegen.core.units import format_hz
from wavegen.reports.tables import percent


def fidelity_table(document: dict[str, Any], *, title: str) -> Table:
    """Return every figure of a recipe, before and after its stages where both are there.

    Parameters
    ----------
    document : dict
        Of :func:`wavegen.production.fidelity.fidelity_document`.
    title : str
        Stands over the table.
    """
    before, after = document["before"], document["after"]
    sides = [before] if after is None else [before, after]
    columns = [dict(_rows(side)) for side in sides]
    names = list(columns[-1])
    return Table(
        title=title,
        headings=("figure", "value") if after is None else ("figure", "before", "after"),
        rows=tuple((name, *(column.get(name, "") for column in columns)) for name in names),
        right=frozenset(range(1, len(sides) + 1)),
    )


def _rows(side: dict[str, Any]) -> list[tuple[str, str]]:
    rows = [row for source in side["evm"] for row in _evm_rows(source)]
    if side["total_error_percent"] is not None:
        rows.append(("error of the whole waveform", f"{side['total_error_percent']:.3f} %"))
    rows += [
        (
            f"ACLR {row['channel']}, {format_hz(round(row['offset_hz']))}",
            f"{row['ratio_db']:.2f} dB",
        )
        for row in side["aclr"]
    ]
    if side["mask"] is not None:
        rows.append(("mask margin", f"{side['mask']['margin_db']:+.2f} dB"))
    rows += [
        ("occupied bandwidth (99 %)", format_hz(round(side["occupied_bandwidth_hz"]))),
        ("raw cubic metric", f"{side['raw_cubic_metric_db']:.2f} dB"),
        ("PAPR at the samples", f"{side['papr_db']:.2f} dB"),
    ]
    rows += [
        (
            f"level at {percent(row['probability'])}",
            f"{row['level_db']:.2f} dB" + ("" if row["resolved"] else " (few samples)"),
        )
        for row in side["levels"]
    ]
    return rows


def _evm_rows(source: dict[str, Any]) -> list[tuple[str, str]]:
    classes = source["classes"]
    one = classes[0] if len(classes) == 1 else None
    rows = [(f"EVM {source['source']}{_about(one)}", _evm_text(one or source))]
    if one is None:
        rows += [
            (f"EVM {source['source']} {item['name']}{_about(item)}", _evm_text(item))
            for item in classes
        ]
    return rows


def _about(item: dict[str, Any] | None) -> str:
    return f" ({item['constellation']})" if item and item["constellation"] else ""


def _evm_text(item: dict[str, Any]) -> str:
    limit = item.get("limit_percent")
    beside = "" if limit is None else f" of {limit:g} %"
    return f"{item['percent']:.3f} %{beside}"
