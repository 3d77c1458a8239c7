"""What a gain curve from two power distributions takes for granted, and whether it holds."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from wavegen.comparison.alignment import Alignment
from wavegen.comparison.gain import GainPoints, SmallSignal, points_at
from wavegen.comparison.side import Side
from wavegen.comparison.spectra import SpectrumDifference
from wavegen.core.units import format_hz

WIDE_ENOUGH = 3.0
"""Sample rate of the output over the occupied bandwidth of the input, from which a capture keeps
what the device adds beside the signal."""
NARROW_ERRORS = ((1.0, 1.5), (1.5, 0.7), (3.0, 0.02))
"""Ratio, and by how many dB the gain of an amplifier driven 6 dB back reads wrong (own figures, by
simulation of band-limited noise through a Rapp curve)."""
FLOOR_LEVELS_DB = (-25.0, -15.0)
FLOOR_DB = 0.3
FLAT_SLOPE = 0.15
FLAT_DB = 1.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Assumption:
    """One of them.

    Parameters
    ----------
    name : str
        For programs.
    holds : bool or None
        None where it cannot be told.
    says : str
        What was found, and what it means.
    """

    name: str
    holds: bool | None
    says: str


def assumptions(
    sides: tuple[Side, Side],
    points: GainPoints,
    small: SmallSignal,
    spectra: SpectrumDifference | None,
    alignment: Alignment | None,
    *,
    mean_db: float,
) -> tuple[Assumption, ...]:
    """Return what the gain curve rests on.

    Parameters
    ----------
    sides : (Side, Side)
        Input and output.
    points : GainPoints
        The curve.
    small : SmallSignal
        Its gain at low levels.
    spectra : SpectrumDifference or None
        Of both sides.
    alignment : Alignment or None
        Of both sides, where they are of one signal.
    mean_db : float
        Mean input power.
    """
    return (
        _bandwidth(spectra),
        _floor(sides, small, mean_db=mean_db),
        _rising(points, alignment, mean_db=mean_db),
        _memory(alignment),
        _one_signal(sides, alignment),
    )


def _bandwidth(spectra: SpectrumDifference | None) -> Assumption:
    name = "bandwidth"
    if spectra is None:
        text = "without samples of both sides it is not known how wide they were captured"
        return Assumption(name=name, holds=None, says=text)
    width_hz = spectra.first.occupied.width_hz
    rate_hz = spectra.second.spectrum.sample_rate_hz
    ratio = rate_hz / width_hz
    text = (
        f"the output is sampled at {format_hz(rate_hz)}, {ratio:.2f} times the "
        f"{format_hz(width_hz, digits=4)} that the input occupies"
    )
    if ratio >= WIDE_ENOUGH:
        return Assumption(name=name, holds=True, says=text)
    known = np.array(NARROW_ERRORS)
    error_db = float(np.interp(ratio, known[:, 0], known[:, 1]))
    text += (
        f": a capture narrower than {WIDE_ENOUGH:g} times leaves out what the device adds beside "
        f"the signal and mimics compression, by some {error_db:.1f} dB where it is driven hard"
    )
    return Assumption(name=name, holds=False, says=text)


def _floor(sides: tuple[Side, Side], small: SmallSignal, *, mean_db: float) -> Assumption:
    name = "noise_floor"
    source, output = sides[0].scale_curve or sides[0].curve, sides[1].scale_curve or sides[1].curve
    share = source.ccdf(mean_db + np.arange(*FLOOR_LEVELS_DB, 2.0))
    low = points_at(source, output, share)
    if low.input_db.size < 2:
        return Assumption(name=name, holds=None, says="no levels far below the mean to tell it by")
    off = low.gain_db - small.gain_db
    surely = np.abs(off) > FLOOR_DB + np.hypot(low.error_db, small.error_db)
    if not surely.any():
        text = (
            f"gain is even down to {mean_db - low.input_db[0]:.0f} dB below the mean input (the "
            "noise beside a noise-like signal does not show there: it adds its power at all levels)"
        )
        return Assumption(name=name, holds=True, says=text)
    place = int(np.argmax(np.abs(off)))
    side = "output" if off[place] > 0 else "input"
    text = (
        f"at {low.input_db[place] - mean_db:+.0f} dB over the mean input the gain reads "
        f"{off[place]:+.2f} dB: a noise floor at the {side} (or a gain that changes at low "
        f"levels); the curve starts above it"
    )
    return Assumption(name=name, holds=False, says=text)


def _rising(points: GainPoints, alignment: Alignment | None, *, mean_db: float) -> Assumption:
    name = "output_rises"
    folds = alignment.folds_from_db if alignment else None
    if folds is not None:
        text = (
            f"beyond {folds:+.1f} dB over the mean input the output falls again: quantiles do not "
            "correspond there, and the gain is wrong from the output level on that is reached "
            "twice"
        )
        return Assumption(name=name, holds=False, says=text)
    slope = np.gradient(points.output_db, points.input_db) if points.input_db.size > 2 else None
    if slope is None:
        return Assumption(name=name, holds=None, says="too few points to tell")
    flat = np.flatnonzero(slope < FLAT_SLOPE)
    reach = points.input_db[-1] - points.input_db[flat[0]] if flat.size else 0.0
    if flat.size and reach >= FLAT_DB:
        text = (
            f"from {points.input_db[flat[0]] - mean_db:+.1f} dB over the mean input the output "
            f"hardly rises ({float(slope[flat].mean()):.2f} dB for a dB): a limit, or a curve that "
            "folds back, which distributions cannot tell apart"
        )
        return Assumption(name=name, holds=None if alignment is None else True, says=text)
    return Assumption(name=name, holds=True, says="the output rises with the input throughout")


def _memory(alignment: Alignment | None) -> Assumption:
    name = "no_memory"
    if alignment is None:
        text = "cannot be told from captures that do not share a signal in time"
        return Assumption(name=name, holds=None, says=text)
    if alignment.has_memory:
        text = (
            f"neighbours in time explain {100 * alignment.explained:.0f} % of what a memoryless "
            f"curve leaves ({alignment.memory_db:.1f} dB of the output): the gain depends on more "
            "than the level, and the curve is an average"
        )
        return Assumption(name=name, holds=False, says=text)
    text = f"a memoryless curve leaves {alignment.left_db:.1f} dB of the output, as noise does"
    return Assumption(name=name, holds=True, says=text)


def _one_signal(sides: tuple[Side, Side], alignment: Alignment | None) -> Assumption:
    name = "one_signal"
    both_loop = sides[0].loops and sides[1].loops
    if alignment is not None:
        text = (
            f"both are of one signal (correlation {alignment.correlation:.3f}, output "
            f"{alignment.delay_samples:.2f} samples later)"
        )
        return Assumption(name=name, holds=True, says=text)
    if both_loop:
        text = (
            "both are loops, and exact, but it could not be seen that they are of one signal: "
            "loops of different data do not correspond exactly"
        )
        return Assumption(name=name, holds=None, says=text)
    text = "different captures: both are taken as samples of one process at the level of the device"
    return Assumption(name=name, holds=None, says=text)


def doubts(found: tuple[Assumption, ...]) -> Iterator[str]:
    """Return what does not hold, for warnings."""
    return (item.says for item in found if item.holds is False)
