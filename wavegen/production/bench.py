"""Levels along the bench's path: average and peak envelope power, against every rating."""

from __future__ import annotations

import math
from collections.abc import Collection, Sequence
from dataclasses import dataclass
from typing import Any

from wavegen.core.errors import ArgumentsError, TargetMissed
from wavegen.recipe.bench import Bench, PathStage


def engineering(value: float, unit: str) -> str:
    """Write a value with three digits and a decimal prefix.

    Examples
    --------
    >>> engineering(0.00398, "W"), engineering(19.95, "V"), engineering(0.0, "W")
    ('3.98 mW', '19.9 V', '0 W')
    """
    if not value:
        return f"0 {unit}"
    digits = float(f"{value:.3g}")
    power = min(max(math.floor(math.log10(abs(digits)) / 3), -4), 2)
    prefix = {-4: "p", -3: "n", -2: "µ", -1: "m", 0: "", 1: "k", 2: "M"}[power]
    return f"{digits / 1000.0**power:.3g} {prefix}{unit}"


@dataclass(frozen=True, slots=True, kw_only=True)
class Rating:
    """A rating beside what it is to hold.

    Parameters
    ----------
    key : str
        Its name in a recipe: ``peak_limit``.
    what : str
        What is rated, in words.
    value, limit : float
        In ``unit``, allowances not counted.
    unit : {"dBm", "J"}
        Of both.
    allowance_db : float
        How much higher the value may turn out, dB.
    """

    key: str
    what: str
    value: float
    limit: float
    unit: str
    allowance_db: float

    @property
    def margin_db(self) -> float:
        """What is left below the rating once the allowance is taken, dB."""
        left = self.limit - self.value
        if self.unit == "J":
            left = 10 * math.log10(self.limit / self.value) if self.value > 0 else math.inf
        return left - self.allowance_db

    @property
    def is_exceeded(self) -> bool:
        """Whether the value, with its allowance, lies over the rating."""
        return self.margin_db < 0

    def text(self, value: float) -> str:
        """Return a value in the rating's unit."""
        return engineering(value, "J") if self.unit == "J" else f"{value:.2f} dBm"


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
    number : int or None
        Place in the path, from 0; None for the generator's output.
    average_allowance_db, peak_allowance_db : float or None
        How much higher either may turn out, by the recipe, dB.
    burst_energy_j, energy_limit_j : float or None
        Energy of the longest burst, and what a sensor bears, J.
    mixer_peak_dbm, mixer_limit_dbm : float or None
        Peak envelope power at an analyser's mixer, and its rating, dBm.
    """

    name: str
    role: str
    average_dbm: float
    peak_envelope_dbm: float
    average_limit_dbm: float | None
    peak_limit_dbm: float | None
    channel: int | None = None
    number: int | None = None
    average_allowance_db: float | None = None
    peak_allowance_db: float | None = None
    burst_energy_j: float | None = None
    energy_limit_j: float | None = None
    mixer_peak_dbm: float | None = None
    mixer_limit_dbm: float | None = None

    @property
    def ratings(self) -> list[Rating]:
        """Every rating that this place has."""
        average, peak = self.average_allowance_db or 0.0, self.peak_allowance_db or 0.0
        rows = (
            ("average_limit", "average power", self.average_dbm, self.average_limit_dbm, "dBm"),
            (
                "peak_limit",
                "peak envelope power",
                self.peak_envelope_dbm,
                self.peak_limit_dbm,
                "dBm",
            ),
            ("energy_limit", "energy of a burst", self.burst_energy_j, self.energy_limit_j, "J"),
            (
                "mixer_limit",
                "peak envelope power at the mixer",
                self.mixer_peak_dbm,
                self.mixer_limit_dbm,
                "dBm",
            ),
        )
        return [
            Rating(
                key=key,
                what=what,
                value=value,
                limit=limit,
                unit=unit,
                allowance_db=peak if key in {"peak_limit", "mixer_limit"} else average,
            )
            for key, what, value, limit, unit in rows
            if value is not None and limit is not None
        ]


def path_levels(
    bench: Bench,
    papr_db: float,
    *,
    over_first_db: float = 0.0,
    channel: int | None = None,
    burst_s: float | None = None,
    burst_over_average_db: float = 0.0,
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
    burst_s : float, optional
        Longest on-time, s; None for a signal that is on all the time.
    burst_over_average_db : float
        Mean power of the on-time over the average that the bench names, dB.

    Returns
    -------
    list of PathLevel
        In the order of the path; before it the generator's output, where the recipe rates it.

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
        burst_w = watts(average + burst_over_average_db)
        mixer = average + papr_db - place.input_attenuation_db
        levels.append(
            PathLevel(
                name=place.name,
                role=place.role or "",
                average_dbm=average,
                peak_envelope_dbm=average + papr_db,
                average_limit_dbm=place.average_limit_dbm,
                peak_limit_dbm=place.peak_limit_dbm,
                channel=channel,
                number=number,
                **_allowances(bench),
                burst_energy_j=(
                    burst_w * burst_s if burst_s and place.energy_limit_j is not None else None
                ),
                energy_limit_j=place.energy_limit_j,
                mixer_peak_dbm=None if place.mixer_limit_dbm is None else mixer,
                mixer_limit_dbm=place.mixer_limit_dbm,
            )
        )
    return levels


def _allowances(bench: Bench) -> dict[str, Any]:
    average = bench.level_uncertainty_db
    return {
        "average_allowance_db": average or None,
        "peak_allowance_db": average + bench.overshoot_db or None,
    }


def generator_level(bench: Bench, levels: Sequence[PathLevel]) -> PathLevel:
    """Return the level at the generator's output, with its ratings.

    Parameters
    ----------
    bench : Bench
        The path; its first stage may be the generator itself.
    levels : sequence of PathLevel
        Of one channel, as from :func:`path_levels`.
    """
    first, place = levels[0], bench.path[0]
    gain_db = place.gain_db if place.role == "generator" else 0.0
    limits = bench.generator
    return PathLevel(
        name="generator",
        role="generator",
        average_dbm=first.average_dbm + gain_db,
        peak_envelope_dbm=first.peak_envelope_dbm + gain_db,
        average_limit_dbm=limits.average_limit_dbm if limits else None,
        peak_limit_dbm=limits.peak_limit_dbm if limits else None,
        channel=first.channel,
        **_allowances(bench),
    )


def watts(power_dbm: float) -> float:
    """Return a power in W.

    Examples
    --------
    >>> round(watts(36.0), 3)
    3.981
    """
    return float(10 ** (power_dbm / 10 - 3))


def peak_volts(peak_envelope_dbm: float, impedance_ohm: float) -> float:
    """Return the largest voltage of a carrier with this envelope power, ``sqrt(2 P R)``, V.

    Examples
    --------
    >>> round(peak_volts(36.0, 50.0), 2)
    19.95
    """
    return math.sqrt(2 * watts(peak_envelope_dbm) * impedance_ohm)


def reflection(place: PathStage) -> float:
    """Return the largest reflection coefficient at a place's input, 0 where none is stated."""
    return 0.0 if place.vswr is None else (place.vswr - 1) / (place.vswr + 1)


