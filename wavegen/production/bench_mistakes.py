"""What a device would see if something went wrong at the bench."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

from wavegen.production.bench import PathLevel


@dataclass(frozen=True, slots=True, kw_only=True)
class SheetFacts:
    """What a sheet needs beyond a sidecar.

    Parameters
    ----------
    longest_burst_s : float or None
        Longest on-time, s; None for a signal that is on all the time.
    first_sample_db, last_sample_db : float or None
        Power of the first and of the last sample over the mean of the loop, dB; None if it is
        zero.
    bandwidth_hz : float
        That holds 99 % of the power, Hz.
    unreduced_papr_db : float or None
        PAPR between samples, over the loop's mean, of the same recipe without crest-factor
        reduction, dB; None if there is none in it.
    """

    longest_burst_s: float | None
    first_sample_db: float | None
    last_sample_db: float | None
    bandwidth_hz: float
    unreduced_papr_db: float | None


def mistakes(
    facts: SheetFacts,
    levels: Sequence[PathLevel],
    named_over_period_db: float,
    back_off_db: float,
) -> list[dict[str, Any]]:
    """Return what the device would see if something went wrong, and which ratings would not hold.

    Parameters
    ----------
    facts : SheetFacts
        Of the loop.
    levels : sequence of PathLevel
        Everywhere, the generator's output first.
    named_over_period_db : float
        Mean that the bench names over that of the period, dB.
    back_off_db : float
        Full scale over the mean of the period, dB.

    Returns
    -------
    list of dict
        ``what``, ``average_dbm``, ``peak_envelope_dbm``, both over what was planned, and
        ``exceeds``. A carrier that is held has its peak for an average.
    """
    device = next(level for level in levels if level.role == "device")
    average, peak = device.average_dbm, device.peak_envelope_dbm
    period_dbm = average - named_over_period_db
    found = [
        (
            "the full-scale level is set, but the setting means RMS",
            average + back_off_db,
            peak + back_off_db,
            False,
        )
    ]
    if facts.unreduced_papr_db is not None:
        raised = period_dbm + facts.unreduced_papr_db
        what = "the file without crest-factor reduction is loaded"
        found.append((what, average, raised, False))
    found.append(("playing stops at the highest sample, and it is held", peak, peak, True))
    if facts.last_sample_db is not None:
        held = period_dbm + facts.last_sample_db
        found.append(("playing stops at the last sample, and it is held", held, held, True))
    return [
        {
            "what": what,
            "average_dbm": new_average,
            "peak_envelope_dbm": new_peak,
            "over_average_db": new_average - average,
            "over_peak_db": new_peak - peak,
            "exceeds": _exceeded(
                levels, new_average - average, new_peak - peak, is_carrier=is_carrier
            ),
        }
        for what, new_average, new_peak, is_carrier in found
    ]


def _exceeded(
    levels: Sequence[PathLevel], average_db: float, peak_db: float, *, is_carrier: bool
) -> list[str]:
    """Return the ratings that do not hold with averages and peaks so much higher everywhere."""
    names = []
    for level in levels:
        energy, mixer = level.burst_energy_j, level.mixer_peak_dbm
        raised = replace(
            level,
            average_dbm=level.average_dbm + average_db,
            peak_envelope_dbm=level.peak_envelope_dbm + peak_db,
            mixer_peak_dbm=None if mixer is None else mixer + peak_db,
            # A carrier is no pulse: it is the average rating that it strains.
            burst_energy_j=None
            if energy is None or is_carrier
            else energy * 10 ** (average_db / 10),
        )
        names += [f"{level.name}.{item.key}" for item in raised.ratings if item.is_exceeded]
    return names


def edges(
    facts: SheetFacts, levels: Sequence[PathLevel], named_over_period_db: float
) -> dict[str, float | None]:
    """Return the power of the first and the last sample at the device, dBm; None where zero."""
    device = next(level for level in levels if level.role == "device")
    period_dbm = device.average_dbm - named_over_period_db
    return {
        name: None if over is None else period_dbm + over
        for name, over in (
            ("first_dbm", facts.first_sample_db),
            ("last_dbm", facts.last_sample_db),
        )
    }
