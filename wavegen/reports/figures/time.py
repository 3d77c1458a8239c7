"""Power against time, and how a loop closes, as pictures."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from wavegen.core.signal import Samples
from wavegen.core.units import format_s
from wavegen.meters.envelope import Envelope
from wavegen.reports.figures.look import INK, SHADE, draw, legend, new_figure, stroke

if TYPE_CHECKING:
    from collections.abc import Sequence

    from matplotlib.figure import Figure

_UNITS = ((1.0, "s"), (1e-3, "ms"), (1e-6, "µs"), (1e-9, "ns"))
_LOWEST_DB = -40.0


def time_unit(span_s: float) -> tuple[float, str]:
    """Return the unit in which a span is a number of one to three digits.

    Examples
    --------
    >>> time_unit(0.0042)
    (0.001, 'ms')
    """
    return next((unit for unit in _UNITS if span_s >= unit[0]), _UNITS[-1])


def envelope_figure(
    envelope: Envelope, *, title: str, on_times_s: Sequence[tuple[float, float]] = ()
) -> Figure:
    """Draw power against time: mean and span in each of many short stretches.

    Parameters
    ----------
    envelope : Envelope
        As metered.
    title : str
        Heading.
    on_times_s : sequence of (float, float)
        When the signal is on, s; shaded.

    Returns
    -------
    Figure
    """
    figure, (axes,) = new_figure(title)
    unit, name = time_unit(envelope.duration_s)
    mean = envelope.total_mean
    edges = np.linspace(0.0, envelope.duration_s / unit, envelope.mean.size + 1)

    def over_mean(power: np.ndarray) -> np.ndarray:
        return 10 * np.log10(np.maximum(power / mean, 10 ** (_LOWEST_DB / 10)))

    for start, stop in on_times_s:
        axes.axvspan(start / unit, stop / unit, facecolor=SHADE, edgecolor="none", zorder=0)
    axes.stairs(
        over_mean(envelope.highest),
        edges,
        baseline=over_mean(envelope.lowest),
        fill=True,
        color=stroke(0).colour,
        alpha=0.30,
        label="from the least to the largest",
    )
    each = format_s(envelope.duration_s / envelope.mean.size)
    axes.stairs(
        over_mean(envelope.mean),
        edges,
        baseline=None,
        color=stroke(1).colour,
        linewidth=1.6,
        label=f"mean of each {each}",
    )
    axes.set_xlim(0, envelope.duration_s / unit)
    axes.set_ylim(bottom=max(_LOWEST_DB, float(over_mean(envelope.lowest).min()) - 2))
    axes.set_xlabel(f"time, {name}")
    axes.set_ylabel("power over the mean, dB")
    legend(axes, place="lower right")
    return figure


def seam_picture(
    around: Samples, *, sample_rate_hz: float, title: str, verdict: str = ""
) -> Figure:
    """Draw both rails where the end of a loop meets its start.

    Parameters
    ----------
    around : complex64 array, shape (2 n,)
        The last n samples of the loop, then its first n.
    sample_rate_hz : float
        Hz.
    title : str
        Heading.
    verdict : str
        Said in the figure.

    Returns
    -------
    Figure
    """
    figure, (axes,) = new_figure(title)
    half = around.size // 2
    unit, name = time_unit(half / sample_rate_hz)
    place = (np.arange(around.size) - half) / sample_rate_hz / unit
    for number, (rail, values) in enumerate((("I", around.real), ("Q", around.imag))):
        draw(axes, place, values, stroke(number), label=rail)
        axes.plot(
            place,
            values,
            linestyle="none",
            marker=stroke(number).mark,
            markersize=3.5,
            color=stroke(number).colour,
        )
    axes.axvline(0.0, color=INK, linewidth=1.2)
    axes.annotate(
        "the loop starts again",
        (0.0, 1.0),
        xycoords=("data", "axes fraction"),
        xytext=(6, -4),
        textcoords="offset points",
        va="top",
        fontsize=11,
        color=INK,
    )
    axes.set_xlim(place[0], place[-1])
    axes.set_xlabel(f"time from the seam, {name}" + (f"   ({verdict})" if verdict else ""))
    axes.set_ylabel("sample, full scale 1")
    legend(axes, place="lower right")
    return figure