def risk_names(bench: Bench) -> list[str]:
    """Return the ratings of a bench by the names under which a risk can be accepted."""
    found = [
        f"{place.name}.{key}"
        for place in bench.path
        for key, value in (
            ("average_limit", place.average_limit_dbm),
            ("peak_limit", place.peak_limit_dbm),
            ("energy_limit", place.energy_limit_j),
            ("mixer_limit", place.mixer_limit_dbm),
        )
        if value is not None
    ]
    limits = bench.generator
    if limits is not None:
        found += [
            f"generator.{key}"
            for key, value in (
                ("average_limit", limits.average_limit_dbm),
                ("peak_limit", limits.peak_limit_dbm),
            )
            if value is not None
        ]
    return found


def check_risks(names: Collection[str], bench: Bench | None) -> None:
    """Refuse to accept what is no rating of a bench.

    Raises
    ------
    ArgumentsError
        Names the ratings that there are.
    """
    known = [] if bench is None else risk_names(bench)
    for name in names:
        if name not in known:
            raise ArgumentsError(
                where="--accept-risk",
                problem=f"{name[:100]!r} is no rating of this recipe's bench",
                allowed=", ".join(known) or "nothing: the recipe rates nothing",
                remedy="Name one rating as STAGE.RATING.",
            )


def refuse_overload(levels: Sequence[PathLevel], *, accepted: Collection[str] = ()) -> list[str]:
    """Refuse levels over a rating, before any file is written.

    Parameters
    ----------
    levels : sequence of PathLevel
        Of every place.
    accepted : collection of str
        Ratings, as ``cable.peak_limit``, that whoever is responsible lets be exceeded.

    Returns
    -------
    list of str
        Those of them that are exceeded.

    Raises
    ------
    TargetMissed
        The first place over one of its other ratings.
    """
    exceeded = []
    for level in levels:
        for rating in level.ratings:
            if not rating.is_exceeded:
                continue
            name = f"{level.name}.{rating.key}"
            if name in accepted:
                exceeded.append(name)
                continue
            of = "" if level.channel is None else f" of channel {level.channel}"
            allowance = (
                f", and up to {rating.allowance_db:g} dB more by the stated allowance"
                if rating.allowance_db
                else ""
            )
            is_path = level.number is not None
            raise TargetMissed(
                where=f"bench.path[{level.number}]" if is_path else "bench.generator",
                problem=(
                    f"{rating.what}{of} at the {'input' if is_path else 'output'} of "
                    f"{level.name!r} would be "
                    f"{rating.text(rating.value)}{allowance}"
                ),
                allowed=f"its rating, up to {rating.text(rating.limit)}",
                remedy=(
                    "Lower average_power_at_device, reduce the crest factor, or put an "
                    "attenuator before it; let qualified people decide on ratings."
                ),
            )
    return exceeded
