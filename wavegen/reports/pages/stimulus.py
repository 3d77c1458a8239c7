"""The report page of a stimulus that was made, and that of a measurement."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from wavegen.reports import measurement
from wavegen.reports.figures.picture import Picture
from wavegen.reports.figures.stimulus import level_words
from wavegen.reports.pages.page import Page, Section, Standing
from wavegen.reports.tables import (
    bench_table,
    channel_table,
    file_table,
    law_words,
    level_table,
    percent,
    summary_table,
)

_STANDINGS: dict[str, Standing] = {"agrees": "good", "differs": "bad", "undecided": "open"}


def stimulus_page(
    document: dict[str, Any], pictures: Sequence[Picture], *, sheet: Sequence[Section] = ()
) -> Page:
    """Return the page of a stimulus.

    Parameters
    ----------
    document : dict
        Its sidecar.
    pictures : sequence of Picture
        As made by :func:`wavegen.reports.figures.stimulus.pictures_of`.
    sheet : sequence of Section
        Of its bench sheet; without one, levels along the path stand in a table.
    """
    title = document["title"] or document["recipe"]["name"]
    law = document["law"]
    bench = bench_table(document)
    tables = [summary_table(document, title="Figures of the file"), level_table(document)]
    more = [table for table in (channel_table(document), file_table(document)) if table]
    sections = [
        Section(
            heading="Power statistics", pictures=_named(pictures, "ccdf"), tables=tuple(tables)
        ),
        Section(
            heading="Waveform",
            pictures=_others(pictures, "ccdf"),
        ),
    ]
    if bench and not sheet:
        sections.append(
            Section(heading="Levels along the path", tables=(bench,)),
        )
    sections.append(Section(heading="Files", tables=tuple(more)))
    sections.append(Section(heading="Recipe", text=document["recipe"]["text"]))
    return Page(
        title=title,
        summary=(_peak_words(document), level_words(document)),
        verdict=law_words(law) if law else "",
        standing=_STANDINGS.get(law["verdict"], "") if law else "",
        warnings=tuple(_doubts(document)),
        cautions=(document["safety"],),
        sections=(*sections, *sheet),
        origin=_origin(document),
    )


def measurement_page(document: dict[str, Any], pictures: Sequence[Picture]) -> Page:
    """Return the page of a measurement; parameters as of :func:`stimulus_page`."""
    first, *others = measurement.tables(document)
    return Page(
        title=document["name"],
        summary=(_peak_words(document), level_words(document), *measurement.lines(document)),
        warnings=tuple(_doubts(document)),
        cautions=(document["safety"],) if "safety" in document else (),
        sections=(
            Section(
                heading="Power statistics",
                pictures=_named(pictures, "ccdf"),
                tables=(first, *others),
            ),
            Section(
                heading="Waveform",
                pictures=_others(pictures, "ccdf"),
            ),
        ),
        origin=_origin(document),
    )


def _named(pictures: Sequence[Picture], name: str) -> tuple[Picture, ...]:
    return tuple(item for item in pictures if item.name.partition("-")[0] == name)


def _others(pictures: Sequence[Picture], name: str) -> tuple[Picture, ...]:
    return tuple(item for item in pictures if item.name.partition("-")[0] != name)


def _peak_words(document: dict[str, Any]) -> str:
    """Say what matters most: how high, how often, and the peak."""
    rare = [row for row in document["levels"] if row["resolved"] and row["level_db"] is not None]
    peak = f"the highest peak stands {document['papr_db']:.2f} dB above the mean"
    between = document.get("papr_between_samples_db")
    if between is not None:
        peak = f"the highest peak, between samples, stands {between:.2f} dB above the mean"
    if not rare:
        return f"{peak[0].upper()}{peak[1:]}."
    last = rare[-1]
    share = percent(last["probability"])
    return (
        f"The power exceeds its mean by {last['level_db']:.2f} dB for {share} of the time; {peak}."
    )


def _doubts(document: dict[str, Any]) -> list[str]:
    said = []
    for note in (*document.get("rounded", ()), *document.get("warnings", ())):
        if isinstance(note, str):
            said.append(note)
            continue
        change = f" (asked {note['asked']}, got {note['given']})" if "given" in note else ""
        said.append(f"{note['where']}: {note['text']}{change}")
    return said


def _origin(document: dict[str, Any]) -> tuple[tuple[str, str], ...]:
    found: list[tuple[str, str]] = []
    recipe = document.get("recipe")
    if isinstance(recipe, dict):
        found.append(("recipe, SHA-256", recipe["sha256"]))
        found += [("changed by", str(item)) for item in recipe.get("overrides", ())]
        found.append(("seed", str(document["seed"])))
    for item in (*document.get("files_read", ()), *document.get("files", ())):
        if item.get("sha512"):
            found.append((f"{item['name']}, SHA-512", item["sha512"]))
    found += [(name, str(value)) for name, value in document.get("versions", {}).items()]
    return tuple(found)
