"""The report pages of comparisons, shaped stimuli, devices and tunings."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
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
    """Return the page of a match; a recipe to start from stands in a section of its own."""
    nearest = next((look for look in document["looks_like"][:1] if look["is_near"]), None)
    recipe = nearest["recipe"] if nearest else ""
    said = _without_text(comparison.match_lines(document), recipe.splitlines())
    page = _page(
        f"{document['stimulus']['name']} against {document['field']['name']}",
        _last_first(said),
        comparison.match_tables(document),
        pictures,
        document,
        verdict=document["verdict"],
    )
    if not recipe:
        return page
    start = Section(heading="A recipe to start from", text=recipe)
    return replace(page, sections=(*page.sections, start))


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
        _last_first(gain_curve.gain_lines(document)),
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
        _last_first(tuning.outcome_words(document)),
        [tuning.method_table(document, title="Methods")],
        pictures,
        document,
        verdict=confirmation.get("verdict", ""),
    )


def _file_row(item: dict[str, Any] | str) -> tuple[str, str]:
    """Return name and hash of a file that was written; a file of words has a name alone."""
    if isinstance(item, str):
        return "file", item
    digest = item.get("sha512")
    return (f"{item['name']}, SHA-512", digest) if digest else ("file", item["name"])


def _last_first(lines: Sequence[str]) -> list[str]:
    """Return sentences of which the last says what came of it, that one first."""
    return [*lines[-1:], *lines[:-1]]


def _without_text(lines: list[str], text: Sequence[str]) -> list[str]:
    """Return sentences without the lines of a text among them, which is shown elsewhere."""
    count = len(text)
    places = [k for k in range(len(lines)) if count and lines[k : k + count] == list(text)]
    if not places:
        return lines
    before = [
        *lines[: places[0] - 1],
        lines[places[0] - 1].removesuffix(" A recipe to start from:"),
    ]
    return [*before, *lines[places[0] + count :]]


def _page(
    title: str,
    lines: Sequence[str],
    tables: Sequence[Table],
    pictures: Sequence[Picture],
    document: dict[str, Any],
    *,
    verdict: str,
) -> Page:
    files = [*document.get("files_read", ()), *document.get("files", ())]
    origin = [_file_row(item) for item in files]
    origin += [(name, str(value)) for name, value in document.get("versions", {}).items()]
    return Page(
        title=title,
        summary=tuple(lines),
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
