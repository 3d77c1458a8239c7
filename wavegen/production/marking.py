"""Where a loop starts over and its bursts and frames stand, as markers of the files."""

from __future__ import annotations

from wavegen.core.site import Note
from wavegen.files.format import Annotation
from wavegen.files.markers import Kind, marker
from wavegen.production.prepare import Prepared
from wavegen.stages.channel.gate import on_time

MOST_MARKERS = 1000
"""More of one kind are left out, with a note: markers are for people and triggers."""


def markers_of(prepared: Prepared) -> tuple[Annotation, ...]:
    """Return the markers of a loop, by start.

    Parameters
    ----------
    prepared : Prepared
        Gets a note where a kind of marker is left out.

    Returns
    -------
    tuple of Annotation
        ``period start`` for the whole loop, ``burst on`` for each on-time (ramps included), and
        ``frame`` for each cycle of a source that has frames, where the loop holds several.
    """
    n, cycle = prepared.site.n_samples, prepared.cycle_samples
    places: dict[Kind, list[tuple[int, int]]] = {"period start": [(0, n)]}
    bursts = on_time(prepared.built.signal)
    if bursts is not None:
        places["burst on"] = bursts.starts(n)
    if getattr(prepared.loaded.recipe.signal, "is_framed", False) and n > cycle:
        places["frame"] = [(start, cycle) for start in range(0, n, cycle)]
    found: list[Annotation] = []
    for kind, stretches in places.items():
        if len(stretches) > MOST_MARKERS:
            text = f"{len(stretches)} markers of the kind {kind!r} are left out of the files"
            prepared.notes.append(Note(kind="info", where="output", text=text))
            continue
        found += [marker(kind, start, length) for start, length in stretches]
    return tuple(sorted(found, key=lambda item: (item.start_sample, -(item.n_samples or 0))))
