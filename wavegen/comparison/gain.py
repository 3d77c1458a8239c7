"""A device's gain curve from the power distributions at its input and output.

A memoryless device whose output rises with its input maps quantile to quantile: the output level
exceeded in a share q of the time is what the device makes of the input level exceeded in the same
share. No alignment in time is needed; different captures of one process will do. (The principle
is histogram matching; J. Sole-Casals et al., PLoS ONE 11, 2016, use it for blind inversion.)

How sure it is: where the curve's slope is s (dB of output for a dB of input), an input quantile
that is off by d moves the point along the curve by d and off it by ``d - s d`` less; what remains
of both errors is ``output error - s input error`` (derivation). Loops are exact.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.optimize
from numpy.typing import NDArray

from wavegen.comparison.curves import Curve
from wavegen.comparison.difference import CONFIDENCE, combined, probabilities

Reals = NDArray[np.float64]

STEP_DB = 0.5
LOWEST_DB = -10.0
"""Where the curve begins, dB over the mean input power: noise floors show further down."""
DEEPEST = 1e-6
SMALL_DB = 0.0
"""Up to this input level, over the mean, points tell the small-signal gain."""
STEEPEST = 2.0
SAME_DB = 1e-6
LEAST_POINTS = 5
LEAST_ERROR_DB = 1e-3
"""Levels are read between bins of a histogram: none is taken as better than that."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class GainPoints:
    """Gain at rising input levels.

    Parameters
    ----------
    probability : float64 array, shape (n,)
        Of the input being above each level, falling.
    input_db, output_db : float64 arrays, shape (n,)
        Levels on the scales of both sides (dBm, or dB over full scale).
    low_db, high_db : float64 arrays, shape (n,)
        Between these lies the gain at that input level, with 95 % each.
    """

    probability: Reals
    input_db: Reals
    output_db: Reals
    low_db: Reals
    high_db: Reals

    @property
    def gain_db(self) -> Reals:
        """Output less input, dB."""
        return np.asarray(self.output_db - self.input_db)

    @property
    def error_db(self) -> Reals:
        """Half-width of the interval, dB."""
        return np.asarray((self.high_db - self.low_db) / 2)


@dataclass(frozen=True, slots=True, kw_only=True)
class Compression:
    """Where the gain has fallen by so much below the small-signal gain.

    Parameters
    ----------
    fall_db : float
        How far: 1 or 3 dB.
    input_db, output_db : float
        There, on the scales of the sides.
    low_db, high_db : float
        Between these lies the input level; infinite where the data begin or end first.
    """

    fall_db: float
    input_db: float
    output_db: float
    low_db: float
    high_db: float


@dataclass(frozen=True, slots=True, kw_only=True)
class SmallSignal:
    """The gain at low levels.

    Parameters
    ----------
    gain_db : float
        Where the fitted line meets zero power.
    error_db : float
        Half-width of its interval of 95 %.
    """

    gain_db: float
    error_db: float


def gain_points(source: Curve, output: Curve, *, mean_db: float) -> GainPoints:
    """Return gain against input level by quantiles.

    Parameters
    ----------
    source, output : Curve
        Input and output on their own scales (not over the mean).
    mean_db : float
        Mean input power on that scale.

    Returns
    -------
    GainPoints
        Every half dB from 10 dB below the mean up to the last level that both sides resolve;
        none where they resolve nothing.
    """
    lowest = resolved_to(source, output)
    if lowest is None:
        empty = np.zeros(0)
        return GainPoints(
            probability=empty, input_db=empty, output_db=empty, low_db=empty, high_db=empty
        )
    top = float(source.level_db(lowest))
    low = mean_db + LOWEST_DB
    level = np.arange(low, top, STEP_DB)
    level = np.append(level[level < top - STEP_DB / 4], top)
    share = np.append(np.clip(source.ccdf(level[:-1]), lowest, 1.0), lowest)
    return points_at(source, output, share)


