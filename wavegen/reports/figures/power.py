"""Power statistics as pictures: CCDF, PDF and CDF."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from wavegen.reports.figures.look import (
    INK,
    REFERENCE,
    Stroke,
    condensed,
    draw,
    legend,
    new_figure,
    stroke,
)
from wavegen.reports.tables import percent

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

MARKED = (0.1, 0.01, 0.001, 1e-4, 1e-5, 1e-6)
_LOWEST_DB = -12.0
_DENSITY_POINTS = 220


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class CcdfCurve:
    """One CCDF to draw.

    Parameters
    ----------
    name : str
        As the legend has it.
    level_db : float64 array, shape (n,)
        Rising, dB over the mean.
    probability : float64 array, shape (n,)
        That the power lies above it; zeros are not drawn.
    low, high : float64 array, shape (n,), optional
        Interval of the probability.
    is_reference : bool
        Whether it only stands for comparison.
    """

    name: str
    level_db: NDArray[np.float64]
    probability: NDArray[np.float64]
    low: NDArray[np.float64] | None = None
    high: NDArray[np.float64] | None = None
    is_reference: bool = False

    @classmethod
    def of(cls, name: str, ccdf: dict[str, Any], *, is_reference: bool = False) -> CcdfCurve:
        """Take a curve from a document: ``level_db``, ``probability``, and perhaps an interval."""
        arrays = {
            key: np.asarray(ccdf[key], np.float64)
            for key in ("level_db", "probability", "low", "high")
            if ccdf.get(key) is not None
        }
        return cls(name=name, is_reference=is_reference, **arrays)

    def level_at(self, probability: float) -> float | None:
        """Return the level exceeded with a probability, dB; None if the curve ends before."""
        seen = self.probability > 0
        level, logarithm = self.level_db[seen], np.log(self.probability[seen])
        if level.size < 2 or not self.probability[seen][-1] <= probability < 1:
            return None
        return float(np.interp(-np.log(probability), -logarithm, level))


def _strokes(curves: Sequence[CcdfCurve]) -> list[Stroke]:
    number, found = 0, []
    for curve in curves:
        found.append(REFERENCE if curve.is_reference else stroke(number))
        number += not curve.is_reference
    return found


def ccdf_figure(
    curves: Sequence[CcdfCurve],
    *,
    title: str,
    marks: Sequence[tuple[float, float]] | None = None,
    mean_dbm: float | None = None,
    least: float | None = None,
) -> Figure:
    """Draw CCDFs over the level above the mean.

    Parameters
    ----------
    curves : sequence of CcdfCurve
        The first is what the figure is about.
    title : str
        Heading.
    marks : sequence of (probability, level in dB), optional
        Levels written in; read off the first curve at 10 % ... 0.0001 % unless given.
    mean_dbm : float, optional
        Mean power of the first, dBm: then a second axis tells levels in dBm.
    least : float, optional
        Lowest probability shown; as far as the first curve goes unless given.

    Returns
    -------
    Figure
    """
    figure, (axes,) = new_figure(title)
    first = curves[0]
    seen = first.probability[first.probability > 0]
    floor = least or min(10.0 ** np.floor(np.log10(max(float(seen.min(initial=1.0)), 1e-9))), 0.01)
    for curve, style in zip(curves, _strokes(curves), strict=True):
        drawn = curve.probability > 0
        draw(axes, curve.level_db[drawn], curve.probability[drawn], style, label=curve.name)
        if curve.low is not None and curve.high is not None:
            axes.fill_between(
                curve.level_db[drawn],
                np.maximum(curve.low[drawn], floor / 10),
                np.maximum(curve.high[drawn], floor / 10),
                color=style.colour,
                alpha=0.22,
                linewidth=0,
                label=f"{curve.name}, 95 % interval",
            )
    for chosen, level in _marks_of(first) if marks is None else marks:
        if chosen > floor:
            _mark(axes, chosen, level)
    axes.set_yscale("log")
    axes.set_ylim(floor, 1.0)
    axes.yaxis.set_major_formatter(lambda value, _: percent(value))
    axes.grid(visible=True, which="minor", axis="y", color="#e7ebee", linewidth=0.5)
    top = [end for curve in curves if (end := curve.level_at(floor)) is not None]
    ends = [float(first.level_db[first.probability > 0].max(initial=0.0)), *top]
    axes.set_xlim(min(_LOWEST_DB, min(ends) - 1), max(*ends, 3.0) + 1.0)
    axes.set_xlabel("level above the mean power, dB")
    axes.set_ylabel("share of time above the level")
    if mean_dbm is not None:
        second = axes.secondary_xaxis(
            "top",
            functions=(
                lambda level: np.asarray(level) + mean_dbm,
                lambda level: np.asarray(level) - mean_dbm,
            ),
        )
        second.set_xlabel("level, dBm", fontsize=12, color=INK)
        second.tick_params(labelsize=11, colors=INK)
    legend(axes, place="lower left")
    return figure


def _marks_of(curve: CcdfCurve) -> list[tuple[float, float]]:
    return [
        (probability, level)
        for probability in MARKED
        if (level := curve.level_at(probability)) is not None
    ]


def _mark(axes: Axes, probability: float, level: float) -> None:
    axes.plot([level], [probability], marker="o", markersize=6, color=INK, linestyle="none")
    axes.annotate(
        f"{level:.2f} dB",
        (level, probability),
        xytext=(8, 5),
        textcoords="offset points",
        fontsize=11,
        color=INK,
        bbox={"boxstyle": "square,pad=0.1", "facecolor": "white", "edgecolor": "none"},
    )


def density_figure(
    level_db: ArrayLike, pdf_per_db: ArrayLike, cdf: ArrayLike, *, title: str
) -> Figure:
    """Draw the PDF and the CDF of instantaneous power, side by side.

    Parameters
    ----------
    level_db : array, shape (n,)
        Level above the mean, dB, rising.
    pdf_per_db : array, shape (n,)
        Density, 1/dB.
    cdf : array, shape (n,)
        Share of time at or below the level.
    title : str
        Heading.

    Returns
    -------
    Figure
    """
    figure, (left, right) = new_figure(title, n_panels=2)
    level, share = np.asarray(level_db, np.float64), np.asarray(cdf, np.float64)
    for axes, place, drawn, name in (
        (
            left,
            condensed(level, _DENSITY_POINTS),
            condensed(np.asarray(pdf_per_db, np.float64), _DENSITY_POINTS),
            "density (PDF), 1/dB",
        ),
        (right, level, share, "share of time below the level (CDF)"),
    ):
        draw(axes, place, drawn, stroke(0), label=name.partition(" (")[0])
        axes.fill_between(place, drawn, color=stroke(0).colour, alpha=0.08, linewidth=0)
        axes.set_xlabel("level above the mean power, dB")
        axes.set_ylabel(name)
        axes.set_ylim(bottom=0)
        axes.set_xlim(_span(level, share))
    right.yaxis.set_major_formatter(lambda value, _: percent(round(value, 6)))
    return figure


def _span(level: NDArray[np.float64], cdf: NDArray[np.float64]) -> tuple[float, float]:
    """Return the levels between which all but a thousandth lies."""
    inside = level[(cdf > 1e-3) & (cdf < 1)]
    low, high = (inside[0], inside[-1]) if inside.size else (level[0], level[-1])
    return float(low) - 1.0, float(high) + 1.0
