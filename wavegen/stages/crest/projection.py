"""Least-distortion projection: the nearest signal under a ceiling, changed in its band only.

The dual problem is solved by accelerated proximal steps (:mod:`wavegen.dsp.dual_projection`, with
its sources); a last, smooth gain makes the ceiling hold at every sample. One ceiling for the whole
signal is the right problem: of all signals that differ from the source inside its bands only and
keep below that ceiling this one has the least error.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from typing import Annotated, ClassVar

from annotated_types import Ge, Gt, Le

from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.dsp.dual_projection import hold_below, project
from wavegen.stages.ceiling import look, reduce_to, refuse_zero
from wavegen.stages.passband import Passband, filled_band
from wavegen.stages.searchable import Choice, Searchable


@dataclass(frozen=True, slots=True, kw_only=True)
class Projection:
    """Settings of a least-distortion projection.

    Parameters
    ----------
    ceiling_db : float
        Highest envelope power of the output, at its samples, over its mean power, dB; 0.1 to
        60. Of a gated signal, over the mean of the on-time.
    rounds : int
        Accelerated steps, each a pair of transforms; 1 to 200. At 4 times the band 20 come
        within 0.05 dB of the optimum, 50 within 0.02 dB; at 8 times about twice as many.
    passbands : tuple of Passband
        Bands of the signal, where distortion is allowed; found on the signal if not given.
    transition_hz : Fraction, optional
        Width of each edge of the bands, outside them, Hz.
    """

    search: ClassVar[Searchable] = Searchable(
        choices=(Choice(field="rounds", values=(10, 20, 50)),), pairs="rounds"
    )

    ceiling_db: Annotated[float, Ge(0.1), Le(60)]
    rounds: Annotated[int, Ge(1), Le(200)] = 20
    passbands: tuple[Passband, ...] = ()
    transition_hz: Annotated[Fraction, Gt(0)] | None = None

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the projected signal, at the mean power it had before.

        Parameters
        ----------
        site : Site
            Where it is built. Told of the band, the ceiling over the mean of the input, the
            change of mean power that is undone, and the peaks between samples.
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
        filled = filled_band(
            site, source, passbands=self.passbands, transition_hz=self.transition_hz
        )
        if filled is None:
            raise refuse_zero(site, self.ceiling_db)
        band = filled.band_filter
        half = max(band.half_length, 1)

        def process(amplitude: float, gain: float) -> Signal:
            made = project(source, band=band, amplitude=amplitude, n_rounds=self.rounds)
            return hold_below(
                made,
                amplitude=amplitude,
                gain=gain,
                half_length=half,
                mean_power=source.mean_power,
            )

        action = f"projects in {self.rounds} rounds"
        halo = (self.rounds + 2) * half
        pilot = look(source, oversampling=filled.oversampling, halo=halo)
        return reduce_to(site, pilot, self.ceiling_db, process, action) or source