def points_at(source: Curve, output: Curve, share: Reals) -> GainPoints:
    """Return gain at given probabilities, falling."""
    share = np.unique(share)[::-1]
    share = share[share < 1]
    levels = np.asarray(source.level_db(share)), np.asarray(output.level_db(share))
    # Equal input levels (a wall, a gate) are one point: that of the rarest.
    known = np.isfinite(levels[0] + levels[1])
    share, levels = share[known], (levels[0][known], levels[1][known])
    used = np.append(np.diff(levels[0]) > SAME_DB, True)[: share.size]
    share, levels = share[used], (levels[0][used], levels[1][used])
    slope = _slopes(levels[0], levels[1])
    ends = [side.level_interval(share, confidence=CONFIDENCE) for side in (source, output)]
    moved = tuple(levels[0] + slope * (end - levels[0]) for end in ends[0])
    low, high = combined((levels[1], levels[0]), ends[1], (moved[0], moved[1]))
    return GainPoints(
        probability=share, input_db=levels[0], output_db=levels[1], low_db=low, high_db=high
    )


def resolved_to(source: Curve, output: Curve) -> float | None:
    """Return the least probability that both sides resolve, None if none."""
    asked = probabilities(DEEPEST)
    used = asked[source.is_resolved(asked) & output.is_resolved(asked)]
    return float(used.min()) if used.size else None


def _slopes(x: Reals, y: Reals) -> Reals:
    """Return dB of output for a dB of input around each point, over three points."""
    if x.size < 2:
        return np.ones(x.shape)
    return np.asarray(np.clip(np.gradient(y, x), 0.0, STEEPEST))


def small_signal(points: GainPoints, *, mean_db: float) -> SmallSignal:
    """Return the gain that the curve tends to at low levels.

    Parameters
    ----------
    points : GainPoints
        At least one.
    mean_db : float
        Mean input power.

    Returns
    -------
    SmallSignal

    Notes
    -----
    A smooth odd curve has the gain ``G0 + a P + b P^2`` dB at small powers P (derivation: the
    series of its amplitude has odd terms alone); that is fitted to the points up to the mean
    power and read at P = 0. Quantiles err together: those at probabilities ``p > q`` with the
    correlation ``sqrt(q (1 - p) / (p (1 - q)))`` (the Brownian bridge of an empirical
    distribution; M. D. Donsker, Ann. Math. Statist. 23, 1952), which weighs the points and gives
    the error. With fewer than five points there the lowest one counts.
    """
    power = 10 ** ((points.input_db - mean_db) / 10)
    used = np.isfinite(points.error_db) & (points.input_db <= mean_db + SMALL_DB)
    if np.count_nonzero(used) < LEAST_POINTS:
        return SmallSignal(gain_db=float(points.gain_db[0]), error_db=float(points.error_db[0]))
    share = points.probability[used]
    odds = share / (1 - share)
    pairs = np.sqrt(np.minimum.outer(odds, odds) / np.maximum.outer(odds, odds))
    error = np.maximum(points.error_db[used], LEAST_ERROR_DB)
    root = np.linalg.cholesky(pairs * np.multiply.outer(error, error))
    basis = np.stack([np.ones(error.size), power[used], power[used] ** 2], axis=1)
    basis = np.linalg.solve(root, basis)
    wanted = np.linalg.solve(root, points.gain_db[used])
    found, *_ = np.linalg.lstsq(basis, wanted, rcond=None)
    error_db = float(np.sqrt(np.linalg.inv(basis.T @ basis)[0, 0]))
    is_exact = not points.error_db[used].any()
    return SmallSignal(gain_db=float(found[0]), error_db=0.0 if is_exact else error_db)


