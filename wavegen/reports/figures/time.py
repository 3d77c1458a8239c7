"""Power against time, and how a loop closes, as pictures."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from wavegen.core.signal import Samples
from wavegen.core.units import format_s
from wavegen.meters.envelope import Envelope
from wavegen.reports.figures.look import (
    INK,
    SHADE,
    absolute_axis,
    draw,
    legend,
    new_figure,
    note,
    stroke,
)

if TYPE_CHECKING:
    from collections.abc import Sequence

    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

_UNITS = ((1.0, "s"), (1e-3, "ms"), (1e-6, "µs"), (1e-9, "ns"))
_LOWEST_DB = -40.0
_LEAST_SPAN_DB = 10.0
_STRIP = (0.965, 0.035)
"""Where the bar of on-times stands, and how high it is, over the height of the axes."""


def time_unit(span_s: float) -> tuple[float, str]:
    """Return the unit in which a span is a number of one to three digits.

    Examples
    --------
    >>> time_unit(0.0042)
    (0.001, 'ms')
    """
    return next((unit for unit in _UNITS if span_s >= unit[0]), _UNITS[-1])


def envelope_figure(
    envelope: Envelope,
    *,
    title: str,
    on_times_s: Sequence[tuple[float, float]] = (),
    mean_dbm: float | None = None,
    level_name: str = "level, dBm",
) -> Figure:
    """Draw power against time: mean and span in each of many short stretches.

    Parameters
    ----------
    envelope : Envelope
        As metered.
    title : str
        Heading.
    on_times_s : sequence of (float, float)
        When the signal is on, s; shaded, with a bar above.
    mean_dbm : float, optional
        Mean power, dBm: then a second axis tells levels in dBm.
    level_name : str
        Of that axis.

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

    highest, lowest = over_mean(envelope.highest), over_mean(envelope.lowest)
    if on_times_s:
        _shade(axes, [(start / unit, stop / unit) for start, stop in on_times_s])
    axes.stairs(
        highest,
        edges,
        baseline=lowest,
        fill=True,
        color=stroke(0).colour,
        alpha=0.38,
        label="from the least to the largest",
    )
    each = format_s(float(f"{envelope.duration_s / envelope.mean.size:.3g}"))
    axes.stairs(
        over_mean(envelope.mean),
        edges,
        baseline=None,
        color=stroke(1).colour,
        linewidth=1.6,
        label=f"mean of each {each}",
    )
    top = float(highest.max()) + (4.0 if on_times_s else 2.0)
    bottom = float(lowest.min())
    is_cut = bottom <= _LOWEST_DB
    axes.set_xlim(0, envelope.duration_s / unit)
    axes.set_ylim(_LOWEST_DB if is_cut else min(bottom - 2, top - _LEAST_SPAN_DB), max(top, 3.0))
    axes.set_xlabel(f"time, {name}")
    axes.set_ylabel("power over the mean, dB")
    if is_cut:
        note(axes, f"what lies below {_LOWEST_DB:g} dB is drawn there")
    if mean_dbm is not None:
        absolute_axis(axes, mean_dbm, level_name, along="y")
    legend(axes)
    return figure


def _shade(axes: Axes, on_times: Sequence[tuple[float, float]]) -> None:
    """Shade when a signal is on, and draw a bar above that grey print shows too."""
    for start, stop in on_times:
        axes.axvspan(start, stop, facecolor=SHADE, edgecolor="none", zorder=0)
    axes.broken_barh(
        [(start, stop - start) for start, stop in on_times],
        _STRIP,
        transform=axes.get_xaxis_transform(),
        facecolor=INK,
        linewidth=0,
        label=f"on: {len(on_times)} times" if len(on_times) > 1 else "on",
    )


def seam_picture(
    around: Samples,
    *,
    sample_rate_hz: float,
    title: str,
    verdict: str = "",
    is_real: bool = False,
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
    is_real : bool
        The file holds one rail, and no quadrature.

    Returns
    -------
    Figure
    """
    figure, (axes,) = new_figure(title)
    half = around.size // 2
    unit, name = time_unit(half / sample_rate_hz)
    place = (np.arange(around.size) - half) / sample_rate_hz / unit
    rails = (("samples", around.real),) if is_real else (("I", around.real), ("Q", around.imag))
    for number, (rail, values) in enumerate(rails):
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
    drawn = np.concatenate([values for _, values in rails])
    low, high = float(drawn.min(initial=0.0)), float(drawn.max(initial=0.0))
    room = 0.06 * (high - low or 1.0)
    axes.set_xlim(place[0], place[-1])
    axes.set_ylim(low - room, high + 2.5 * room)  # above: what is written there
    axes.set_xlabel(f"time from the seam, {name}")
    axes.set_ylabel("sample, full scale 1")
    if verdict:
        note(axes, f"Loop seam: {verdict}")
    legend(axes)
    return figure
