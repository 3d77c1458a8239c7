"""Cubic metric: how much a third-order device makes of a signal's envelope."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from wavegen.core.errors import SignalError
from wavegen.core.signal import Samples, Signal
from wavegen.core.table import Table
from wavegen.dsp.cell_sums import CELL, sum_cells
from wavegen.dsp.grid_sums import CellReading, Sums
from wavegen.dsp.power_kernel import exact_powers

REFERENCE_DB = 1.52
"""Raw cubic metric of the voice reference signal (from memory, agrees with the published 4.0 dB
of OFDMA)."""
K_MULTICARRIER = 1.56
K_WCDMA = 1.85
_BLOCK_CELLS = 32


@dataclass(frozen=True, slots=True, kw_only=True)
class CubicMetric:
    """Moments of the envelope power, and the metric made of them.

    Parameters
    ----------
    n_samples : int
        Samples measured.
    mean, second, third : float
        Means of ``p``, ``p^2`` and ``p^3``, ``p = |x|^2``.

    Notes
    -----
    Raw ``20 log10 rms((r / rms r)^3) = 10 log10(E p^3 / (E p)^3)``, ``r`` the envelope; the cubic
    metric is ``(raw - 1.52 dB) / K``. 3GPP R1-060385 and TS 25.101 cl. 6.2.2 (formula confirmed;
    1.52, 1.56 and 1.85 from memory).
    """

    n_samples: int
    mean: float
    second: float
    third: float

    @property
    def raw_db(self) -> float:
        """Raw cubic metric, dB; 0 for a constant envelope."""
        return 10 * math.log10(self.third / self.mean**3)

    def cubic_metric_db(self, k: float = K_MULTICARRIER) -> float:
        """Return the cubic metric, dB.

        Parameters
        ----------
        k : float
            1.56 for OFDM, DFT-spread OFDM and multicode signals, 1.85 for W-CDMA of few codes.
        """
        return (self.raw_db - REFERENCE_DB) / k

    def rows(self) -> tuple[tuple[str, str], ...]:
        """Return names and values, for tables."""
        return (
            ("raw cubic metric", f"{self.raw_db:.3f} dB"),
            (f"cubic metric, K {K_MULTICARRIER}", f"{self.cubic_metric_db():.3f} dB"),
            (f"cubic metric, K {K_WCDMA}", f"{self.cubic_metric_db(K_WCDMA):.3f} dB"),
        )

    def table(self) -> Table:
        """Return raw and both cubic metrics, for people."""
        return Table(
            title="Cubic metric",
            headings=("", "value"),
            rows=self.rows(),
            right=frozenset({1}),
        )


class CubicReading(CellReading):
    """Running moments of one stretch.

    Parameters
    ----------
    where : str
        What is measured, for messages.
    """

    def __init__(self, where: str) -> None:
        super().__init__(CELL)
        self._where = where

    def reduce(self, first: int, samples: Samples) -> Sums:
        """Return the sums of ``p``, ``p^2`` and ``p^3`` of each cell, shape (n_cells, 3)."""
        out = np.empty((samples.size // CELL, 3))
        for low in range(0, out.shape[0], _BLOCK_CELLS):
            power = exact_powers(samples[low * CELL : (low + _BLOCK_CELLS) * CELL])
            rows = out[low : low + _BLOCK_CELLS]
            rows[:, 0] = sum_cells(power)
            square = power * power
            rows[:, 1] = sum_cells(square)
            np.multiply(square, power, out=square)
            rows[:, 2] = sum_cells(square)
        return out

    def result(self) -> CubicMetric:
        """Return the metric.

        Raises
        ------
        SignalError
            No samples, one that is not finite, or zeros only.
        """
        total = self.total()
        if total is None or not np.isfinite(total).all() or not total[0] > 0:
            found = "no samples" if total is None else "zeros only, or samples that are not finite"
            raise SignalError(
                where=self._where,
                problem=f"the cubic metric has seen {found}",
                allowed="finite samples with a mean power above zero",
                remedy="Check the level, the gating, or the part that was asked for.",
            )
        first, second, third = (float(value) / self.n_samples for value in total)
        return CubicMetric(n_samples=self.n_samples, mean=first, second=second, third=third)


@dataclass(frozen=True, slots=True, kw_only=True)
class CubicMeter:
    """Settings of the meter of the cubic metric.

    Parameters
    ----------
    where : str
        What is measured: a file's name, a recipe path.

    Notes
    -----
    Sums are float64 over cells of 1024 samples of the absolute grid, added by a fixed pairwise
    tree. The samples should run at 1.7 times the band or more (K.-H. Kim, J.-S. No, D.-J. Shin,
    arXiv 1506.07054).
    """

    where: str = "signal"

    def begin(self, signal: Signal) -> CubicReading:
        """Return an empty reading."""
        return CubicReading(self.where)
