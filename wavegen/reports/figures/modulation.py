"""Received symbols beside the points they stand for."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from wavegen.core.signal import Samples
from wavegen.reports.figures.look import INK, legend, new_figure, note, stroke
from wavegen.reports.inert import one_line

if TYPE_CHECKING:
    from matplotlib.figure import Figure

MOST_PANELS = 3
_LONGEST_NAME = 32
_MANY_POINTS = 100
_LEAST_EVM_PERCENT = 1e-3
_FEW_DIGITS_PERCENT = 0.1


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
    shown = clouds[:MOST_PANELS]
    figure, panels = new_figure(title, n_panels=len(shown))
    for number, (axes, cloud) in enumerate(zip(panels, shown, strict=True)):
        style = stroke(number)
        points = np.unique(np.round(cloud.ideal, 5))
        axes.plot(
            cloud.received.real,
            cloud.received.imag,
            linestyle="none",
            marker="o",
            markersize=3,
            markeredgewidth=0,
            color=style.colour,
            alpha=0.6,
            label="received",
            rasterized=True,
        )
        axes.plot(
            points.real,
            points.imag,
            linestyle="none",
            marker="o",
            markersize=8 if points.size > _MANY_POINTS else 12,
            markerfacecolor="none",
            markeredgewidth=1.2,
            color=INK,
            label="sent",
        )
        evm = "" if cloud.evm_percent is None else f"EVM {evm_words(cloud.evm_percent)}"
        note(axes, f"{_cut(cloud.name)}\n{evm}" if evm else _cut(cloud.name))
        rails = np.concatenate([cloud.received.real, cloud.received.imag, points.real, points.imag])
        reach = 1.15 * max(float(np.abs(rails).max()), 1e-6)
        axes.set_xlim(-reach, reach)
        axes.set_ylim(-reach, reach)
        axes.set_aspect("equal")
        axes.set_xlabel("in-phase, over the RMS")
    panels[0].set_ylabel("quadrature, over the RMS")
    legend(panels[0], mark_scale=1.6)
    return figure


def _cut(name: str) -> str:
    """Return a name that fits over a panel."""
    line = one_line(name)
    return line if len(line) <= _LONGEST_NAME else f"{line[:_LONGEST_NAME].rstrip()} ..."


def evm_words(percent: float) -> str:
    """Write an EVM with the digits that mean something.

    Examples
    --------
    >>> evm_words(3.7281), evm_words(0.00388), evm_words(2.4e-5)
    ('3.73 %', '0.0039 %', 'below 0.001 %')
    """
    if percent < _LEAST_EVM_PERCENT:
        return f"below {_LEAST_EVM_PERCENT:g} %"
    return f"{percent:.3g} %" if percent >= _FEW_DIGITS_PERCENT else f"{percent:.2g} %"
