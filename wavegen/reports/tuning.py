"""What came of a tune, as tables and sentences for people."""

from __future__ import annotations

from typing import Any

from wavegen.core.table import Table
from wavegen.reports.tables import percent

WORSE_DB = 3.0
"""From here on a fall of ACLR is told where nothing limits it."""
_MARKS = {"kept": "", "missed": "not kept", "unfinished": "unfinished", "unsuited": "unsuited"}


def method_table(document: dict[str, Any], *, title: str) -> Table:
    """Return one row a method, the best first, the untouched signal before all.

    Parameters
    ----------
    document : dict
        Of a tune.
    title : str
        Stands over the table.
    """
    is_power = document["objective"] == "output_dbm"
    rows = [_row("as it is", document["before"], is_power=is_power)]
    rows += [
        _row(_name(item), item["best"], is_power=is_power)
        for item in document["methods"]
        if item["best"] is not None
    ]
    goal = "dBm out" if is_power else "to bound"
    return Table(
        title=f"{title}: levels at {percent(document['probability'])}",
        headings=("method", "level dB", "EVM %", "ACLR dB", goal, "pairs", "gain dB"),
        rows=tuple(rows),
        right=frozenset(range(1, 7)),
    )


def _name(item: dict[str, Any]) -> str:
    mark = _MARKS[item["state"]] or ("cut short" if item["is_cut"] else "")
    name: str = item["method"].replace("_", " ")
    return f"{name} ({mark})" if mark else name


def _row(name: str, found: dict[str, Any], *, is_power: bool) -> tuple[str, ...]:
    goal = found["output_dbm"] if is_power else found.get("over_bound_db")
    gained = found.get("gained_db")
    settings = settings_words(found["settings"])
    return (
        f"{name}: {settings}" if settings else name,
        f"{found['level_db']:.2f}",
        f"{found['evm_percent']:.2f}",
        "" if found["aclr_db"] is None else f"{found['aclr_db']:.1f}",
        "" if goal is None else (f"{goal:.2f}" if is_power else f"{goal:+.2f}"),
        f"{found['fft_pairs']:g}",
        "" if gained is None else f"{gained:.2f}",
    )


def settings_words(settings: dict[str, Any]) -> str:
    """Return settings as a recipe names them.

    Examples
    --------
    >>> settings_words({"ceiling_db": 6.5, "rounds": 8})
    'ceiling 6.5 dB, rounds 8'
    """
    told = []
    for name, value in settings.items():
        key = name.removesuffix("_db").replace("_", " ")
        unit = " dB" if name.endswith("_db") and isinstance(value, int | float) else ""
        if value is not None:
            told.append(f"{key} {value:g}{unit}" if unit else f"{key} {value}")
    return ", ".join(told)


def outcome_words(document: dict[str, Any]) -> list[str]:
    """Return what is said of the outcome, one sentence or two a paragraph."""
    best = document["best"]
    said = [f"Limits: {document['limits']['told']}."]
    if document["channels"]:
        said[0] += f" Adjacent: {document['channels']}."
    if best is None:
        return [*said, *_infeasible(document)]
    said.append(_best_words(document, best))
    if best["gained_db"] <= 0:
        said.append("Nothing is gained by it: the signal as it is does as well within the limits.")
    said += _neighbour_words(document, best)
    if any(item["is_cut"] for item in document["methods"]):
        said.append(
            "The time was over before all settings were searched (cut short, unfinished): with "
            "more --seconds and --overwrite the same command goes on from here."
        )
    if document["reference"] is not None and best["over_bound_db"] is not None:
        reference = document["reference"]
        rounds = reference["settings"].get("rounds")
        said.append(
            f"Bound: the least-distortion projection ({rounds} rounds) reaches "
            f"{best['bound_db']:.2f} dB at the same EVM; the best stands "
            f"{abs(best['over_bound_db']):.2f} dB "
            f"{'above' if best['over_bound_db'] >= 0 else 'below'}. It bounds the ceiling; at a "
            "probability it is a reference only."
        )
    if document["confirmation"] is not None:
        said.append(confirmation_words(document))
    return said


