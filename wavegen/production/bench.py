"""Levels along the bench's path: average and peak envelope power, against every rating."""

from __future__ import annotations

from dataclasses import dataclass

from wavegen.core.errors import TargetMissed
from wavegen.recipe.settings import Bench


@dataclass(frozen=True, slots=True, kw_only=True)
class PathLevel:
    """The level at the input of one place of the path.

    Parameters
    ----------
    name, role : str
        As in the recipe; role is empty if none was given.
    average_dbm : float
        Mean power over the loop, or over the on-time where the recipe says so, dBm.
    peak_envelope_dbm : float
        Peak envelope power, dBm: average plus PAPR, from the peak between samples.
    average_limit_dbm, peak_limit_dbm : float or None
        Ratings at the input.
    channel : int or None
        Which of two channels; None where there is one.
    """

    name: str
    role: str
    average_dbm: float
    peak_envelope_dbm: float
    average_limit_dbm: float | None
    peak_limit_dbm: float | None
    channel: int | None = None


def path_levels(
    bench: Bench, papr_db: float, *, over_first_db: float = 0.0, channel: int | None = None
) -> list[PathLevel]:
    """Return average and peak at the input of every place.

    Parameters
    ----------
    bench : Bench
        Average power wanted at the device, and the path with its gains.
    papr_db : float
        Peak between samples over the mean that ``bench.averaged_over`` names, dB.
    over_first_db : float
        Average power of this channel over that of the first, dB.
    channel : int, optional
        Which of two channels; each has a path of its own, alike.

    Returns
    -------
    list of PathLevel
        In the order of the path.

    Notes
    -----
    Gains are small-signal: a place that compresses passes on less.
    """
    device = next(i for i, place in enumerate(bench.path) if place.role == "device")
    levels = []
    for number, place in enumerate(bench.path):
        low, high = min(number, device), max(number, device)
        between = sum(step.gain_db for step in bench.path[low:high])
        average = bench.average_power_at_device_dbm + over_first_db
        average += between if number > device else -between
        levels.append(
            PathLevel(
                name=place.name,
                role=place.role or "",
                average_dbm=average,
                peak_envelope_dbm=average + papr_db,
                average_limit_dbm=place.average_limit_dbm,
                peak_limit_dbm=place.peak_limit_dbm,
                channel=channel,
            )
        )
    return levels


def refuse_overload(levels: list[PathLevel]) -> None:
    """Refuse levels over a rating, before any file is written.

    Raises
    ------
    TargetMissed
        The first place whose average or peak lies over its rating.
    """
    for level in levels:
        for what, value, limit in (
            ("average power", level.average_dbm, level.average_limit_dbm),
            ("peak envelope power", level.peak_envelope_dbm, level.peak_limit_dbm),
        ):
            if limit is not None and value > limit:
                of = "" if level.channel is None else f" of channel {level.channel}"
                places = [place for place in levels if place.channel == level.channel]
                raise TargetMissed(
                    where=f"bench.path[{places.index(level)}]",
                    problem=f"{what}{of} at the input of {level.name!r} would be {value:.2f} dBm",
                    allowed=f"its rating, up to {limit:.2f} dBm",
                    remedy=(
                        "Lower average_power_at_device, reduce the crest factor, or put an "
                        "attenuator before it; let qualified people decide on ratings."
                    ),
                )
