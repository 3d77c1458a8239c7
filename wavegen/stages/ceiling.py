"""The amplitude that gives a wanted ceiling over the mean of the output, found on a pilot."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import RecipeError
from wavegen.core.evaluate import evaluate
from wavegen.core.signal import Range, Signal
from wavegen.core.site import Note, Site
from wavegen.dsp.bursts import Bursts
from wavegen.dsp.interpolation import delay_taps
from wavegen.stages.channel.gate import on_time

PILOT_SAMPLES = 1 << 22
"""Samples on which the mean and the peak of the input are read; a loop up to this whole."""
STRETCH_SAMPLES = 1 << 16
"""One stretch of a longer loop; 64 of them, spread evenly."""
TRIAL_SAMPLES = 1 << 18
"""Samples on which a method is tried; a loop up to this whole."""
TRIAL_STRETCH = 1 << 15
"""One stretch of a longer loop, at least."""
SHORTEST_STRETCH = 1 << 12
"""One stretch of a gated loop, at least: it lasts as long as the shortest burst."""
POINTS_OF_BAND = 16
"""Grid on which the peak between samples is read, over the width of the band."""
TOLERANCE = 2e-4
"""Relative error of the power found: 0.001 dB."""
MOST_TRIALS = 40


class Process(Protocol):
    """A method at a given amplitude: the signal it makes, not yet scaled back."""

    def __call__(self, amplitude: float, gain: float) -> Signal:
        """Return the processed signal times a gain."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Trial:
    """What a method did to the pilot at one amplitude.

    Parameters
    ----------
    mean_ratio : float
        Mean power of the output over that of the input.
    error_fraction : float
        RMS of ``y / g - x`` over that of ``x``, with the complex gain ``g`` fitted.
    peak_db, level_db : float
        Highest envelope power at the samples and the level at 0.01 %, over the output's mean.
    between_db, between_level_db : float
        The same on 16 points of the band.
    """

    mean_ratio: float
    error_fraction: float
    peak_db: float = math.nan
    level_db: float = math.nan
    between_db: float = math.nan
    between_level_db: float = math.nan


