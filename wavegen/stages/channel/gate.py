"""On-off keying of a whole signal: bursts with ramps, exact zeros between them."""

from __future__ import annotations

from dataclasses import dataclass, replace
from fractions import Fraction
from typing import Annotated, Protocol, runtime_checkable

import numpy as np
from annotated_types import Gt, Le, MaxLen, MinLen
from numpy.typing import NDArray

from wavegen.core.errors import RecipeError
from wavegen.core.signal import Samples, Signal
from wavegen.core.site import Cycle, Note, Site
from wavegen.core.timespan import TimeSpan
from wavegen.core.units import QuantityError, format_s
from wavegen.dsp.bursts import LONGEST_TABLE, Bursts, raised_cosine_ramp
from wavegen.laws.law import Law
from wavegen.laws.mapped import GatedLaw
from wavegen.laws.operations import GatedTerm
from wavegen.laws.own_samples import LONGEST, gate_samples, own_samples
from wavegen.laws.term import NoLaw, Term

NO_TIME = TimeSpan(Fraction(0), "samples")
NEITHER = (False, False)
MOST_RAMP_AMPLITUDES = 256
"""Amplitudes that stand for a ramp in a law; their mean square is the ramp's."""


@dataclass(frozen=True, eq=False, kw_only=True)
class Gated(Signal):
    """A signal while it is on, zeros while it is off.

    Parameters
    ----------
    gate : Bursts
        When it is on; the period divides the loop.
    """

    gate: Bursts

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Copy what is on, weigh the ramps."""
        return self.gate.apply(arrays[0], start)

    def is_on(self, start: int, stop: int) -> NDArray[np.bool_]:
        """Return which samples are fully on, ramps excluded; shape (stop - start,)."""
        return self.gate.is_on(start, stop)

    def bursts(self, n_samples: int) -> list[tuple[int, int]]:
        """Return first sample and length (ramps included) of the bursts of a loop."""
        return self.gate.starts(n_samples)


@runtime_checkable
class MovesBursts(Protocol):
    """A signal that comes later, or at another rate, than its only input."""

    def carry(self, bursts: Bursts) -> Bursts:
        """Return the on-times at its output for those at its input."""


@runtime_checkable
class ActsOn(Protocol):
    """A signal of several inputs, all made of one of them: it is on when that is."""

    @property
    def acts_on(self) -> Signal:
        """The input that decides."""


def on_time(signal: Signal) -> Bursts | None:
    """Return when a signal is on, if one gate decides that for all of it.

    Parameters
    ----------
    signal : Signal
        The end of a chain.

    Returns
    -------
    Bursts or None
        On the signal's own axis. None if there is no gate between it and its source, or the
        next sum of several parts: a gate of one part is not one of the sum. Of several gates in
        the chain the outermost counts, the one that acted last. Delays and changes of rate
        after the gate are followed; what a filter after it adds at the edges of a burst belongs
        to no on-time.
    """
    passed: list[MovesBursts] = []
    while not isinstance(signal, Gated):
        if isinstance(signal, ActsOn):
            signal = signal.acts_on
            continue
        if len(signal.inputs) != 1:
            return None
        if isinstance(signal, MovesBursts):
            passed.append(signal)
        signal = signal.inputs[0]
    bursts = signal.gate
    for mover in reversed(passed):
        bursts = mover.carry(bursts)
    return bursts


@dataclass(frozen=True, slots=True, kw_only=True)
class Gate:
    """Settings of a periodic gate: a pattern of slots, or a duty over a period.

    Parameters
    ----------
    pattern : str, optional
        One period of slots, 1 on and 0 off, in quotes: ``"1101"``. Slots in a row make one
        burst, also over the end of the pattern.
    slot : TimeSpan, optional
        Length of each slot of the pattern; whole samples.
    duty_percent : Fraction, optional
        On-time over the period, ramps included, percent; the burst begins the period.
    period : TimeSpan, optional
        Of the duty; whole samples.
    ramp : TimeSpan
        Raised-cosine ramp in amplitude at both ends of each burst, inside its on-time; shorter
        than half of it.

    Notes
    -----
    The signal has its own power while fully on, so its mean power is lowered by the duty, the
    ramps counted as they are. Statistics of the on-time leave the ramps out.
    """

    pattern: Annotated[str, MinLen(1), MaxLen(10_000)] | None = None
    slot: TimeSpan | None = None
    duty_percent: Annotated[Fraction, Gt(0), Le(100)] | None = None
    period: TimeSpan | None = None
    ramp: TimeSpan = NO_TIME

    def __post_init__(self) -> None:
        """Refuse anything but one of the two forms, and times that are none."""
        by_pattern = (self.pattern is not None, self.slot is not None)
        by_duty = (self.duty_percent is not None, self.period is not None)
        if (by_pattern, by_duty) not in {((True, True), NEITHER), (NEITHER, (True, True))}:
            raise QuantityError(
                problem="it is not said when the gate is on",
                allowed="pattern with slot, or duty with period",
                remedy='Write it like pattern: "1101", slot: 0.5 ms or duty: 25 %, period: 1 ms.',
            )
        if self.pattern is not None and (set(self.pattern) - {"0", "1"} or "1" not in self.pattern):
            raise QuantityError(
                problem=f"{self.pattern[:40]!r} is no pattern of slots",
                allowed="1 for on and 0 for off, at least one of them on",
                remedy='Write it like "1101".',
                key="pattern",
            )
        for key, span in (("slot", self.slot), ("period", self.period), ("ramp", self.ramp)):
            if span is not None and (span.value < 0 or (not span.value and key != "ramp")):
                raise QuantityError(
                    problem=f"{span} is no length",
                    allowed="0 or more" if key == "ramp" else "more than 0",
                    remedy="Give a longer one.",
                    key=key,
                )

    def cycle(self, sample_rate_hz: Fraction, path: str) -> Cycle:
        """Return the period of the gate: every loop is a whole number of them.

        Parameters
        ----------
        sample_rate_hz : Fraction
            Hz.
        path : str
            Path of the stage in the recipe.

        Returns
        -------
        Cycle

        Raises
        ------
        RecipeError
            A slot or a period is not a whole number of samples.
        """
        key, span, count = self._unit()
        length = span.samples(sample_rate_hz)
        if length.denominator != 1:
            near = max(round(length), 1) / sample_rate_hz
            raise RecipeError(
                where=f"{path}.{key}",
                problem=f"{span} is {float(length):.10g} samples",
                allowed="a whole number of samples",
                remedy=f"Write {format_s(near)}, or samples, if that is meant.",
            )
        return Cycle(n_samples=int(length) * count)

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the gated signal.

        Parameters
        ----------
        site : Site
            Where it is built. Told of an on-time or a ramp that was rounded to whole samples.
        source : Signal
            What is gated.

        Returns
        -------
        Signal
            ``source`` itself where the gate is always on.

        Raises
        ------
        RecipeError
            Slot or period no whole number of samples, a loop that is no whole number of
            periods, ramps that leave nothing fully on, or an on-time of less than a sample.
        """
        rate = source.sample_rate_hz
        period = self.cycle(rate, site.path).n_samples
        if source.n_samples % period:
            raise site.error(
                key=self._unit()[0],
                problem=f"the gate repeats after {period} samples, "
                f"which do not divide the loop of {source.n_samples}",
                allowed="a loop of whole periods of the gate",
                remedy=f"Use a loop of a multiple of {format_s(period / rate)}.",
            )
        bursts = self._bursts(site, rate, period)
        if bursts is None:
            return source
        return Gated(
            sample_rate_hz=rate,
            n_samples=source.n_samples,
            inputs=(source,),
            mean_power=None if source.mean_power is None else source.mean_power * bursts.mean_gain,
            gate=bursts,
        )

    def law(self, site: Site, source: Law) -> Law | NoLaw:
        """Return the law of the whole, over its mean; ``on_time`` of it is that of the on-time."""
        bursts = self._quiet_bursts(site)
        if bursts is None:
            return source
        own = own_samples(source)
        if own is not None and bursts.period_samples <= LONGEST:
            ones = np.ones(bursts.period_samples, np.complex64)
            gains = bursts.apply(ones, 0).real.astype(np.float64)
            found = gate_samples(own, gains, bursts.is_on(0, bursts.period_samples))
            if found is not None:
                return found
        ramps = 2 * bursts.ramp_samples * len(bursts.runs)
        return GatedLaw(
            source=source,
            duty_fully_on=float(bursts.duty_fully_on),
            ramp=raised_cosine_ramp(min(bursts.ramp_samples, MOST_RAMP_AMPLITUDES)),
            ramp_share=ramps / bursts.period_samples,
        )

    def term(self, site: Site, source: Term) -> Term | NoLaw:
        """Return the gated part of a composite."""
        bursts = self._quiet_bursts(site)
        if bursts is None:
            return source
        if bursts.period_samples > LONGEST_TABLE:
            return NoLaw(
                reason=f"{source.name}, gated, repeats after {bursts.period_samples} samples"
            )
        ones = np.ones(bursts.period_samples, np.complex64)
        return GatedTerm.of(source, bursts.apply(ones, 0).real.astype(np.float64))

    def _quiet_bursts(self, site: Site) -> Bursts | None:
        """Return the on-times without telling of rounding again."""
        period = self.cycle(site.sample_rate_hz, site.path).n_samples
        return self._bursts(replace(site, notes=[]), site.sample_rate_hz, period)

    def _unit(self) -> tuple[str, TimeSpan, int]:
        """Return the key that sets the period, its length, and how many make a period."""
        if self.pattern is not None and self.slot is not None:
            return "slot", self.slot, len(self.pattern)
        return "period", self.period or NO_TIME, 1

    def _bursts(self, site: Site, rate: Fraction, period: int) -> Bursts | None:
        if self.pattern is not None:
            if "0" not in self.pattern:
                return None
            slots = tuple(slot == "1" for slot in self.pattern)
            bursts = Bursts.of_slots(slots, period // len(slots))
        else:
            on = _rounded(site, "duty", (self.duty_percent or 0) * Fraction(period, 100), rate)
            if on == period:
                return None
            if not on:
                raise site.error(
                    key="duty",
                    problem="the on-time is less than half a sample",
                    allowed="on-times from one sample on",
                    remedy="Raise the duty, or lengthen the period.",
                )
            bursts = Bursts(period_samples=period, runs=((0, on),))
        ramp = _rounded(site, "ramp", self.ramp.samples(rate), rate)
        if 2 * ramp >= bursts.shortest_samples:
            raise site.error(
                key="ramp",
                problem=f"two ramps of {ramp} samples leave nothing fully on "
                f"of a burst of {bursts.shortest_samples}",
                allowed=f"up to {(bursts.shortest_samples - 1) // 2} samples",
                remedy="Shorten the ramp, or lengthen the on-time.",
            )
        return Bursts(period_samples=period, runs=bursts.runs, ramp_samples=ramp)


def _rounded(site: Site, key: str, length: Fraction, rate: Fraction) -> int:
    """Return whole samples, and say so where they are not what was asked."""
    whole = round(length)
    if whole != length:
        site.notes.append(
            Note(
                kind="rounded",
                where=f"{site.path}.{key}",
                text=f"rounded to {whole} whole samples",
                asked=format_s(length / rate),
                given=format_s(whole / rate),
            )
        )
    return whole
