"""After how many samples a loop's data repeat: what is played over again says nothing new."""

from __future__ import annotations

import math
from collections.abc import Iterator
from concurrent.futures import Executor
from dataclasses import dataclass
from typing import Self

import numpy as np
from numpy.typing import NDArray

from wavegen.core.evaluate import evaluate
from wavegen.core.progress import Progress, silent
from wavegen.core.render import Tap, render
from wavegen.core.signal import Range, Samples, Signal

EQUAL_DB = -80.0
"""Largest difference over the mean power at which two samples count as the same."""
_LOOKS = 16
_LOOK_SAMPLES = 512
_GOLDEN = (math.sqrt(5) - 1) / 2
_MOST_SAMPLES = 1 << 42
"""Longer loops are not factorised."""


@dataclass(frozen=True, eq=False, kw_only=True)
class Lagged(Signal):
    """Difference of a loop and itself some samples later.

    Parameters
    ----------
    lag_samples : int
        How much later.
    """

    lag_samples: int

    @classmethod
    def of(cls, source: Signal, lag_samples: int) -> Self:
        """Return the difference over one period of the source."""
        return cls(
            sample_rate_hz=source.sample_rate_hz,
            n_samples=source.n_samples,
            inputs=(source, source),
            mean_power=None,
            lag_samples=lag_samples,
        )

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the range and the one that comes later."""
        return ((start, stop), (start + self.lag_samples, stop + self.lag_samples))

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Subtract."""
        with np.errstate(invalid="ignore"):
            return np.asarray(arrays[0] - arrays[1])


@dataclass(slots=True)
class _Largest:
    """Largest power so far."""

    power: float = 0.0

    def feed(self, start: int, samples: Samples) -> None:
        """Take in samples."""
        self.power = max(self.power, _largest(samples))

    def merge(self, following: _Largest) -> None:
        """Append another stretch."""
        self.power = max(self.power, following.power)

    def result(self) -> float:
        """Return the largest power."""
        return self.power


@dataclass(frozen=True, slots=True)
class _LargestMeter:
    """Settings of the meter of the largest power."""

    def begin(self, signal: Signal) -> _Largest:
        """Return an empty reading."""
        return _Largest()


def data_period(
    signal: Signal,
    *,
    code_step: float = 0.0,
    workers: int = 1,
    executor: Executor | None = None,
    progress: Progress = silent,
) -> int:
    """Return the shortest time after which a loop repeats itself.

    Parameters
    ----------
    signal : Signal
        One turn of the loop.
    code_step : float
        Step of its codes, full scale 1; 0 for floats. Two samples that differ by a step in each
        rail were rounded apart.
    workers, executor, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    int
        Samples; the loop's own length if no part of it repeats, 1 for a carrier at 0 Hz.

    Notes
    -----
    Every period divides the loop, so that only its prime factors are tried; 16 stretches decide
    against nearly every one of them, and what passes is compared throughout.
    """
    period = signal.n_samples
    if period > _MOST_SAMPLES:
        return period
    limit = _limit(signal, code_step)
    for prime in _primes(period):
        while period % prime == 0 and _looks_equal(signal, period // prime, limit):
            shorter = Lagged.of(signal, period // prime)
            tap = Tap(name="largest", signal=shorter, meter=_LargestMeter())
            found = render(
                shorter,
                taps=(tap,),
                workers=workers,
                executor=executor,
                progress=progress,
                task="data period",
            )
            if not found["largest"] <= limit:
                break
            period //= prime
    return period


def _limit(signal: Signal, code_step: float) -> float:
    """Return the power of a difference that rounding explains."""
    powers = [float(np.mean(_powers(part))) for part in _parts(signal, 0)]
    by_codes = 2 * (1.01 * code_step) ** 2
    return max(10 ** (EQUAL_DB / 10) * float(np.mean(powers)), by_codes)


def _parts(signal: Signal, lag: int) -> Iterator[Samples]:
    """Yield stretches spread over a loop, at distances that follow no period."""
    size = min(_LOOK_SAMPLES, signal.n_samples)
    for look in range(_LOOKS):
        start = int(signal.n_samples * ((0.5 + look * _GOLDEN) % 1)) + lag
        yield evaluate({signal: (start, start + size)})[signal]


def _looks_equal(signal: Signal, lag: int, limit: float) -> bool:
    pairs = zip(_parts(signal, 0), _parts(signal, lag), strict=True)
    with np.errstate(invalid="ignore"):  # what is not finite equals nothing
        return all(_largest(mine - its) <= limit for mine, its in pairs)


def _largest(samples: Samples) -> float:
    return float(_powers(samples).max())


def _powers(samples: Samples) -> NDArray[np.float64]:
    return samples.real.astype(np.float64) ** 2 + samples.imag.astype(np.float64) ** 2


def _primes(number: int) -> list[int]:
    """Return the prime factors of a number, each once, rising.

    Examples
    --------
    >>> _primes(5110)
    [2, 5, 7, 73]
    """
    found, rest, trial = [], number, 2
    while trial <= math.isqrt(rest):
        if rest % trial == 0:
            found.append(trial)
            while rest % trial == 0:
                rest //= trial
        trial += 1
    return [*found, rest] if rest > 1 else found
