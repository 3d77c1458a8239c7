"""Phase laws of tones, by name, and what is doubtful about them."""

from __future__ import annotations

import math
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from wavegen.core.rng import stream_key
from wavegen.core.site import Note, Site
from wavegen.dsp.phase_descent import LONGEST_SPAN, optimised_phases, peak_over_mean
from wavegen.dsp.phases import (
    equal_phases,
    newman_phases,
    random_phases,
    rudin_shapiro_phases,
    schroeder_phases,
)

Phases = Literal["equal", "random", "newman", "schroeder", "rudin_shapiro", "optimised"]


def law_phases(
    phases: Phases, site: Site, powers: NDArray[np.float64], notes: list[Note]
) -> NDArray[np.float64]:
    """Return the phases of a law, radians.

    Parameters
    ----------
    phases : str
        Name of the law; those to be optimised start at 0.
    site : Site
        Names random phases; its notes are left alone.
    powers : float64 array, shape (n_tones,)
        In the order of frequency.
    notes : list of Note
        Filled.
    """
    count = powers.size
    match phases:
        case "equal" | "optimised":
            return equal_phases(count)
        case "random":
            return random_phases(stream_key(site.seed, site.label), count)
        case "newman":
            return newman_phases(count)
        case "schroeder":
            return schroeder_phases(powers)
        case "rudin_shapiro":
            if count & (count - 1):
                text = (
                    f"{count} is not a power of two: the bound of 3.01 dB on the crest factor of "
                    "rudin_shapiro phases does not hold; phases: optimised suits any count."
                )
                notes.append(Note(kind="warning", where=f"{site.path}.phases", text=text))
            return rudin_shapiro_phases(count)


def note_uneven(phases: Phases, site: Site, bins: NDArray[np.int64], notes: list[Note]) -> None:
    """Warn of a law for even spacing on tones that are not."""
    if phases in {"newman", "schroeder", "rudin_shapiro"} and np.unique(np.diff(bins)).size > 1:
        text = (
            f"The tones are not evenly spaced: {phases} phases need not give a low crest factor; "
            "phases: optimised suits any list."
        )
        notes.append(Note(kind="warning", where=f"{site.path}.phases", text=text))


def optimise(
    site: Site,
    bins: NDArray[np.int64],
    powers: NDArray[np.float64],
    own: NDArray[np.float64],
    notes: list[Note],
) -> NDArray[np.float64]:
    """Return phases with a low peak of the envelope, radians, and tell of it.

    Parameters
    ----------
    site : Site
        For messages.
    bins : int64 array, shape (n_tones,)
        Lines of the loop's grid, rising.
    powers : float64 array, shape (n_tones,)
        On any scale.
    own : float64 array, shape (n_tones,)
        Phases that tones were given, which stay; NaN for the others.
    notes : list of Note
        Filled.

    Raises
    ------
    RecipeError
        The tones repeat too late to be searched.
    """
    common = int(np.gcd.reduce(np.append(np.diff(bins), 0))) or 1
    span = int(bins[-1] - bins[0]) // common
    if span > LONGEST_SPAN:
        raise site.error(
            key="phases",
            problem=f"the envelope of these tones has {span} lines between the lowest and the "
            "highest",
            allowed=f"up to {LONGEST_SPAN} for optimised phases",
            remedy="Move the tones to a coarser grid, or shorten the loop.",
        )
    found = optimised_phases(bins, powers, own)
    near = (bins - bins[0]) // common
    peak_db = 10 * math.log10(peak_over_mean(near, powers, found))
    text = f"phases searched for these {bins.size} tones: {peak_db:.2f} dB peak over mean"
    notes.append(Note(kind="info", where=f"{site.path}.phases", text=text))
    return found
