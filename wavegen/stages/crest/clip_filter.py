"""Clip and filter, repeated: peaks are clipped, and only what falls into the band is kept.

J. Armstrong, "Peak-to-average power reduction for OFDM by repeated clipping and frequency domain
filtering", Electronics Letters 38(5), 2002, 246-247. Filtered is here what the clip takes away,
not what it leaves: for a signal inside its band that is the same, and what lies outside is left
as it was.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, ClassVar

import numpy as np
from annotated_types import Ge, Le

from wavegen.core.signal import Range, Samples, Signal
from wavegen.core.site import Site
from wavegen.dsp.band_filter import BandFilter
from wavegen.dsp.row_kernels import put_excess, take_difference
from wavegen.stages.in_band import InBand, Method, reduce_in_band, repeat_rounds
from wavegen.stages.passband import FilledBand
from wavegen.stages.searchable import Choice, Searchable


@dataclass(frozen=True, eq=False, kw_only=True)
class ClipFilterRound(Signal):
    """A signal less the part of its excess that lies in the band, times a gain.

    Parameters
    ----------
    amplitude : float
        Where it is clipped.
    band : BandFilter
        What passes may be changed.
    gain : float
        Amplitude ratio of the whole.
    """

    amplitude: float
    band: BandFilter
    gain: float = 1.0

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the range with the filter's halo."""
        reach = self.band.half_length
        return ((start - reach, stop + reach),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Clip, filter the excess, subtract."""
        source, out = arrays[0], np.empty(stop - start, np.complex64)
        half, hop = self.band.half_length, self.band.hop

        def put(rows: Samples, low: int) -> None:
            put_excess(rows, source[low:], hop=hop, amplitude=self.amplitude)

        def take(rows: Samples, low: int, high: int) -> None:
            base = source[half + low : half + high]
            take_difference(out[low:high], base, rows, half=half, hop=hop, gain=self.gain)

        self.band.run(out.size, put, take)
        return out


@dataclass(frozen=True, slots=True, kw_only=True)
class ClipFilter(InBand):
    """Settings of repeated clipping and filtering.

    Parameters
    ----------
    ceiling_db : float
        Where every round clips, over the mean power of the output, dB; 0.1 to 60. Of a gated
        signal, over the mean of the on-time. Filtering lets peaks grow back: the more rounds,
        the less.
    passbands : tuple of Passband
        Bands of the signal, where distortion is allowed; found on the signal if not given.
    transition_hz : Fraction, optional
        Width of each edge of the bands, outside them, Hz.
    rounds : int
        How often it is clipped and filtered; 1 to 64. Each costs a pair of transforms.
    """

    search: ClassVar[Searchable] = Searchable(
        choices=(Choice(field="rounds", values=(1, 2, 4, 8, 16, 32)),), pairs="rounds"
    )

    rounds: Annotated[int, Ge(1), Le(64)] = 8

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the signal after all rounds, at the mean power it had before.

        Parameters
        ----------
        site : Site
            Where it is built. Told of the band, the clip amplitude over the mean of the input,
            the change of mean power that is undone, and the peaks that are left.
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
            band = filled.band_filter

            def process(amplitude: float, gain: float) -> Signal:
                def one(source: Signal, *, mean_power: float | None, gain: float) -> Signal:
                    return ClipFilterRound(
                        sample_rate_hz=source.sample_rate_hz,
                        n_samples=source.n_samples,
                        step=band.hop,
                        inputs=(source,),
                        mean_power=mean_power,
                        amplitude=amplitude,
                        band=band,
                        gain=gain,
                    )

                return repeat_rounds(source, self.rounds, one, gain)

            return Method(
                process=process,
                action=f"clips {self.rounds} times" if self.rounds > 1 else "clips once",
                halo=self.rounds * band.half_length,
            )

        return reduce_in_band(site, source, self, method)
