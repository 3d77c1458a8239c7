"""A constant added to a signal: what leaks of the carrier."""

from __future__ import annotations

import cmath
import math
from dataclasses import dataclass
from typing import Annotated, ClassVar

import numpy as np
from annotated_types import Ge, Le

from wavegen.core.signal import Samples, Signal
from wavegen.core.site import Note, Site
from wavegen.laws.law import Law
from wavegen.laws.rail_mixing import shifted_term
from wavegen.laws.term import NoLaw, Term
from wavegen.stages.ceiling import look
from wavegen.stages.channel.gate import on_time
from wavegen.stages.drive import refuse_silence
from wavegen.stages.rails import rails_law

LOST_DB = -160.0
"""A constant below this is lost in float32."""


@dataclass(frozen=True, eq=False, kw_only=True)
class Offset(Signal):
    """A signal and a constant.

    Parameters
    ----------
    constant : complex
        What is added.
    """

    constant: complex

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Add the constant to both rails."""
        out = np.empty(stop - start, np.complex64)
        np.add(arrays[0].real, np.float32(self.constant.real), out=out.real)
        np.add(arrays[0].imag, np.float32(self.constant.imag), out=out.imag)
        return out


@dataclass(frozen=True, slots=True, kw_only=True)
class DcOffset:
    """Settings of a DC offset, which is carrier leakage once it is modulated.

    Parameters
    ----------
    level_db : float
        Power of the constant over the mean power of the signal (of a gated signal: of its
        on-time), dB: dBc of the whole signal.
    phase_deg : float
        Its phase, degrees.

    Notes
    -----
    The constant is there all the time, also while a gate is shut. It adds its power to the mean;
    the change is told and stays.
    """

    treats_rails_apart: ClassVar[bool] = True

    level_db: Annotated[float, Ge(-200), Le(40)]
    phase_deg: Annotated[float, Ge(-360), Le(360)] = 0.0

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the signal with the constant.

        Parameters
        ----------
        site : Site
            Where it is built. Told the change of mean power.
        source : Signal
            What it is added to.

        Returns
        -------
        Signal
            ``source`` itself where the constant is lost in float32.

        Raises
        ------
        RecipeError
            The signal is zero.
        """
        pilot = look(source, oversampling=1.0, halo=0)
        if pilot is None:
            raise refuse_silence(site)
        share = 10 ** (self.level_db / 10)
        if self.level_db < LOST_DB:
            return source
        angle = math.radians(self.phase_deg)
        size = math.sqrt(share * pilot.mean)
        nominal = source.mean_power
        is_gated = on_time(source) is not None
        made = Offset(
            sample_rate_hz=source.sample_rate_hz,
            n_samples=source.n_samples,
            inputs=(source,),
            mean_power=None if nominal is None or is_gated else nominal * (1 + share),
            constant=complex(size * math.cos(angle), size * math.sin(angle)),
        )
        change = pilot.try_out(made, peaks=False).mean_ratio
        text = (
            f"the mean power changes by {10 * math.log10(max(change, 1e-30)):+.4f} dB, found on "
            f"{pilot.origin}"
        )
        site.notes.append(Note(kind="info", where=site.path, text=text))
        return made

    def law(self, site: Site, source: Law) -> Law | NoLaw:
        """Return the law of complex Gaussian noise beside a constant: Rice's; see :meth:`term`."""
        return rails_law(self, site, source, "with a DC offset")

    def term(self, site: Site, source: Term) -> Term | NoLaw:
        """Return what a part is beside a constant: lawful where its directions are known."""
        if self.level_db < LOST_DB:
            return source
        size = math.sqrt(source.mean_power) * 10 ** (self.level_db / 20)
        return shifted_term(source, cmath.rect(size, math.radians(self.phase_deg)))
