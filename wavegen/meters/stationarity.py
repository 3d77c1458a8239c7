"""Whether a record is one thing throughout: its level, and breaks of its waveform."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Self

import numpy as np
from numpy.typing import NDArray

from wavegen.core.evaluate import evaluate
from wavegen.core.render import Tap
from wavegen.core.signal import Samples, Signal
from wavegen.dsp.cell_sums import CELL
from wavegen.dsp.differences import DifferenceHeights
from wavegen.meters.fault import Fault
from wavegen.meters.record import RecordFigures

Floats = NDArray[np.float64]
SURE_SIGMA = 6.0
"""Complex Gaussian estimates pass this many standard errors once in exp(36) = 4e15."""
DRIFT_DB = 0.2
"""Over the record; half as much as the tightest tolerance that levels are compared with."""
STEP_DB = 0.5
SPLICE_DB = 15.0
"""How far breaks must stand over the rest of the fourth difference. Measured: jumps between symbols
of a real uplink stand up to 11 dB over theirs, splices of oversampled noise 20 dB."""
MOST_SPLICES = 16
"""More breaks than this are a way of modulating, not a way of editing."""
EDGE_DB = 10.0
"""A break across which the level changes by more is an edge of a burst."""
ALWAYS_ON = 0.9
"""Share of batches that are on from which a record counts as such throughout."""
_N_BATCHES = 64
_FEWEST_BATCHES = 16
_INDEPENDENT = 20
_NEAR = 16


def breaks_tap(signal: Signal, *, loops: bool) -> Tap:
    """Return the tap that looks for breaks of a waveform, named ``breaks``.

    Parameters
    ----------
    signal : Signal
        The record.
    loops : bool
        Whether its last sample is followed by the first.

    Returns
    -------
    Tap
        Its result is the largest power of the fourth difference in each cell of 1024 samples,
        float64 array, shape (n_cells,); None where nothing changes.
    """
    breaks = DifferenceHeights.of(signal, loops=loops)
    return Tap(name="breaks", signal=breaks, meter=_BreakMeter())


def batches_of(figures: RecordFigures) -> NDArray[np.float64]:
    """Return the cells added up to 64 to 127 batches of equal count, shape (n_batches, 4)."""
    cells = figures.cells[figures.cells[:, 0] > 0.5 * figures.cell_samples]
    while cells.shape[0] >= 2 * _N_BATCHES:
        cells = cells[: cells.shape[0] // 2 * 2]
        cells = cells[0::2] + cells[1::2]
    return cells


def _on_batches(figures: RecordFigures) -> tuple[Floats, NDArray[np.bool_]]:
    """Return the mean power of each batch, and which stand no more than 6 dB below the highest."""
    batches = batches_of(figures)
    power = batches[:, 3] / batches[:, 0]
    top = float(np.quantile(power, 0.9)) if power.size else 0.0
    return power, power > top / 4


def on_share(figures: RecordFigures, bandwidth: float) -> float:
    """Return the share of batches that are on.

    Parameters
    ----------
    figures : RecordFigures
        The record.
    bandwidth : float
        Of a flat band of the same spread, cycles per sample.

    Returns
    -------
    float
        1 of what is too short or too narrow to tell: the level of noise in a batch of fewer than
        20 independent samples is uncertain by more than 1 dB.
    """
    power, is_on = _on_batches(figures)
    if power.size < _FEWEST_BATCHES or not is_on.any():
        return 1.0
    independent = bandwidth * figures.n_samples / power.size
    return float(is_on.mean()) if independent >= _INDEPENDENT else 1.0


def level_faults(figures: RecordFigures) -> list[Fault]:
    """Find a level that steps once or drifts, over the batches that are on."""
    power, is_on = _on_batches(figures)
    if power.size < _FEWEST_BATCHES or is_on.mean() < ALWAYS_ON:
        return []  # bursts: their levels are told one by one
    level = 10 * np.log10(power[is_on])
    place = np.flatnonzero(is_on).astype(np.float64)
    per_batch = figures.n_samples / power.size
    step = _step(level)
    drift = _drift(place, level)
    if step is not None and (drift is None or step[2] >= drift[1]):
        at, size_db, _ = step
        sample = round(float(place[at]) * per_batch)
        return [
            Fault(
                kind="level_step",
                text="the level steps",
                size=size_db,
                unit="dB",
                where=f"near sample {sample}",
                effect="two levels in one curve: it is wider than that of either part",
                remedy="Measure both parts with --from and --to.",
                first_sample=sample,
            )
        ]
    if drift is None:
        return []
    return [
        Fault(
            kind="level_drift",
            text="the level drifts",
            size=drift[0],
            unit="dB over the record",
            where="throughout",
            effect="the record is not stationary: mean and levels depend on the part measured",
            remedy="Let the source settle, or measure a shorter part with --from and --to.",
        )
    ]


def _drift(place: NDArray[np.float64], level: NDArray[np.float64]) -> tuple[float, float] | None:
    """Return the slope over the whole, dB, and its significance, if it is sure."""
    centred = place - place.mean()
    slope = float(centred @ level / (centred @ centred))
    rest = level - level.mean() - slope * centred
    spread = float(rest @ rest) / max(rest.size - 2, 1)
    # Neighbouring batches that move together count less: first-order correlation.
    linked = float(rest[1:] @ rest[:-1] / (rest @ rest)) if spread > 0 else 0.0
    linked = min(max(linked, 0.0), 0.9)
    error = math.sqrt(spread / float(centred @ centred) * (1 + linked) / (1 - linked))
    size_db = slope * float(np.ptp(place) + 1)
    sure = abs(slope) / max(error, 1e-300)
    return (size_db, sure) if abs(size_db) >= DRIFT_DB and sure > SURE_SIGMA else None


def _step(level: NDArray[np.float64]) -> tuple[int, float, float] | None:
    """Return where the level steps best, by how much (dB), and its significance."""
    n = level.size
    count = np.arange(4, n - 3)
    sums = np.concatenate([[0.0], np.cumsum(level)])
    squares = np.concatenate([[0.0], np.cumsum((level - level.mean()) ** 2)])
    low = sums[count] / count
    high = (sums[-1] - sums[count]) / (n - count)
    gain = count * (n - count) / n * (high - low) ** 2
    best = int(np.argmax(gain))
    at, size_db = int(count[best]), float(high[best] - low[best])
    left = max(float(squares[-1] - gain[best]), 1e-12) / max(n - 2, 1)
    # Slow movements pass for steps: ask how batches just before and after differ, too.
    near = float(level[at : at + 4].mean() - level[at - 4 : at].mean())
    sure = math.sqrt(float(gain[best]) / left)
    is_sharp = near * size_db > 0 and abs(near) > 0.7 * abs(size_db)
    is_one = abs(size_db) >= STEP_DB and sure > 2 * SURE_SIGMA and is_sharp
    return (at, size_db, sure) if is_one else None


def splices(
    signal: Signal,
    breaks: Signal,
    maxima: NDArray[np.float64],
    figures: RecordFigures,
) -> list[Fault]:
    """Find breaks of the waveform: few cells of the fourth difference far over the rest."""
    order = np.argsort(-maxima, kind="stable")[: MOST_SPLICES * 2 + 2]
    ranked = maxima[order]
    if maxima.size < 4 * MOST_SPLICES:
        return []
    ratio = ranked[:-1] / np.maximum(ranked[1:], 1e-300)
    n_high = int(np.argmax(ratio[: 2 * MOST_SPLICES])) + 1
    if ratio[n_high - 1] < 10 ** (SPLICE_DB / 10):
        return []
    places: list[int] = []
    for cell in np.sort(order[:n_high]).tolist():
        start = cell * CELL
        stop = min(start + CELL, signal.n_samples)
        power = np.abs(evaluate({breaks: (start, stop)})[breaks]) ** 2
        place = start + int(np.argmax(power))
        if place < 2 * figures.head.size and place - 2 < figures.head.size:
            continue  # what happens there is told as start-up
        if not places or place - places[-1] > _NEAR:
            places.append(place)
    places = [place for place in places if not _is_edge(signal, place)]
    if not 1 <= len(places) <= MOST_SPLICES or _is_clocked(places):
        return []
    height_db = _db(float(ranked[n_high - 1] / ranked[n_high]))
    listed = ", ".join(str(place) for place in places[:5]) + (" ..." if len(places) > 5 else "")
    return [
        Fault(
            kind="splice",
            text="the waveform breaks, as where records are joined",
            size=len(places),
            unit="breaks" if len(places) > 1 else "break",
            where=f"sample{'s' if len(places) > 1 else ''} {listed}",
            effect=f"stand {height_db:.0f} dB over the rest of the fourth difference: spectrum, "
            "ACLR and peak between samples are not to be judged across them",
            remedy="Measure the parts with --from and --to; of power statistics only the mean "
            "level of the parts matters.",
            first_sample=places[0],
        )
    ]


def _is_edge(signal: Signal, place: int) -> bool:
    """Return whether a burst begins or ends here: silence, or another level, on one side."""
    low, high = max(place - 40, 0), min(place + 40, signal.n_samples)
    samples = evaluate({signal: (low, high)})[signal].astype(np.complex128)
    power = np.abs(samples) ** 2
    before, after = power[: place - low - 3], power[place - low + 4 :]
    if before.size < 8 or after.size < 8:
        return True  # too near to an end to tell
    ratio = (float(before.mean()) + 1e-300) / (float(after.mean()) + 1e-300)
    return not 10 ** (-EDGE_DB / 10) < ratio < 10 ** (EDGE_DB / 10)


def _is_clocked(places: list[int]) -> bool:
    """Return whether three or more breaks come at equal distances: symbols, not splices."""
    gaps = np.diff(places)
    return gaps.size >= 2 and float(np.ptp(gaps)) < 0.15 * float(gaps.mean())


def _db(ratio: float) -> float:
    return 10.0 * math.log10(ratio) if ratio > 0 else -math.inf


@dataclass(frozen=True, slots=True, kw_only=True)
class _BreakMeter:
    """Settings of the meter of breaks."""

    def begin(self, signal: Signal) -> _Breaks:
        """Return an empty reading."""
        return _Breaks()


class _Breaks:
    """Heights of the fourth difference, cell by cell."""

    def __init__(self) -> None:
        self._parts: list[NDArray[np.float32]] = []

    def feed(self, start: int, samples: Samples) -> None:
        """Take in the heights of cells whose first has index ``start``."""
        self._parts.append(samples.real.copy())

    def merge(self, following: Self) -> None:
        """Append the reading of the stretch that starts where this one ends."""
        self._parts.extend(following._parts)

    def result(self) -> NDArray[np.float64] | None:
        """Return the heights; None where nothing changes."""
        heights = np.concatenate(self._parts).astype(np.float64)
        return heights if heights.max() > 0 else None