def compression(points: GainPoints, small: SmallSignal, *, fall_db: float) -> Compression | None:
    """Return where the gain has fallen so far below the small-signal gain for good.

    Parameters
    ----------
    points : GainPoints
        The curve.
    small : SmallSignal
        What it falls from.
    fall_db : float
        How far.

    Returns
    -------
    Compression or None
        None where the data do not reach it.
    """
    wanted = small.gain_db - fall_db
    level = _crossing(points.input_db, points.gain_db, wanted)
    if level is None:
        return None
    up = points.gain_db + np.hypot(points.high_db - points.gain_db, small.error_db)
    down = points.gain_db - np.hypot(points.gain_db - points.low_db, small.error_db)
    low = _crossing(points.input_db, down, wanted)
    is_below = down[0] <= wanted  # it lies under the lowest point
    high = _crossing(points.input_db, up, wanted)
    return Compression(
        fall_db=fall_db,
        input_db=level,
        output_db=level + wanted,
        low_db=-np.inf if is_below or low is None else min(low, level),
        high_db=np.inf if high is None else max(high, level),
    )


def _crossing(level: Reals, gain: Reals, wanted: float) -> float | None:
    """Return the level from which the gain stays at or below a value, None if there is none."""
    above = np.flatnonzero(gain > wanted)
    if not above.size:
        return float(level[0])
    last = int(above[-1])
    if last + 1 == level.size:
        return None
    part = (gain[last] - wanted) / (gain[last] - gain[last + 1])
    return float(level[last] + part * (level[last + 1] - level[last]))


@dataclass(frozen=True, slots=True, kw_only=True)
class RappFit:
    """A Rapp curve fitted to the points.

    Parameters
    ----------
    gain_db : float
        Small-signal gain.
    saturation_db : float
        Output level that it tends to, on the scale of the output.
    smoothness : float
        Exponent p.
    rms_db, largest_db : float
        What it is off by at the points.

    Notes
    -----
    ``P_out = G P / (1 + (G P / S)^p)^(1/p)`` in powers: C. Rapp, Proc. 2nd European Conference
    on Satellite Communications, 1991, with its amplitudes squared.
    """

    gain_db: float
    saturation_db: float
    smoothness: float
    rms_db: float
    largest_db: float

    def output_db(self, input_db: Reals) -> Reals:
        """Return output levels for input levels."""
        return _rapp(input_db, self.gain_db, self.saturation_db, self.smoothness)


def _rapp(input_db: Reals, gain_db: float, saturation_db: float, smoothness: float) -> Reals:
    linear = input_db + gain_db
    # log1p of a power of ten that may be huge: log-add-exp of 0 and its logarithm.
    ratio = smoothness * (linear - saturation_db) * np.log(10) / 10
    return np.asarray(linear - 10 / np.log(10) / smoothness * np.logaddexp(0.0, ratio))


def fit_rapp(points: GainPoints, small: SmallSignal) -> RappFit | None:
    """Return the Rapp curve nearest to the points; None where nothing compresses.

    Parameters
    ----------
    points : GainPoints
        The curve.
    small : SmallSignal
        Its gain at low levels.
    """
    fall = small.gain_db - points.gain_db[-1] if points.input_db.size >= 4 else 0.0
    if fall < max(0.1, 2 * points.error_db[-1]):
        return None
    weight = 1 / np.maximum(points.error_db, 0.01)

    def off(guess: Reals) -> Reals:
        return np.asarray(
            (_rapp(points.input_db, guess[0], guess[1], np.exp(guess[2])) - points.output_db)
            * weight
        )

    start = np.array([small.gain_db, float(points.output_db[-1]) + 0.5, np.log(2.0)])
    bounds = (
        [small.gain_db - 3, float(points.output_db[0]), np.log(0.2)],
        [small.gain_db + 3, float(points.output_db[-1]) + 60, np.log(100.0)],
    )
    found = scipy.optimize.least_squares(off, start, bounds=bounds, loss="soft_l1").x
    rest = _rapp(points.input_db, found[0], found[1], float(np.exp(found[2]))) - points.output_db
    return RappFit(
        gain_db=float(found[0]),
        saturation_db=float(found[1]),
        smoothness=float(np.exp(found[2])),
        rms_db=float(np.sqrt(np.mean(rest**2))),
        largest_db=float(np.max(np.abs(rest))),
    )
