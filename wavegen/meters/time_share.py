"""Percent of the time above and below a level, relative or absolute."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

from wavegen.meters.power_statistics import RESOLVING_SAMPLES, PowerStatistics


@dataclass(frozen=True, slots=True, kw_only=True)
class TimeShare:
    """How long a signal is above a level.

    Parameters
    ----------
    level_db : float
        Over the mean, dB.
    level_dbfs : float
        The same over full scale, dB.
    level_dbm : float or None
        The same in dBm, where the level of full scale is known.
    above_percent, below_percent : float
        Share of the time above it, and at or below it; they add up to 100.
    resolved : bool
        Whether at least 10 samples lie on either side.
    """

    level_db: float
    level_dbfs: float
    level_dbm: float | None
    above_percent: float
    below_percent: float
    resolved: bool

    def row(self) -> dict[str, Any]:
        """Return it as JSON values."""
        return {
            "level_db": self.level_db,
            "level_dbfs": self.level_dbfs,
            "level_dbm": self.level_dbm,
            "above_percent": self.above_percent,
            "below_percent": self.below_percent,
            "resolved": self.resolved,
        }


def time_share(
    statistics: PowerStatistics, level_db: float, *, reference_level_dbm: float | None = None
) -> TimeShare:
    """Return the share of the time above and below a level over the mean.

    Parameters
    ----------
    statistics : PowerStatistics
        Of the signal.
    level_db : float
        Over the mean, dB.
    reference_level_dbm : float or None
        Power at 0 dBFS, dBm, where known.
    """
    above = float(statistics.exceedances(level_db))
    return _share(statistics, above, level_db, reference_level_dbm)


def time_share_absolute(
    statistics: PowerStatistics, level_dbfs: float, *, reference_level_dbm: float | None = None
) -> TimeShare:
    """Return the share of the time above and below a level over full scale.

    Parameters
    ----------
    statistics : PowerStatistics
        Of the signal.
    level_dbfs : float
        Over full scale, dB; a level in dBm less ``reference_level_dbm``.
    reference_level_dbm : float or None
        Power at 0 dBFS, dBm, where known.
    """
    above = float(statistics.exceedances_of_power(10 ** (level_dbfs / 10)))
    return _share(statistics, above, level_dbfs - statistics.mean_db, reference_level_dbm)


def _share(
    statistics: PowerStatistics, above: float, level_db: float, reference_level_dbm: float | None
) -> TimeShare:
    n = statistics.n_samples
    level_dbfs = level_db + statistics.mean_db
    share = 100 * above / n
    few = min(above, n - above)
    return TimeShare(
        level_db=level_db,
        level_dbfs=level_dbfs,
        level_dbm=None if reference_level_dbm is None else level_dbfs + reference_level_dbm,
        above_percent=share,
        below_percent=100 - share,
        resolved=math.floor(few) >= RESOLVING_SAMPLES,
    )
