"""Bursts of a recording: found by level, read off its markers, or given as a pattern.

How the search works. The mean power in a short window that moves along is counted into a
histogram. Its 5th percentile is the *floor*, its 99.9th the *top*; the threshold lies halfway
between them in dB, unless one is given over the on-level. A burst opens where the window's power
reaches the threshold, and closes where it falls under a second one, lower by the hysteresis. Gaps
shorter than the dead time are closed, bursts shorter than the shortest are dropped. The window
opens early and closes late; edges are moved inwards by what an abrupt edge would need.

Whether there are bursts at all is asked first: top and floor must stand 6 dB apart, and the
middle third of the levels between them must be all but empty. Without bursts the window's power
has one hump, whose middle is its fullest part.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from concurrent.futures import Executor
from dataclasses import dataclass
from typing import Literal, Self

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import ArgumentsError, SignalError
from wavegen.core.progress import Progress, silent
from wavegen.core.render import Tap, render
from wavegen.core.signal import Range, Samples, Signal
from wavegen.dsp.bursts import Bursts
from wavegen.dsp.moving_power import MovingPower
from wavegen.files.format import Annotation
from wavegen.meters.power import PowerMeter
from wavegen.meters.power_statistics import PowerStatistics

FLOOR_PROBABILITY = 0.95
TOP_PROBABILITY = 1e-3
"""Exceeded for this share of the time: 5th and 99.9th percentile."""
WINDOWS = (16, 64, 256, 1024, 4096)
"""Tried in this order unless one is asked for, samples."""
LEAST_CONTRAST_DB = 6.0
"""Top over floor. Gaussian noise of 16 independent values a window spreads over 5 dB."""
MOST_BETWEEN = 0.05
"""Share of the time in the middle third between floor and top. Measured: real bursts 0.03 and
less, continuous signals 0.12 and more wherever the contrast passes 6 dB."""
DEEPEST_FLOOR_DB = 60.0
"""A floor further under the top (exact zeros) counts as this far."""
DEFAULT_HYSTERESIS_DB = 3.0
_WINDOWS_IN_RECORD = 16
_STRIP_SAMPLES = 1 << 18
"""Shorter than usual: five windows are held at once."""


@dataclass(frozen=True, slots=True, kw_only=True)
class BurstSearch:
    """Settings of the search.

    Parameters
    ----------
    window_samples : int or None
        Length of the moving window; None tries 16, 64, 256, 1024 and 4096 and takes the first
        in which on and off stand apart.
    threshold_db : float or None
        Over the on-level, hence below 0, dB. None: halfway between floor and top.
    hysteresis_db : float or None
        How far below the threshold a burst closes. None: 3 dB, or a sixth of top over floor
        where that is less.
    dead_time_samples : int or None
        Shorter gaps do not end a burst. None: one window.
    shortest_samples : int or None
        Shorter bursts do not count. None: half a window.
    guard_samples : int or None
        Left out of the statistics at both ends of a burst, for its ramps. None: half a window.
    edges : {"moved", "crossing"}
        Whether edges are moved inwards for what the window adds, or stay where it crosses.
    """

    window_samples: int | None = None
    threshold_db: float | None = None
    hysteresis_db: float | None = None
    dead_time_samples: int | None = None
    shortest_samples: int | None = None
    guard_samples: int | None = None
    edges: Literal["moved", "crossing"] = "moved"


@dataclass(frozen=True, slots=True, kw_only=True)
class FoundBursts:
    """Bursts, and how they were found: figures say what they were gated by.

    Parameters
    ----------
    bursts : Bursts or None
        One period as long as the record; its ramps are the guard. None: no bursts.
    label : str
        How: for titles of tables.
    n_samples : int
        Length of the record.
    window_samples : int or None
        Window of the search; None where nothing was searched.
    floor_dbfs, top_dbfs : float or None
        5th and 99.9th percentile of the window's power, dB over full scale.
    on_level_dbfs : float or None
        Mean power of the windows above the threshold, dB over full scale.
    threshold_dbfs, closing_dbfs : float or None
        Where bursts open and close, dB over full scale.
    between : float or None
        Share of the time in the middle third between floor and top.
    reason : str
        Why there are none, where there are none.
    n_cut : int
        Bursts that the ends of the record cut.
    """

    bursts: Bursts | None
    label: str
    n_samples: int
    window_samples: int | None = None
    floor_dbfs: float | None = None
    top_dbfs: float | None = None
    on_level_dbfs: float | None = None
    threshold_dbfs: float | None = None
    closing_dbfs: float | None = None
    between: float | None = None
    reason: str = ""
    n_cut: int = 0

    @property
    def n_bursts(self) -> int:
        """How many."""
        return len(self.bursts.runs) if self.bursts else 0

    @property
    def duty(self) -> float:
        """On-time over all, ramps and guard included; 1 where there are no bursts."""
        return float(self.bursts.duty) if self.bursts else 1.0

    @property
    def duty_measured(self) -> float:
        """Share of the time that gated statistics are about; 1 where there are no bursts."""
        if self.bursts is None:
            return 1.0
        inset = 2 * self.bursts.ramp_samples
        kept = sum(max(stop - start - inset, 0) for start, stop in self.bursts.runs)
        return kept / self.n_samples


def find_bursts(
    signal: Signal,
    search: BurstSearch | None = None,
    *,
    loops: bool,
    where: str = "signal",
    workers: int = 1,
    executor: Executor | None = None,
    progress: Progress = silent,
) -> FoundBursts:
    """Find the bursts of a record by level, in two passes over it.

    Parameters
    ----------
    signal : Signal
        What is searched.
    search : BurstSearch, optional
        Settings; those of the class if not given.
    loops : bool
        Whether bursts may pass the seam.
    where : str
        What it is called in messages.
    workers, executor, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    FoundBursts
        Without bursts where on and off do not stand apart (unless a threshold or a window was
        asked for), or nothing long enough is on.

    Raises
    ------
    ArgumentsError
        A setting that means nothing.
    SignalError
        A sample is not finite, or there is nothing but zeros.

    Notes
    -----
    If a burst is on for less than 0.1 % of the time, the 99.9th percentile knows nothing of
    it. Where the usual top shows no bursts, the level that is exceeded for two windows in all
    is tried as top: a single stray sample lifts one window's length only.
    """
    search = search or BurstSearch()
    _check(search)
    names = {
        "workers": workers,
        "executor": executor,
        "progress": progress,
        "strip_samples": _STRIP_SAMPLES,
    }
    n = signal.n_samples
    widths = _widths(search, n)
    tracks = [MovingPower.of(signal, width, loops=loops) for width in widths]
    taps = tuple(
        Tap(name=str(track.window_samples), signal=track, meter=PowerMeter(where=where))
        for track in tracks
    )
    found = render(signal, taps=taps, task=f"levels of {where}", **names)  # type: ignore[arg-type]
    splits = [_split(found[tap.name], width) for tap, width in zip(taps, widths, strict=True)]
    is_told = search.window_samples is not None or search.threshold_db is not None
    place = next((k for k, split in enumerate(splits) if split.is_bimodal), 0 if is_told else None)
    if place is None:
        split = max(splits, key=lambda item: item.contrast_db)
        return FoundBursts(
            bursts=None,
            label="whole record: no bursts found",
            n_samples=n,
            window_samples=split.window,
            floor_dbfs=_db(split.floor),
            top_dbfs=_db(split.top),
            between=split.between,
            reason=f"in windows of {split.window} samples the level spreads over "
            f"{split.contrast_db:.1f} dB without a gap between on and off",
        )
    split, track = splits[place], tracks[place]
    statistics: PowerStatistics = found[taps[place].name]
    threshold = math.sqrt(split.floor * split.top)
    on_level = _mean_above(statistics, threshold)
    if search.threshold_db is not None:
        threshold = on_level * 10 ** (search.threshold_db / 10)
        on_level = _mean_above(statistics, threshold)
    hysteresis = search.hysteresis_db
    if hysteresis is None:
        hysteresis = min(DEFAULT_HYSTERESIS_DB, split.contrast_db / 6)
    closing = threshold * 10 ** (-hysteresis / 10)
    tap = Tap(name="edges", signal=track, meter=_EdgeMeter(opening=threshold, closing=closing))
    crossings: list[Range] = render(track, taps=(tap,), task=f"bursts of {where}", **names)[  # type: ignore[arg-type]
        "edges"
    ].runs(n, loops=loops)
    runs, n_cut = _tidied(
        crossings, search, split.window, (threshold / on_level, closing / on_level), n, loops=loops
    )
    ends_db = _db(threshold / on_level)
    guard = search.guard_samples
    if guard is None:
        guard = 0 if search.edges == "crossing" else split.window // 2
    runs = [(start, stop) for start, stop in runs if stop - start > 2 * guard]
    return FoundBursts(
        bursts=Bursts(period_samples=n, runs=tuple(runs), ramp_samples=guard) if runs else None,
        label=f"bursts found: {len(runs)}, threshold {ends_db:.1f} dB over the on-level"
        if runs
        else "whole record: no bursts found",
        n_samples=n,
        window_samples=split.window,
        floor_dbfs=_db(split.floor),
        top_dbfs=_db(split.top),
        on_level_dbfs=_db(on_level),
        threshold_dbfs=_db(threshold),
        closing_dbfs=_db(closing),
        between=split.between,
        reason="" if runs else "nothing stays above the threshold for long enough",
        n_cut=n_cut,
    )


def marked_bursts(
    annotations: Iterable[Annotation], *, n_samples: int, guard_samples: int = 0, label: str = ""
) -> FoundBursts:
    """Return the bursts that a file's own markers name.

    Parameters
    ----------
    annotations : iterable of Annotation
        Those without a length, and those of another label, are left out; overlaps are joined.
    n_samples : int
        Length of the record; markers are cut there.
    guard_samples : int
        Left out of the statistics at both ends of each.
    label : str
        Only markers of this label, if given.

    Raises
    ------
    SignalError
        No marker is left.
    """
    asked = sorted(
        (max(item.start_sample, 0), min(item.start_sample + item.n_samples, n_samples))
        for item in annotations
        if item.n_samples and (not label or item.label == label)
    )
    runs: list[Range] = []
    for start, stop in asked:
        if runs and start <= runs[-1][1]:
            runs[-1] = (runs[-1][0], max(runs[-1][1], stop))
        elif start < stop:
            runs.append((start, stop))
    runs = [(start, stop) for start, stop in runs if stop - start > 2 * guard_samples]
    if not runs:
        raise SignalError(
            where="markers",
            problem=f"no marker{f' {label!r}' if label else ''} covers samples of the record",
            allowed="markers with a start and a length",
            remedy="Gate by level instead, or name another marker.",
        )
    return FoundBursts(
        bursts=Bursts(period_samples=n_samples, runs=tuple(runs), ramp_samples=guard_samples),
        label=f"bursts by the file's markers: {len(runs)}",
        n_samples=n_samples,
    )


def pattern_bursts(bursts: Bursts, *, n_samples: int) -> FoundBursts:
    """Return the bursts of a pattern that was given.

    Parameters
    ----------
    bursts : Bursts
        Periodic, on the record's own axis.
    n_samples : int
        Length of the record.

    Raises
    ------
    SignalError
        The pattern is never on within the record.
    """
    whole = bursts.over(n_samples)
    if not any(stop - start > 2 * bursts.ramp_samples for start, stop in whole.runs):
        raise SignalError(
            where="pattern",
            problem=f"is never on in {n_samples} samples",
            allowed="a pattern with some on-time in the record",
            remedy="Check period, on-time and offset.",
        )
    return FoundBursts(
        bursts=whole, label=f"bursts by pattern: {len(whole.runs)}", n_samples=n_samples
    )


@dataclass(frozen=True, slots=True)
class _Split:
    """How the power in a window divides into on and off."""

    window: int
    floor: float
    top: float
    between: float

    @property
    def contrast_db(self) -> float:
        return _db(self.top / self.floor)

    @property
    def is_bimodal(self) -> bool:
        return self.contrast_db >= LEAST_CONTRAST_DB and self.between <= MOST_BETWEEN


def _check(search: BurstSearch) -> None:
    for name, least in (
        ("window_samples", 1),
        ("dead_time_samples", 0),
        ("shortest_samples", 0),
        ("guard_samples", 0),
        ("hysteresis_db", 0),
    ):
        value = getattr(search, name)
        if value is not None and not least <= value < math.inf:
            raise ArgumentsError(
                where=name,
                problem=f"is {value}",
                allowed=f"{least} or more",
                remedy="Correct it, or leave it out.",
            )
    if search.threshold_db is not None and not -200 <= search.threshold_db < 0:
        raise ArgumentsError(
            where="threshold_db",
            problem=f"is {search.threshold_db:g} dB over the on-level",
            allowed="below 0 dB, from -200 dB on",
            remedy="Give how far under the on-level a burst begins, such as -10 dB.",
        )


def _widths(search: BurstSearch, n_samples: int) -> tuple[int, ...]:
    if search.window_samples is not None:
        return (min(search.window_samples, n_samples),)
    fitting = tuple(width for width in WINDOWS if width * _WINDOWS_IN_RECORD <= n_samples)
    return fitting or (max(n_samples // _WINDOWS_IN_RECORD, 1),)


def _split(statistics: PowerStatistics, window: int) -> _Split:
    """Return the split at the usual top, or at a rare one where only that shows bursts."""
    tops = [TOP_PROBABILITY]
    rare = 2 * window / statistics.n_samples
    if rare < TOP_PROBABILITY:
        tops.append(rare)
    splits = []
    for probability in tops:
        top = float(statistics.level_power(probability))
        top = top or statistics.peak
        floor = float(statistics.level_power(FLOOR_PROBABILITY))
        floor = max(floor, top * 10 ** (-DEEPEST_FLOOR_DB / 10))
        low, high = floor ** (2 / 3) * top ** (1 / 3), floor ** (1 / 3) * top ** (2 / 3)
        counts = statistics.exceedances_of_power([low, high])
        between = float(counts[0] - counts[1]) / statistics.n_samples
        splits.append(_Split(window, floor, top, between))
    return next((split for split in splits if split.is_bimodal), splits[0])


def _mean_above(statistics: PowerStatistics, power: float) -> float:
    """Return the mean of the powers above one, from the histogram (0.0085 dB a bin)."""
    middles = np.sqrt(statistics.edges[:-1] * statistics.edges[1:])[:-1]
    counts = np.where(middles > power, statistics.counts[:-1], 0)
    is_in = statistics.top_powers > power
    total = float(np.sum(counts * middles))
    total += float(np.sum(statistics.top_powers[is_in] * statistics.top_counts[is_in]))
    n = int(counts.sum()) + int(statistics.top_counts[is_in].sum())
    return total / n if n else statistics.peak


def _tidied(
    crossings: list[Range],
    search: BurstSearch,
    window: int,
    shares: tuple[float, float],
    n_samples: int,
    *,
    loops: bool,
) -> tuple[list[Range], int]:
    """Close short gaps, move edges inwards, drop what is too short; count what is cut."""
    dead = window if search.dead_time_samples is None else search.dead_time_samples
    joined: list[Range] = []
    for start, stop in crossings:
        if joined and start - joined[-1][1] < dead:
            joined[-1] = (joined[-1][0], stop)
        else:
            joined.append((start, stop))
    if loops and len(joined) > 1 and joined[0][0] + n_samples - joined[-1][1] < dead:
        _, end = joined.pop(0)
        joined[-1] = (joined[-1][0], end + n_samples)
    shifts = [0, 0]  # the window crosses a level when that share of it holds an abrupt burst
    if search.edges == "moved":
        shifts = [round(window * max(0.5 - share, 0.0)) for share in shares]
    shortest = window // 2 if search.shortest_samples is None else search.shortest_samples
    runs, n_cut = [], 0
    for start, stop in joined:
        low, high = start + shifts[0], stop - shifts[1]
        if not loops and start == 0:
            low = 0
        if not loops and stop == n_samples:
            high = n_samples
        if loops and (start, stop) == (0, n_samples):
            low, high = start, stop
        if high - low < max(shortest, 1):
            continue
        n_cut += not loops and (low == 0 or high == n_samples)
        runs.append((low, high))
    return sorted((low % n_samples, low % n_samples + high - low) for low, high in runs), n_cut


def _db(power: float) -> float:
    return 10.0 * math.log10(power) if power > 0 else -math.inf


class _EdgeReading:
    """Where a burst opens and closes in one stretch, mergeable whatever stood before it.

    Only samples at or above the opening level, or under the closing one, decide; of these the
    first and last are kept, and every change between them.
    """

    def __init__(self, opening: float, closing: float) -> None:
        self._opening = opening
        self._closing = closing
        self._first: tuple[int, bool] | None = None
        self._last: bool | None = None
        self._changes: list[NDArray[np.int64]] = []

    def feed(self, start: int, samples: Samples) -> None:
        """Take in samples whose first has index ``start``."""
        power = samples.real.astype(np.float64) ** 2
        opens = power >= self._opening
        decided = np.flatnonzero(opens | (power < self._closing))
        if not decided.size:
            return
        state = opens[decided]
        if self._first is None:
            self._first = (start + int(decided[0]), bool(state[0]))
        elif self._last != bool(state[0]):
            self._changes.append(np.array([start + decided[0]]))
        self._last = bool(state[-1])
        self._changes.append(start + decided[1:][state[1:] != state[:-1]])

    def merge(self, following: Self) -> None:
        """Append the reading of the stretch that starts where this one ends."""
        if following._first is None:
            return
        if self._first is None:
            self._first = following._first
        elif self._last != following._first[1]:
            self._changes.append(np.array([following._first[0]]))
        self._changes.extend(following._changes)
        self._last = following._last

    def result(self) -> Self:
        """Return itself: what stands at the ends is the asker's to know."""
        return self

    def runs(self, n_samples: int, *, loops: bool) -> list[Range]:
        """Return the stretches that are on; one that passes the seam ends past ``n_samples``."""
        if self._first is None:
            return []
        changes = np.concatenate(self._changes).tolist() if self._changes else []
        is_on = self._first[1]
        # Undecided samples before the first decided one are off unless a loop comes in on.
        if is_on and not changes:
            return [(0 if loops else self._first[0], n_samples)]
        if is_on:
            changes.insert(0, self._first[0])
        if len(changes) % 2:
            changes.append(n_samples)
            if loops and not is_on:  # on at the end, off from the first decided sample
                changes[-1] += self._first[0]
            elif loops:
                runs = list(zip(changes[::2], changes[1::2], strict=True))
                _, stop = runs.pop(0)
                return [*runs[:-1], (runs[-1][0], n_samples + stop)]
        return list(zip(changes[::2], changes[1::2], strict=True))


@dataclass(frozen=True, slots=True, kw_only=True)
class _EdgeMeter:
    """Settings of the meter of crossings.

    Parameters
    ----------
    opening, closing : float
        Powers.
    """

    opening: float
    closing: float

    def begin(self, signal: Signal) -> _EdgeReading:
        """Return an empty reading."""
        return _EdgeReading(self.opening, self.closing)
