"""How true a recipe's signal is to its own symbols and to its neighbours, before and after."""

from __future__ import annotations

import math
from dataclasses import dataclass, field, replace
from typing import Any

from wavegen.core.allocation import keep_large_blocks
from wavegen.core.errors import RecipeError
from wavegen.core.progress import Progress, silent
from wavegen.core.signal import Signal
from wavegen.core.site import Note, Site
from wavegen.core.units import format_hz
from wavegen.meters.aclr import AclrPlan
from wavegen.meters.evm_probe import EvmResult, EvmSettings
from wavegen.meters.fidelity import FidelitySettings
from wavegen.meters.mask import SpectralMask
from wavegen.production.chain_cut import without_distortion
from wavegen.production.figures import Figures, has_symbols, measure_figures
from wavegen.production.graph import build
from wavegen.production.neighbours import (
    ChannelRequest,
    OccupiedBand,
    is_held,
    occupied_band,
    plan_channels,
    spectrum_meter,
)
from wavegen.production.prepare import find_loop
from wavegen.production.sidecar import note_rows, rounded, versions
from wavegen.recipe.load import LoadedRecipe

PROBABILITIES = (0.1, 0.01, 1e-3, 1e-4, 1e-5)
MOST_DB = 300.0
"""What is told of a ratio without bound."""


@dataclass(frozen=True, slots=True, kw_only=True)
class FidelityRequest:
    """What is to be measured of a recipe.

    Parameters
    ----------
    evm : EvmSettings
        How EVM is meant, and whose limits stand beside it.
    channels : ChannelRequest
        Adjacent channels.
    must_hold : bool
        Whether channels that the sample rate does not hold are an error; else they are left out.
    mask : SpectralMask or None
        None: that of the recipe, if it has one.
    """

    evm: EvmSettings = field(default_factory=EvmSettings)
    channels: ChannelRequest = field(default_factory=ChannelRequest)
    must_hold: bool = False
    mask: SpectralMask | None = None


def with_mask(request: FidelityRequest, loaded: LoadedRecipe) -> FidelityRequest:
    """Return a request with the recipe's mask where it has none of its own."""
    return request if request.mask is not None else replace(request, mask=loaded.recipe.mask)


@dataclass(frozen=True, slots=True, kw_only=True)
class FidelityPlan:
    """What is measured, and about which band.

    Parameters
    ----------
    settings : FidelitySettings
        For the meters.
    band : OccupiedBand
        Of the signal.
    channels : AclrPlan or None
        None where they are not held.
    notes : tuple of Note
        What is left out, and why.
    """

    settings: FidelitySettings
    band: OccupiedBand
    channels: AclrPlan | None
    notes: tuple[Note, ...] = ()


def plan_fidelity(site: Site, signal: Signal, request: FidelityRequest) -> FidelityPlan:
    """Fix what is measured of a signal and of all that is made from it.

    Parameters
    ----------
    site : Site
        Where the signal is built.
    signal : Signal
        Before anything distorts it.
    request : FidelityRequest
        What was asked for.

    Raises
    ------
    RecipeError
        The signal is zero.
    ArgumentsError
        No such channels.
    """
    band = occupied_band(site, signal)
    if band is None:
        raise site.error(
            key="",
            problem="the signal is zero",
            allowed="signals with power",
            remedy="Correct the signal.",
        )
    notes = []
    channels: AclrPlan | None = plan_channels(request.channels, band)
    assert channels is not None  # noqa: S101 - told to the type checker
    widths = [channel.bandwidth_hz for channel in (channels.carrier, *channels.neighbours)]
    if not request.must_hold and not is_held(channels, signal, band.centre_hz):
        text = (
            f"no ACLR: {channels.name} would need {format_hz(round(channels.needed_hz))}; the "
            f"sample rate is {format_hz(signal.sample_rate_hz)}"
        )
        notes.append(Note(kind="warning", where="sample_rate", text=text))
        channels = None
    evm: EvmSettings | None = request.evm
    found, why = has_symbols(signal)
    if not found:
        text = f"no EVM: {why}; the error of the whole waveform stands in its place"
        notes.append(Note(kind="warning", where=site.path, text=text))
        evm = None
    settings = FidelitySettings(
        spectrum=spectrum_meter(signal, min(widths), request.mask),
        evm=evm,
        channels=channels,
        mask=request.mask,
        centre_hz=band.centre_hz,
    )
    return FidelityPlan(settings=settings, band=band, channels=channels, notes=tuple(notes))


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class RecipeFidelity:
    """Figures of a recipe before and after its crest-factor reduction, devices and converters.

    Parameters
    ----------
    plan : FidelityPlan
        What was measured.
    before, after : Figures
        ``after`` is ``before`` itself where nothing of the kind is in the chain.
    notes : tuple of Note
        What was rounded, doubtful or worth knowing.
    """

    plan: FidelityPlan
    before: Figures
    after: Figures
    notes: tuple[Note, ...]

    @property
    def has_two(self) -> bool:
        """Whether anything distorts the signal."""
        return self.after is not self.before


