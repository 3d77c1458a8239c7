"""A change of sample rate by any exact ratio."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from typing import Annotated

from annotated_types import Gt

from wavegen.core.errors import RecipeError
from wavegen.core.signal import Range, Samples, Signal
from wavegen.core.site import Cycle, Note, Site
from wavegen.core.units import format_hz
from wavegen.dsp.bursts import Bursts
from wavegen.dsp.interpolation import PASSBAND, Interpolator
from wavegen.dsp.pilot import power_beyond
from wavegen.dsp.pulse_shaping import Shaper, plan_shaping
from wavegen.laws.law import Law
from wavegen.laws.operations import filtered_law, filtered_term
from wavegen.laws.term import NoLaw, Term

LARGEST_RATIO = 1024
"""Rates further apart than this are refused: the kernel would outgrow every cache."""
DOUBTFUL_SHARE = 1e-6
"""Power beyond the passband worth a warning: -60 dB."""


@dataclass(frozen=True, eq=False, kw_only=True)
class Resampled(Signal):
    """A signal at another rate; sample 0 stays where it was.

    Parameters
    ----------
    ratio : (int, int)
        Samples out and in of the shortest common cycle.
    """

    ratio: tuple[int, int]

    @cached_property
    def shaper(self) -> Shaper:
        """Return what turns ranges of the input into ranges of the output."""
        return _shaper(*self.ratio, self.inputs[0].n_samples)

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the input under the kernel of samples ``[start, stop)``."""
        return (self.shaper.needs(start, stop),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Return samples ``[start, stop)``."""
        return self.shaper.shape(start, stop, arrays[0])

    def carry(self, bursts: Bursts) -> Bursts:
        """Return the on-times of a gate before the change of rate."""
        return bursts.resampled(Fraction(*self.ratio))


def _shaper(n_out: int, n_in: int, period: int) -> Shaper:
    kernel = Interpolator.between(Fraction(n_out, n_in))
    return plan_shaping(kernel, n_samples=n_out, n_symbols=n_in, period_symbols=period, gain=1.0)


@dataclass(frozen=True, slots=True, kw_only=True)
class Resample:
    """Settings of a change of rate: what comes before runs at a rate of its own.

    Parameters
    ----------
    input_rate_hz : Fraction
        Sample rate of the signal and the stages before this one, Hz; what follows runs at the
        sample rate of the recipe, or at the input rate of the next change. 1/1024 to 1024 of
        that rate.

    Notes
    -----
    A windowed sinc on FFT rows: flat to 0.9 of half the lower rate within 1e-6, images of what
    lies there more than 120 dB down before the float32 arithmetic (about -130 dB) is counted.
    Between 0.9 and 1.1 of half the lower rate the amplitude falls (-6 dB in the middle): power
    there is neither kept nor rejected, and is warned of.
    """

    input_rate_hz: Annotated[Fraction, Gt(0)]

    def upstream_rate(self, sample_rate_hz: Fraction) -> Fraction:
        """Return the rate at which what comes before is built, Hz.

        Parameters
        ----------
        sample_rate_hz : Fraction
            Rate of the output, Hz.
        """
        return self.input_rate_hz

    def cycle(self, sample_rate_hz: Fraction, path: str) -> Cycle:
        """Return the fewest output samples that are whole input samples.

        Parameters
        ----------
        sample_rate_hz : Fraction
            Rate of the output, Hz.
        path : str
            Path of the stage in the recipe.

        Raises
        ------
        RecipeError
            The rates are more than 1024 apart.
        """
        ratio = sample_rate_hz / self.input_rate_hz
        if not Fraction(1, LARGEST_RATIO) <= ratio <= LARGEST_RATIO:
            low, high = sample_rate_hz / LARGEST_RATIO, sample_rate_hz * LARGEST_RATIO
            raise RecipeError(
                where=f"{path}.input_rate",
                problem=f"{format_hz(self.input_rate_hz)} is {float(1 / ratio):.4g} times "
                f"the rate that follows",
                allowed=f"from {format_hz(low)} to {format_hz(high)}",
                remedy="Choose rates that are closer to each other.",
            )
        return Cycle(n_samples=ratio.numerator)

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the signal at the rate of the site; its mean power stays.

        Parameters
        ----------
        site : Site
            Of the output. Warned where the signal has power beyond the passband.
        source : Signal
            At the input rate, with a loop of the same duration.

        Returns
        -------
        Signal
            ``source`` itself where both rates are the same.

        Raises
        ------
        RecipeError
            Rates more than 1024 apart, a source at another rate, or a loop that is no whole
            number of input samples.
        """
        rate_in, rate_out = self.input_rate_hz, site.sample_rate_hz
        self.cycle(rate_out, site.path)
        n_in = site.n_samples * rate_in / rate_out
        if source.sample_rate_hz != rate_in or source.n_samples != n_in:
            raise site.error(
                key="input_rate",
                problem=f"the signal before it has {source.n_samples} samples "
                f"at {format_hz(source.sample_rate_hz)}",
                allowed=f"{float(n_in):.10g} samples at {format_hz(rate_in)}, "
                f"a loop of {site.n_samples} at {format_hz(rate_out)}",
                remedy="Choose a loop that is whole at both rates.",
            )
        if rate_in == rate_out:
            return source
        ratio = rate_out / rate_in
        edge = PASSBAND / 2 * float(min(ratio, Fraction(1)))
        beyond = power_beyond(source, edge)
        if beyond > DOUBTFUL_SHARE:
            text = (
                f"{beyond:.2g} of the power lies beyond {format_hz(edge * float(rate_in))} "
                f"of the centre, where the change of rate keeps no exact amplitude"
            )
            site.notes.append(Note(kind="warning", where=f"{site.path}.input_rate", text=text))
        return Resampled(
            sample_rate_hz=rate_out,
            n_samples=site.n_samples,
            step=_shaper(ratio.numerator, ratio.denominator, source.n_samples).step,
            inputs=(source,),
            mean_power=source.mean_power,
            ratio=(ratio.numerator, ratio.denominator),
        )

    def law(self, site: Site, source: Law) -> Law | NoLaw:
        """Return the law at the new rate: only complex Gaussian signals keep theirs."""
        if self.input_rate_hz == site.sample_rate_hz:
            return source
        return filtered_law(source, how="resampled")

    def term(self, site: Site, source: Term) -> Term | NoLaw:
        """Return the part of a composite at the new rate."""
        if self.input_rate_hz == site.sample_rate_hz:
            return source
        return filtered_term(source, how="resampled")
