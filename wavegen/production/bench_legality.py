"""What of a file a generator takes, and what would be legal in its place."""

from __future__ import annotations

import math
from typing import Any

from wavegen.core.units import format_hz, format_s
from wavegen.recipe.bench import Generator


def legality(limits: Generator, document: dict[str, Any]) -> list[dict[str, Any]]:
    """Return what of the file the generator takes, and what would be legal instead.

    Parameters
    ----------
    limits : Generator
        Of the bench.
    document : dict
        The sidecar.

    Returns
    -------
    list of dict
        ``what``, ``value``, ``allowed``, ``is_met``: duration, data, then what the bench limits.
    """
    rate, n_samples = document["sample_rate_hz"], document["n_samples"]
    n_channels = len(document["files"][0].get("channels") or [document])
    bits = {item["bits"] or _bits(item["datatype"]) for item in document["files"]}
    rows = [
        _row("duration", format_s(document["duration_s"]), "", is_met=True),
        _row(
            "data", f"{n_samples * n_channels * 4 / 1e6:.6g} MB as 16-bit I and Q", "", is_met=True
        ),
    ]
    least, most = limits.clock_least_hz, limits.clock_most_hz
    if least is not None or most is not None:
        span = (
            f"{format_hz(least or 0)} to {format_hz(most)}"
            if most
            else f"from {format_hz(least or 0)}"
        )
        is_met = (least or 0) <= rate <= (most or math.inf)
        rows.append(_row("clock", format_hz(rate), span, is_met=is_met))
    if limits.memory_samples is not None or limits.least_samples > 1:
        high = limits.memory_samples
        span = (
            f"{limits.least_samples} to {high} samples"
            if high
            else f"from {limits.least_samples} samples"
        )
        is_met = limits.least_samples <= n_samples <= (high or n_samples)
        rows.append(_row("length", f"{n_samples} samples", span, is_met=is_met))
    if limits.granularity_samples > 1:
        step = limits.granularity_samples
        over = n_samples % step
        near = f"{n_samples - over} or {n_samples - over + step}" if over else ""
        instead = f"a multiple of {step}" + (f": {near} samples" if near else "")
        rows.append(_row("granularity", f"{n_samples} samples", instead, is_met=not over))
    if limits.word_bits is not None:
        widest = max(bits)
        rows.append(
            _row(
                "word",
                f"{widest} bits",
                f"{limits.word_bits} bits are converted",
                is_met=widest >= limits.word_bits,
            )
        )
    return rows


def _bits(datatype: str) -> int:
    digits = "".join(character for character in datatype.partition("_")[0] if character.isdigit())
    return int(digits) if digits else 16


def _row(what: str, value: str, allowed: str, *, is_met: bool) -> dict[str, Any]:
    return {"what": what, "value": value, "allowed": allowed, "is_met": is_met}
