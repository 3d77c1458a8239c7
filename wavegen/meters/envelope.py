"""Power against time, in as many stretches as a picture has columns."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Self

import numpy as np
from annotated_types import Ge, Le
from numpy.typing import NDArray

from wavegen.core.errors import SignalError
from wavegen.core.signal import Samples, Signal

Rows = tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Envelope:
    """Least, mean and largest power of each stretch of a signal.

    Parameters
    ----------
    lowest, mean, highest : float64 array, shape (n_columns,)
        Power, full scale 1.
    duration_s : float
        Of all of it.
    total_mean : float
        Mean power of the whole.
    """

    lowest: NDArray[np.float64]
    mean: NDArray[np.float64]
    highest: NDArray[np.float64]
    duration_s: float
    total_mean: float


class EnvelopeReading:
    """Running figures of one stretch.

    Parameters
    ----------
    signal : Signal
        What is measured.
    n_columns : int
        Stretches that its period is cut into.
    """

    def __init__(self, signal: Signal, n_columns: int) -> None:
        count = min(n_columns, signal.n_samples)
        self._edges = np.arange(count + 1, dtype=np.int64) * signal.n_samples // count
        self._rate_hz = float(signal.sample_rate_hz)
        self._rows: dict[int, Rows] = {}
        self._loose: dict[int, NDArray[np.float64]] = {}
        self._stop: int | None = None

    def feed(self, start: int, samples: Samples) -> None:
        """Take in samples whose first has index ``start``.

        Raises
        ------
        SignalError
            A sample is not finite.
        """
        power = samples.real.astype(np.float64) ** 2 + samples.imag.astype(np.float64) ** 2
        if not np.isfinite(power).all():
            raise SignalError(
                where=f"sample {start + int(np.argmin(np.isfinite(power)))}",
                problem="is not a finite number",
                allowed="finite samples",
                remedy="Cut it out, or find the stage that made it.",
            )
        self._add(start, power)
        self._stop = start + samples.size

    def merge(self, following: Self) -> None:
        """Append the reading of the stretch that starts where this one ends."""
        self._rows.update(following._rows)
        for start, power in following._loose.items():
            self._add(start, power)
        if following._stop is not None:
            self._stop = following._stop

    def _add(self, start: int, power: NDArray[np.float64]) -> None:
        """Join powers to what waits before them; whole stretches become rows."""
        for begin, waiting in self._loose.items():
            if begin + waiting.size == start:
                del self._loose[begin]
                start, power = begin, np.concatenate([waiting, power])
                break
        first = int(np.searchsorted(self._edges, start))
        last = int(np.searchsorted(self._edges, start + power.size, side="right")) - 1
        if first >= last:
            self._keep(start, power)
            return
        low, high = int(self._edges[first]) - start, int(self._edges[last]) - start
        cuts = self._edges[first:last] - start - low
        whole = power[low:high]
        sizes = np.diff(self._edges[first : last + 1])
        self._rows[first] = (
            np.minimum.reduceat(whole, cuts),
            np.add.reduceat(whole, cuts) / sizes,
            np.maximum.reduceat(whole, cuts),
        )
        self._keep(start, power[:low])
        self._keep(start + high, power[high:])

    def _keep(self, start: int, power: NDArray[np.float64]) -> None:
        if power.size:
            self._loose[start] = power.copy()

    def result(self) -> Envelope:
        """Return the figures of the whole signal.

        Raises
        ------
        SignalError
            Not all of it was fed.
        """
        found = sum(rows[0].size for rows in self._rows.values())
        if self._loose or found != self._edges.size - 1:
            raise SignalError(
                where="envelope",
                problem=f"{found} of {self._edges.size - 1} stretches were fed",
                allowed="the whole signal",
                remedy="Feed every sample once.",
            )
        lowest, mean, highest = (
            np.concatenate([self._rows[first][k] for first in sorted(self._rows)]) for k in range(3)
        )
        n_samples = int(self._edges[-1])
        return Envelope(
            lowest=lowest,
            mean=mean,
            highest=highest,
            duration_s=n_samples / self._rate_hz,
            total_mean=float(np.dot(mean, np.diff(self._edges)) / n_samples),
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class EnvelopeMeter:
    """Settings of the meter of power against time.

    Parameters
    ----------
    n_columns : int
        Stretches of equal length; as many as there are samples, if these are fewer.
    """

    n_columns: Annotated[int, Ge(1), Le(100_000)] = 800

    def begin(self, signal: Signal) -> EnvelopeReading:
        """Return an empty reading."""
        return EnvelopeReading(signal, self.n_columns)
