"""Received symbols beside the points they stand for."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from wavegen.core.signal import Samples
from wavegen.reports.figures.look import INK, new_figure, stroke

if TYPE_CHECKING:
    from matplotlib.figure import Figure


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Cloud:
    """Symbols of one class.

    Parameters
    ----------
    name : str
        Their source or group.
    received, ideal : complex array, shape (n,)
        What a receiver makes of them, after one complex gain, and what was sent.
    evm_percent : float or None
        Of all symbols of the class, not of these alone.
    """

    name: str
    received: Samples
    ideal: Samples
    evm_percent: float | None = None


def constellation_figure(clouds: Sequence[Cloud], *, title: str) -> Figure:
    """Draw received symbols and the ideal points, a panel for each class.

    Parameters
    ----------
    clouds : sequence of Cloud
        At least one; three are drawn at most.
    title : str
        Heading.

    Returns
    -------
    Figure
    """
    shown = clouds[:3]
    figure, panels = new_figure(title, n_panels=len(shown))
    for number, (axes, cloud) in enumerate(zip(panels, shown, strict=True)):
        style = stroke(number)
        axes.plot(
            cloud.received.real,
            cloud.received.imag,
            linestyle="none",
            marker=".",
            markersize=3,
            color=style.colour,
            alpha=0.5,
            label="received",
            rasterized=True,
        )
        points = np.unique(np.round(cloud.ideal, 5))
        axes.plot(
            points.real,
            points.imag,
            linestyle="none",
            marker="+",
            markersize=9,
            markeredgewidth=1.4,
            color=INK,
            label="sent",
        )
        evm = "" if cloud.evm_percent is None else f": EVM {cloud.evm_percent:.3g} %"
        axes.set_title(f"{cloud.name}{evm}", fontsize=12, color=INK, parse_math=False)
        rails = np.concatenate([cloud.received.real, cloud.received.imag, points.real, points.imag])
        reach = 1.15 * max(float(np.abs(rails).max()), 1e-6)
        axes.set_xlim(-reach, reach)
        axes.set_ylim(-reach, reach)
        axes.set_aspect("equal")
        axes.set_xlabel("in-phase, RMS of the class 1")
        axes.set_ylabel("quadrature")
    handles, labels = panels[0].get_legend_handles_labels()
    figure.legend(handles, labels, loc="outside lower center", ncols=2, fontsize=11, markerscale=2)
    return figure