@dataclass(frozen=True, slots=True, kw_only=True)
class Found:
    """The amplitude that gives a ceiling.

    Parameters
    ----------
    amplitude : float
        On the scale of the input.
    gain : float
        Amplitude ratio that undoes the change of mean power.
    trial : Trial
        What the method does there, on the pilot.
    """

    amplitude: float
    gain: float
    trial: Trial


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Pilot:
    """Places at which a signal is looked at.

    Parameters
    ----------
    source : Signal
        The signal.
    bursts : Bursts or None
        When it is on.
    mean, highest : float
        Mean and highest power of the input, while it is on.
    is_seen_whole : bool
        Whether that is the whole loop.
    stretches : tuple of (int, int)
        Where methods are tried.
    oversampling : float
        Sample rate over the band.
    """

    source: Signal
    bursts: Bursts | None
    mean: float
    highest: float
    is_seen_whole: bool
    stretches: tuple[Range, ...]
    oversampling: float

    @property
    def peak_db(self) -> float:
        """Highest power of the input over its mean, dB."""
        return 10 * math.log10(self.highest / self.mean)

    @property
    def origin(self) -> str:
        """Where methods are tried, in words."""
        if self.stretches == ((0, self.source.n_samples),):
            where = "the whole loop"
        else:
            length = self.stretches[0][1] - self.stretches[0][0]
            where = f"{len(self.stretches)} stretches of {length} samples"
        return where if self.bursts is None else f"{where}, while it is on"

    def try_out(self, signal: Signal, *, peaks: bool) -> Trial:
        """Return what a processed signal is like, and how it differs from the source.

        Parameters
        ----------
        signal : Signal
            The source after a method.
        peaks : bool
            Whether its peaks are wanted too.
        """
        sums: list[tuple[float, float, complex]] = []
        powers: list[NDArray[np.float32]] = []
        between: list[NDArray[np.float32]] = []
        factor = min(max(math.ceil(POINTS_OF_BAND / self.oversampling), 1), POINTS_OF_BAND)
        shifts = [k / factor for k in range(1 - factor // 2 - factor % 2, factor // 2 + 1) if k]
        bank = [delay_taps(shift) for shift in shifts] if peaks else []
        reach = bank[0].size // 2 if bank else 0
        for start, stop in self.stretches:
            got = evaluate({self.source: (start, stop), signal: (start - reach, stop + reach)})
            wide = got[signal]
            after = wide[reach : wide.size - reach]
            before = after if signal is self.source else got[self.source]
            is_on = slice(None) if self.bursts is None else self.bursts.is_on(start, stop)
            x, y = before[is_on].astype(np.complex128), after[is_on].astype(np.complex128)
            sums.append((_product(x, x).real, _product(y, y).real, _product(x, y)))
            if peaks:
                own = _power(after)[is_on]
                highest = own
                powers.append(own)
                for taps in bank:
                    moved = _power(np.convolve(wide, taps.astype(np.complex64), "valid"))[is_on]
                    between.append(moved)
                between.append(highest)
        power_in = math.fsum(each[0] for each in sums)
        power_out = math.fsum(each[1] for each in sums)
        if not power_in or not power_out:
            return Trial(mean_ratio=0.0, error_fraction=math.inf)
        product = abs(sum(each[2] for each in sums)) ** 2 / power_in
        error = math.sqrt(max(power_out - product, 0.0) / product) if product else math.inf
        made = {"mean_ratio": power_out / power_in, "error_fraction": error}
        if peaks:
            mean = power_out / sum(each.size for each in powers)
            for name, values in (("", powers), ("between_", between)):
                joined = np.concatenate(values)
                made[f"{name}peak_db" if not name else "between_db"] = _db(joined.max() / mean)
                made[f"{name}level_db"] = _db(float(np.quantile(joined, 1 - 1e-4)) / mean)
        return Trial(**made)


def look(source: Signal, *, oversampling: float, halo: int) -> Pilot | None:
    """Choose where a signal is looked at, and read its mean and peak.

    Parameters
    ----------
    source : Signal
        Up to 2^22 samples of it are computed.
    oversampling : float
        Sample rate over the band.
    halo : int
        Samples that a method reads beyond what it makes; stretches are twice as long at least.

    Returns
    -------
    Pilot or None
        None for a signal without power.
    """
    bursts = on_time(source)
    total = highest = 0.0
    count = 0
    for power in pilot_power(source, bursts):
        total += float(power.sum(dtype=np.float64))
        highest = max(highest, float(power.max()))
        count += power.size
    if not total:
        return None
    n = source.n_samples
    stretches: tuple[Range, ...] = ((0, n),)
    if n > TRIAL_SAMPLES:
        length = min(max(TRIAL_STRETCH, 2 * halo), TRIAL_SAMPLES)
        if bursts is not None:  # a stretch begins with a burst: no longer than it lasts
            length = max(min(length, bursts.shortest_samples), SHORTEST_STRETCH)
        stretches = tuple(
            (start, start + length)
            for start in _spread(source, bursts, max(TRIAL_SAMPLES // length, 2))
        )
    return Pilot(
        source=source,
        bursts=bursts,
        mean=total / count,
        highest=highest,
        is_seen_whole=n <= PILOT_SAMPLES,
        stretches=stretches,
        oversampling=oversampling,
    )


def find_amplitude(pilot: Pilot, ceiling_db: float, process: Process) -> Found | None:
    """Solve ``A^2 = ceiling E[|y|^2]`` for a method's amplitude.

    Parameters
    ----------
    pilot : Pilot
        Where the method is tried.
    ceiling_db : float
        Over the mean of the output, dB.
    process : callable
        The method at an amplitude.

    Returns
    -------
    Found or None
        None where no amplitude gives the ceiling: the method removes as much from the mean.

    Notes
    -----
    ``a - ceiling r(a)``, with ``a`` the amplitude squared and ``r`` the mean of the output, both
    over the mean of the input, is nearly linear: secant steps from ``a = ceiling`` end after three
    or four trials. Methods whose steps jump with the amplitude are held in a bracket, halved at
    every third trial; at a jump the side is taken on which the ceiling holds.
    """
    ceiling = 10 ** (ceiling_db / 10)

    def trial(share: float, *, peaks: bool = False) -> Trial:
        return pilot.try_out(process(math.sqrt(share * pilot.mean), 1.0), peaks=peaks)

    share = ceiling
    last_share = last_excess = math.nan
    low, high = 0.0, math.inf
    for number in range(MOST_TRIALS):
        excess = share - ceiling * trial(share).mean_ratio
        if abs(excess) <= TOLERANCE * share:
            break
        low, high = (low, share) if excess > 0 else (share, high)
        if high - low <= TOLERANCE / 4 * low:  # a jump: the side on which the ceiling holds
            share = low
            break
        slope = (excess - last_excess) / (share - last_share) if share != last_share else 1.0
        step = excess / slope if slope > 0.02 else excess  # the first has no slope: NaN
        last_share, last_excess = share, excess
        share = max(share - step, share / 4)
        if low and high < math.inf and (number % 3 == 2 or not low < share < high):
            share = (low + high) / 2
        if share < 1e-4:
            return None
    else:
        return None
    final = trial(share, peaks=True)
    return Found(
        amplitude=math.sqrt(share * pilot.mean),
        gain=final.mean_ratio**-0.5,
        trial=final,
    )


def reduce_to(
    site: Site,
    pilot: Pilot | None,
    ceiling_db: float,
    process: Process,
    action: str,
) -> Signal | None:
    """Return a signal with its peaks reduced at the mean power it had, and tell what was done.

    Parameters
    ----------
    site : Site
        Told of the amplitude, the change of mean power and what is left of the peaks.
    pilot : Pilot or None
        From :func:`look`.
    ceiling_db : float
        Over the mean of the output, dB.
    process : callable
        The method at an amplitude.
    action : str
        What the method does, as the beginning of a sentence: ``clips 4 times``.

    Returns
    -------
    Signal or None
        None where the signal never reaches the ceiling.

    Raises
    ------
    RecipeError
        The signal is zero, or no amplitude gives the ceiling.
    """
    if pilot is None:
        raise refuse_zero(site, ceiling_db)
    if pilot.is_seen_whole and pilot.peak_db <= ceiling_db:
        text = f"nothing to do: the signal peaks {pilot.peak_db:.3f} dB over its mean"
        site.notes.append(Note(kind="info", where=f"{site.path}.ceiling", text=text))
        return None
    found = find_amplitude(pilot, ceiling_db, process)
    if found is None:
        raise site.error(
            key="ceiling",
            problem=f"{ceiling_db:g} dB cannot be met: the method takes as much from the mean "
            "as from the peaks",
            allowed="a ceiling well below the peaks, but not near the mean",
            remedy="Raise the ceiling.",
        )
    trial = found.trial
    over_db = 20 * math.log10(found.amplitude) - 10 * math.log10(pilot.mean)
    text = (
        f"{action} at {over_db:.3f} dB over the mean of its input, found on "
        f"{pilot.origin}: fitted error {100 * trial.error_fraction:.2f} %; the change of mean "
        f"power, {10 * math.log10(trial.mean_ratio):.4f} dB, is undone; "
        f"{trial.level_db:.2f} dB at 0.01 % and {trial.peak_db:.2f} dB at the peak there, "
        f"between samples {trial.between_level_db:.2f} and {trial.between_db:.2f} dB"
    )
    site.notes.append(Note(kind="info", where=f"{site.path}.ceiling", text=text))
    return process(found.amplitude, found.gain)


def refuse_zero(site: Site, ceiling_db: float) -> RecipeError:
    """Return the error of a signal that is zero."""
    return site.error(
        key="ceiling",
        problem=f"{ceiling_db:g} dB cannot be met: the signal is zero",
        allowed="signals with power",
        remedy="Correct the signal.",
    )


def pilot_power(source: Signal, bursts: Bursts | None) -> Iterator[NDArray[np.float32]]:
    """Yield the envelope power of stretches of a signal, the same stretches every time.

    Parameters
    ----------
    source : Signal
        Read whole up to 2^22 samples, else at 64 stretches of 2^16.
    bursts : Bursts or None
        Of a gated signal only what is fully on; a long loop is read at bursts spread evenly.
    """
    if source.n_samples <= PILOT_SAMPLES:
        length, starts = 1 << 20, list(range(0, source.n_samples, 1 << 20))
    else:
        length, starts = STRETCH_SAMPLES, _spread(source, bursts, PILOT_SAMPLES // STRETCH_SAMPLES)
    for start in starts:
        stop = min(start + length, source.n_samples)
        power = _power(evaluate({source: (start, stop)})[source])
        if bursts is not None:
            power = power[bursts.is_on(start, stop)]
        if power.size:
            yield power


def _spread(source: Signal, bursts: Bursts | None, count: int) -> list[int]:
    """Return starts of stretches: evenly, or at bursts."""
    if bursts is None:
        return [source.n_samples * k // count for k in range(count)]
    every = [start for start, _ in bursts.starts(source.n_samples)]
    return [every[k] for k in sorted({len(every) * k // count for k in range(count)})]


def _power(samples: NDArray[np.complex64]) -> NDArray[np.float32]:
    power: NDArray[np.float32] = samples.real * samples.real
    power += samples.imag * samples.imag
    return power


def _product(x: NDArray[np.complex128], y: NDArray[np.complex128]) -> complex:
    """Return ``<x, y>``; a library's threads would wait for each other longer than they work."""
    return complex(np.sum(np.conj(x) * y))


def _db(ratio: float) -> float:
    return 10 * math.log10(ratio) if ratio > 0 else -math.inf