def _neighbour_words(document: dict[str, Any], best: dict[str, Any]) -> list[str]:
    """Say that the adjacent channels suffer where nothing keeps them clear."""
    limits, before = document["limits"], document["before"]["aclr_db"]
    is_kept = (
        limits["aclr_db"] is not None or limits["keeps_channel_limits"] or limits["keeps_mask"]
    )
    if is_kept or before is None or best["aclr_db"] > before - WORSE_DB:
        return []
    text = (
        f"Nothing limits the adjacent channels: ACLR falls from {before:.1f} to "
        f"{best['aclr_db']:.1f} dB. Give --aclr-limit to keep them clear."
    )
    return [text]


def _best_words(document: dict[str, Any], best: dict[str, Any]) -> str:
    name = best["method"].replace("_", " ")
    if document["objective"] == "output_dbm":
        return (
            f"Best: {name}, {settings_words(best['settings'])}, driven with "
            f"{best['input_dbm']:.2f} dBm on average: {best['output_dbm']:.2f} dBm behind "
            f"{document['device']}, {best['gained_db']:.2f} dB more than without; the peak at its "
            f"input is {best['input_dbm'] + best['peak_db']:.2f} dBm."
        )
    return (
        f"Best: {name}, {settings_words(best['settings'])}: {best['level_db']:.2f} dB instead of "
        f"{best['level_before_db']:.2f} dB; with peaks as high as before the average may rise by "
        f"{best['gained_db']:.2f} dB. {best['binding']} is kept by {best['margin_db']:.2f} dB."
    )


def confirmation_words(document: dict[str, Any]) -> str:
    """Say how the best does on other data."""
    found = document["confirmation"]
    if found["verdict"] == "no_other_data":
        return "The signal does not depend on the seed: this loop is all there is."
    level, evm, margin = found["level_db"], found["evm_percent"], found["margin_db"]
    verdict = {
        "confirmed": "Confirmed on other data",
        "undecided": "UNDECIDED on other data: the loops are too short to tell",
        "missed": "MISSED on other data",
    }[found["verdict"]]
    power = "" if found["output_dbm"] is None else f"{found['output_dbm']:.2f} dBm on average, "
    return (
        f"{verdict} ({len(found['seeds'])} seeds; intervals of 95 %): {power}"
        f"level {_interval(level, 'dB')}, EVM {_interval(evm, '%')}, "
        f"limits kept by {_interval(margin, 'dB')}."
    )


def _interval(found: dict[str, float | None], unit: str) -> str:
    """Return a figure and its interval; a record too short leaves its ends open."""
    low, high = found["low"], found["high"]
    if low is not None and high is not None:
        ends = f"{low:.2f} to {high:.2f}"
    elif low is None and high is None:
        ends = "the loops are too short for an interval"
    else:
        told = f"from {low:.2f} on" if low is not None else f"up to {high:.2f}"
        ends = f"{told}: the loops are too short for the other end"
    return f"{found['mean']:.2f} {unit} ({ends})"


def _infeasible(document: dict[str, Any]) -> list[str]:
    nearest = document["nearest"]
    name = nearest["method"].replace("_", " ") or "the signal as it is"
    settings = settings_words(nearest["settings"])
    told = f"{name}, {settings}" if settings else name
    aclr = "" if nearest["aclr_db"] is None else f", ACLR {nearest['aclr_db']:.2f} dB"
    start = (
        "The time was over before anything was found that keeps the limits."
        if document["is_unfinished"]
        else "No method keeps the limits."
    )
    if nearest["margin_db"] >= 0:  # no method could be tried to the end
        why = "; ".join(
            f"{item['method'].replace('_', ' ')}: {item['reason']}"
            for item in document["methods"]
            if item["state"] == "unsuited"
        )
        start = f"No method suits this signal: {why}." if why else start
        return [f"{start} {told[0].upper()}{told[1:]} keeps the limits."]
    text = (
        f"{start} Nearest: {told}: EVM {nearest['evm_percent']:.3f} %{aclr}, level "
        f"{nearest['level_db']:.2f} dB; {nearest['binding']} misses its limit by "
        f"{-nearest['margin_db']:.2f} dB."
    )
    return [text]


def unsuited_words(document: dict[str, Any], asked: frozenset[str]) -> list[str]:
    """Say which of some methods were left out, and why."""
    return [
        f"{item['method']}: {item['reason']}"
        for item in document["methods"]
        if item["state"] == "unsuited" and item["method"] in asked
    ]
