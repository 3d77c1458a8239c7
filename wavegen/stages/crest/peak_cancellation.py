"""Peak cancellation: a band-limited pulse is subtracted at each peak.

J. Song, H. Ochiai, "Performance analysis for OFDM signals with peak cancellation", EURASIP
J. Wireless Communications and Networking 2015:85. Which samples are peaks is decided by their
neighbours alone, so that strips need no history.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, ClassVar, Literal

import numpy as np
from annotated_types import Ge, Le

from wavegen.core.signal import Range, Samples, Signal
from wavegen.core.site import Site
from wavegen.dsp.band_filter import BandFilter
from wavegen.dsp.occupied_bands import design_pulse
from wavegen.dsp.peak_rows import put_peaks
from wavegen.dsp.row_kernels import take_difference
from wavegen.stages.in_band import InBand, Method, reduce_in_band, repeat_rounds
from wavegen.stages.passband import FilledBand
from wavegen.stages.searchable import Choice, Searchable

LONGEST_LOBE = 64
"""Samples compared on each side of a peak, at most."""


def half_lobe(pulse: BandFilter) -> int:
    """Return half the half-width of a pulse's main lobe, samples: peaks nearer are one peak.

    Parameters
    ----------
    pulse : BandFilter
        1 in the middle.

    Returns
    -------
    int
        Half the lag at which the magnitude stops falling; 1 to 64.
    """
    size = np.abs(pulse.taps[pulse.half_length :])
    rising = np.flatnonzero(np.diff(size) > 0)
    first = int(rising[0]) if rising.size else size.size - 1
    return min(max(round(first / 2), 1), LONGEST_LOBE)


@dataclass(frozen=True, eq=False, kw_only=True)
class CancellationPass(Signal):
    """A signal less one pulse for each of its peaks, times a gain.

    Parameters
    ----------
    amplitude : float
        Where peaks are brought down to.
    pulse : BandFilter
        1 in the middle.
    reach : int
        A peak is the highest sample within so many on each side.
    gain : float
        Amplitude ratio of the whole.
    """

    amplitude: float
    pulse: BandFilter
    reach: int
    gain: float = 1.0

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the range with the pulse's halo and the neighbours of the outermost peaks."""
        halo = self.pulse.half_length + self.reach
        return ((start - halo, stop + halo),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Find the peaks, place their excess, shape it with the pulse, subtract."""
        source, out = arrays[0], np.empty(stop - start, np.complex64)
        half, hop, reach = self.pulse.half_length, self.pulse.hop, self.reach

        def put(rows: Samples, low: int) -> None:
            put_peaks(rows, source[low:], hop=hop, reach=reach, amplitude=self.amplitude)

        def take(rows: Samples, low: int, high: int) -> None:
            base = source[half + reach + low : half + reach + high]
            take_difference(out[low:high], base, rows, half=half, hop=hop, gain=self.gain)

        self.pulse.run(out.size, put, take)
        return out


@dataclass(frozen=True, slots=True, kw_only=True)
class PeakCancellation(InBand):
    """Settings of peak cancellation.

    Parameters
    ----------
    ceiling_db : float
        Where each peak is brought down to, over the mean power of the output, dB; 0.1 to 60. Of
        a gated signal, over the mean of the on-time. Pulses add up, so that some peaks stay
        above: the more passes, the fewer.
    passbands : tuple of Passband
        Bands of the signal, where distortion is allowed; found on the signal if not given.
    transition_hz : Fraction, optional
        Width of each edge of the bands, outside them, Hz.
    passes : int
        How often peaks are looked for and cancelled; 1 to 32. Each costs a pair of transforms.
    pulse : {"spectrum", "band"}
        A pulse whose power spectrum has the shape of the signal's own, so that every carrier of
        a composite bears its share; or one that is flat over the bands.
    """

    search: ClassVar[Searchable] = Searchable(
        choices=(
            Choice(field="passes", values=(1, 2, 4, 8, 16, 32)),
            Choice(field="pulse", values=("spectrum", "band"), is_ordered=False),
        ),
        pairs="passes",
    )

    passes: Annotated[int, Ge(1), Le(32)] = 4
    pulse: Literal["spectrum", "band"] = "spectrum"

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the signal after all passes, at the mean power it had before.

        Parameters
        ----------
        site : Site
            Where it is built. Told of the band, the amplitude over the mean of the input, the
            change of mean power that is undone, and the peaks that are left.
        source : Signal
            What is reduced; parts of it are read here.

        Returns
        -------
        Signal
            ``source`` itself where it never reaches the ceiling.

        Raises
        ------
        RecipeError
            The source is zero, a passband lies outside the sampled band, or no amplitude gives
            the ceiling.
        """

        def method(filled: FilledBand) -> Method:
            pulse = self._pulse_for(filled)
            reach = half_lobe(pulse)

            def process(amplitude: float, gain: float) -> Signal:
                def one(source: Signal, *, mean_power: float | None, gain: float) -> Signal:
                    return CancellationPass(
                        sample_rate_hz=source.sample_rate_hz,
                        n_samples=source.n_samples,
                        step=pulse.hop,
                        inputs=(source,),
                        mean_power=mean_power,
                        amplitude=amplitude,
                        pulse=pulse,
                        reach=reach,
                        gain=gain,
                    )

                return repeat_rounds(source, self.passes, one, gain)

            times = f"in {self.passes} passes" if self.passes > 1 else "once"
            return Method(
                process=process,
                action=f"cancels peaks {times}",
                halo=self.passes * (pulse.half_length + reach),
            )

        return reduce_in_band(site, source, self, method)

    def _pulse_for(self, filled: FilledBand) -> BandFilter:
        """Return the pulse, 1 in its middle."""
        band = filled.band_filter
        if self.pulse == "spectrum" and band.half_length:
            return BandFilter(
                design_pulse(
                    filled.spectrum,
                    filled.bands,
                    half_length=band.half_length,
                    widened=filled.transition / 2,
                )
            )
        return BandFilter(band.taps / band.taps[band.half_length].real)
