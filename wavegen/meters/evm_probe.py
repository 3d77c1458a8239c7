"""EVM of one source by name: fitted, equalised, as 3GPP or IEEE 802.11 define it."""

from __future__ import annotations

import math
from collections.abc import Mapping
from concurrent.futures import Executor
from dataclasses import dataclass, replace
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import ArgumentsError
from wavegen.core.progress import Progress, silent
from wavegen.core.render import Tap, render
from wavegen.core.signal import Signal
from wavegen.core.table import Table
from wavegen.meters.arrivals import LocatedSource, locate_sources
from wavegen.meters.evm import EvmMeter, EvmSums, Paired, pair_of
from wavegen.meters.evm_errors import (
    ErrorSpread,
    FrameErrorMeter,
    equalised,
    errors_of,
    spread_of,
)
from wavegen.meters.limits import evm_limit, evm_limit_of
from wavegen.meters.power import PowerMeter
from wavegen.sources.ofdm_signal import Prefixed
from wavegen.sources.reception import Reception, SymbolClass

Definition = Literal["gain_fitted", "zero_forcing", "3gpp", "802.11"]
SMOOTHING_3GPP = 19
"""Subcarriers over which 3GPP averages the equaliser (TS 38.104 Annex B.6; from memory)."""


@dataclass(frozen=True, slots=True, kw_only=True)
class EvmSettings:
    """How EVM is measured.

    Parameters
    ----------
    definition : str
        ``gain_fitted``: one complex gain for the carrier. ``zero_forcing``: one for each
        subcarrier of OFDM, from all its symbols (the same as ``gain_fitted`` for single
        carriers). ``3gpp``: the larger of the figures at two timings of the transform, half an
        EVM window either side of the middle of the shortest prefix, behind an equaliser averaged
        over 19 subcarriers. ``802.11``: zero forcing, RMS in each frame, then the mean over
        frames.
    window_samples : int, optional
        ``3gpp``: the EVM window, samples at the carrier's own rate; see
        :func:`wavegen.meters.limits.evm_window_samples`.
    frame_symbols : int, optional
        ``802.11``: symbols of a frame (the standard: at least 16); it must divide the loop.
    has_spread : bool
        Whether peak and percentiles are wanted: they take a second rendering.
    limits : str, optional
        Standard whose limits stand beside the figures, ``NR BS FR1``, or the full name of one
        limit for all: ``NR BS FR1 64QAM``.

    Notes
    -----
    Equalisers here are found from everything that was sent, where 3GPP and IEEE 802.11 use
    reference signals and preambles: on undistorted channels this differs by noise alone. 3GPP TS
    38.104 Annex B and C; IEEE 802.11-2020 cl. 17.3.9.8 (from memory).
    """

    definition: Definition = "gain_fitted"
    window_samples: int | None = None
    frame_symbols: int | None = None
    has_spread: bool = False
    limits: str | None = None

    def __post_init__(self) -> None:
        """Refuse a definition without what it needs."""
        for key, of in (("window_samples", "3gpp"), ("frame_symbols", "802.11")):
            if self.definition == of and not getattr(self, key):
                raise ArgumentsError(
                    where="evm",
                    problem=f"the {of} definition of EVM needs {key}",
                    allowed=f"{key} above 0",
                    remedy="Give it, or choose another definition.",
                )


@dataclass(frozen=True, slots=True, kw_only=True)
class EvmFigures:
    """EVM of one class of symbols.

    Parameters
    ----------
    name : str
        ``all``, ``symbols``, ``groups[0]``, ``pilots[0]``.
    constellation : str
        Its constellation; empty where there is none, or several.
    percent : float
        RMS, by the definition asked for.
    fitted_percent : float
        RMS behind one complex gain for the carrier.
    unfitted_percent : float
        RMS without any fit: changes of level and phase count.
    equalised_percent : float
        RMS behind one gain for each subcarrier.
    spread : ErrorSpread or None
        Peak and percentiles, behind the gains of the definition.
    limit_percent : float or None
        Limit of the standard asked for.
    """

    name: str
    constellation: str
    percent: float
    fitted_percent: float
    unfitted_percent: float
    equalised_percent: float
    spread: ErrorSpread | None = None
    limit_percent: float | None = None

    @property
    def is_kept(self) -> bool | None:
        """Whether the limit is kept; None without one."""
        return None if self.limit_percent is None else self.percent <= self.limit_percent


