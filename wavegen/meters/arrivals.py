"""Every source of a graph with symbols, and how it stands in what a receiver gets."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from wavegen.core.errors import SignalError
from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.dsp.arrival import Arrival, bring_back
from wavegen.dsp.overlap_save import Filtered
from wavegen.sources.reception import Receivable, Reception
from wavegen.stages.channel.delay import Interpolated, Shifted
from wavegen.stages.channel.gate import Gated
from wavegen.stages.channel.resample import Resample, Resampled
from wavegen.stages.channel.scale import Scaled
from wavegen.stages.combine.sum import Summed

SYMMETRY = 1e-6
"""Largest difference of mirrored taps, over the largest tap, of a filter with one delay."""


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class LocatedSource:
    """A source in the composite.

    Parameters
    ----------
    path : str
        Which: ``signal`` or ``parts[1]``, ``parts[1].parts[0]`` of nested sums.
    source : Signal
        The source.
    conditioned : Signal
        What a receiver gets, at the source's own sample rate.
    arrival : Arrival
        How the source stands in it.
    is_alone : bool
        Whether nothing else is in the composite; else the others' leakage into its band, or into
        its transform, counts as error.
    """

    path: str
    source: Signal
    conditioned: Signal
    arrival: Arrival
    is_alone: bool

    @property
    def has_symbols(self) -> bool:
        """Whether a receiver can find symbols of it."""
        return isinstance(self.source, Receivable)

    def reception(self, *, early_samples: int | None = None) -> Reception:
        """Return what was sent and what is received.

        Parameters
        ----------
        early_samples : int, optional
            OFDM: how long before the useful part the transform begins.

        Raises
        ------
        SignalError
            The source has no symbols to be found, or no filter that finds them.
        """
        if not isinstance(self.source, Receivable):
            kind = type(self.source).__name__
            raise SignalError(
                where=self.path,
                problem=f"{kind} has no symbols that a linear receiver finds",
                allowed="single carriers and OFDM",
                remedy="Leave it out of the EVM.",
            )
        return self.source.receive(self.conditioned, self.arrival, early_samples=early_samples)


def locate_sources(graph: Signal, conditioned: Signal | None = None) -> list[LocatedSource]:
    """Return every source of a graph, with its arrival collected along sums and stages.

    Parameters
    ----------
    graph : Signal
        What is sent: sources through sums and stages.
    conditioned : Signal, optional
        What a receiver gets, of the same rate and loop; ``graph`` itself if not given. Give it
        where the samples are stored, or where a device was measured.

    Returns
    -------
    list of LocatedSource
        In the order of the recipe; sources without symbols too.

    Raises
    ------
    SignalError
        A gate on the way, or samples of another length.

    Notes
    -----
    Levels, delays, shifts in frequency and changes of rate are followed. A filter counts with
    the delay of its middle tap if its taps are symmetrical, which they are in designed bands;
    else with the centre of their energy, which is remarked. What else has an input of its own
    length and rate (crest reduction, devices) keeps time.
    """
    seen = graph if conditioned is None else conditioned
    if (seen.n_samples, seen.sample_rate_hz) != (graph.n_samples, graph.sample_rate_hz):
        raise SignalError(
            where="signal",
            problem=f"{seen.n_samples} samples are received of a loop of {graph.n_samples}",
            allowed="the same loop at the same sample rate",
            remedy="Bring what is received to the rate and length of what is sent.",
        )
    found = list(_walk(graph, seen, Arrival(n_samples=seen.n_samples), ""))
    return [
        LocatedSource(
            path=path or "signal",
            source=source,
            conditioned=received,
            arrival=arrival,
            is_alone=len(found) == 1,
        )
        for path, source, received, arrival in found
    ]


def _walk(
    node: Signal, seen: Signal, arrival: Arrival, path: str
) -> Iterator[tuple[str, Signal, Signal, Arrival]]:
    if isinstance(node, Receivable):
        yield path, node, seen, arrival
        return
    if isinstance(node, Summed):
        for number, (part, place) in enumerate(zip(node.inputs, node.placements, strict=True)):
            there = arrival.placed(
                n_cycles=place.n_cycles, gain=place.gain, phase_rad=place.phase_rad
            )
            here = f"{path}.parts[{number}]" if path else f"parts[{number}]"
            yield from _walk(part, seen, there, here)
        return
    if isinstance(node, Gated):
        raise SignalError(
            where=path or "signal",
            problem="symbols are cut by a gate, and the pulses of those that are left with them",
            allowed="EVM of signals that are on all the time",
            remedy="Measure the EVM without the gate.",
        )
    if isinstance(node, Resampled):
        inner = node.inputs[0]
        seen, arrival = _at_rate_of(inner, seen, arrival, path)
        yield from _walk(inner, seen, arrival, path)
        return
    kept = [
        source
        for source in node.inputs
        if (source.n_samples, source.sample_rate_hz) == (node.n_samples, node.sample_rate_hz)
    ]
    if not kept:
        yield path, node, seen, arrival
        return
    yield from _walk(kept[0], seen, _past(node, arrival), path)


def _past(node: Signal, arrival: Arrival) -> Arrival:
    """Return the arrival of the input of a stage that keeps rate and length."""
    if isinstance(node, Scaled):
        return arrival.placed(n_cycles=0, gain=node.gain, phase_rad=0.0)
    if isinstance(node, Shifted):
        return arrival.delayed(Fraction(node.lag))
    if isinstance(node, Interpolated):
        return arrival.delayed(node.lag + node.fraction)
    if isinstance(node, Filtered):
        centre, is_symmetric = _centre(node)
        there = arrival.delayed(node.lag + centre)
        if is_symmetric:
            return there
        return there.remarked("a filter on the way has no single delay: its taps are not symmetric")
    return arrival


def _centre(node: Filtered) -> tuple[Fraction, bool]:
    """Return where the taps are centred, from the middle one, and whether they mirror there."""
    size = np.abs(node.taps)
    heard = np.flatnonzero(size > SYMMETRY * size.max())
    first, last = int(heard[0]), int(heard[-1])
    taps = node.taps[first : last + 1]
    difference = np.abs(taps - np.conj(taps[::-1]))
    if difference.max() <= SYMMETRY * size.max():
        return Fraction(first + last, 2) - node.half_length, True
    lags = np.arange(node.taps.size) - node.half_length
    return Fraction(round(float(np.sum(lags * size**2) / np.sum(size**2)))), False


def _at_rate_of(inner: Signal, seen: Signal, arrival: Arrival, path: str) -> tuple[Signal, Arrival]:
    """Return what is received at the rate before a change of rate, and an arrival in it."""
    site = Site(
        sample_rate_hz=inner.sample_rate_hz,
        n_samples=inner.n_samples,
        seed=0,
        label=path or "signal",
        path=path or "signal",
    )
    back = Resample(input_rate_hz=seen.sample_rate_hz).build(site, bring_back(seen, arrival))
    remarks = (*arrival.remarks, *(note.text for note in site.notes))
    return back, Arrival(n_samples=inner.n_samples, remarks=remarks)
