"""Every figure of fidelity of a signal in one rendering, and the pair before and after."""

from __future__ import annotations

from collections.abc import Mapping
from concurrent.futures import Executor
from dataclasses import dataclass, field
from typing import Any

from wavegen.core.progress import Progress, silent
from wavegen.core.render import Tap, render
from wavegen.core.signal import Signal
from wavegen.core.table import Table
from wavegen.meters.aclr import Aclr, AclrPlan, aclr
from wavegen.meters.cubic import CubicMeter, CubicMetric
from wavegen.meters.evm import EvmSums
from wavegen.meters.evm_probe import EvmProbe, EvmResult, EvmSettings, probes_of, total_tap
from wavegen.meters.mask import MaskResult, SpectralMask, check_mask
from wavegen.meters.occupied_bandwidth import OccupiedBandwidth, occupied_bandwidth
from wavegen.meters.spectrum import Spectrum, SpectrumMeter

SPECTRUM = "spectrum"
CUBIC = "cubic metric"
TOTAL = "total error"


@dataclass(frozen=True, slots=True, kw_only=True)
class FidelitySettings:
    """What is measured, and how.

    Parameters
    ----------
    spectrum : SpectrumMeter
        Of the power spectral density.
    evm : EvmSettings or None
        None: no EVM.
    channels : AclrPlan or None
        Channels of an ACLR; None: none.
    mask : SpectralMask or None
        None: none.
    centre_hz : float
        Where the carrier of channels and mask stands, Hz.
    """

    spectrum: SpectrumMeter = field(default_factory=SpectrumMeter)
    evm: EvmSettings | None = field(default_factory=EvmSettings)
    channels: AclrPlan | None = None
    mask: SpectralMask | None = None
    centre_hz: float = 0.0


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Fidelity:
    """What a signal does to its own symbols and to its neighbours.

    Parameters
    ----------
    spectrum : Spectrum
        Power spectral density.
    occupied : OccupiedBandwidth
        99 %.
    cubic : CubicMetric
        Raw and by both constants.
    evm : tuple of EvmResult
        One for each source with symbols.
    aclr : Aclr or None
        Where channels were asked for.
    mask : MaskResult or None
        Where a mask was asked for.
    total : EvmSums or None
        Error of the whole waveform, out-of-band parts included, where a reference was given.
    """

    spectrum: Spectrum
    occupied: OccupiedBandwidth
    cubic: CubicMetric
    evm: tuple[EvmResult, ...] = ()
    aclr: Aclr | None = None
    mask: MaskResult | None = None
    total: EvmSums | None = None

    def rows(self) -> tuple[tuple[str, str], ...]:
        """Return names and values of all figures."""
        rows = [row for result in self.evm for row in result.rows()]
        if self.total is not None:
            rows += [
                ("total error, gain-fitted", f"{self.total.fitted_percent:.3f} %"),
                ("total error, unfitted", f"{self.total.unfitted_percent:.3f} %"),
            ]
        for part in (self.aclr, self.mask, self.occupied, self.cubic):
            rows += [] if part is None else part.rows()
        return tuple(rows)

    def table(self) -> Table:
        """Return all figures, for people."""
        return Table(
            title="Fidelity",
            headings=("figure", "value"),
            rows=self.rows(),
            right=frozenset({1}),
        )


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class BeforeAfter:
    """The same figures before and after something was done to a signal.

    Parameters
    ----------
    before, after : Fidelity
        By the same settings.
    """

    before: Fidelity
    after: Fidelity

    def table(self) -> Table:
        """Return both side by side, for people."""
        earlier = dict(self.before.rows())
        rows = tuple((name, earlier.get(name, ""), value) for name, value in self.after.rows())
        return Table(
            title="Fidelity before and after",
            headings=("figure", "before", "after"),
            rows=rows,
            right=frozenset({1, 2}),
        )


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class FidelityProbe:
    """All meters of fidelity on one signal: taps for a rendering, then the result.

    Parameters
    ----------
    signal : Signal
        What is received.
    settings : FidelitySettings
        What is measured.
    probes : tuple of EvmProbe
        One for each source with symbols.
    reference : Signal or None
        What the whole waveform is compared with.
    """

    signal: Signal
    settings: FidelitySettings
    probes: tuple[EvmProbe, ...]
    reference: Signal | None = None

    @classmethod
    def of(
        cls,
        graph: Signal,
        conditioned: Signal | None = None,
        *,
        settings: FidelitySettings | None = None,
        reference: Signal | None = None,
    ) -> FidelityProbe:
        """Return the probe of a graph.

        Parameters
        ----------
        graph : Signal
            What is sent: sources through sums and stages.
        conditioned : Signal, optional
            What is received; ``graph`` itself if not given.
        settings : FidelitySettings, optional
            What is measured.
        reference : Signal, optional
            What the whole waveform is compared with: the signal before a reduction of its peaks.

        Raises
        ------
        SignalError
            As raised on the way to a source.
        """
        chosen = settings or FidelitySettings()
        probes = () if chosen.evm is None else tuple(probes_of(graph, conditioned, chosen.evm))
        return cls(
            signal=graph if conditioned is None else conditioned,
            settings=chosen,
            probes=probes,
            reference=reference,
        )

    def taps(self) -> tuple[Tap, ...]:
        """Return what the first rendering must meter."""
        taps = [
            Tap(name=SPECTRUM, signal=self.signal, meter=self.settings.spectrum),
            Tap(name=CUBIC, signal=self.signal, meter=CubicMeter()),
            *(tap for probe in self.probes for tap in probe.taps()),
        ]
        if self.reference is not None:
            taps.append(total_tap(self.reference, self.signal))
        return tuple(taps)

    def second_taps(self, readings: Mapping[str, Any]) -> tuple[Tap, ...]:
        """Return what a second rendering must meter; empty where one is enough."""
        return tuple(tap for probe in self.probes for tap in probe.second_taps(readings))

    def result(
        self, readings: Mapping[str, Any], second: Mapping[str, Any] | None = None
    ) -> Fidelity:
        """Return all figures.

        Parameters
        ----------
        readings, second : mapping
            Results of the renderings, by tap name.

        Raises
        ------
        SignalError
            The sample rate does not hold the channels or the mask.
        """
        settings, spectrum = self.settings, readings[SPECTRUM]
        ratios = masked = None
        if settings.channels is not None:
            ratios = aclr(
                spectrum,
                carrier=settings.channels.carrier,
                neighbours=settings.channels.neighbours,
                centre_hz=settings.centre_hz,
            )
        if settings.mask is not None:
            masked = check_mask(spectrum, settings.mask, centre_hz=settings.centre_hz)
        return Fidelity(
            spectrum=spectrum,
            occupied=occupied_bandwidth(spectrum),
            cubic=readings[CUBIC],
            evm=tuple(probe.result(readings, second) for probe in self.probes),
            aclr=ratios,
            mask=masked,
            total=readings.get(TOTAL),
        )


def measure_fidelity(
    graph: Signal,
    conditioned: Signal | None = None,
    *,
    settings: FidelitySettings | None = None,
    reference: Signal | None = None,
    workers: int = 1,
    executor: Executor | None = None,
    strip_samples: int | None = None,
    progress: Progress = silent,
) -> Fidelity:
    """Measure every figure of fidelity of one loop.

    Parameters
    ----------
    graph, conditioned, settings, reference
        As in :meth:`FidelityProbe.of`.
    workers, executor, strip_samples, progress
        As in :func:`wavegen.core.render.render`; no figure depends on them.

    Returns
    -------
    Fidelity

    Raises
    ------
    SignalError
        As raised on the way to a source, or by a meter.
    """
    probe = FidelityProbe.of(graph, conditioned, settings=settings, reference=reference)

    def run(taps: tuple[Tap, ...]) -> dict[str, Any]:
        return render(
            probe.signal,
            taps=taps,
            workers=workers,
            executor=executor,
            strip_samples=strip_samples,
            progress=progress,
            task="fidelity",
        )

    first = run(probe.taps())
    more = probe.second_taps(first)
    return probe.result(first, run(more) if more else None)