@dataclass(frozen=True, slots=True, kw_only=True)
class EvmResult:
    """EVM of one source.

    Parameters
    ----------
    path : str
        Which: ``signal``, ``parts[0]``.
    definition : str
        By which ``percent`` is meant.
    overall : EvmFigures
        All that was sent.
    classes : tuple of EvmFigures
        Groups and pilots apart.
    gain_db, phase_deg : float
        The one gain, over that which the recipe's levels give.
    remarks : tuple of str
        What to know about the figures.
    """

    path: str
    definition: Definition
    overall: EvmFigures
    classes: tuple[EvmFigures, ...]
    gain_db: float
    phase_deg: float
    remarks: tuple[str, ...] = ()

    @property
    def percent(self) -> float:
        """RMS EVM of all that was sent, by the definition, percent."""
        return self.overall.percent

    @property
    def is_kept(self) -> bool | None:
        """Whether every limit is kept; None where there is none."""
        verdicts = [item.is_kept for item in self.classes if item.is_kept is not None]
        return all(verdicts) if verdicts else None

    def rows(self) -> tuple[tuple[str, str], ...]:
        """Return names and values, for tables of before and after."""
        rows = [(f"EVM {self.path}", f"{self.percent:.3f} %")]
        if len(self.classes) > 1:
            rows += [(f"EVM {self.path} {x.name}", f"{x.percent:.3f} %") for x in self.classes]
        return tuple(rows)

    def table(self) -> Table:
        """Return every class, for people."""
        rows = tuple(
            (
                item.name,
                item.constellation,
                f"{item.percent:.4g}",
                f"{item.fitted_percent:.4g}",
                f"{item.unfitted_percent:.4g}",
                f"{item.equalised_percent:.4g}",
                f"{item.spread.p95_percent:.4g}" if item.spread else "",
                f"{item.spread.peak_percent:.4g}" if item.spread else "",
                "" if item.limit_percent is None else f"{item.limit_percent:g}",
            )
            for item in (self.overall, *self.classes)
        )
        return Table(
            title=f"EVM of {self.path} ({self.definition}), percent",
            headings=(
                "symbols",
                "constellation",
                "RMS",
                "gain-fitted",
                "unfitted",
                "equalised",
                "95 %",
                "peak",
                "limit",
            ),
            rows=rows,
            right=frozenset(range(2, 9)),
        )


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class EvmProbe:
    """The meters of one source's EVM: taps for a rendering, then the result.

    Parameters
    ----------
    source : LocatedSource
        Which source.
    settings : EvmSettings
        How it is measured.
    receptions : tuple of Reception
        One; two timings by the definition of 3GPP.
    """

    source: LocatedSource
    settings: EvmSettings
    receptions: tuple[Reception, ...]

    @classmethod
    def of(cls, source: LocatedSource, settings: EvmSettings) -> EvmProbe:
        """Return the probe of a source.

        Raises
        ------
        SignalError
            The source has no symbols, or the window does not fit into its prefix.
        """
        early: tuple[int | None, ...] = (None,)
        if settings.definition == "3gpp" and isinstance(source.source, Prefixed):
            middle, half = (
                min(source.source.layout.prefixes) // 2,
                (settings.window_samples or 0) // 2,
            )
            early = (middle + half, middle - half)
        receptions = tuple(source.reception(early_samples=item) for item in early)
        return cls(source=source, settings=settings, receptions=receptions)

    def taps(self) -> tuple[Tap, ...]:
        """Return what the first rendering must meter."""
        return tuple(
            Tap(
                name=f"evm {self.source.path} {number}",
                signal=pair_of(reception),
                meter=EvmMeter.of(reception, where=self.source.path),
            )
            for number, reception in enumerate(self.receptions)
        )

    def _gains(self, sums: EvmSums) -> complex | NDArray[np.complex128]:
        definition = self.settings.definition
        if definition == "gain_fitted" or sums.reference.shape[1] == 1:
            return sums.gain
        return sums.column_gains(SMOOTHING_3GPP if definition == "3gpp" else 1)

    def _worst(self, readings: Mapping[str, Any]) -> tuple[Reception, EvmSums]:
        """Return the timing that counts."""
        pairs = [
            (readings[tap.name], r) for tap, r in zip(self.taps(), self.receptions, strict=True)
        ]
        sums, reception = max(pairs, key=lambda pair: pair[0].percent(self._gains(pair[0])))
        return reception, sums

    def second_taps(self, readings: Mapping[str, Any]) -> tuple[Tap, ...]:
        """Return what a second rendering must meter, the gains being known.

        Parameters
        ----------
        readings : mapping
            Results of the first.

        Returns
        -------
        tuple of Tap
            Empty where one rendering is enough.
        """
        reception, sums = self._worst(readings)
        gains, path = self._gains(sums), self.source.path
        balanced = _balanced(reception, gains)
        taps = []
        if self.settings.has_spread:
            fine = balanced
            if reception.spread is not None:
                fine = reception.spread.reception(balanced.received)
            for number, item in enumerate(fine.classes):
                rms = _rms(fine, sums, number)
                taps.append(
                    Tap(
                        name=f"errors {path} {item.name}",
                        signal=errors_of(fine, rms=rms, number=number),
                        meter=PowerMeter(where=path),
                    )
                )
        if self.settings.definition == "802.11":
            frame = (self.settings.frame_symbols or 1) * reception.n_columns
            share, labels = 1.0, reception.labels
            if labels is not None:
                share = float(np.mean(labels >= 0))
            mean = sums.reference.sum() / (share * reception.ideal.n_samples)
            whole = replace(balanced, labels=None)
            taps.append(
                Tap(
                    name=f"frames {path}",
                    signal=errors_of(whole, rms=math.sqrt(mean), number=0),
                    meter=FrameErrorMeter(frame_points=frame, used_points=frame * share),
                )
            )
        return tuple(taps)

    def result(
        self, readings: Mapping[str, Any], second: Mapping[str, Any] | None = None
    ) -> EvmResult:
        """Return the figures.

        Parameters
        ----------
        readings : mapping
            Results of the first rendering.
        second : mapping, optional
            Of the second, where there was one.
        """
        reception, sums = self._worst(readings)
        found = second or {}
        path, settings = self.source.path, self.settings
        figures = tuple(
            self._figures(reception, sums, number, item, found)
            for number, item in enumerate(reception.classes)
            if sums.reference[number].any()
        )
        percent = sums.percent(self._gains(sums))
        if f"frames {path}" in found:
            percent = 100 * found[f"frames {path}"]
        one = figures[0] if len(figures) == 1 else None
        overall = EvmFigures(
            name="all",
            constellation=one.constellation if one else "",
            percent=percent,
            fitted_percent=sums.fitted_percent,
            unfitted_percent=sums.unfitted_percent,
            equalised_percent=sums.percent(sums.column_gains()),
            spread=one.spread if one else None,
            limit_percent=one.limit_percent if one else None,
        )
        if one is not None:
            figures = (replace(one, percent=percent),)
        remarks = list(reception.remarks)
        if not self.source.is_alone:
            remarks.append("other carriers' leakage into this one's receiver counts as error")
        return EvmResult(
            path=path,
            definition=settings.definition,
            overall=overall,
            classes=figures,
            gain_db=sums.gain_db,
            phase_deg=sums.phase_deg,
            remarks=tuple(remarks),
        )

    def _figures(
        self,
        reception: Reception,
        sums: EvmSums,
        number: int,
        item: SymbolClass,
        found: Mapping[str, Any],
    ) -> EvmFigures:
        statistics = found.get(f"errors {self.source.path} {item.name}")
        spread = None
        if statistics is not None:
            fine = reception if reception.spread is None else None
            labels = reception.labels
            share = 1.0
            if fine is not None and labels is not None:
                share = float(np.mean(labels == number))
            elif reception.spread is not None:
                points = reception.spread.reception(reception.received)
                if points.labels is not None:
                    share = float(np.mean(points.labels == number))
            spread = spread_of(statistics, share=share)
        return EvmFigures(
            name=item.name,
            constellation=item.constellation,
            percent=sums.percent(self._gains(sums), [number]),
            fitted_percent=sums.percent(sums.gain, [number]),
            unfitted_percent=sums.percent(1.0, [number]),
            equalised_percent=sums.percent(sums.column_gains(), [number]),
            spread=spread,
            limit_percent=_limit(self.settings.limits, item),
        )