def recipe_fidelity(
    loaded: LoadedRecipe,
    request: FidelityRequest | None = None,
    *,
    workers: int = 1,
    progress: Progress = silent,
) -> RecipeFidelity:
    """Measure what a recipe's stages do to EVM, neighbours, bandwidth and power statistics.

    Parameters
    ----------
    loaded : LoadedRecipe
        A checked recipe; of two channels the first counts.
    request : FidelityRequest, optional
        What is measured.
    workers, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    RecipeFidelity

    Raises
    ------
    RecipeError
        What cannot be honoured, at ``file:line:column``.
    SignalError
        The sample rate does not hold the channels or the mask.
    """
    keep_large_blocks()
    asked = with_mask(request or FidelityRequest(), loaded)
    try:
        _, sites = find_loop(loaded)
        channel, site = sites[0]
        stages = channel.recipe.stages
        plain = without_distortion(stages)
        clean = build(channel.recipe.signal, plain, replace(site, notes=[])).signal
        plan = plan_fidelity(site, clean, asked)
        signal = build(channel.recipe.signal, stages, site).signal if plain != stages else clean
    except RecipeError as error:
        raise loaded.resolve(error) from error

    def measure(one: Signal, reference: Signal | None, task: str) -> Figures:
        return measure_figures(
            one,
            settings=plan.settings,
            reference=reference,
            workers=workers,
            progress=progress,
            task=task,
        )

    before = measure(clean, None, "before")
    after = before if plain == stages else measure(signal, clean, "after")
    notes = (*site.notes, *plan.notes)
    return RecipeFidelity(plan=plan, before=before, after=after, notes=notes)


def fidelity_document(loaded: LoadedRecipe, found: RecipeFidelity) -> dict[str, Any]:
    """Return the figures of a recipe as JSON values."""
    return {
        "format": "wavegen.fidelity",
        "version": 1,
        "name": loaded.name,
        "title": loaded.recipe.title,
        "channels": channel_words(found.plan),
        "before": figure_rows(found.before),
        "after": figure_rows(found.after) if found.has_two else None,
        "rounded": note_rows([note for note in found.notes if note.kind == "rounded"]),
        "warnings": note_rows([note for note in found.notes if note.kind == "warning"]),
        "versions": versions(),
    }


def channel_words(plan: FidelityPlan) -> dict[str, Any] | None:
    """Return which channels were measured as JSON values."""
    if plan.channels is None:
        return None
    return {
        "name": plan.channels.name,
        "source": plan.channels.source,
        "status": plan.channels.status,
        "centre_hz": plan.band.centre_hz,
    }


def figure_rows(figures: Figures) -> dict[str, Any]:
    """Return the figures of one signal as JSON values."""
    fidelity, statistics = figures.fidelity, figures.power.statistics
    return {
        "evm_percent": rounded(worst_evm(figures), 5),
        "aclr_db": None if fidelity.aclr is None else rounded(ratio_db(fidelity.aclr.worst_db), 3),
        "evm": [evm_row(result) for result in fidelity.evm],
        "total_error_percent": None
        if fidelity.total is None
        else rounded(fidelity.total.fitted_percent, 5),
        "aclr": aclr_rows(figures),
        "mask": None if fidelity.mask is None else mask_row(figures),
        "occupied_bandwidth_hz": rounded(fidelity.occupied.width_hz, 1),
        "raw_cubic_metric_db": rounded(fidelity.cubic.raw_db, 4),
        "papr_db": rounded(statistics.papr_db, 4),
        "levels": [
            {
                "probability": row.probability,
                "level_db": rounded(row.level_db, 4),
                "resolved": bool(row.resolved),
            }
            for row in statistics.levels(PROBABILITIES)
        ],
    }


def worst_evm(figures: Figures) -> float:
    """Return the highest EVM of any source; of the whole waveform where no source has one."""
    fidelity = figures.fidelity
    if fidelity.evm:
        return max(result.percent for result in fidelity.evm)
    return 0.0 if fidelity.total is None else fidelity.total.fitted_percent


def ratio_db(value: float) -> float:
    """Return a ratio that JSON can hold: none is above 300 dB."""
    return min(value, MOST_DB) if not math.isnan(value) else MOST_DB


def evm_row(result: EvmResult) -> dict[str, Any]:
    """Return the EVM of one source as JSON values."""
    return {
        "source": result.path,
        "definition": result.definition,
        "percent": rounded(result.percent, 5),
        "unfitted_percent": rounded(result.overall.unfitted_percent, 5),
        "gain_db": rounded(result.gain_db, 5),
        "classes": [
            {
                "name": item.name,
                "constellation": item.constellation,
                "percent": rounded(item.percent, 5),
                "limit_percent": item.limit_percent,
                "peak_percent": rounded(item.spread.peak_percent, 4) if item.spread else None,
                "p95_percent": rounded(item.spread.p95_percent, 4) if item.spread else None,
            }
            for item in result.classes
        ],
        "remarks": list(result.remarks),
    }


def aclr_rows(figures: Figures) -> list[dict[str, Any]]:
    """Return the leakage into each channel as JSON values."""
    found = figures.fidelity.aclr
    if found is None:
        return []
    return [
        {
            "channel": item.channel.name,
            "offset_hz": item.channel.offset_hz,
            "bandwidth_hz": item.channel.bandwidth_hz,
            "filter": item.channel.filter,
            "ratio_db": rounded(ratio_db(item.ratio_db), 3),
            "limit_db": item.channel.limit_db,
        }
        for item in found.ratios
    ]


def mask_row(figures: Figures) -> dict[str, Any]:
    """Return the comparison with the mask as JSON values."""
    found = figures.fidelity.mask
    assert found is not None  # noqa: S101 - asked where there is one
    tightest = min(found.segments, key=lambda segment: segment.margin_db)
    return {
        "is_kept": found.is_kept,
        "margin_db": rounded(found.margin_db, 3),
        "tightest_at_hz": rounded(tightest.at_hz, 1),
    }
