"""The pictures of any document, by what it is."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from wavegen.core.errors import ArgumentsError
from wavegen.reports.figures import compared
from wavegen.reports.figures.picture import Picture
from wavegen.reports.figures.stimulus import pictures_of

if TYPE_CHECKING:
    from matplotlib.figure import Figure

_BY_KIND = {
    "match": compared.match_pictures,
    "shape": compared.shape_pictures,
    "gain_curve": compared.gain_pictures,
    "tuning": compared.tune_pictures,
}


def pictures_in(document: Mapping[str, Any]) -> list[Picture]:
    """Return the pictures of what a document itself holds.

    Parameters
    ----------
    document : mapping
        As ``--json`` prints it, of any verb that measures or makes.

    Returns
    -------
    list of Picture
        Of a stimulus or a measurement: CCDF, PDF and CDF. What needs samples (power against
        time, spectrum, constellation, seam) is drawn by :func:`.stimulus.pictures_of`.

    Raises
    ------
    ArgumentsError
        There is nothing to draw in it, or Matplotlib is not installed.
    """
    found = dict(document)
    kind = str(found.get("format", "")).rpartition(".")[2]
    if kind in _BY_KIND:
        return _BY_KIND[kind](found)
    if "ccdf" in found and "levels" in found:
        title = found.get("title") or found.get("name") or found["recipe"]["name"]
        return pictures_of(found, None, title=title)
    raise ArgumentsError(
        where="figures",
        problem=f"a document of the kind {kind or 'unknown'!r} holds no curve",
        allowed="documents of make, measure, match, shape, gain-curve and tune",
        remedy="Measure the recipe, or make it.",
    )


def figures_in(document: Mapping[str, Any]) -> dict[str, Figure]:
    """Return the figures of a document by their names, for whoever places or saves them.

    Raises
    ------
    ArgumentsError
        As :func:`pictures_in`.
    """
    return {picture.name: picture.figure for picture in pictures_in(document)}