def _balanced(reception: Reception, gains: complex | NDArray[np.complex128]) -> Reception:
    """Return a reception with the gains taken out."""
    if reception.rails is None:
        return replace(reception, received=equalised(reception.received, gains))
    joined: Any = reception.received  # rails are turned before they are joined
    return replace(reception, received=replace(joined, gain=complex(gains)), rails=None)


def _rms(reception: Reception, sums: EvmSums, number: int) -> float:
    """Return the RMS of what was sent in a class, on the axis of a reception."""
    places = float(reception.ideal.n_samples)
    if reception.labels is not None:
        places *= float(np.mean(reception.labels == number))
    power = float(sums.reference[number].sum()) / max(places, 1.0)
    return math.sqrt(power) or 1.0


def _limit(standard: str | None, item: SymbolClass) -> float | None:
    if standard is None or not item.is_data:
        return None
    try:
        return evm_limit(standard).percent
    except ArgumentsError:
        limit = evm_limit_of(standard, item.constellation)
        return None if limit is None else limit.percent


def probes_of(
    graph: Signal, conditioned: Signal | None = None, settings: EvmSettings | None = None
) -> list[EvmProbe]:
    """Return a probe for every source with symbols.

    Parameters
    ----------
    graph : Signal
        What is sent.
    conditioned : Signal, optional
        What is received; ``graph`` itself if not given.
    settings : EvmSettings, optional
        How EVM is measured.

    Raises
    ------
    SignalError
        As raised on the way to a source.
    """
    chosen = settings or EvmSettings()
    located = locate_sources(graph, conditioned)
    return [EvmProbe.of(item, chosen) for item in located if item.has_symbols]


