"""Strips of a signal to meters and a sink, by any number of workers, in order.

A strip is a worker's unit. Its length is fixed by the recipe, never by the workers, and the
bytes do not depend on it either. The task is a module-level function of (graph, strip), so that
threads, processes or any other ``concurrent.futures.Executor`` can run it.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Callable, Iterator
from concurrent.futures import Executor, Future, ThreadPoolExecutor
from dataclasses import dataclass
from typing import Any, Protocol, Self

import numpy as np

from wavegen.core.evaluate import evaluate, order, plan
from wavegen.core.progress import Progress, silent
from wavegen.core.signal import Range, Samples, Signal

STRIP_SAMPLES = 1 << 19
"""As fast as 2^20, and a stimulus is made in 255 MB instead of 306."""
LONGEST_STRIP_SAMPLES = 1 << 22
SHORTEST_STRIP_SAMPLES = 1 << 16
STRIP_QUANTUM = 1 << 14
IN_FLIGHT_BYTES = 250_000_000
IN_FLIGHT_STRIPS = 4
"""Strips assumed in flight when the length is fixed (two workers and two waiting)."""


class Reading(Protocol):
    """The running state of a meter over one stretch."""

    def feed(self, start: int, samples: Samples) -> None:
        """Take in samples whose first has index ``start``; stretches come in order."""

    def merge(self, following: Self) -> None:
        """Append the reading of the stretch that starts where this one ends."""

    def result(self) -> Any:
        """Return what was measured."""


class Meter(Protocol):
    """Settings of a measurement."""

    def begin(self, signal: Signal) -> Reading:
        """Return an empty reading for a signal."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Tap:
    """A meter on a signal of the graph.

    Parameters
    ----------
    name : str
        Key of the result.
    signal : Signal
        Any signal of the same duration as what is rendered; its axis may differ.
    meter : Meter
        What measures it.
    """

    name: str
    signal: Signal
    meter: Meter


def strip_length(signal: Signal) -> int:
    """Return the strip length for a signal, samples.

    Notes
    -----
    2^19, raised to eight times the summed step of the deepest chain, at most 2^22, and only
    while four strips in flight stay under 250 MB; never under 2^16; whole multiples of 2^14.
    """
    depth: dict[Signal, int] = {}
    for item in order([signal]):
        depth[item] = item.step + max((depth[source] for source in item.inputs), default=0)
    wanted = min(max(STRIP_SAMPLES, 8 * depth[signal]), LONGEST_STRIP_SAMPLES)
    length = -(-wanted // STRIP_QUANTUM) * STRIP_QUANTUM
    while length > SHORTEST_STRIP_SAMPLES:
        held = plan({signal: (0, min(length, signal.n_samples))}).peak_bytes * IN_FLIGHT_STRIPS
        if held <= IN_FLIGHT_BYTES:
            break
        fitting = min(length * IN_FLIGHT_BYTES // held, length - 1)
        length = max(fitting // STRIP_QUANTUM * STRIP_QUANTUM, SHORTEST_STRIP_SAMPLES)
    return length


def _on_axis(signal: Signal, of: Signal, start: int, stop: int) -> Range:
    """Return the range on a tap's own axis that belongs to a strip; strips never overlap."""
    return (
        -(-start * signal.n_samples // of.n_samples),
        -(-stop * signal.n_samples // of.n_samples),
    )


def measure_strip(
    signal: Signal, taps: tuple[Tap, ...], start: int, stop: int, *, keep: bool
) -> tuple[Samples | None, list[Reading]]:
    """Compute one strip and feed its meters: the task that a worker runs.

    Parameters
    ----------
    signal : Signal
        What is rendered.
    taps : tuple of Tap
        Meters and what they measure.
    start, stop : int
        The strip.
    keep : bool
        Whether the samples are wanted back.

    Returns
    -------
    samples : complex64 array, shape (stop - start,), or None
    readings : list of Reading
        One for each tap.
    """
    wanted: dict[Signal, Range] = {signal: (start, stop)}
    for tap in taps:
        wanted[tap.signal] = _on_axis(tap.signal, signal, start, stop)
    got = evaluate(wanted)
    readings = []
    for tap in taps:
        reading = tap.meter.begin(tap.signal)
        low, high = wanted[tap.signal]
        if high > low:
            reading.feed(low, got[tap.signal])
        readings.append(reading)
    return (got[signal] if keep else None), readings


def render(
    signal: Signal,
    *,
    taps: tuple[Tap, ...] = (),
    sink: Callable[[Samples], None] | None = None,
    workers: int = 1,
    executor: Executor | None = None,
    strip_samples: int | None = None,
    progress: Progress = silent,
    task: str = "render",
) -> dict[str, Any]:
    """Compute one period, strip by strip, and return what the meters read.

    Parameters
    ----------
    signal : Signal
        What is rendered.
    taps : tuple of Tap
        Meters, on this signal or on others of its graph.
    sink : callable, optional
        Called with each strip's samples, in order.
    workers : int
        Threads, or tasks kept in flight (plus two) where ``executor`` is given.
    executor : concurrent.futures.Executor, optional
        Who runs the strips; a thread pool of ``workers`` if not given.
    strip_samples : int, optional
        Strip length; :func:`strip_length` if not given. No result depends on it.
    progress : Progress
        Told after every strip.
    task : str
        What the progress is called.

    Returns
    -------
    dict of str to object
        The result of each tap's meter, by tap name.

    Raises
    ------
    WavegenError
        As raised by a signal or a meter. What was still to be done is cancelled.
    """
    length = strip_samples or strip_length(signal)
    totals: list[Reading] = []
    pool = executor or ThreadPoolExecutor(workers, thread_name_prefix="strip")
    waiting: deque[tuple[int, Future[tuple[Samples | None, list[Reading]]]]] = deque()
    starts: Iterator[int] = iter(range(0, signal.n_samples, length))

    def submit() -> None:
        start = next(starts, None)
        if start is not None:
            stop = min(start + length, signal.n_samples)
            future = pool.submit(measure_strip, signal, taps, start, stop, keep=sink is not None)
            waiting.append((stop, future))

    try:
        progress(task, 0, signal.n_samples)
        for _ in range(workers + 2):
            submit()
        while waiting:
            stop, future = waiting.popleft()
            samples, readings = future.result()
            submit()
            if sink is not None and samples is not None:
                sink(samples)
            if totals:
                for total, reading in zip(totals, readings, strict=True):
                    total.merge(reading)
            else:
                totals = readings
            progress(task, stop, signal.n_samples)
    finally:
        for _, future in waiting:
            future.cancel()
        if executor is None:
            pool.shutdown(cancel_futures=True)
    return {tap.name: total.result() for tap, total in zip(taps, totals, strict=True)}


def samples_of(signal: Signal, start: int = 0, stop: int | None = None) -> Samples:
    """Return a range of a signal as an array of its own.

    Parameters
    ----------
    signal : Signal
        Any signal.
    start, stop : int
        Range; the whole period if not given. Indices may pass the seam.

    Returns
    -------
    complex64 array, shape (stop - start,)
    """
    wanted = (start, signal.n_samples if stop is None else stop)
    return np.array(evaluate({signal: wanted})[signal])
