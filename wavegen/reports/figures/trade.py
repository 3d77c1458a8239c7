"""What crest-factor reduction costs, and what a device does, as pictures."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from wavegen.reports.figures.look import INK, REFERENCE, SHADE, draw, legend, new_figure, stroke

if TYPE_CHECKING:
    from matplotlib.figure import Figure


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

    Returns
    -------
    Figure
    """
    figure, (axes,) = new_figure(title)
    for number, front in enumerate(fronts):
        style = stroke(number)
        draw(axes, *front.best, style, label=front.name)
        axes.plot(
            front.evm_percent,
            front.level_db,
            linestyle="none",
            marker=style.mark,
            markersize=6,
            color=style.colour,
        )
    if bound is not None:
        draw(axes, *bound.best, REFERENCE, label=bound.name)
    if evm_limit_percent is not None:
        right = max(axes.get_xlim()[1], evm_limit_percent * 1.1)
        axes.axvspan(evm_limit_percent, right, facecolor=SHADE, zorder=0)
        axes.axvline(evm_limit_percent, color=INK, linewidth=1.2)
        axes.set_xlim(right=right)
    axes.set_xlim(left=0)
    axes.set_xlabel(
        "EVM, % of the RMS signal" + ("   (shaded: over the limit)" if evm_limit_percent else "")
    )
    axes.set_ylabel(level_name)
    legend(axes)
    return figure


def gain_figure(
    rows: Sequence[dict[str, Any]],
    *,
    title: str,
    input_name: str = "input level, dB over the input mean",
    compression_db: float | None = None,
    unit: str = "dB",
) -> Figure:
    """Draw a device's gain against its input level.

    Parameters
    ----------
    rows : sequence of dict
        ``input_db``, ``gain_db`` and, where known, ``low_db`` and ``high_db``.
    title, input_name : str
        Heading, and what the level is over.
    compression_db : float, optional
        Input level of the 1 dB compression point.
    unit : str
        Of input levels.

    Returns
    -------
    Figure
    """
    figure, (axes,) = new_figure(title)
    columns = {
        key: np.array([np.nan if row.get(key) is None else row[key] for row in rows], np.float64)
        for key in ("input_db", "gain_db", "low_db", "high_db")
    }
    draw(axes, columns["input_db"], columns["gain_db"], stroke(0), label="gain")
    if np.isfinite(columns["low_db"]).any():
        axes.fill_between(
            columns["input_db"],
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
    axes.set_ylabel("gain, dB")
    legend(axes)
    return figure
