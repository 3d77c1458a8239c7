"""A record's faults, found and said; nothing is removed or repaired here.

Each threshold is where a figure begins to suffer, and each finding must stand out of what chance
does. *Small* is -40 dB: an error of that size is 1 % EVM and moves no level by 0.02 dB.
"""

from __future__ import annotations

import math
from concurrent.futures import Executor
from dataclasses import dataclass
from typing import Any, Self

import numpy as np
from numpy.typing import NDArray

from wavegen.core.evaluate import evaluate
from wavegen.core.progress import Progress, silent
from wavegen.core.render import Tap, render
from wavegen.core.signal import Samples, Signal
from wavegen.dsp.cell_sums import CELL
from wavegen.dsp.differences import FourthDifference
from wavegen.meters.power import PowerReading
from wavegen.meters.power_statistics import PowerStatistics
from wavegen.meters.record import RecordFigures, RecordMeter
from wavegen.meters.stretches import Stretches, look_at_stretches

SMALL_DB = -40.0
"""Offset over the signal, image over the signal: 1 % EVM each."""
CARRIER_DB = 50.0
"""An offset so far over the rest is an unmodulated carrier at 0 Hz."""
SURE_SIGMA = 6.0
"""Complex Gaussian estimates pass this many standard errors once in exp(36) = 4e15."""
START_UP_RATIO = 2.0
"""First samples further out than any later one by 3 dB: of honest samples the first 64 hold the
largest in 64 of n records, by 3 dB in one of millions."""
FILL_RATIO = 100.0
"""20 dB further out is no settling but a word of another meaning."""
PILE_UP = 10
"""Samples at an extreme code from which they count as a pile."""
PILE_UP_RATIO = 5.0
"""Over what a smooth curve would put there, given the codes within 2 % of the range. A sine, the
steepest smooth case, has 1."""
CORNER_RATIO = 1.03
"""Largest power over the largest rail squared: where one rail is clipped the other is free, so
that it passes 1; where the envelope is constant or clipped it stays 1."""
QUANTISATION_DB = -30.0
"""Step^2 / 12 a rail over the signal's power: 3 % EVM, levels in steps of 0.6 dB at most."""
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
_N_BATCHES = 64
_RUN = 16


