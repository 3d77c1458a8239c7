"""The on-time of a signal, measured apart: where it is, and each burst by itself."""

from __future__ import annotations

from collections.abc import Mapping
from concurrent.futures import Executor
from dataclasses import dataclass
from typing import Any

from wavegen.core.errors import ArgumentsError
from wavegen.core.progress import Progress, silent
from wavegen.core.render import Tap, render
from wavegen.core.signal import Signal
from wavegen.dsp.bursts import Bursts
from wavegen.meters.batches import BatchedPowerMeter, BatchedStatistics
from wavegen.meters.burst_powers import BurstPowerMeter, BurstPowers, Levelled
from wavegen.meters.burst_search import (
    BurstSearch,
    FoundBursts,
    find_bursts,
    marked_bursts,
    pattern_bursts,
)
from wavegen.production.measure_settings import GateSettings, rounded_samples, whole_samples
from wavegen.production.subject import Subject


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class GatedFigures:
    """What was measured of the on-time.

    Parameters
    ----------
    found : FoundBursts
        When it is on, and how that is known; without bursts there is nothing else.
    on : BatchedStatistics or None
        Of all bursts together.
    powers : BurstPowers or None
        Of each.
    levelled : BatchedStatistics or None
        Of all bursts, each over its own mean.
    """

    found: FoundBursts
    on: BatchedStatistics | None = None
    powers: BurstPowers | None = None
    levelled: BatchedStatistics | None = None


def find_gate(
    subject: Subject,
    signal: Signal,
    gate: GateSettings | None,
    *,
    workers: int = 1,
    executor: Executor | None = None,
    progress: Progress = silent,
) -> FoundBursts | None:
    """Return when a subject is on: as asked, else as its recipe says.

    Parameters
    ----------
    subject : Subject
        What is known of it.
    signal : Signal
        Its samples.
    gate : GateSettings or None
        What is asked.
    workers, executor, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    FoundBursts or None
        None where neither says anything.

    Raises
    ------
    ArgumentsError
        A setting that means nothing at this rate.
    SignalError
        No marker, or a pattern that is never on.
    """
    n = signal.n_samples
    if gate is None:
        if subject.bursts is None:
            return None
        return pattern_bursts(subject.bursts, n_samples=n)
    rate_hz = signal.sample_rate_hz
    guard = rounded_samples(gate.guard, rate_hz, "--guard")
    if gate.by == "markers":
        return marked_bursts(
            subject.annotations, n_samples=n, guard_samples=guard or 0, label=gate.label
        )
    if gate.by == "pattern":
        return pattern_bursts(_pattern(gate, signal, guard or 0), n_samples=n)
    search = BurstSearch(
        window_samples=rounded_samples(gate.window, rate_hz, "--gate-window", least=1),
        threshold_db=gate.threshold_db,
        hysteresis_db=gate.hysteresis_db,
        dead_time_samples=rounded_samples(gate.dead_time, rate_hz, "--dead-time"),
        shortest_samples=rounded_samples(gate.shortest, rate_hz, "--shortest-burst"),
        guard_samples=guard,
        edges=gate.edges,
    )
    return find_bursts(
        signal,
        search,
        loops=subject.loops,
        where=subject.name,
        workers=workers,
        executor=executor,
        progress=progress,
    )


def _pattern(gate: GateSettings, signal: Signal, guard: int) -> Bursts:
    if gate.slot is None or set(gate.pattern) != {"0", "1"}:
        raise ArgumentsError(
            where="--gate",
            problem=f"{gate.pattern[:40]!r} with a slot of {gate.slot or 'no length'}",
            allowed="1 for on and 0 for off, both at least once, and --slot",
            remedy="Write it like --gate 11000000 --slot 0.5ms.",
        )
    rate_hz = signal.sample_rate_hz
    slot = whole_samples(gate.slot, rate_hz, "--slot", least=1)
    delay = whole_samples(gate.delay, rate_hz, "--gate-delay")
    bursts = Bursts.of_slots(tuple(mark == "1" for mark in gate.pattern), slot, guard)
    if 2 * guard >= bursts.shortest_samples:
        raise ArgumentsError(
            where="--guard",
            problem=f"{guard} samples at both ends of {bursts.shortest_samples}",
            allowed="less than half of the shortest on-time",
            remedy="Shorten the guard.",
        )
    # A pattern goes on before its first slot as well: a delay only moves it.
    start = delay % bursts.period_samples
    moved = sorted(((a + start) % bursts.period_samples, b - a) for a, b in bursts.runs)
    return Bursts(
        period_samples=bursts.period_samples,
        runs=tuple((a, a + length) for a, length in moved),
        ramp_samples=guard,
    )


def gate_taps(
    found: FoundBursts | None, signal: Signal, *, loops: bool, where: str
) -> tuple[Tap, ...]:
    """Return the taps that measure the on-time; none where there is none."""
    if found is None or found.bursts is None:
        return ()
    on = BatchedPowerMeter(where=where, loops=loops, bursts=found.bursts)
    each = BurstPowerMeter(bursts=found.bursts, where=where)
    return (
        Tap(name="on", signal=signal, meter=on),
        Tap(name="each", signal=signal, meter=each),
    )


def gated_figures(
    found: FoundBursts | None,
    read: Mapping[str, Any],
    signal: Signal,
    *,
    each: bool,
    loops: bool,
    where: str,
    workers: int = 1,
    executor: Executor | None = None,
    progress: Progress = silent,
) -> GatedFigures | None:
    """Return what the taps read; where bursts are wanted one by one, after one pass more.

    Parameters
    ----------
    found : FoundBursts or None
        From :func:`find_gate`.
    read : mapping
        Results of the taps.
    signal : Signal
        What was measured.
    each : bool
        Whether bursts are wanted over their own means.
    loops : bool
        Whether the signal repeats.
    where : str
        What it is called in messages.
    workers, executor, progress
        As in :func:`wavegen.core.render.render`.
    """
    if found is None:
        return None
    if found.bursts is None:
        return GatedFigures(found=found)
    levelled = None
    powers: BurstPowers = read["each"]
    if each:
        even = Levelled.of(signal, found.bursts, powers)
        meter = BatchedPowerMeter(where=where, loops=loops, bursts=found.bursts)
        levelled = render(
            even,
            taps=(Tap(name="levelled", signal=even, meter=meter),),
            workers=workers,
            executor=executor,
            progress=progress,
            task="bursts one by one",
        )["levelled"]
    return GatedFigures(found=found, on=read["on"], powers=powers, levelled=levelled)


def within_period(found: FoundBursts, period_samples: int) -> Bursts | None:
    """Return the bursts of one data period of a loop; None unless all periods have the same."""
    bursts = found.bursts
    if bursts is None or period_samples == found.n_samples:
        return bursts
    over = bursts.over(found.n_samples)
    runs = sorted({(a % period_samples, b - a) for a, b in over.runs})
    n_periods = found.n_samples // period_samples
    if not runs or len(runs) * n_periods != len(over.runs):
        return None
    return Bursts(
        period_samples=period_samples,
        runs=tuple((a, a + length) for a, length in runs),
        ramp_samples=bursts.ramp_samples,
    )
