"""Stages in a row: at which rate each runs, on which loop, and how they are built."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import replace
from fractions import Fraction
from math import lcm
from typing import Protocol, runtime_checkable

from wavegen.core.errors import RecipeError
from wavegen.core.signal import Signal
from wavegen.core.site import Cycle, Site, StageSettings
from wavegen.core.units import format_hz
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw, Term


@runtime_checkable
class SetsRate(Protocol):
    """A stage whose input runs at another rate than its output."""

    def upstream_rate(self, sample_rate_hz: Fraction) -> Fraction:
        """Return the rate of the input, Hz, for that of the output."""


@runtime_checkable
class SetsCycle(Protocol):
    """A stage that has a say in the length of the loop."""

    def cycle(self, sample_rate_hz: Fraction, path: str) -> Cycle:
        """Return the shortest loop at the output's rate."""


@runtime_checkable
class HasLaw(Protocol):
    """A stage that says what becomes of a law."""

    def law(self, site: Site, source: Law) -> Law | NoLaw:
        """Return the law of the output for that of the input; none by name.

        ``site`` is that of the output, as in ``build``; it takes no notes here.
        """


@runtime_checkable
class HasTerm(Protocol):
    """A stage that says what becomes of a part of a composite."""

    def term(self, site: Site, source: Term) -> Term | NoLaw:
        """Return the term of the output for that of the input; none by name."""


def rates_of(stages: Sequence[StageSettings], sample_rate_hz: Fraction) -> list[Fraction]:
    """Return the rate of the source and of each stage's output.

    Parameters
    ----------
    stages : sequence of stage settings
        In the order of the signal.
    sample_rate_hz : Fraction
        Rate behind the last, Hz.

    Returns
    -------
    list of Fraction, one more than there are stages
        The first is the rate at which the source is built.
    """
    rates = [sample_rate_hz]
    for stage in reversed(stages):
        rate = rates[0]
        rates.insert(0, stage.upstream_rate(rate) if isinstance(stage, SetsRate) else rate)
    return rates


def chain_cycle(
    source: Cycle, stages: Sequence[StageSettings], sample_rate_hz: Fraction, path: str
) -> Cycle:
    """Return the shortest loop of a source behind its stages.

    Parameters
    ----------
    source : Cycle
        Of the source, at the first of :func:`rates_of`.
    stages : sequence of stage settings
        In the order of the signal.
    sample_rate_hz : Fraction
        Rate behind the last, Hz.
    path : str
        Path of the list of stages: ``stages`` or ``signal.parts[0].stages``.

    Returns
    -------
    Cycle
        At ``sample_rate_hz``: whole cycles of the source and of every stage.

    Raises
    ------
    RecipeError
        As raised by a stage.
    """
    rates = rates_of(stages, sample_rate_hz)
    n_samples, rate_before = source.n_samples, rates[0]
    for number, (stage, rate) in enumerate(zip(stages, rates[1:], strict=True)):
        n_samples = (n_samples * rate / rate_before).numerator  # whole at both rates
        rate_before = rate
        if isinstance(stage, SetsCycle):
            n_samples = lcm(n_samples, stage.cycle(rate, f"{path}[{number}]").n_samples)
    symbols = Fraction(source.n_symbols, source.n_samples) * rates[0] / sample_rate_hz
    return Cycle(n_samples=n_samples, n_symbols=int(symbols * n_samples))


def source_site(stages: Sequence[StageSettings], site: Site) -> Site:
    """Return the site of the source of a chain.

    Parameters
    ----------
    stages : sequence of stage settings
        In the order of the signal.
    site : Site
        Of the source, but at the rate and on the loop of the end of the chain.

    Returns
    -------
    Site
        At the rate of the source, on a loop of the same duration.

    Raises
    ------
    RecipeError
        The loop is no whole number of samples at that rate.
    """
    return _at_rate(site, rates_of(stages, site.sample_rate_hz)[0])


def build_chain(stages: Sequence[StageSettings], site: Site, source: Signal, path: str) -> Signal:
    """Build stages in a row.

    Parameters
    ----------
    stages : sequence of stage settings
        In the order of the signal.
    site : Site
        At the rate and on the loop of the end of the chain; its label and notes are used.
    source : Signal
        Built at :func:`source_site`.
    path : str
        Path of the list of stages.

    Returns
    -------
    Signal

    Raises
    ------
    RecipeError
        As raised by a stage, or the loop is not whole at one of the rates.
    """
    for number, (stage, rate) in enumerate(
        zip(stages, rates_of(stages, site.sample_rate_hz)[1:], strict=True)
    ):
        here = site.at(f"{path}[{number}]", site.label)
        source = stage.build(_at_rate(here, rate), source)
    return source


def chain_law(
    stages: Sequence[StageSettings], site: Site, source: Law | NoLaw, path: str
) -> Law | NoLaw:
    """Return the law behind stages in a row.

    Parameters
    ----------
    stages, site, path
        As in :func:`build_chain`.
    source : Law or NoLaw
        Of the source.

    Returns
    -------
    Law or NoLaw
        No law, by name, from the first stage on that leaves none.
    """
    rates = rates_of(stages, site.sample_rate_hz)[1:]
    for number, (stage, rate) in enumerate(zip(stages, rates, strict=True)):
        if isinstance(source, NoLaw):
            return source
        if not isinstance(stage, HasLaw):
            return NoLaw(reason=f"{source.name}, then {_words(stage)}, has no law")
        here = site.at(f"{path}[{number}]", site.label)
        source = stage.law(_at_rate(here, rate), source)
    return source


def chain_term(
    stages: Sequence[StageSettings], site: Site, source: Term | NoLaw, path: str
) -> Term | NoLaw:
    """Return what a part of a composite is behind stages in a row; as :func:`chain_law`."""
    rates = rates_of(stages, site.sample_rate_hz)[1:]
    for number, (stage, rate) in enumerate(zip(stages, rates, strict=True)):
        if isinstance(source, NoLaw):
            return source
        if not isinstance(stage, HasTerm):
            return NoLaw(reason=f"{source.name}, then {_words(stage)}, has no law")
        here = site.at(f"{path}[{number}]", site.label)
        source = stage.term(_at_rate(here, rate), source)
    return source


def _words(stage: StageSettings) -> str:
    """Return the name of a stage's class in words."""
    return re.sub(r"(?<!^)([A-Z])", r" \1", type(stage).__name__).lower()


def _at_rate(site: Site, rate: Fraction) -> Site:
    n_samples = site.n_samples * rate / site.sample_rate_hz
    if n_samples.denominator != 1:
        raise RecipeError(
            where=site.path,
            problem=f"a loop of {site.n_samples} samples at {format_hz(site.sample_rate_hz)} is "
            f"{float(n_samples):.10g} samples at {format_hz(rate)}",
            allowed="loops that are whole at every rate",
            remedy="Choose another duration, or rates of a simpler ratio.",
        )
    return replace(site, sample_rate_hz=rate, n_samples=int(n_samples))
