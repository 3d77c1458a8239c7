"""Least-distortion projection: the nearest signal under a ceiling, changed in its band only.

The dual problem is solved by accelerated proximal steps (:mod:`wavegen.dsp.dual_projection`, with
its sources). One ceiling for the whole signal is the right problem: of all signals that differ from
the source inside its bands only and keep below that ceiling this one has the least error. OFDM is
projected symbol by symbol, on its own subcarriers, before prefix and window; any other waveform as
a stream. A last step makes the ceiling hold: a gain for each symbol, a smooth one on streams.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from typing import Annotated, ClassVar, Literal

import numpy as np
from annotated_types import Ge, Le
from numpy.typing import NDArray

from wavegen.core.signal import Samples, Signal
from wavegen.core.site import Site
from wavegen.core.symbol_bodies import HasBodies
from wavegen.core.units import QuantityError
from wavegen.dsp.dual_projection import correcting_lines, hold_below, project
from wavegen.dsp.mapping_kernel import read_values
from wavegen.stages.in_band import InBand, Method, reduce_in_band
from wavegen.stages.passband import FilledBand
from wavegen.stages.searchable import Choice, Searchable
from wavegen.stages.symbol_bodies import Reworked, reduce_symbols, symbols_of

ROUNDS_PER_BAND = 7
FEWEST_ROUNDS = 10
MOST_ROUNDS = 200


def rounds_for(per_band: float) -> int:
    """Return how many rounds bring the ceiling near the optimum's at the same error.

    Parameters
    ----------
    per_band : float
        Points on which peaks are seen over the band.

    Returns
    -------
    int
        7 for each point of the band, 10 to 200.

    Notes
    -----
    Measured on rows of 256 subcarriers of 64QAM, against 400 to 700 rounds: what is left of
    the ceiling at equal error, gain fitted, is 0.01 dB or less with these rounds at ceilings of
    7.5 and 6 dB on 2 to 16 points, and 0.02 dB at 5 dB. 20 rounds leave 0.02, 0.06 and 0.07 dB
    at 6 dB on 4, 6 and 8 points.

    Examples
    --------
    >>> [rounds_for(each) for each in (1.0, 4.0, 6.0, 8.0, 16.0)]
    [10, 28, 42, 56, 112]
    """
    return min(max(math.ceil(ROUNDS_PER_BAND * per_band), FEWEST_ROUNDS), MOST_ROUNDS)


@dataclass(frozen=True, eq=False, kw_only=True)
class ProjectedSymbols(Reworked):
    """Symbols under a ceiling, changed on the subcarriers that are on and nowhere else.

    Parameters
    ----------
    indices : intp array, shape (n_active,)
        Subcarriers in use.
    on : bool array, shape (n_frame, n_active)
        Which of them are on in each symbol of the frame.
    amplitude : float
        Ceiling of the envelope, before the gain.
    n_rounds : int
        Accelerated steps.
    """

    indices: NDArray[np.intp]
    on: NDArray[np.bool_]
    amplitude: float
    n_rounds: int

    @cached_property
    def _responses(self) -> NDArray[np.float32]:
        """Band of each symbol of the frame, shape (n_frame, n_points)."""
        made = np.zeros((self.on.shape[0], self.view.n_points), np.float32)
        made[:, self.view.bins(self.indices)] = self.on
        return made

    def rework(self, rows: Samples, first: int) -> Samples:
        """Project; then lower each symbol by what the rounds have left above the ceiling."""
        view = self.view
        points = view.finer(rows)
        frame = np.arange(first, first + rows.shape[0]) % self.on.shape[0]
        lines = correcting_lines(
            points,
            response=self._responses[0] if self.on.all() else self._responses[frame],
            amplitude=self.amplitude,
            n_rounds=self.n_rounds,
        )
        change = read_values(lines, bins=view.bins(self.indices))
        points += view.inverse(lines)
        made = view.samples(change, self.indices)
        made += rows
        highest = np.maximum(view.peaks(points), np.float32(self.amplitude**2))
        made *= (np.float32(self.amplitude) / np.sqrt(highest))[:, None]
        return made


@dataclass(frozen=True, slots=True, kw_only=True)
class Projection(InBand):
    """Settings of a least-distortion projection.

    Parameters
    ----------
    ceiling_db : float
        Highest envelope power of the output, at its samples, over its mean power, dB; 0.1 to
        60. Of a gated signal, over the mean of the on-time.
    passbands : tuple of Passband
        Bands of a waveform, where distortion is allowed; found on the signal if not given.
    transition_hz : Fraction, optional
        Width of each edge of the bands of a waveform, outside them, Hz.
    rounds : int, optional
        Accelerated steps, each a pair of transforms; 1 to 200. If not given, 7 for each point on
        which peaks are seen over the band (28 at 4 times the band, 56 at 8 times), 10 at least:
        within 0.02 dB of the optimum's ceiling at the same error.
    acts_on : {"symbols", "waveform"}, optional
        Symbols of OFDM before prefix and window, on their own subcarriers; or the waveform in its
        bands. If not given: symbols where the signal is OFDM whose waveform nothing has changed
        and no band is stated, else the waveform.
    per_band : int
        Points over the band on which peaks of symbols are seen, at least; 1 to 16. A waveform is
        seen on its samples.
    """

    search: ClassVar[Searchable] = Searchable(
        choices=(Choice(field="rounds", values=(10, 20, 50)),), pairs="rounds"
    )

    rounds: Annotated[int, Ge(1), Le(MOST_ROUNDS)] | None = None
    acts_on: Literal["symbols", "waveform"] | None = None
    per_band: Annotated[int, Ge(1), Le(16)] = 4

    def __post_init__(self) -> None:
        """Refuse bands where subcarriers are the band."""
        key = "passbands" if self.passbands else "transition"
        if self.acts_on == "symbols" and self._has_bands:
            raise QuantityError(
                problem="symbols are changed on their own subcarriers: no band is filtered",
                allowed="passbands and transition with acts_on: waveform",
                remedy="Remove it, or let it act on the waveform.",
                key=key,
            )

    @property
    def _has_bands(self) -> bool:
        return bool(self.passbands) or self.transition_hz is not None

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the projected signal, at the mean power it had before.

        Parameters
        ----------
        site : Site
            Where it is built. Told of the band or the points, the ceiling over the mean of the
            input, the change of mean power that is undone, and the peaks between samples.
        source : Signal
            What is reduced; parts of it are read here.

        Returns
        -------
        Signal
            ``source`` itself where it never reaches the ceiling.

        Raises
        ------
        RecipeError
            The source is zero, a passband lies outside the sampled band, no amplitude gives the
            ceiling, or symbols are asked for where there are none.
        """
        is_waveform = self._has_bands or not isinstance(source, HasBodies)
        if self.acts_on == "symbols" or (self.acts_on is None and not is_waveform):
            return self._of_symbols(site, source)

        def method(filled: FilledBand) -> Method:
            band = filled.band_filter
            half = max(band.half_length, 1)
            n_rounds = self.rounds or rounds_for(1 / filled.width)

            def process(amplitude: float, gain: float) -> Signal:
                made = project(source, band=band, amplitude=amplitude, n_rounds=n_rounds)
                return hold_below(
                    made,
                    amplitude=amplitude,
                    gain=gain,
                    half_length=half,
                    mean_power=source.mean_power,
                )

            return Method(
                process=process,
                action=f"projects in {n_rounds} rounds",
                halo=(n_rounds + 2) * half,
            )

        return reduce_in_band(site, source, self, method)

    def _of_symbols(self, site: Site, source: Signal) -> Signal:
        symbols = symbols_of(site, source, per_band=self.per_band)
        grid, bodies = symbols.grid, symbols.source.bodies
        n_rounds = self.rounds or rounds_for(symbols.view.n_points / grid.indices.size)

        def rework(amplitude: float, gain: float) -> Signal:
            return ProjectedSymbols(
                sample_rate_hz=bodies.sample_rate_hz,
                n_samples=bodies.n_samples,
                step=grid.n_fft,
                inputs=(bodies,),
                mean_power=bodies.mean_power,
                view=symbols.view,
                gain=gain,
                indices=grid.indices,
                on=grid.on,
                amplitude=amplitude,
                n_rounds=n_rounds,
            )

        action = f"projects symbols in {n_rounds} rounds"
        return reduce_symbols(
            site, source, symbols, ceiling_db=self.ceiling_db, rework=rework, action=action
        )
