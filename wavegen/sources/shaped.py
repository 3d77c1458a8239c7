"""A waveform with a given spectrum and a given CCDF, and no content."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache
from pathlib import Path
from typing import Annotated, TypeVar

import numpy as np
from annotated_types import Ge, Gt, Le
from numpy.typing import NDArray

from wavegen.core.errors import FileError
from wavegen.core.held import Held
from wavegen.core.rng import random_bytes, stream_key
from wavegen.core.signal import Signal
from wavegen.core.site import Cycle, Note, Site
from wavegen.core.units import QuantityError, format_hz
from wavegen.dsp.shaped_envelope import Shaped as Result
from wavegen.dsp.shaped_envelope import shape_envelope
from wavegen.files.csv_table import open_table
from wavegen.files.curve import Curve, read_curve
from wavegen.laws.law import Law
from wavegen.laws.listed import ListedLaw

Found = TypeVar("Found")

LONGEST_SAMPLES = 1 << 22
"""The whole loop is transformed at once, a hundred times and more: 10 s at 2^20."""
NEAR_DB = 0.05
"""A level error up to this is what was asked for."""
MOVED_DB = 0.01
"""A curve whose mean is off by more is told of."""
_LEAST_BEND, _MOST_BEND = 0.02, 50.0
EDGE_FRACTION = 0.05
_NOTHING_DBC = -150.0
DEEPEST_DB = -120.0
"""Density over the largest below which a bin is left empty."""


@dataclass(frozen=True, slots=True, kw_only=True)
class LevelPoint:
    """One point of a CCDF.

    Parameters
    ----------
    probability_percent : float
        Share of time above the level, %.
    level_db : float
        Over the mean, dB.
    """

    probability_percent: Annotated[float, Gt(0), Le(100)]
    level_db: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Window:
    """The part of each period that follows the curve: what a gate will keep.

    Parameters
    ----------
    period_samples : int
        It repeats after so many; a whole number of periods is a loop.
    first_samples, stop_samples : int
        From which sample of the period to which (not included).
    """

    period_samples: Annotated[int, Ge(1)]
    first_samples: Annotated[int, Ge(0)] = 0
    stop_samples: Annotated[int, Ge(1)]

    def __post_init__(self) -> None:
        """Refuse a part that is none."""
        if not self.first_samples < self.stop_samples <= self.period_samples:
            raise QuantityError(
                problem=f"it runs from {self.first_samples} to {self.stop_samples} of "
                f"{self.period_samples} samples",
                allowed="a part of the period that is not empty",
                remedy="Correct first and stop.",
                key="stop",
            )


@dataclass(frozen=True, slots=True, kw_only=True)
class Shaped:
    """Settings of a waveform that is known by its spectrum and its CCDF alone.

    Parameters
    ----------
    curve : str, optional
        CSV of the CCDF, relative to the recipe: level over the mean in dB, and probability.
    points : tuple of LevelPoint
        The CCDF in place of ``curve``: rising levels, falling probabilities, two at least.
    spectrum : str, optional
        CSV of the power density, relative to the recipe: frequency from the centre in Hz, and
        density in dB (or dBc/Hz); rows rise in frequency. What lies outside them stays empty.
    bandwidth_hz : Fraction, optional
        A flat spectrum of this full width in place of ``spectrum``, Hz.
    edge_fraction : float
        Of a flat spectrum: width of each edge over the bandwidth, half of it outside; the
        density falls as a raised cosine.
    within : Window, optional
        The part of the time that follows the curve, over its own mean; all of it if not given.

    Notes
    -----
    See :mod:`wavegen.dsp.shaped_envelope`. Between points of the curve the logarithm of the
    probability is taken as linear in dB; beyond the rarest point nothing lies higher; below the
    lowest one :func:`quantiles` completes it.
    """

    curve: str | None = None
    points: tuple[LevelPoint, ...] = ()
    spectrum: str | None = None
    bandwidth_hz: Annotated[Fraction, Gt(0)] | None = None
    edge_fraction: Annotated[float, Ge(0), Le(1)] = EDGE_FRACTION
    within: Window | None = None

    def __post_init__(self) -> None:
        """Refuse two curves or two spectra, and points that are no CCDF."""
        for first, second, keys in (
            (self.curve is not None, bool(self.points), ("curve", "points")),
            (self.spectrum is not None, self.bandwidth_hz is not None, ("spectrum", "bandwidth")),
        ):
            if first == second:
                raise QuantityError(
                    problem=f"{' and '.join(keys)} are given"
                    if first
                    else f"no {keys[0]} is given",
                    allowed=f"{keys[0]} or {keys[1]}",
                    remedy="Remove one of them." if first else f"Give {keys[0]} or {keys[1]}.",
                    key=keys[1] if first else keys[0],
                )
        pairs = [(point.level_db, -point.probability_percent) for point in self.points]
        for number in range(1, len(pairs)):
            if not all(a < b for a, b in zip(pairs[number - 1], pairs[number], strict=True)):
                raise QuantityError(
                    problem="the level does not rise, or the probability does not fall",
                    allowed="levels that rise and probabilities that fall from point to point",
                    remedy="Put the points in order of their levels.",
                    key=f"points[{number}]",
                )
        if len(pairs) == 1:
            raise QuantityError(
                problem="one point is no curve",
                allowed="two points or more",
                remedy="Add levels at 10 %, 1 %, 0.1 % and 0.01 %.",
                key="points",
            )

    def cycle(self, sample_rate_hz: Fraction, path: str) -> Cycle:
        """Return one sample, or the period of what it follows: it is made to fit any loop."""
        return Cycle(n_samples=self.within.period_samples if self.within else 1)

    def build(self, site: Site) -> Signal:
        """Return the signal; unit mean power.

        Raises
        ------
        RecipeError
            A file that cannot be read, a loop that is too long, or a spectrum without power
            within the sample rate.
        """
        found = self._shape(site)
        _note_what_is_left(site, found)
        return Held(
            sample_rate_hz=site.sample_rate_hz,
            n_samples=site.n_samples,
            mean_power=1.0,
            samples=found.samples,
        )

    def law(self, site: Site) -> Law:
        """Return the exact curve of this loop; what it was asked to follow is told by a note."""
        return ListedLaw.of(self._shape(site).samples, name="the shaped loop itself")

    def _shape(self, site: Site) -> Result:
        n = site.n_samples
        if n > LONGEST_SAMPLES:
            raise site.error(
                key="",
                problem=f"a shaped loop of {n} samples is too long to be transformed at once",
                allowed=f"up to {LONGEST_SAMPLES} samples",
                remedy="Shorten the duration.",
            )
        amplitudes = self._amplitudes(site)
        within = self._within(n)
        envelopes, moved_db = quantiles(self._curve(site), int(within.sum()))
        if abs(moved_db) > MOVED_DB:
            _note_moved(site, moved_db)
        return _shaped(
            amplitudes.tobytes(), envelopes.tobytes(), within.tobytes(), site.seed, site.label
        )

    def _within(self, n: int) -> NDArray[np.bool_]:
        if self.within is None:
            return np.ones(n, np.bool_)
        place = np.arange(n) % self.within.period_samples
        first, stop = self.within.first_samples, self.within.stop_samples
        return np.asarray((place >= first) & (place < stop))

    def _curve(self, site: Site) -> Curve:
        if self.curve is None:
            return Curve(
                level_db=np.array([point.level_db for point in self.points]),
                probability=np.array([point.probability_percent / 100 for point in self.points]),
                n_samples=None,
            )
        return _told(site, "curve", lambda: read_curve(site.folder / str(self.curve)))

    def _amplitudes(self, site: Site) -> NDArray[np.float64]:
        rate = float(site.sample_rate_hz)
        place = np.asarray(np.fft.fftfreq(site.n_samples), np.float64) * rate
        if self.bandwidth_hz is not None:
            power = flat_density(place, float(self.bandwidth_hz), self.edge_fraction)
            reach = float(self.bandwidth_hz) * (1 + self.edge_fraction)
            if reach > rate:
                raise site.error(
                    key="bandwidth",
                    problem=f"with its edges it occupies {format_hz(reach)}",
                    allowed=f"up to the sample rate, {format_hz(rate)}",
                    remedy="Lower the bandwidth or the edge.",
                )
        else:
            power = _told(
                site, "spectrum", lambda: read_density(site.folder / str(self.spectrum), place)
            )
        if not power.any():
            raise site.error(
                key="spectrum" if self.spectrum else "bandwidth",
                problem="no bin of the loop lies in it",
                allowed="a spectrum with power within the sample rate",
                remedy="Widen it, or make the loop longer.",
            )
        return np.asarray(np.sqrt(power))


def _told(site: Site, key: str, read: Callable[[], Found]) -> Found:
    """Turn a file's error into one at the recipe's key."""
    try:
        return read()
    except FileError as error:
        raise site.error(
            key=key,
            problem=f"{error.where}: {error.problem}",
            allowed=error.allowed,
            remedy=error.remedy,
        ) from error


@lru_cache(maxsize=2)
def _shaped(amplitudes: bytes, envelopes: bytes, within: bytes, seed: int, label: str) -> Result:
    wanted = np.frombuffer(amplitudes, np.float64)
    words = random_bytes(stream_key(seed, label), 0, 4 * wanted.size).view("<u4")
    return shape_envelope(
        wanted,
        np.frombuffer(envelopes, np.float64),
        phases=words * (2 * np.pi / 2**32),
        within=np.frombuffer(within, np.bool_),
    )


def _note_moved(site: Site, moved_db: float) -> None:
    text = (
        f"The curve is not over its own mean: its levels were moved by {moved_db:+.2f} dB. Give "
        "levels over the mean, and points up to high probabilities."
    )
    if not any(note.text == text for note in site.notes):
        site.notes.append(Note(kind="warning", where=site.path, text=text))


def _note_what_is_left(site: Site, found: Result) -> None:
    is_met = found.level_error_db <= NEAR_DB
    text = (
        f"After {found.n_rounds} rounds every level down to ten samples of the loop lies within "
        f"{found.level_error_db:.3g} dB of the curve (most at {100 * found.worst_probability:.3g} "
        "%), with nothing outside the spectrum."
    )
    if not is_met:
        text += " A signal with this spectrum and this curve was not found"
        if found.beyond_band_db > _NOTHING_DBC:
            text += f": met exactly, the curve would put {found.beyond_band_db:.0f} dBc outside"
        text += "."
    site.notes.append(Note(kind="info" if is_met else "warning", where=site.path, text=text))


def flat_density(
    frequency_hz: NDArray[np.float64], bandwidth_hz: float, edge_fraction: float
) -> NDArray[np.float64]:
    """Return a flat density with raised-cosine edges, 1 in the middle, a half at its width."""
    width = bandwidth_hz * edge_fraction
    beyond = np.abs(frequency_hz) - bandwidth_hz / 2
    if width == 0:
        return np.asarray((beyond <= 0).astype(np.float64))
    place = np.clip(beyond / width + 0.5, 0, 1)
    return np.asarray(0.5 + 0.5 * np.cos(np.pi * place)) * (place < 1)


def read_density(path: Path, frequency_hz: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return a density from a file at the places asked for, its largest value 1.

    Parameters
    ----------
    path : Path
        CSV; its first two columns are frequency in Hz, rising, and density in dB.
    frequency_hz : float64 array
        Where it is wanted, Hz; 0 outside the rows, and 120 dB below the largest row.

    Raises
    ------
    FileError
        No such table, fewer than two rows, or frequencies that do not rise.
    """
    table = open_table(path)
    rows = table.rows(0, table.n_rows)
    if table.n_columns < 2 or rows.shape[0] < 2 or not (np.diff(rows[:, 0]) > 0).all():
        raise FileError(
            where=str(path),
            problem="is no spectrum: two columns with rising frequencies are needed",
            allowed="frequency in Hz and density in dB, two rows or more",
            remedy="Name the columns frequency_hz,density_db.",
        )
    place, level = rows[:, 0], rows[:, 1] - rows[:, 1].max()
    found = np.interp(frequency_hz, place, level, left=-np.inf, right=-np.inf)
    return np.asarray(np.where(found > DEEPEST_DB, 10 ** (found / 10), 0.0))


