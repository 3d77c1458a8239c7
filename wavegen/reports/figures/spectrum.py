"""Power spectral density as a picture, with channels and a mask."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from wavegen.core.units import format_hz
from wavegen.meters.spectrum import Spectrum
from wavegen.reports.figures.look import (
    INK,
    LIMIT,
    REFERENCE,
    SHADE,
    condensed,
    draw,
    legend,
    new_figure,
    stroke,
)

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

_UNITS = ((1e9, "GHz"), (1e6, "MHz"), (1e3, "kHz"), (1.0, "Hz"))
_MOST_POINTS = 2000
_DEEPEST_DB = 110.0
_NARROW = 0.13
"""Of the span shown; a narrower channel has no room for its name."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Channel:
    """A channel to shade.

    Parameters
    ----------
    name : str
        Written above it.
    low_hz, high_hz : float
        Its edges.
    remark : str
        Below its name: its leakage.
    """

    name: str
    low_hz: float
    high_hz: float
    remark: str = ""


def frequency_unit(span_hz: float) -> tuple[float, str]:
    """Return the unit in which a span is a number of one to three digits.

    Examples
    --------
    >>> frequency_unit(15.36e6)
    (1000000.0, 'MHz')
    """
    return next((unit for unit in _UNITS if span_hz >= unit[0]), _UNITS[-1])


def _shade(axes: Axes, channel: Channel, span_hz: float, unit: float) -> None:
    """Shade a channel and name it; the name of a narrow one stands beside it, outwards."""
    low, high = channel.low_hz / unit, channel.high_hz / unit
    axes.axvspan(low, high, facecolor=SHADE, zorder=0)
    for edge in (low, high):
        axes.axvline(edge, color=REFERENCE.colour, linewidth=0.9, zorder=0)
    place, side = (low + high) / 2, "center"
    if channel.high_hz - channel.low_hz < _NARROW * span_hz:
        if not channel.remark:
            return
        place, side = (low, "left") if place > 0 else (high, "right")
    axes.annotate(
        f"{channel.name}\n{channel.remark}".rstrip(),
        (place, 1.0),
        xycoords=("data", "axes fraction"),
        xytext=({"left": 3, "right": -3}.get(side, 0), -3),
        textcoords="offset points",
        ha=side,
        va="top",
        fontsize=10,
        color=INK,
    )


def _rough_hz(value_hz: float) -> str:
    return format_hz(float(f"{value_hz:.3g}"))


def spectrum_figure(
    spectra: Sequence[tuple[str, Spectrum]],
    *,
    title: str,
    channels: Sequence[Channel] = (),
    mask: tuple[NDArray[np.float64], NDArray[np.float64]] | None = None,
    is_real: bool = False,
) -> Figure:
    """Draw densities over the total power of each.

    Parameters
    ----------
    spectra : sequence of (name, Spectrum)
        At least one.
    title : str
        Heading.
    channels : sequence of Channel
        Shaded.
    mask : (frequencies in Hz, limits in dBc/Hz), optional
        Drawn as a limit.
    is_real : bool
        Of real samples: frequencies from 0 up.

    Returns
    -------
    Figure
    """
    figure, (axes,) = new_figure(title)
    widest = max(spectrum.sample_rate_hz for _, spectrum in spectra)
    unit, unit_name = frequency_unit(widest / 2)
    top = -np.inf
    for number, (name, spectrum) in enumerate(spectra):
        density = condensed(spectrum.density, _MOST_POINTS) / spectrum.total_power
        level = 10 * np.log10(np.maximum(density, 1e-30))
        draw(
            axes,
            condensed(spectrum.frequencies_hz, _MOST_POINTS) / unit,
            level,
            stroke(number),
            label=f"{name}, resolution {_rough_hz(spectrum.noise_bandwidth_hz)}",
        )
        top = max(top, float(level.max()))
    for channel in channels:
        _shade(axes, channel, widest, unit)
    if mask is not None:
        draw(axes, mask[0] / unit, mask[1], LIMIT, label="limit")
    axes.set_xlim(0.0 if is_real else -widest / 2 / unit, widest / 2 / unit)
    low = axes.get_ylim()[0]
    if mask is not None:
        top, low = max(top, float(mask[1].max())), min(low, float(mask[1].min()) - 5)
    bottom = max(low, top - _DEEPEST_DB)
    axes.set_ylim(bottom, top + 0.06 * (top - bottom) * (4 if channels else 2))
    axes.set_xlabel(f"frequency{'' if is_real else ' from the centre'}, {unit_name}")
    axes.set_ylabel("power density over the total power, dBc/Hz")
    legend(axes)
    return figure
