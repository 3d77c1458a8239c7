"""A constant added to a signal: what leaks of the carrier."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Annotated

import numpy as np
import scipy.special
from annotated_types import Ge, Le

from wavegen.core.signal import Samples, Signal
from wavegen.core.site import Note, Site
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.inversion import law_of_characteristic
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw
from wavegen.stages.ceiling import look
from wavegen.stages.channel.gate import on_time
from wavegen.stages.drive import refuse_silence


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
        if self.level_db < -160:
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
        """Return the law of complex Gaussian noise beside a constant; others have none here."""
        if not isinstance(source, GaussianLaw):
            return NoLaw(reason=f"{source.name}, then a DC offset, has no law")
        amplitude = 10 ** (self.level_db / 20)
        return law_of_characteristic(
            lambda t: np.asarray(np.exp(-0.25 * t * t) * scipy.special.j0(amplitude * t)),
            name=f"{source.name} with a DC offset",
            holds=source.holds,
            mean_power=1 + amplitude**2,
        )