def quantiles(curve: Curve, n: int) -> tuple[NDArray[np.float64], float]:
    """Return envelope values that follow a CCDF, rising, over the RMS value.

    Parameters
    ----------
    curve : Curve
        Two points or more.
    n : int
        How many values; value ``k`` is exceeded with the probability ``1 - (k + 1/2) / n``.

    Returns
    -------
    envelopes : float64 array, shape (n,)
        Their mean square is 1.
    moved_db : float
        By how much all levels had to move for that, dB: nothing for a curve over its own mean
        that does not begin too late.

    Notes
    -----
    Below the lowest point the power is taken to grow as a power of the share of time, with the
    exponent (1 for every density that is finite at zero) that makes the mean right.
    """
    seen = (curve.probability > 0) & (curve.probability < 1)
    level, share = curve.level_db[seen], curve.probability[seen]
    if not level.size:  # a step: one level for all of the time
        return np.ones(n), 0.0
    beyond = 1 - (np.arange(n) + 0.5) / n
    power = 10 ** (np.interp(-np.log(beyond), -np.log(share), level) / 10)
    is_low = beyond > share[0]
    within = (1 - beyond[is_low]) / (1 - share[0])
    lowest = 10 ** (level[0] / 10)
    missing = n - float(power[~is_low].sum())
    bend = is_low.sum() * lowest / missing - 1 if missing > 0 else _MOST_BEND
    power[is_low] = lowest * within ** min(max(bend, _LEAST_BEND), _MOST_BEND)
    mean = float(power.mean())
    return np.sqrt(power / mean), -10 * float(np.log10(mean))
