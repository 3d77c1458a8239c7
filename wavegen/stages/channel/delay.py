"""A delay by any time, whole samples or parts of one."""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction

from wavegen.core.signal import Range, Samples, Signal
from wavegen.core.site import Note, Site
from wavegen.core.timespan import TimeSpan
from wavegen.core.units import format_hz
from wavegen.dsp.bursts import Bursts
from wavegen.dsp.interpolation import PASSBAND, delay_taps
from wavegen.dsp.overlap_save import Filtered
from wavegen.dsp.pilot import power_beyond
from wavegen.laws.law import Law
from wavegen.laws.operations import DelayedTerm, filtered_law, filtered_term
from wavegen.laws.own_samples import delayed_law
from wavegen.laws.term import NoLaw, Term

DOUBTFUL_SHARE = 1e-6
"""Power beyond the passband worth a warning: an EVM of 0.1 %."""


@dataclass(frozen=True, eq=False, kw_only=True)
class Shifted(Signal):
    """A signal delayed by whole samples.

    Parameters
    ----------
    lag : int
        Delay, samples.
    """

    lag: int

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the range that lies the delay before."""
        return ((start - self.lag, stop - self.lag),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Copy the samples."""
        return arrays[0].copy()

    def carry(self, bursts: Bursts) -> Bursts:
        """Return the on-times of a gate before the delay."""
        return bursts.delayed(Fraction(self.lag))


@dataclass(frozen=True, eq=False, kw_only=True)
class Interpolated(Filtered):
    """A signal delayed by part of a sample, and by the whole samples of ``lag``.

    Parameters
    ----------
    fraction : Fraction
        Part of a sample, -1/2 to 1/2.
    """

    fraction: Fraction = Fraction(0)

    def carry(self, bursts: Bursts) -> Bursts:
        """Return the on-times of a gate before the delay."""
        return bursts.delayed(self.lag + self.fraction)


@dataclass(frozen=True, slots=True, kw_only=True)
class Delay:
    """Settings of a delay, cyclic as the loop is.

    Parameters
    ----------
    delay : TimeSpan
        How much later the signal comes, such as ``2.5 us`` or ``-0.25 samples``; negative is
        earlier.

    Notes
    -----
    Whole samples are exact, bit for bit. A part of a sample is made by a windowed sinc that is
    flat, in amplitude and in delay, to 0.9 of half the sample rate: its error there is below
    -120 dB of the signal, that of the float32 arithmetic about -130 dB. Beyond, the amplitude
    falls (at half the rate itself to ``cos(pi fraction)``); power found there is warned of.
    """

    delay: TimeSpan

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the delayed signal; its mean power stays.

        Parameters
        ----------
        site : Site
            Where it is built. Warned where the signal has power beyond the passband.
        source : Signal
            What is delayed.

        Returns
        -------
        Signal
            ``source`` itself where the delay is nothing, or whole loops.
        """
        wanted = self.delay.samples(source.sample_rate_hz) % source.n_samples
        whole = math.floor(wanted + Fraction(1, 2))
        fraction = wanted - whole
        lag = whole % source.n_samples
        if not fraction:
            return _shifted(source, lag)
        beyond = power_beyond(source, PASSBAND / 2)
        if beyond > DOUBTFUL_SHARE:
            edge = format_hz(source.sample_rate_hz * Fraction(PASSBAND) / 2)
            text = (
                f"{beyond:.2g} of the power lies beyond {edge} of the centre, where a delay by a "
                f"part of a sample loses some; a whole number of samples loses none"
            )
            site.notes.append(Note(kind="warning", where=f"{site.path}.delay", text=text))
        made = Filtered.of(source, delay_taps(float(fraction)), lag=lag)
        return Interpolated(
            sample_rate_hz=made.sample_rate_hz,
            n_samples=made.n_samples,
            step=made.step,
            inputs=made.inputs,
            mean_power=source.mean_power,
            taps=made.taps,
            n_fft=made.n_fft,
            lag=lag,
            fraction=fraction,
        )

    def law(self, site: Site, source: Law) -> Law | NoLaw:
        """Return the law of the input behind whole samples; a part of one is a filter."""
        lag = self.delay.samples(site.sample_rate_hz)
        if lag.denominator == 1:
            return delayed_law(source, int(lag))
        return filtered_law(source, how="delayed by part of a sample")

    def term(self, site: Site, source: Term) -> Term | NoLaw:
        """Return the delayed part of a composite."""
        lag = self.delay.samples(site.sample_rate_hz)
        if lag.denominator == 1:
            return DelayedTerm.of(source, int(lag))
        return filtered_term(source, how="delayed by part of a sample")


def _shifted(source: Signal, lag: int) -> Signal:
    if not lag:
        return source
    return Shifted(
        sample_rate_hz=source.sample_rate_hz,
        n_samples=source.n_samples,
        inputs=(source,),
        mean_power=source.mean_power,
        lag=lag,
    )
