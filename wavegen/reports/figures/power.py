"""Power statistics as pictures: CCDF, PDF and CDF."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from wavegen.reports.figures.look import (
    INK,
    LAW,
    REFERENCE,
    Stroke,
    absolute_axis,
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
_HIGHEST_FLOOR = 1e-4
_LEAST_FLOOR = 1e-9
_ANYTHING = 0.9
_MOST_BARS = 120
_LEAST_SPAN_DB = 6.0


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
    kind : {"measured", "law", "reference"}
        What is measured; what mathematics says of it; what only stands for comparison.
    peak_db : float, optional
        Highest level that there is at all: the curve is drawn down to nothing there.
    has_marks : bool
        Whether its points are drawn too: where they are few.
    """

    name: str
    level_db: NDArray[np.float64]
    probability: NDArray[np.float64]
    low: NDArray[np.float64] | None = None
    high: NDArray[np.float64] | None = None
    kind: Literal["measured", "law", "reference"] = "measured"
    peak_db: float | None = None
    has_marks: bool = False

    @classmethod
    def of(cls, name: str, ccdf: dict[str, Any], **more: Any) -> CcdfCurve:
        """Take a curve from a document: ``level_db``, ``probability``, and perhaps an interval."""
        arrays: dict[str, Any] = {
            key: np.asarray(ccdf[key], np.float64)
            for key in ("level_db", "probability", "low", "high")
            if ccdf.get(key) is not None
        }
        return cls(name=name, **more, **arrays)

    def level_at(self, probability: float) -> float | None:
        """Return the level exceeded with a probability, dB; None if the curve ends before."""
        seen = self.probability > 0
        level, logarithm = self.level_db[seen], np.log(self.probability[seen])
        if level.size < 2 or not self.probability[seen][-1] <= probability < 1:
            return None
        return float(np.interp(-np.log(probability), -logarithm, level))


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Spread:
    """Between which levels a process has each of some probabilities.

    Parameters
    ----------
    name : str
        As the legend has it.
    probability, low_db, high_db : float64 array, shape (n,)
        Probabilities falling.
    """

    name: str
    probability: NDArray[np.float64]
    low_db: NDArray[np.float64]
    high_db: NDArray[np.float64]

    def along(self, curve: CcdfCurve) -> tuple[NDArray[np.float64], ...]:
        """Return probabilities falling, and both ends there: as far from a curve as they stand.

        What few rows tell of the distance to the curve is interpolated, so that the band follows
        the curve and no chords show beside it. Without the curve at a row, the rows alone.
        """
        at = [_level_of(curve, float(q)) for q in self.probability]
        if any(level is None for level in at):
            return self.probability, self.low_db, self.high_db
        level = np.array(at, np.float64)
        highest, lowest = self.probability[0], self.probability[-1]
        between = curve.probability[(curve.probability < highest) & (curve.probability > lowest)]
        asked = np.unique(np.concatenate([self.probability, between]))[::-1]
        own = np.array([_level_of(curve, float(q)) for q in asked], np.float64)
        place, rows = -np.log(asked), -np.log(self.probability)
        low = own + np.interp(place, rows, self.low_db - level)
        high = own + np.interp(place, rows, self.high_db - level)
        return asked, low, high


def _level_of(curve: CcdfCurve, probability: float) -> float | None:
    """Return the level at a probability; where the curve falls to nothing, that of its peak."""
    found = curve.level_at(probability)
    return curve.peak_db if found is None and probability < 1 else found


GAUSSIAN_DB = np.arange(-300, 281) / 20.0
"""Levels at which the complex Gaussian is drawn, dB over its mean."""


def gaussian_curve(name: str = "complex Gaussian") -> CcdfCurve:
    """Return the CCDF of the complex Gaussian, ``exp(-p)``, from -15 to 14 dB."""
    return CcdfCurve(
        name=name,
        level_db=GAUSSIAN_DB,
        probability=np.exp(-(10 ** (GAUSSIAN_DB / 10))),
        kind="reference",
    )


