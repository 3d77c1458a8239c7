"""Rounding to the words of a converter, and clipping at their ends."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Annotated

import numpy as np
from annotated_types import Ge, Le
from numpy.typing import NDArray

from wavegen.core.evaluate import evaluate
from wavegen.core.signal import Samples, Signal
from wavegen.core.site import Note, Site
from wavegen.laws.law import Law
from wavegen.laws.quantised import quantised_law
from wavegen.laws.term import NoLaw
from wavegen.stages.ceiling import look
from wavegen.stages.drive import refuse_silence

BLOCK_SAMPLES = 1 << 14
DOUBTFUL_SHARE = 1e-4
"""Codes cut at full scale are warned of from here on."""


def noise_db(bits: int, full_scale_db: float) -> float:
    """Return how far the rounding noise of both rails stands below the mean power, dB.

    Parameters
    ----------
    bits : int
        Of each rail.
    full_scale_db : float
        Full scale of a rail over the RMS envelope, dB.

    Notes
    -----
    ``6.02 bits + 1.76 - full_scale_db``: the errors are uniform over a step, ``step^2 / 12`` on
    each rail (W. R. Bennett, "Spectra of quantized signals", Bell System Technical Journal 27,
    1948), which wants rails that pass over several steps.

    Examples
    --------
    >>> round(noise_db(14, 12.0), 2)
    74.05
    """
    return 20 * math.log10(2) * bits + 10 * math.log10(1.5) - full_scale_db


@dataclass(frozen=True, eq=False, kw_only=True)
class Quantised(Signal):
    """A signal on the steps of a converter.

    Parameters
    ----------
    bits : int
        Of each rail.
    code : float
        Step of one code, on the scale of the source.
    """

    bits: int
    code: float

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Round each rail half to even, and cut it at the ends."""
        out = np.empty(stop - start, np.complex64)
        rails, made = arrays[0].view(np.float32), out.view(np.float32)
        highest = 2 ** (self.bits - 1)
        for low in range(0, made.size, 2 * BLOCK_SAMPLES):
            codes = rails[low : low + 2 * BLOCK_SAMPLES].astype(np.float64)
            codes /= self.code
            np.rint(codes, out=codes)
            np.clip(codes, -highest, highest - 1, out=codes)
            codes *= self.code
            made[low : low + 2 * BLOCK_SAMPLES] = codes
        return out


@dataclass(frozen=True, slots=True, kw_only=True)
class Quantise:
    """Settings of a converter's words.

    Parameters
    ----------
    bits : int
        Of each rail, 2 to 24.
    full_scale_db : float
        Full scale of a rail over the RMS envelope (of a gated signal: of its on-time), dB: the
        mean stands so far below 0 dBFS.

    Notes
    -----
    Codes are rounded half to even and run from ``-2^(bits - 1)`` to ``2^(bits - 1) - 1``. The
    rounding noise stands ``6.02 bits + 1.76 - full_scale`` dB below the mean, as long as nothing
    is cut; how often it is, and what becomes of the mean power, is told. How the words stand in
    a file is a matter of the file: see ``output``.
    """

    bits: Annotated[int, Ge(2), Le(24)] = 16
    full_scale_db: Annotated[float, Ge(-20), Le(80)] = 12.0

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the signal on the steps of the converter.

        Parameters
        ----------
        site : Site
            Where it is built. Told the rounding noise, the share of codes that are cut and the
            change of mean power; warned where more than 1e-4 are cut.
        source : Signal
            What is converted.

        Returns
        -------
        Signal
            Its mean power is to be measured.

        Raises
        ------
        RecipeError
            The signal is zero.
        """
        pilot = look(source, oversampling=1.0, halo=0)
        if pilot is None:
            raise refuse_silence(site)
        full_scale = math.sqrt(pilot.mean) * 10 ** (self.full_scale_db / 20)
        made = Quantised(
            sample_rate_hz=source.sample_rate_hz,
            n_samples=source.n_samples,
            inputs=(source,),
            mean_power=None,
            bits=self.bits,
            code=full_scale / 2 ** (self.bits - 1),
        )
        counted = cut = 0
        for rails in _rails(source, pilot.stretches):
            counted += rails.size
            cut += int(np.count_nonzero(np.abs(rails) > full_scale))
        trial = pilot.try_out(made, peaks=False)
        share = cut / counted
        text = (
            f"rounding stands {noise_db(self.bits, self.full_scale_db):.2f} dB below the mean; "
            f"{share:.2g} of the codes are cut at full scale, the mean power changes by "
            f"{10 * math.log10(max(trial.mean_ratio, 1e-30)):+.4f} dB: found on {pilot.origin}"
        )
        is_much = share > DOUBTFUL_SHARE
        site.notes.append(Note(kind="warning" if is_much else "info", where=site.path, text=text))
        return made

    def law(self, site: Site, source: Law) -> Law | NoLaw:
        """Return the law of the input where the steps are fine and full scale is seldom passed."""
        return quantised_law(source, bits=self.bits, full_scale_db=self.full_scale_db)


def _rails(source: Signal, stretches: tuple[tuple[int, int], ...]) -> Iterator[NDArray[np.float32]]:
    for start, stop in stretches:
        yield evaluate({source: (start, stop)})[source].view(np.float32)
