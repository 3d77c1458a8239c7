"""What crest-factor reduction costs, and what a device does, as pictures."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from wavegen.reports.figures.look import INK, REFERENCE, SHADE, draw, legend, new_figure, stroke
from wavegen.reports.tables import percent

if TYPE_CHECKING:
    from matplotlib.figure import Figure


_POINTS = ("*", "o")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Front:
    """What one method reaches.

    Parameters
    ----------
    name : str
        The method.
    evm_percent, level_db : float64 array, shape (n,)
        Of each setting tried.
    """

    name: str
    evm_percent: NDArray[np.float64]
    level_db: NDArray[np.float64]

    @property
    def best(self) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """EVM and level of the settings that no other one beats in both, by EVM."""
        order = np.lexsort((self.level_db, self.evm_percent))
        evm, level = self.evm_percent[order], self.level_db[order]
        before = np.concatenate([[np.inf], np.minimum.accumulate(level)[:-1]])
        kept = level < before
        return evm[kept], level[kept]


def front_figure(
    fronts: Sequence[Front],
    *,
    title: str,
    level_name: str,
    bound: Front | None = None,
    evm_limit_percent: float | None = None,
    points: Sequence[Front] = (),
) -> Figure:
    """Draw level against EVM: what each method pays for a lower peak.

    Parameters
    ----------
    fronts : sequence of Front
        Methods; points that no other one of the method beats are joined.
    title, level_name : str
        Heading, and which level it is.
    bound : Front, optional
        What none of them can pass.
    evm_limit_percent : float, optional
        The limit; what lies beyond is shaded.
    points : sequence of Front
        Single settings to point out.

    Returns
    -------
    Figure
    """
    figure, (axes,) = new_figure(title)
    for number, front in enumerate(fronts):
        style = stroke(number)
        draw(axes, *front.best, style, label=front.name.replace("_", " "))
        axes.plot(
            front.evm_percent,
            front.level_db,
            linestyle="none",
            marker=style.mark,
            markersize=6,
            color=style.colour,
        )
    if bound is not None:
        draw(axes, *bound.best, REFERENCE, label=bound.name, has_marks=True)
    for point, mark in zip(points, _POINTS, strict=False):
        axes.plot(
            point.evm_percent,
            point.level_db,
            linestyle="none",
            marker=mark,
            markersize=15,
            markerfacecolor="none",
            markeredgecolor=INK,
            markeredgewidth=1.8,
            label=point.name,
            clip_on=False,
        )
    if evm_limit_percent is not None:
        right = max(axes.get_xlim()[1], evm_limit_percent * 1.1)
        axes.axvspan(evm_limit_percent, right, facecolor=SHADE, zorder=0)
        axes.axvline(evm_limit_percent, color=INK, linewidth=1.2)
        axes.set_xlim(right=right)
    axes.set_xlim(left=0)
    axes.margins(y=0.08)
    axes.set_xlabel(
        "EVM, % of the RMS signal" + ("   (shaded: over the limit)" if evm_limit_percent else "")
    )
    axes.set_ylabel(level_name)
    legend(axes)
    return figure


def difference_figure(
    rows: Sequence[dict[str, Any]], *, title: str, name: str, tolerance_db: float
) -> Figure:
    """Draw the difference of two curves at each probability, with its interval.

    Parameters
    ----------
    rows : sequence of dict
        ``probability``, ``difference_db`` and, where known, ``low_db`` and ``high_db``.
    title, name : str
        Heading, and what the difference is of.
    tolerance_db : float
        Within which both count as alike; shaded.

    Returns
    -------
    Figure
    """
    from matplotlib.ticker import LogLocator, NullFormatter

    figure, (axes,) = new_figure(title)
    share, difference = _columns(rows, "probability", "difference_db")
    axes.axhspan(
        -tolerance_db,
        tolerance_db,
        facecolor=SHADE,
        zorder=0,
        label=f"tolerance, {tolerance_db:g} dB either way",
    )
    axes.axhline(0.0, color=INK, linewidth=1.0)
    place, low, high = _columns(rows, "probability", "low_db", "high_db")
    colour = stroke(0).colour
    if np.any(high > low):  # of exact curves there is none to show
        axes.vlines(place, low, high, color=colour, linewidth=2.0, alpha=0.6, label="95 % interval")
    draw(axes, share, difference, stroke(0), label="difference", has_marks=True)
    axes.set_xscale("log")
    axes.set_xlim(float(share.max()) * 1.5, float(share.min()) / 1.5)  # rarer to the right
    axes.xaxis.set_major_locator(LogLocator(numticks=12))
    axes.xaxis.set_major_formatter(lambda value, _: percent(value))
    axes.xaxis.set_minor_formatter(NullFormatter())
    reach = 1.15 * max(np.abs(np.concatenate([difference, low, high])).max(), tolerance_db)
    axes.set_ylim(-reach, reach)
    axes.set_xlabel("share of time above the level")
    axes.set_ylabel(name)
    legend(axes)
    return figure


def _columns(rows: Sequence[dict[str, Any]], *keys: str) -> list[NDArray[np.float64]]:
    """Return columns of the rows that have a value in each."""
    used = [row for row in rows if all(row.get(key) is not None for key in keys)]
    return [np.array([row[key] for row in used], np.float64) for key in keys]


def gain_figure(
    rows: Sequence[dict[str, Any]],
    *,
    title: str,
    input_name: str = "input level over the input mean, dB",
    input_key: str = "input_db",
    compression_db: float | None = None,
    unit: str = "dB",
    gain_name: str = "gain, dB",
) -> Figure:
    """Draw a device's gain against its input level.

    Parameters
    ----------
    rows : sequence of dict
        The input level, ``gain_db`` and, where known, ``low_db`` and ``high_db``.
    title, input_name, input_key : str
        Heading, name of the level axis, and where rows hold that level.
    compression_db : float, optional
        Input level of the 1 dB compression point.
    unit : str
        Of input levels.
    gain_name : str
        Of the other axis.

    Returns
    -------
    Figure
    """
    figure, (axes,) = new_figure(title)
    columns = {
        key: np.array([np.nan if row.get(key) is None else row[key] for row in rows], np.float64)
        for key in (input_key, "gain_db", "low_db", "high_db")
    }
    draw(axes, columns[input_key], columns["gain_db"], stroke(0), label="gain")
    if np.isfinite(columns["low_db"]).any():
        axes.fill_between(
            columns[input_key],
            columns["low_db"],
            columns["high_db"],
            color=stroke(0).colour,
            alpha=0.22,
            linewidth=0,
            label="95 % interval",
        )
    if compression_db is not None:
        axes.axvline(compression_db, color=stroke(1).colour, linewidth=1.6, linestyle=(0, (6, 2)))
        axes.annotate(
            f"1 dB compressed at {compression_db:.2f} {unit}",
            (compression_db, 0.02),
            xycoords=("data", "axes fraction"),
            xytext=(-6, 0),
            textcoords="offset points",
            ha="right",
            fontsize=11,
            color=INK,
        )
    axes.set_xlabel(input_name)
    axes.set_ylabel(gain_name)
    legend(axes)
    return figure
