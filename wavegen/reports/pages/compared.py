"""The report pages of comparisons, shaped stimuli, devices and tunings."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from wavegen.core.table import Table
from wavegen.production.sidecar import SAFETY
from wavegen.reports import comparison, gain_curve, shape, tuning
from wavegen.reports.figures.picture import Picture
from wavegen.reports.pages.page import Page, Section, Standing

_STANDINGS: dict[str, Standing] = {
    "match": "good",
    "differ": "bad",
    "undecided": "open",
    "confirmed": "good",
}


def match_page(document: dict[str, Any], pictures: Sequence[Picture]) -> Page:
    """Return the page of a match."""
    return _page(
        f"{document['stimulus']['name']} against {document['field']['name']}",
        comparison.match_lines(document),
        comparison.match_tables(document),
        pictures,
        document,
        verdict=document["verdict"],
    )


def shape_page(document: dict[str, Any], pictures: Sequence[Picture]) -> Page:
    """Return the page of a shaped stimulus."""
    return _page(
        f"{document['name']}, in the shape of {document['field']}",
        shape.lines(document),
        shape.tables(document),
        pictures,
        document,
        verdict=document["verdict"],
    )


def gain_page(document: dict[str, Any], pictures: Sequence[Picture]) -> Page:
    """Return the page of a device's gain curve."""
    return _page(
        "Gain of the device",
        gain_curve.gain_lines(document),
        gain_curve.gain_tables(document),
        pictures,
        document,
        verdict=document["verdict"],
    )


def tune_page(document: dict[str, Any], pictures: Sequence[Picture]) -> Page:
    """Return the page of a tuning."""
    confirmation = document.get("confirmation") or {}
    return _page(
        f"Crest-factor reduction of {document['title'] or document['name']}",
        tuning.outcome_words(document),
        [tuning.method_table(document, title="Methods")],
        pictures,
        document,
        verdict=confirmation.get("verdict", ""),
    )


def _page(
    title: str,
    lines: Sequence[str],
    tables: Sequence[Table],
    pictures: Sequence[Picture],
    document: dict[str, Any],
    *,
    verdict: str,
) -> Page:
    origin = [(name, str(value)) for name, value in document.get("versions", {}).items()]
    return Page(
        title=title,
        summary=tuple(lines[::-1]),
        verdict=verdict,
        standing=_STANDINGS.get(verdict, ""),
        warnings=tuple(f"{note['where']}: {note['text']}" for note in document["warnings"]),
        cautions=(SAFETY,),
        sections=(
            Section(heading="Curves", pictures=tuple(pictures)),
            Section(heading="Figures", tables=tuple(tables)),
        ),
        origin=tuple(origin),
    )
