"""A record's faults, found and said; nothing is removed or repaired here.

Each threshold is where a figure begins to suffer, and each finding must stand out of what chance
does. *Small* is -40 dB: an error of that size is 1 % EVM and moves no level by 0.02 dB.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from concurrent.futures import Executor
from dataclasses import dataclass
from typing import Any, Self

import numpy as np
from numpy.typing import NDArray

from wavegen.core.progress import Progress, silent
from wavegen.core.render import Tap, render
from wavegen.core.signal import Signal
from wavegen.dsp.differences import FourthDifference
from wavegen.files.format import Recording
from wavegen.meters.fault import Fault, stretch_text
from wavegen.meters.record import RecordFigures, RecordMeter
from wavegen.meters.stationarity import (
    SURE_SIGMA,
    batches_of,
    breaks_tap,
    level_faults,
    on_share,
    splices,
)
from wavegen.meters.stretches import Stretches, look_at_stretches

SMALL_DB = -40.0
"""Offset over the signal, image over the signal: 1 % EVM each."""
CARRIER_DB = 50.0
"""An offset so far over the rest is an unmodulated carrier at 0 Hz."""
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
_RUN = 16


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
    on_share : float
        Share of the record's 64 to 127 parts that stand no more than 6 dB below the highest: 1
        of what is always on, or too short to tell.
    """

    faults: tuple[Fault, ...]
    offset: complex
    offset_dbc: float
    gain_imbalance_db: float | None
    phase_imbalance_deg: float | None
    quantisation_db: float | None
    n_codes: int | None
    on_share: float = 1.0


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class FaultSearch:
    """A search for faults, to go along with other meters in one pass over a record.

    Parameters
    ----------
    signal : Signal
        The samples, full scale 1.0.
    seen : Stretches
        What up to 2048 stretches of it say.
    taps : tuple of Tap
        To be rendered; :meth:`result` takes what they read.
    loops : bool
        Whether the last sample is followed by the first.
    n_rails : int
        1 for a file of real samples.
    """

    signal: Signal
    seen: Stretches
    taps: tuple[Tap, ...]
    loops: bool
    n_rails: int

    @classmethod
    def of(
        cls,
        signal: Signal,
        *,
        loops: bool = False,
        code_scale: float | None = None,
        n_rails: int = 2,
    ) -> Self:
        """Look at stretches of a record and return the search in all of it.

        Parameters
        ----------
        signal, loops, code_scale, n_rails
            As in :func:`check_record`.
        """
        seen = look_at_stretches(signal)
        record = RecordMeter(offset=seen.offset, code_scale=code_scale, n_rails=n_rails)
        return cls(
            signal=signal,
            seen=seen,
            taps=(
                Tap(name="record", signal=signal, meter=record),
                breaks_tap(signal, loops=loops),
            ),
            loops=loops,
            n_rails=n_rails,
        )

    def result(self, read: Mapping[str, Any]) -> RecordCheck:
        """Return what was found.

        Parameters
        ----------
        read : mapping
            Results of the taps, by their names.
        """
        figures: RecordFigures = read["record"]
        faults: list[Fault] = [
            *_not_finite(figures),
            *_start(figures),
            *_tail(figures),
            *_clipping(figures),
        ]
        offset, offset_dbc, dc = _dc(figures, self.seen)
        imbalance, unequal = _imbalance(self.seen, self.n_rails)
        noise_db, n_codes, coarse = _quantisation(figures)
        faults += [*dc, *unequal, *coarse, *level_faults(figures)]
        if read["breaks"] is not None:
            breaks = FourthDifference.of(self.signal, loops=self.loops)
            faults += splices(self.signal, breaks, read["breaks"], figures)
        return RecordCheck(
            faults=tuple(faults),
            offset=offset,
            offset_dbc=offset_dbc,
            gain_imbalance_db=imbalance[0] if imbalance else None,
            phase_imbalance_deg=imbalance[1] if imbalance else None,
            quantisation_db=noise_db,
            n_codes=n_codes,
            on_share=on_share(figures, self.seen.flat_bandwidth),
        )


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
    search = FaultSearch.of(signal, loops=loops, code_scale=code_scale, n_rails=n_rails)
    read = render(
        signal,
        taps=search.taps,
        workers=workers,
        executor=executor,
        progress=progress,
        task="faults",
    )
    return search.result(read)


def code_scale(recording: Recording) -> float | None:
    """Return the codes to full scale of a file of integers, for :func:`check_record`.

    Parameters
    ----------
    recording : Recording
        As opened.

    Returns
    -------
    float or None
        None for files of floats. Codes that stand half a step off zero count in half steps.
    """
    datatype = recording.datatype
    if not datatype.is_integer or recording.is_power:
        return None
    source = getattr(recording.signal, "source", recording.signal)
    scale = datatype.full_scale / float(getattr(source, "gain", 1.0))
    return scale if float(datatype.offset).is_integer() else 2 * scale


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
                where=stretch_text(0, n_fill),
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
                where=stretch_text(n_fill, last),
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
        where=stretch_text(start, stop),
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


def _dc(figures: RecordFigures, seen: Stretches) -> tuple[complex, float, list[Fault]]:
    """Return the offset, its power over the signal's, dB, and the fault if it is one."""
    total = figures.cells.sum(axis=0)
    n = float(total[0])
    if not n:
        return seen.offset, -math.inf, []
    offset = complex(total[1], total[2]) / n
    signal_power = float(total[3]) / n - abs(offset - figures.offset) ** 2
    power = abs(offset) ** 2
    if not signal_power > 0:
        return offset, (math.inf if power else -math.inf), []
    size_db = _db(power / signal_power)
    batches = batches_of(figures)
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
    if not total[0]:  # no longer than the start that is left out
        return None, int(codes.size), []
    mean = complex(total[1], total[2]) / total[0]
    power = float(total[3]) / total[0] - abs(mean - figures.offset) ** 2
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
