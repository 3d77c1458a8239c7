"""Curves that come as points: exports of instruments, figures, sidecars."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from wavegen.comparison.curves import PointsCurve
from wavegen.core.errors import FileError
from wavegen.files.curve import read_curve
from wavegen.production.sidecar import GRID_STEP_DB

Reals = NDArray[np.float64]

FEWEST_POINTS = 4
MEAN_MARGIN_DB = 0.25
"""How far the mean that a curve of points allows may lie from 0 dB before it is refused: twice
what a reading to 0.1 dB can be off."""
_DB = 10 / np.log(10)


def loop_curve(level_db: Sequence[float], probability: Sequence[float]) -> PointsCurve:
    """Return the curve of a loop from the grid in its sidecar: exact, but for what lies between.

    Parameters
    ----------
    level_db, probability : sequence of float
        As in the sidecar.
    """
    return PointsCurve(
        levels=np.array(level_db),
        probabilities=np.array(probability),
        reading_db=GRID_STEP_DB / 2,
        is_exact=True,
    )


def read_points(path: Path, *, n_samples: int | None, reading_db: float) -> PointsCurve:
    """Read a curve from CSV.

    Parameters
    ----------
    path : Path
        As :func:`wavegen.files.curve.read_curve` takes it.
    n_samples : int or None
        Samples that it was measured on, if its file does not say.
    reading_db : float
        Half-width of what its levels may be off by reading, dB.

    Raises
    ------
    FileError
        No such curve, too few points, or levels that cannot be over a mean power.
    """
    found = read_curve(path)
    used = np.unique(found.probability[found.probability > 0])
    if used.size < FEWEST_POINTS:
        raise FileError(
            where=str(path),
            problem=f"has {used.size} different probabilities above 0",
            allowed=f"{FEWEST_POINTS} points or more to compare a curve by",
            remedy="Export more points of the curve.",
        )
    check_over_mean(str(path), found.level_db, found.probability)
    return PointsCurve(
        levels=found.level_db,
        probabilities=found.probability,
        n_samples=n_samples or found.n_samples,
        reading_db=reading_db,
    )


def check_over_mean(where: str, levels_db: Reals, probabilities: Reals) -> None:
    """Refuse points that cannot be levels over a mean power.

    Parameters
    ----------
    where : str
        The file.
    levels_db, probabilities : float64 arrays, shape (n_points,)
        As in :class:`PointsCurve`.

    Raises
    ------
    FileError
        The mean of every distribution that goes through the points lies above or below 0 dB.

    Notes
    -----
    ``E[p] = integral of P(p > x) dx``, and P falls: between two points it is at most the higher
    probability and at least the lower one. Below the first point it is at most 1, beyond the
    last nothing bounds the power unless its probability is small: up to 1 % there may stand 6 dB
    higher at most, which moves the mean by 4 % of it.
    """
    power = np.exp(levels_db / _DB)
    steps = np.diff(power)
    least = power[0] * probabilities[0] + float(np.sum(steps * probabilities[1:]))
    most = power[0] + float(np.sum(steps * probabilities[:-1]))
    ends = float(probabilities[-1])
    most = most + 4 * ends * float(power[-1]) if ends <= 0.01 else np.inf
    low_db, high_db = (float(_DB * np.log(max(x, 1e-30))) for x in (least, most))
    if low_db <= MEAN_MARGIN_DB and high_db >= -MEAN_MARGIN_DB:
        return
    words = f"at least {low_db:.2f}" if low_db > 0 else f"at most {high_db:.2f}"
    raise FileError(
        where=where,
        problem=f"the mean of a power with these probabilities is {words} dB on its own scale",
        allowed="levels over the mean power, whose mean is 0 dB",
        remedy="Check the unit of the probability (percent or fraction), and what levels are over.",
    )