def _strokes(curves: Sequence[CcdfCurve]) -> list[Stroke]:
    number, found = 0, []
    for curve in curves:
        own = {"law": LAW, "reference": REFERENCE}.get(curve.kind)
        found.append(own or stroke(number))
        number += curve.kind == "measured"
    return found


def ccdf_figure(
    curves: Sequence[CcdfCurve],
    *,
    title: str,
    marks: Sequence[tuple[float, float]] | None = None,
    spread: Spread | None = None,
    mean_dbm: float | None = None,
    level_name: str = "level, dBm",
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
    spread : Spread, optional
        Interval of the process that the first is a sample of.
    mean_dbm : float, optional
        Mean power of the first, dBm: then a second axis tells levels in dBm.
    level_name : str
        Of that axis.
    least : float, optional
        Lowest probability shown; as far as the first curve goes unless given.

    Returns
    -------
    Figure
    """
    figure, (axes,) = new_figure(title)
    floor = least or _floor(curves[0])
    if spread is not None:
        probability, low_db, high_db = spread.along(curves[0])
        axes.fill_betweenx(
            probability,
            low_db,
            high_db,
            color=stroke(0).colour,
            alpha=0.25,
            linewidth=0,
            label=spread.name,
        )
    for curve, style in zip(curves, _strokes(curves), strict=True):
        _draw_curve(axes, curve, style, floor)
    banded = [curve for curve in curves if curve.low is not None and curve.high is not None]
    for curve, style in zip(curves, _strokes(curves), strict=True):
        if curve in banded:
            label = "95 % interval" if len(banded) == 1 else f"95 % interval, {curve.name}"
            _draw_band(axes, curve, style, floor, label)
    for chosen, level in _marks_of(curves[0]) if marks is None else marks:
        if chosen > floor:
            _mark(axes, chosen, level)
    _scale_ccdf(axes, curves, floor)
    if mean_dbm is not None:
        absolute_axis(axes, mean_dbm, level_name)
    legend(axes)
    return figure


def _floor(curve: CcdfCurve) -> float:
    """Return the decade down to which a curve is shown: 0.01 % at least."""
    least = float(curve.probability[curve.probability > 0].min(initial=1.0))
    decade = 10.0 ** np.floor(np.log10(max(least, _LEAST_FLOOR)))
    return float(min(decade, _HIGHEST_FLOOR))


def _draw_curve(axes: Axes, curve: CcdfCurve, style: Stroke, floor: float) -> None:
    drawn = curve.probability > 0
    level, share = curve.level_db[drawn], curve.probability[drawn]
    if curve.peak_db is not None and level.size:
        inside = level < curve.peak_db
        last = share[inside][-1] if inside.any() else 1.0
        level = np.concatenate([level[inside], [curve.peak_db, curve.peak_db]])
        share = np.concatenate([share[inside], [last, floor / 10]])
    draw(axes, level, share, style, label=curve.name, has_marks=curve.has_marks)


def _draw_band(axes: Axes, curve: CcdfCurve, style: Stroke, floor: float, label: str) -> None:
    """Shade an interval, where it says anything: from nothing to all of the time says nothing."""
    assert curve.low is not None  # noqa: S101 - asked by the caller
    assert curve.high is not None  # noqa: S101
    drawn = (curve.probability > 0) & ((curve.low > floor / 10) | (curve.high < _ANYTHING))
    if not drawn.any():
        return
    axes.fill_between(
        curve.level_db,
        np.maximum(curve.low, floor / 10),
        np.maximum(curve.high, floor / 10),
        where=drawn.tolist(),
        color=style.colour,
        alpha=0.25,
        linewidth=0,
        label=label,
    )


def _scale_ccdf(axes: Axes, curves: Sequence[CcdfCurve], floor: float) -> None:
    """Fit both axes: room for what is written at the curves, and as far as they go."""
    from matplotlib.ticker import LogLocator, NullFormatter

    axes.set_yscale("log")
    axes.set_ylim(floor, 1.0)
    axes.yaxis.set_major_formatter(lambda value, _: percent(value))
    axes.yaxis.set_major_locator(LogLocator(numticks=12))
    axes.yaxis.set_minor_locator(LogLocator(subs=(2, 5), numticks=12))
    axes.yaxis.set_minor_formatter(NullFormatter())
    axes.grid(visible=True, which="minor", axis="y", color="#e7ebee", linewidth=0.5)
    ends = []
    for curve in curves:
        if curve.kind != "reference":
            seen = curve.level_db[curve.probability > floor]
            ends.append(float(seen.max(initial=0.0)) if curve.peak_db is None else curve.peak_db)
    starts = [
        float(curve.level_db.min(initial=0.0)) for curve in curves if curve.kind != "reference"
    ]
    left = max(_LOWEST_DB, min(starts) - 1)
    right = max(*ends, 2.0)
    axes.set_xlim(left, right + 0.14 * (right - left))
    axes.set_xlabel("level above the mean power, dB")
    axes.set_ylabel("share of time above the level")


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
    level_db: ArrayLike,
    pdf_per_db: ArrayLike,
    cdf: ArrayLike,
    *,
    title: str,
    mean_dbm: float | None = None,
    level_name: str = "level, dBm",
) -> Figure:
    """Draw the PDF and the CDF of instantaneous power, side by side.

    Parameters
    ----------
    level_db : array, shape (n,)
        Level above the mean, dB, rising in equal steps.
    pdf_per_db : array, shape (n,)
        Density between a level and the next, 1/dB.
    cdf : array, shape (n,)
        Share of time at or below the level.
    title : str
        Heading.
    mean_dbm, level_name
        As in :func:`ccdf_figure`.

    Returns
    -------
    Figure
    """
    figure, (left, right) = new_figure(title, n_panels=2)
    level, share = np.asarray(level_db, np.float64), np.asarray(cdf, np.float64)
    low, high = _span(level, share)
    edges, density = _bars(level, np.asarray(pdf_per_db, np.float64), high - low)
    left.stairs(density, edges, color=stroke(0).colour, linewidth=1.8, label="density")
    left.stairs(density, edges, color=stroke(0).colour, alpha=0.12, fill=True)
    left.set_ylabel(f"density (PDF) in steps of {edges[1] - edges[0]:.2g} dB, 1/dB")
    draw(right, level, share, stroke(0), label="share of time below the level")
    right.fill_between(level, share, color=stroke(0).colour, alpha=0.12, linewidth=0)
    right.set_ylabel("share of time below the level (CDF)")
    right.yaxis.set_major_formatter(lambda value, _: percent(round(value, 6)))
    for axes in (left, right):
        axes.set_xlabel("level above the mean power, dB")
        axes.set_ylim(bottom=0)
        axes.set_xlim(low, high)
        if mean_dbm is not None:
            absolute_axis(axes, mean_dbm, level_name, n_ticks=6)
    return figure


def _bars(
    level: NDArray[np.float64], pdf: NDArray[np.float64], span_db: float
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return edges and heights of bars wide enough that a span holds 120 of them at most."""
    step = float(level[1] - level[0]) if level.size > 1 else 1.0
    factor = max(1, int(np.ceil(span_db / step / _MOST_BARS)))
    whole = -(-level.size // factor) * factor
    padded = np.zeros(whole)
    padded[: pdf.size] = pdf
    edges = level[0] + step * factor * np.arange(whole // factor + 1)
    return edges, padded.reshape(-1, factor).mean(axis=1)


def _span(level: NDArray[np.float64], cdf: NDArray[np.float64]) -> tuple[float, float]:
    """Return the levels between which all but a thousandth lies, 6 dB apart at least."""
    last = level.size - 1
    first = np.searchsorted(cdf, max(1e-3, float(cdf[0])), side="right")
    low = float(level[min(int(first), last)])
    high = float(level[min(int(np.searchsorted(cdf, 1.0)), last)])
    spare = max(1.0, (_LEAST_SPAN_DB - (high - low)) / 2)
    return low - spare, high + spare