@dataclass(frozen=True, slots=True, kw_only=True)
class Fault:
    """One thing that is wrong with a record.

    Parameters
    ----------
    kind : str
        Name for programs: ``dc_offset``, ``iq_imbalance``, ``clipped``, ``fill``, ``start_up``,
        ``not_finite``, ``ends_early``, ``coarse_quantisation``, ``splice``, ``level_step``,
        ``level_drift``, ``constant_start``.
    text : str
        Name for people.
    size : float
        How large.
    unit : str
        Of ``size``.
    where : str
        In which samples.
    effect : str
        What it does to the figures.
    remedy : str
        What to do about it.
    first_sample, stop_sample : int or None
        The same place in numbers, where it is one.
    """

    kind: str
    text: str
    size: float
    unit: str
    where: str
    effect: str
    remedy: str
    first_sample: int | None = None
    stop_sample: int | None = None

    def row(self) -> dict[str, Any]:
        """Return it as JSON values."""
        return {
            "kind": self.kind,
            "fault": self.text,
            "size": round(self.size, 4),
            "unit": self.unit,
            "where": self.where,
            "first_sample": self.first_sample,
            "stop_sample": self.stop_sample,
            "effect": self.effect,
            "remedy": self.remedy,
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class RecordCheck:
    """The faults of a record, and what they were judged by.

    Parameters
    ----------
    faults : tuple of Fault
        What was found; empty for a clean record.
    offset : complex
        Mean of the samples, start-up left out: what ``--remove-dc`` subtracts.
    offset_dbc : float
        Its power over that of the rest, dB.
    gain_imbalance_db, phase_imbalance_deg : float or None
        I over Q, and how far their axes are from square; None where the signal itself is
        one-sided or has too few lines to tell.
    quantisation_db : float or None
        Noise of the steps over the signal, dB, where codes are known.
    n_codes : int or None
        Distinct codes of the rails, where codes are known.
    """

    faults: tuple[Fault, ...]
    offset: complex
    offset_dbc: float
    gain_imbalance_db: float | None
    phase_imbalance_deg: float | None
    quantisation_db: float | None
    n_codes: int | None


def check_record(
    signal: Signal,
    *,
    loops: bool = False,
    code_scale: float | None = None,
    n_rails: int = 2,
    workers: int = 1,
    executor: Executor | None = None,
    progress: Progress = silent,
) -> RecordCheck:
    """Look for faults, in one pass over a record and a look at up to 2048 stretches of it.

    Parameters
    ----------
    signal : Signal
        The samples, full scale 1.0.
    loops : bool
        Whether the last sample is followed by the first.
    code_scale : float or None
        Codes to full scale, for files of integers (32768 for 16 bits).
    n_rails : int
        1 for a file of real samples.
    workers, executor, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    RecordCheck

    Raises
    ------
    FileError
        The file cannot be read to its end.
    """
    seen = look_at_stretches(signal)
    record = RecordMeter(offset=seen.offset, code_scale=code_scale, n_rails=n_rails)
    taps = [Tap(name="record", signal=signal, meter=record)]
    breaks = FourthDifference.of(signal, loops=loops)
    taps.append(Tap(name="breaks", signal=breaks, meter=_BreakMeter()))
    read = render(
        signal,
        taps=tuple(taps),
        workers=workers,
        executor=executor,
        progress=progress,
        task="faults",
    )
    figures: RecordFigures = read["record"]
    faults: list[Fault] = [
        *_not_finite(figures),
        *_start(figures),
        *_tail(figures),
        *_clipping(figures),
    ]
    offset, offset_dbc, dc = _dc(figures, seen)
    imbalance, unequal = _imbalance(seen, n_rails)
    noise_db, n_codes, coarse = _quantisation(figures)
    faults += [*dc, *unequal, *coarse, *_level(figures)]
    if read["breaks"] is not None:
        faults += _splices(signal, breaks, read["breaks"], figures)
    return RecordCheck(
        faults=tuple(faults),
        offset=offset,
        offset_dbc=offset_dbc,
        gain_imbalance_db=imbalance[0] if imbalance else None,
        phase_imbalance_deg=imbalance[1] if imbalance else None,
        quantisation_db=noise_db,
        n_codes=n_codes,
    )


def _db(ratio: float) -> float:
    return 10.0 * math.log10(ratio) if ratio > 0 else -math.inf


def _not_finite(figures: RecordFigures) -> list[Fault]:
    if not figures.n_bad:
        return []
    return [
        Fault(
            kind="not_finite",
            text="samples that are not finite",
            size=figures.n_bad,
            unit="samples",
            where=f"the first is sample {figures.first_bad}",
            effect="no mean, peak or curve exists with them",
            remedy="Cut them out with --from and --to, or convert the file again.",
            first_sample=figures.first_bad,
        )
    ]


def _start(figures: RecordFigures) -> list[Fault]:
    """Fill words and start-up: the first samples lie out of the range of all later ones."""
    found = []
    head = figures.head.astype(np.complex128)
    if figures.n_samples <= 4 * head.size:
        return _fill_inside(figures)
    distance = np.abs(head - figures.offset) ** 2
    limit = max(figures.furthest, 1e-30) * START_UP_RATIO
    is_out = distance > limit
    last = int(np.flatnonzero(is_out)[-1]) + 1 if is_out.any() else 0
    if last and is_out[:last].mean() < 0.75:  # strays among honest samples start nothing
        last = 0
    is_fill = (distance > limit * FILL_RATIO / START_UP_RATIO) | (head == -1 - 1j)
    n_fill = int(np.argmin(np.append(is_fill[:last], False)))
    if n_fill:
        without = (figures.total_power - float(np.sum(np.abs(head[:n_fill]) ** 2))) / (
            figures.n_samples - n_fill
        )
        lift_db = _db(figures.total_power / figures.n_samples / without)
        found.append(
            Fault(
                kind="fill",
                text="fill or sync words at the start",
                size=lift_db,
                unit="dB",
                where=_stretch(0, n_fill),
                effect=f"lifts the mean by {lift_db:.1f} dB, all levels read as much too low",
                remedy=f"Measure with --from {last}samples.",
                first_sample=0,
                stop_sample=n_fill,
            )
        )
    if last > n_fill:
        ratio_db = _db(float(distance[n_fill:last].max()) / figures.furthest)
        found.append(
            Fault(
                kind="start_up",
                text="start-up",
                size=last - n_fill,
                unit="samples",
                where=_stretch(n_fill, last),
                effect=f"lies {ratio_db:.1f} dB further out than any later sample: sets the peak "
                "of what is left when an offset is removed",
                remedy=f"Measure with --from {last}samples.",
                first_sample=n_fill,
                stop_sample=last,
            )
        )
    run = figures.first_run
    if run >= _RUN and run > 2 * max(figures.longest_run, figures.last_run):
        found.append(_constant("constant_start", "the same sample again and again", 0, run))
    return found + ([] if n_fill else _fill_inside(figures))


def _fill_inside(figures: RecordFigures) -> list[Fault]:
    """Both rails at the lowest code: missing data are often filled so."""
    if not figures.n_fill or figures.n_fill / figures.n_samples > 0.5:
        return []
    share = 2.0 * figures.n_fill / max(figures.total_power, 1e-300)
    if share < 10 ** (SMALL_DB / 10) and figures.n_fill < PILE_UP:
        return []
    return [
        Fault(
            kind="fill",
            text="samples with both rails at the lowest code",
            size=figures.n_fill,
            unit="samples",
            where=f"the first is sample {figures.first_fill}",
            effect=f"hold {100 * share:.3g} % of the power if they are fill words",
            remedy="Cut the record there with --from and --to.",
            first_sample=figures.first_fill,
        )
    ]


def _constant(kind: str, text: str, start: int, stop: int) -> Fault:
    return Fault(
        kind=kind,
        text=text,
        size=stop - start,
        unit="samples",
        where=_stretch(start, stop),
        effect="counts as signal: moves the mean and stands as a step in the curve",
        remedy=f"Measure with --from {stop}samples."
        if start == 0
        else f"Measure with --to {start}samples.",
        first_sample=start,
        stop_sample=stop,
    )


def _tail(figures: RecordFigures) -> list[Fault]:
    run, n = figures.last_run, figures.n_samples
    if run < _RUN or run <= 2 * max(figures.longest_run, figures.first_run) or run == n:
        return []
    return [_constant("ends_early", "the record ends before the file does", n - run, n)]


def _clipping(figures: RecordFigures) -> list[Fault]:
    """Find samples that pile up at an extreme code of a rail."""
    found = []
    for name, (values, counts) in zip("IQ", figures.rails, strict=False):
        for sign, side in ((1.0, "highest"), (-1.0, "lowest")):
            order = slice(None, None, -1) if sign > 0 else slice(None)
            pile = _pile_up(values[order], counts[order], figures)
            if pile is None:
                continue
            code, count = pile
            share = count / figures.n_samples
            at = code / (figures.code_scale or 1.0)
            is_full = figures.code_scale is not None and abs(at) >= 1 - 1.5 / figures.code_scale
            found.append(
                Fault(
                    kind="clipped",
                    text="samples at full scale" if is_full else "samples pile up at one code",
                    size=count,
                    unit="samples",
                    where=f"{name}, {side} code ({code:g})",
                    effect=f"{100 * share:.3g} % of the time the rail wanted to go further: the "
                    "true peak is higher, the curve's lower end of probability is cut",
                    remedy="Record again with less gain.",
                )
            )
    return found


def _pile_up(
    values: NDArray[np.float64], counts: NDArray[np.int64], figures: RecordFigures
) -> tuple[float, int] | None:
    """Return the extreme code and its count, if more lie there than a smooth curve holds.

    Parameters
    ----------
    values, counts : arrays, shape (n,)
        Codes from the extreme one inwards.
    figures : RecordFigures
        Of the record.
    """
    if values.size < 4:
        return None
    scale = figures.code_scale
    extreme, count = float(values[0]), int(counts[0])
    top = abs(extreme) / (scale or 1.0)
    is_full = scale is not None and top >= 1 - 1.5 / scale
    is_fill = scale is not None and figures.n_fill and top >= 1
    count -= figures.n_fill if is_fill else 0
    if count < (2 if is_full else PILE_UP):
        return None
    if figures.peak < CORNER_RATIO * top**2 and len(figures.rails) > 1:
        return None
    reach = 0.02 * abs(float(values[0] - values[-1]))
    step = 1.0 if scale else abs(extreme) / 512
    near = np.abs(values - extreme) <= max(reach, 4 * step)
    near[0] = False
    beside = int(counts[near].sum())
    if not beside:
        return None
    n_steps = max(reach / step, 4.0)
    smooth = max(beside / (math.sqrt(n_steps + 1) - 1), 0.25)
    return (extreme, count) if count >= PILE_UP_RATIO * smooth else None


def _batches(figures: RecordFigures) -> NDArray[np.float64]:
    """Return the cells added up to 64 to 127 batches of equal count, shape (n_batches, 6)."""
    cells = figures.cells[figures.cells[:, 0] > 0.5 * figures.cell_samples]
    while cells.shape[0] >= 2 * _N_BATCHES:
        cells = cells[: cells.shape[0] // 2 * 2]
        cells = cells[0::2] + cells[1::2]
    return cells


def _dc(figures: RecordFigures, seen: Stretches) -> tuple[complex, float, list[Fault]]:
    """Return the offset, its power over the signal's, dB, and the fault if it is one."""
    total = figures.cells.sum(axis=0)
    n = float(total[0])
    if not n:
        return seen.offset, -math.inf, []
    shift = complex(total[1], total[2]) / n
    offset = seen.offset + shift
    signal_power = float(total[3] + total[4]) / n - abs(shift) ** 2
    power = abs(offset) ** 2
    if not signal_power > 0:
        return offset, (math.inf if power else -math.inf), []
    size_db = _db(power / signal_power)
    batches = _batches(figures)
    means = (batches[:, 1] + 1j * batches[:, 2]) / batches[:, :1].ravel()
    if means.size < 4:
        return offset, size_db, []
    error = float(np.mean(np.abs(means - means.mean()) ** 2)) / (means.size - 1)
    is_sure = power > SURE_SIGMA**2 * error
    is_line_of_many = seen.strongest_line > power / 4
    if not (SMALL_DB <= size_db < CARRIER_DB and is_sure) or is_line_of_many:
        return offset, size_db, []
    what = (
        "hides the envelope: levels read nearly constant"
        if size_db > 0
        else f"adds {100 * power / signal_power:.2g} % to the mean power and to EVM"
    )
    fault = Fault(
        kind="dc_offset",
        text="DC offset (or a carrier at 0 Hz)",
        size=size_db,
        unit="dB over the signal",
        where="throughout",
        effect=f"I {offset.real:+.3g}, Q {offset.imag:+.3g} of full scale; {what}",
        remedy="If no carrier is meant, measure with --remove-dc.",
    )
    return offset, size_db, [fault]


def _imbalance(seen: Stretches, n_rails: int) -> tuple[tuple[float, float] | None, list[Fault]]:
    """Return gain (dB) and phase (deg) imbalance, and the fault if it is one."""
    ratio = seen.pseudo_ratio
    if n_rails < 2 or not math.isfinite(seen.pseudo_sigma):
        return None, []
    gain_db = _db((1 + ratio.real) / (1 - ratio.real))
    phase_deg = math.degrees(
        math.asin(max(-1.0, min(1.0, ratio.imag / math.sqrt(1 - ratio.real**2))))
    )
    image_db = _db(abs(ratio) ** 2 / 4)
    if image_db < SMALL_DB or abs(ratio) < SURE_SIGMA * seen.pseudo_sigma:
        return (gain_db, phase_deg), []
    fault = Fault(
        kind="iq_imbalance",
        text="I/Q gain and phase imbalance",
        size=image_db,
        unit="dB image over signal",
        where="throughout",
        effect=f"gain I over Q {gain_db:+.2f} dB, phase {phase_deg:+.2f} deg: EVM of "
        f"{50 * abs(ratio):.2g} %, and mirrored spectrum",
        remedy="Correct the receiver, or correct the record with these two figures.",
    )
    return (gain_db, phase_deg), [fault]


def _quantisation(
    figures: RecordFigures,
) -> tuple[float | None, int | None, list[Fault]]:
    """Return noise of the steps over the signal, dB, distinct codes, and the fault if any."""
    if figures.code_scale is None:
        return None, None, []
    codes = np.unique(np.concatenate([values for values, _ in figures.rails]))
    total = figures.cells.sum(axis=0)
    power = float(total[3] + total[4] - (total[1] ** 2 + total[2] ** 2) / total[0]) / total[0]
    if not power > 0:
        return None, int(codes.size), []
    step = math.gcd(*(int(code) for code in np.diff(codes))) if codes.size > 1 else 1
    step &= -step  # words at the left of their container leave the lowest bits alone
    step = 1 if step > 256 else step
    noise_db = _db((step / figures.code_scale) ** 2 / 6 / power)
    if noise_db < QUANTISATION_DB:
        return noise_db, int(codes.size), []
    rms = math.sqrt(power / 2) * figures.code_scale / step
    fault = Fault(
        kind="coarse_quantisation",
        text="coarse quantisation",
        size=noise_db,
        unit="dB noise over signal",
        where="throughout",
        effect=f"{codes.size} distinct codes, RMS {rms:.1f} steps a rail: low levels come in "
        "steps, and the noise counts as signal",
        remedy="Record with more gain or more bits.",
    )
    return noise_db, int(codes.size), [fault]


def _level(figures: RecordFigures) -> list[Fault]:
    """Find a level that steps once or drifts, over the batches that are on."""
    batches = _batches(figures)
    if batches.shape[0] < 16:
        return []
    power = (batches[:, 3] + batches[:, 4]) / batches[:, 0]
    top = float(np.quantile(power, 0.9))
    is_on = power > top / 4
    if is_on.mean() < 0.9:  # bursts: their levels are told one by one
        return []
    level = 10 * np.log10(power[is_on])
    place = np.flatnonzero(is_on).astype(np.float64)
    per_batch = figures.n_samples / batches.shape[0]
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


def _splices(
    signal: Signal,
    breaks: FourthDifference,
    statistics: PowerStatistics,
    figures: RecordFigures,
) -> list[Fault]:
    """Find breaks of the waveform: few cells of the fourth difference far over the rest."""
    maxima = statistics.cell_maxima
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
        start = max((statistics.start // CELL + cell) * CELL, statistics.start)
        stop = min(start + CELL, signal.n_samples)
        power = np.abs(evaluate({breaks: (start, stop)})[breaks]) ** 2
        place = start + int(np.argmax(power))
        if place < 2 * figures.head.size and place - 2 < figures.head.size:
            continue  # what happens there is told as start-up
        if not places or place - places[-1] > _RUN:
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


def _stretch(start: int, stop: int) -> str:
    return f"sample {start}" if stop == start + 1 else f"samples {start} to {stop - 1}"


@dataclass(frozen=True, slots=True, kw_only=True)
class _BreakMeter:
    """Settings of the meter of breaks."""

    def begin(self, signal: Signal) -> _Breaks:
        """Return an empty reading."""
        return _Breaks()


class _Breaks:
    """A power reading whose result is None where there is no power."""

    def __init__(self) -> None:
        self._power = PowerReading("fourth difference")

    def feed(self, start: int, samples: Samples) -> None:
        """Take in samples whose first has index ``start``."""
        self._power.feed(start, samples)

    def merge(self, following: Self) -> None:
        """Append the reading of the stretch that starts where this one ends."""
        self._power.merge(following._power)

    def result(self) -> PowerStatistics | None:
        """Return the statistics."""
        return self._power.result() if self._power.peak > 0 else None
