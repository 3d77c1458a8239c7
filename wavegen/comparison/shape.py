"""A stimulus with the spectrum and the power statistics of the field, and none of its content."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from fractions import Fraction
from pathlib import Path
from typing import Any

import scipy.fft

from wavegen.comparison.curves import ExactCurve
from wavegen.comparison.difference import (
    HIGHEST,
    DifferenceRow,
    as_recorded,
    compare,
    probabilities,
)
from wavegen.comparison.match_document import row_document
from wavegen.comparison.off_times import share_of_time_on
from wavegen.comparison.shaped_recipe import RegularGate, curve_text, recipe_text, spectrum_text
from wavegen.comparison.side import CURVE_FORMAT, LOOP, Side, SideSettings
from wavegen.comparison.sides import open_side
from wavegen.comparison.spectra import (
    SideSpectrum,
    SpectrumDifference,
    side_spectrum,
    spectrum_difference,
)
from wavegen.core.errors import ArgumentsError, SignalError, WavegenError
from wavegen.core.progress import Progress, silent
from wavegen.core.timespan import TimeSpan
from wavegen.core.units import format_hz
from wavegen.files.atomic import Drafts
from wavegen.files.faults import told
from wavegen.meters.equivalence import check_tolerance
from wavegen.meters.occupied_bandwidth import occupied_bandwidth
from wavegen.production.make import Made, make
from wavegen.production.measure_settings import MeasureSettings, whole_samples
from wavegen.production.measured_signal import measure_signal
from wavegen.production.show import is_curve
from wavegen.production.sidecar import FORMAT
from wavegen.production.subject_files import open_subject
from wavegen.recipe.load import load_recipe
from wavegen.sources.shaped import EDGE_FRACTION, LONGEST_SAMPLES, flat_density

TOLERANCE_DB = 0.05
MOST_SAMPLES = 1 << 20
"""Length of the loop unless another is asked for, or the field is shorter."""
FEWEST_SAMPLES = 1 << 17
"""A loop of a short field is longer: the last levels of few samples come in large steps."""
SHORTEST_SAMPLES = 1024
_EVENTS = 10
_ALWAYS = 0.01
_RAMP_OVER_BANDWIDTH = 4


@dataclass(frozen=True, slots=True, kw_only=True)
class ShapeSettings:
    """What is wanted of the stimulus.

    Parameters
    ----------
    name : str
        Of the recipe, and of everything made from it.
    title : str
        Of the recipe.
    seed : int
        Another seed gives another stimulus with the same statistics.
    duration : TimeSpan or None
        Length of the loop; as long as the field, 2^17 samples at least and 2^20 at most, if not
        given.
    bandwidth_hz : Fraction or None
        A flat spectrum in place of the field's.
    sample_rate_hz : Fraction or None
        Of a field that is only a curve.
    tolerance_db : float
        What a level may be off by.
    """

    name: str
    title: str
    seed: int = 1
    duration: TimeSpan | None = None
    bandwidth_hz: Fraction | None = None
    sample_rate_hz: Fraction | None = None
    tolerance_db: float = TOLERANCE_DB


def shape(
    field: SideSettings,
    settings: ShapeSettings,
    *,
    out: Path,
    overwrite: bool = False,
    workers: int = 1,
    progress: Progress = silent,
) -> dict[str, Any]:
    """Make a stimulus with the field's spectrum and CCDF, and compare both.

    Parameters
    ----------
    field : SideSettings
        A recording, stimulus or recipe; or a curve, with a bandwidth and a sample rate. With a
        gate the on-time is followed, and a regular gate of the same duty is put on top.
    settings : ShapeSettings
        What is wanted.
    out : Path
        Everything goes to ``out/NAME``: the recipe, the curve and the spectrum that it follows,
        the files and their sidecar.
    overwrite : bool
        Whether files that exist are replaced.
    workers, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    dict
        JSON values. ``verdict`` is ``match`` if every level down to the last that both sides
        resolve lies within the tolerance, else ``differ``: the files are the nearest found.

    Raises
    ------
    ArgumentsError
        What is missing to make samples of a curve, or a length that cannot be.
    SignalError
        A field without phase or spectrum where no bandwidth is given.
    FileError, RecipeError
        As raised while reading and making.

    Notes
    -----
    See :mod:`wavegen.dsp.shaped_envelope`.
    """
    check_tolerance(settings.tolerance_db)
    field, skipped = _after_opening(field, workers=workers, progress=progress)
    side = _opened(field, workers=workers, progress=progress)
    spectrum = None
    if settings.bandwidth_hz is None:
        spectrum = side_spectrum(side, workers=workers, progress=progress)
        if spectrum is None:
            raise SignalError(
                where=side.name,
                problem="has no spectrum that could be followed",
                allowed="samples with their phase, or a bandwidth",
                remedy="Give --bandwidth.",
            )
    rate_hz = _rate(side, settings)
    _check_bandwidth(settings.bandwidth_hz, rate_hz)
    gate = _gate(side, rate_hz, spectrum, settings)
    n_samples = _length(side, settings, rate_hz, gate)
    _check_length(n_samples)
    made = _make(
        recipe_text(
            name=settings.name,
            title=settings.title,
            seed=settings.seed,
            bandwidth_hz=settings.bandwidth_hz,
            rate_hz=rate_hz,
            n_samples=n_samples,
            gate=gate,
        ),
        curve_text(side, n_samples),
        None if spectrum is None else spectrum_text(spectrum),
        settings,
        out=out,
        overwrite=overwrite,
        workers=workers,
        progress=progress,
    )
    stimulus = _stimulus_side(made, is_gated=gate is not None, workers=workers, progress=progress)
    return _document(
        side, stimulus, spectrum, made, settings, gate=gate, skipped=skipped, workers=workers
    )


def _opened(field: SideSettings, *, workers: int, progress: Progress) -> Side:
    """Open the field; if nothing is left without its offset, say that this may be kept."""
    try:
        return open_side(field, workers=workers, progress=progress)
    except SignalError as error:
        if not field.removes_offset or field.gate is not None:
            raise
        raise SignalError(
            where=error.where,
            problem=error.problem,
            allowed=error.allowed,
            remedy=f"{error.remedy} A carrier at 0 Hz is kept with --keep-dc.",
        ) from error


def _after_opening(
    field: SideSettings, *, workers: int, progress: Progress
) -> tuple[SideSettings, int]:
    """Leave out fill words and start-up, where the part was not chosen; return how many."""
    path = Path(field.subject)
    is_told = field.is_recipe or field.part.is_cut or field.hints.format == CURVE_FORMAT
    if is_told or not path.is_file() or path.name.lower().endswith(".ccdf.json") or is_curve(path):
        return field, 0
    subject = open_subject(path, field.hints, field.part)
    if subject.is_described or subject.loops:
        return field, 0
    wanted = MeasureSettings(states_process=False)
    found = measure_signal(subject, wanted, workers=workers, progress=progress)
    faults = found.check.faults if found.check else ()
    stop = max(
        (fault.stop_sample or 0 for fault in faults if fault.kind in {"fill", "start_up"}),
        default=0,
    )
    if not stop or stop > subject.signal.n_samples // 2:
        return field, 0
    part = replace(field.part, first=TimeSpan(Fraction(stop), "samples"))
    return replace(field, part=part), stop


def _rate(side: Side, settings: ShapeSettings) -> Fraction:
    if side.signal is not None and not side.is_power:
        return side.signal.sample_rate_hz
    if settings.sample_rate_hz is None or settings.bandwidth_hz is None:
        raise ArgumentsError(
            where="--bandwidth/--sample-rate",
            problem=f"{side.name} tells levels alone",
            allowed="a bandwidth and a sample rate for it",
            remedy="Give both, such as --bandwidth 5MHz --sample-rate 20MHz.",
        )
    return settings.sample_rate_hz


def _check_bandwidth(bandwidth_hz: Fraction | None, rate_hz: Fraction) -> None:
    most_hz = float(rate_hz) / (1 + EDGE_FRACTION)
    if bandwidth_hz is not None and bandwidth_hz > most_hz:
        raise ArgumentsError(
            where="--bandwidth",
            problem=f"{format_hz(bandwidth_hz)} with its edges is wider than the sample rate, "
            f"{format_hz(rate_hz)}",
            allowed=f"up to {format_hz(most_hz, digits=4)}",
            remedy="Choose a narrower band.",
        )


def _gate(
    side: Side, rate_hz: Fraction, spectrum: SideSpectrum | None, settings: ShapeSettings
) -> RegularGate | None:
    """Return a regular gate with the duty and the mean spacing of the field's bursts."""
    if side.bursts is None or side.signal is None or side.duty is None:
        return None
    runs = side.bursts.runs
    period = max(round(side.signal.n_samples / len(runs)), 4)
    width = float(settings.bandwidth_hz or (spectrum.occupied.width_hz if spectrum else rate_hz))
    ramp = max(round(_RAMP_OVER_BANDWIDTH * float(rate_hz) / width), 1)
    on = min(round(side.duty * period) + 2 * ramp, period - 1)
    return RegularGate(period_samples=period, on_samples=on, ramp_samples=min(ramp, (on - 1) // 2))


def _length(
    side: Side, settings: ShapeSettings, rate_hz: Fraction, gate: RegularGate | None
) -> int:
    if settings.duration is not None:
        wanted = whole_samples(settings.duration, rate_hz, "--duration")
    else:
        own = side.signal.n_samples if side.signal is not None else MOST_SAMPLES
        wanted = min(max(own, FEWEST_SAMPLES), MOST_SAMPLES)
        if gate is None:  # a length that transforms fast
            size = wanted
            while scipy.fft.next_fast_len(size) != size:
                size -= 1
            return size
    if gate is None:
        return wanted
    return max(wanted // gate.period_samples, 1) * gate.period_samples


def _check_length(n_samples: int) -> None:
    if not SHORTEST_SAMPLES <= n_samples <= LONGEST_SAMPLES:
        raise ArgumentsError(
            where="--duration",
            problem=f"a loop of {n_samples} samples",
            allowed=f"{SHORTEST_SAMPLES} to {LONGEST_SAMPLES} samples",
            remedy="Choose another duration.",
        )


def _make(
    recipe: str,
    curve: str,
    spectrum: str | None,
    settings: ShapeSettings,
    *,
    out: Path,
    overwrite: bool,
    workers: int,
    progress: Progress,
) -> Made:
    """Write what the recipe needs, then make it; take it back if that fails."""
    folder = out / settings.name
    texts = {f"{settings.name}.yaml": recipe, f"{settings.name}.curve.csv": curve}
    if spectrum is not None:
        texts[f"{settings.name}.spectrum.csv"] = spectrum
    fresh = [name for name in texts if not (folder / name).exists()]
    with Drafts(folder, overwrite=overwrite) as drafts:
        for name, text in texts.items():
            draft = drafts.add(name)
            with told(draft):
                draft.write_text(text, encoding="utf-8")
    try:
        loaded = load_recipe(folder / f"{settings.name}.yaml")
        return make(loaded, out=out, overwrite=overwrite, workers=workers, progress=progress)
    except (WavegenError, KeyboardInterrupt):
        for name in fresh:
            (folder / name).unlink(missing_ok=True)
        if not any(folder.iterdir()):
            folder.rmdir()
        raise


def _stimulus_side(made: Made, *, is_gated: bool, workers: int, progress: Progress) -> Side:
    """Measure what was made; of a gated one the on-time, as its recipe has it."""
    subject = open_subject(made.folder / made.document["files"][0]["name"])
    wanted = MeasureSettings(states_process=False, finds_faults=False)
    found = measure_signal(subject, wanted, workers=workers, progress=progress)
    statistics = found.statistics
    if is_gated and found.gate is not None and found.gate.on is not None:
        statistics = found.gate.on.statistics
    return Side(
        name=subject.name,
        is_=LOOP,
        curve=ExactCurve(source=statistics),
        n_samples=statistics.n_samples,
        signal=found.signal,
        loops=True,
    )


def _least(side: Side, stimulus: Side) -> float:
    """Return the least usual probability that both sides resolve; 1 % is looked at anyway."""
    counts = [item.n_samples for item in (side, stimulus) if item.n_samples]
    rarest = min(max((_EVENTS / count for count in counts), default=1e-4), HIGHEST)
    asked = probabilities(float(f"{rarest:.3g}"))
    resolved = asked[side.curve.is_resolved(asked)]
    return float(resolved.min(initial=max(_ALWAYS, asked.min())))


def _spectra(
    own: SideSpectrum | None, wanted: SideSpectrum | None, settings: ShapeSettings
) -> SpectrumDifference | None:
    """Return how the spectrum differs from the field's, or from the flat one asked for."""
    if own is None:
        return None
    if wanted is None:
        place, width_hz = own.spectrum.frequencies_hz, float(settings.bandwidth_hz or 0)
        density = flat_density(place, width_hz, EDGE_FRACTION)
        flat = replace(own.spectrum, density=density)
        wanted = SideSpectrum(spectrum=flat, occupied=occupied_bandwidth(flat))
    return spectrum_difference(own, wanted, is_centred=False)


def _gate_hint(side: Side) -> list[str]:
    """Return what would shape a field that is switched on and off, if it was not asked for."""
    on = share_of_time_on(side)
    if on is None:
        return []
    text = (
        f"is on for {100 * on:.2g} % of the time only: with --gate auto its on-time is shaped and "
        "gated again, which comes nearer than levels and spectrum of all of the time"
    )
    return [text]


def _document(
    side: Side,
    stimulus: Side,
    spectrum: SideSpectrum | None,
    made: Made,
    settings: ShapeSettings,
    *,
    gate: RegularGate | None,
    skipped: int,
    workers: int,
) -> dict[str, Any]:
    least = _least(side, stimulus)
    found = compare(
        as_recorded(stimulus.curve),
        as_recorded(side.curve),
        tolerance_db=settings.tolerance_db,
        down_to=least,
    )
    rows: tuple[DifferenceRow, ...] = found.rows
    differences = [abs(row.difference_db) for row in rows]
    largest = max(differences, default=math.inf)
    between = _spectra(side_spectrum(stimulus, workers=workers), spectrum, settings)
    is_met = largest <= settings.tolerance_db
    return {
        "format": f"{FORMAT}.shape",
        "version": 1,
        "verdict": "match" if is_met else "differ",
        "name": settings.name,
        "folder": str(made.folder),
        "recipe": f"{settings.name}.yaml",
        "files": made.document["files"],
        "tolerance_db": settings.tolerance_db,
        "down_to": least,
        "largest_difference_db": largest if math.isfinite(largest) else None,
        "levels": [row_document(row) for row in rows],
        "levels_are": "of the on-time" if gate else "of all of the time",
        "spectrum": None
        if between is None
        else {
            "largest_difference_db": between.largest_db,
            "is_over": "the field's" if spectrum is not None else "a flat one",
            "occupied_bandwidth_hz": between.second.occupied.width_hz,
        },
        "gate": None
        if gate is None
        else {
            "period_samples": gate.period_samples,
            "duty": gate.on_samples / gate.period_samples,
            "is": "regular, with the duty and the mean spacing of the field's bursts",
        },
        "field": side.name,
        "skipped_samples": skipped,
        "warnings": [*made.document["warnings"]]
        + [
            {"kind": "warning", "where": side.name, "text": text}
            for text in [*side.warnings, *_gate_hint(side)]
        ],
    }
