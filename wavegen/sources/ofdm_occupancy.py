"""Which subcarriers an OFDM signal uses in which symbols: no two parts on one at a time."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from wavegen.core.site import Note, Site
from wavegen.sources.ofdm_power import Part


def check_subcarriers(site: Site, parts: Sequence[Part], n_fft: int) -> NDArray[np.intp]:
    """Return the subcarriers in use in any symbol, ascending.

    Parameters
    ----------
    site : Site
        For messages.
    parts : sequence of Part
        All over the same frame.
    n_fft : int
        FFT length.

    Returns
    -------
    intp array, shape (n_active,)

    Raises
    ------
    RecipeError
        No parts, a subcarrier out of range, or one used twice in the same symbol.
    """
    if not parts:
        raise site.error(
            key="groups",
            problem="there are neither groups nor pilots",
            allowed="at least one group or one entry of pilots",
            remedy="Add a group with subcarriers and a constellation.",
        )
    lowest, highest = -(n_fft // 2), (n_fft - 1) // 2
    for number, part in enumerate(parts):
        key = f"{part.key}.subcarriers"
        for index in (int(part.indices.min()), int(part.indices.max())):
            if not lowest <= index <= highest:
                raise site.error(
                    key=key,
                    problem=f"subcarrier {index} is outside an FFT of {n_fft}",
                    allowed=f"{lowest} to {highest}",
                    remedy="Leave it out, or raise the sample rate.",
                )
        different, counts = np.unique(part.indices, return_counts=True)
        if different.size < part.indices.size:
            raise site.error(
                key=key,
                problem=f"subcarrier {different[np.argmax(counts > 1)]} is listed twice",
                allowed="each subcarrier once",
                remedy="Leave one of the two out.",
            )
        for other in parts[:number]:
            _refuse_overlap(site, part, other)
    return np.unique(np.concatenate([part.indices for part in parts]))


def _refuse_overlap(site: Site, part: Part, other: Part) -> None:
    together = np.flatnonzero(part.presence.on & other.presence.on)
    shared = np.intersect1d(part.indices, other.indices) if together.size else together
    if not shared.size:
        return
    when = (
        "" if together.size == part.presence.on.size else f" in symbol {together[0]} of the frame"
    )
    raise site.error(
        key=f"{part.key}.subcarriers",
        problem=f"subcarrier {shared[0]} is in use by {other.key} too{when}",
        allowed="each subcarrier once in a symbol",
        remedy="Leave it out in one of the two, or have them on in different symbols.",
    )


def note_idle(site: Site, parts: Sequence[Part]) -> None:
    """Tell of symbols in which nothing is on: the mean power is that of the whole loop."""
    is_on = np.any([part.presence.on for part in parts], axis=0)
    if is_on.all():
        return
    n_on, n_frame = int(is_on.sum()), is_on.size
    text = (
        f"{n_frame - n_on} of {n_frame} symbols of the frame are silent: the mean power, 1 over "
        f"the whole loop, is about {10 * math.log10(n_frame / n_on):.2f} dB higher in the others."
    )
    site.notes.append(Note(kind="info", where=f"{site.path}.frame", text=text))