def total_tap(reference: Signal, conditioned: Signal) -> Tap:
    """Return the meter of the error of the whole waveform, out-of-band parts included.

    Parameters
    ----------
    reference : Signal
        Before what is judged.
    conditioned : Signal
        After it, in step.

    Returns
    -------
    Tap
        Named ``total error``; its result is an :class:`wavegen.meters.evm.EvmSums`.
    """
    return Tap(name="total error", signal=Paired.of(conditioned, reference), meter=EvmMeter())


def measure_evm(
    graph: Signal,
    conditioned: Signal | None = None,
    *,
    settings: EvmSettings | None = None,
    workers: int = 1,
    executor: Executor | None = None,
    strip_samples: int | None = None,
    progress: Progress = silent,
) -> list[EvmResult]:
    """Measure the EVM of every source with symbols.

    Parameters
    ----------
    graph : Signal
        What is sent: sources through sums and stages.
    conditioned : Signal, optional
        What is received; ``graph`` itself if not given.
    settings : EvmSettings, optional
        How.
    workers, executor, strip_samples, progress
        As in :func:`wavegen.core.render.render`; no figure depends on them.

    Returns
    -------
    list of EvmResult
        In the order of the recipe.

    Raises
    ------
    SignalError
        As raised on the way to a source, or by a meter.
    """
    probes = probes_of(graph, conditioned, settings)
    seen = graph if conditioned is None else conditioned

    def run(taps: tuple[Tap, ...]) -> dict[str, Any]:
        return render(
            seen,
            taps=taps,
            workers=workers,
            executor=executor,
            strip_samples=strip_samples,
            progress=progress,
            task="EVM",
        )

    if not probes:
        return []
    first = run(tuple(tap for probe in probes for tap in probe.taps()))
    more = tuple(tap for probe in probes for tap in probe.second_taps(first))
    second = run(more) if more else {}
    return [probe.result(first, second) for probe in probes]
