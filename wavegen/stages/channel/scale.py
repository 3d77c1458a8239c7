"""A change of level."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated

import numpy as np
from annotated_types import Ge, Le

from wavegen.core.signal import Samples, Signal
from wavegen.core.site import Site
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw, Term
from wavegen.laws.term import Scaled as ScaledTerm


@dataclass(frozen=True, eq=False, kw_only=True)
class Scaled(Signal):
    """A signal times a real gain.

    Parameters
    ----------
    gain : float
        Amplitude ratio.
    """

    gain: float

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Multiply both rails."""
        out = np.empty(stop - start, np.complex64)
        np.multiply(arrays[0].view(np.float32), np.float32(self.gain), out=out.view(np.float32))
        return out


@dataclass(frozen=True, slots=True, kw_only=True)
class Scale:
    """Settings of a change of level.

    Parameters
    ----------
    gain_db : float
        Output over input, dB; -200 to 200.
    """

    gain_db: Annotated[float, Ge(-200), Le(200)]

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the scaled signal; its nominal mean power changes accordingly.

        Parameters
        ----------
        site : Site
            Where it is built.
        source : Signal
            What is scaled.

        Returns
        -------
        Signal
            ``source`` itself where the gain is 0 dB.
        """
        if not self.gain_db:
            return source
        power = None if source.mean_power is None else source.mean_power * 10 ** (self.gain_db / 10)
        return Scaled(
            sample_rate_hz=source.sample_rate_hz,
            n_samples=source.n_samples,
            inputs=(source,),
            mean_power=power,
            gain=10 ** (self.gain_db / 20),
        )

    def law(self, site: Site, source: Law) -> Law | NoLaw:
        """Return the law of the input: levels are over the mean."""
        return source

    def term(self, site: Site, source: Term) -> Term | NoLaw:
        """Return the scaled part of a composite."""
        return ScaledTerm.of(source, gain=10 ** (self.gain_db / 20))
