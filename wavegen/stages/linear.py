"""What filtering stages tell of the mean power that they leave."""

from __future__ import annotations

import math

from wavegen.core.signal import Signal
from wavegen.core.site import Note, Site
from wavegen.dsp.pilot import N_STRETCHES, STRETCH_SAMPLES, is_whole

SILENT_DB = -100.0
"""A filter that leaves less of a signal than this has probably missed its band."""


def tell_power(site: Site, source: Signal, gain: float | None, *, is_undone: bool = False) -> None:
    """Tell what a filter leaves of the mean power, with a warning where that is next to nothing.

    Parameters
    ----------
    site : Site
        Told.
    source : Signal
        What is filtered.
    gain : float or None
        From :func:`wavegen.dsp.pilot.power_gain`.
    is_undone : bool
        Whether the output is scaled back.
    """
    origin = (
        "the whole loop"
        if is_whole(source)
        else f"{N_STRETCHES} stretches of {STRETCH_SAMPLES} samples"
    )
    gain_db = 10 * math.log10(gain) if gain else -math.inf
    done = ", which is undone" if is_undone else ""
    if gain_db > SILENT_DB:
        text = f"the mean power changes by {gain_db:+.3f} dB{done}; found on {origin}"
        site.notes.append(Note(kind="info", where=site.path, text=text))
        return
    text = f"next to nothing of the signal passes; found on {origin}"
    site.notes.append(Note(kind="warning", where=site.path, text=text))
