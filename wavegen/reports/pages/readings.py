"""What a page's script needs to tell values where one points at a figure."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from wavegen.reports.inert import one_line

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

_POINTS_AN_INCH = 72.0
_MOST_POINTS = 600
_DIGITS = 6


def readings_of(figure: Figure) -> list[dict[str, Any]]:
    """Return place, scales and curves of every panel of a figure that was drawn.

    Parameters
    ----------
    figure : Figure
        After it was rendered as SVG: only then do panels stand where they will be seen.

    Returns
    -------
    list of dict
        ``box`` (left, top, right, bottom in the SVG's own units), ``x`` and ``y`` (``from``,
        ``to``, ``log``, ``name``) and ``curves`` (``name``, ``x``, ``y``). Panels without a named
        curve are left out.
    """
    width, height = (float(size) * _POINTS_AN_INCH for size in figure.get_size_inches())
    panels = []
    for axes in figure.axes:
        curves = _curves(axes)
        if not curves:
            continue
        box = axes.get_position()
        panels.append(
            {
                "box": [
                    round(value, 2)
                    for value in (
                        box.x0 * width,
                        (1 - box.y1) * height,
                        box.x1 * width,
                        (1 - box.y0) * height,
                    )
                ],
                "x": _scale(axes.get_xlim(), axes.get_xscale(), axes.get_xlabel()),
                "y": _scale(axes.get_ylim(), axes.get_yscale(), axes.get_ylabel()),
                "curves": curves,
            }
        )
    return panels


def _scale(limits: tuple[float, float], kind: str, name: str) -> dict[str, Any]:
    low, high = (float(value) for value in limits)
    return {"from": low, "to": high, "log": kind == "log", "name": name}


def _curves(axes: Axes) -> list[dict[str, Any]]:
    """Return the named lines and steps of a panel whose places rise."""
    from matplotlib.patches import StepPatch

    found = [
        (line.get_label(), *np.asarray(line.get_data(), np.float64))
        for line in axes.lines
        if np.size(line.get_xdata()) > 1
    ]
    for patch in axes.patches:
        if isinstance(patch, StepPatch) and not patch.get_fill():
            values, edges, _ = patch.get_data()
            middle = (np.asarray(edges)[1:] + np.asarray(edges)[:-1]) / 2
            found.append((patch.get_label(), middle, np.asarray(values, np.float64)))
    curves = []
    for label, places, values in found:
        name = one_line(str(label))
        falls = places.size > 1 and places[0] > places[-1]
        x, y = (places[::-1], values[::-1]) if falls else (places, values)
        if name and not name.startswith("_") and x.size > 1 and np.all(np.diff(x) >= 0):
            chosen = np.unique(np.linspace(0, x.size - 1, min(x.size, _MOST_POINTS)).astype(int))
            curves.append({"name": name, "x": _short(x[chosen]), "y": _short(y[chosen])})
    return curves


def _short(values: NDArray[np.float64]) -> list[float | None]:
    """Round to six digits; what is not finite is None."""
    return [
        float(f"{value:.{_DIGITS}g}") if math.isfinite(value) else None for value in values.tolist()
    ]
