"""Two rails of unequal gain that are not quite at right angles: an image beside the signal."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Annotated, ClassVar

import numpy as np
from annotated_types import Ge, Le

from wavegen.core.signal import Samples, Signal
from wavegen.core.site import Note, Site
from wavegen.laws.law import Law
from wavegen.laws.rail_mixing import image_term
from wavegen.laws.term import NoLaw, Term
from wavegen.stages.ceiling import look
from wavegen.stages.drive import refuse_silence
from wavegen.stages.rails import rails_law

BLOCK_SAMPLES = 1 << 14


def image_factors(gain_db: float, phase_deg: float) -> tuple[complex, complex]:
    """Return what of the signal and of its conjugate is in the output.

    Parameters
    ----------
    gain_db : float
        Gain of the I rail over that of the Q rail, dB.
    phase_deg : float
        By how much more than a quarter turn Q is ahead of I, degrees.

    Returns
    -------
    signal, image : complex
        ``y = signal x + image conj(x)``; squares add to 1.

    Notes
    -----
    With ``y = g_I exp(-j phi/2) I + j g_Q exp(j phi/2) Q``: derivation.

    Examples
    --------
    >>> signal, image = image_factors(1.0, 0.0)
    >>> round(20 * math.log10(abs(image / signal)), 2)
    -24.81
    """
    half = complex(math.cos(math.radians(phase_deg) / 2), math.sin(math.radians(phase_deg) / 2))
    i = 10 ** (gain_db / 40) * half.conjugate()
    q = 10 ** (-gain_db / 40) * half
    signal, image = (i + q) / 2, (i - q) / 2
    size = math.hypot(abs(signal), abs(image))
    return signal / size, image / size


@dataclass(frozen=True, eq=False, kw_only=True)
class Imbalanced(Signal):
    """A signal with its image.

    Parameters
    ----------
    signal, image : complex
        ``y = signal x + image conj(x)``.
    """

    signal: complex
    image: complex

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Mix the rails of each sample."""
        out = np.empty(stop - start, np.complex64)
        plus, minus = self.signal + self.image, self.signal - self.image
        ii, qi = np.float32(plus.real), np.float32(plus.imag)  # from I to I and to Q
        qq, iq = np.float32(minus.real), np.float32(-minus.imag)  # from Q to Q and to I
        for low in range(0, out.size, BLOCK_SAMPLES):
            block = arrays[0][low : low + BLOCK_SAMPLES]
            part = out[low : low + BLOCK_SAMPLES]
            part.real = ii * block.real + iq * block.imag
            part.imag = qi * block.real + qq * block.imag
        return out


@dataclass(frozen=True, slots=True, kw_only=True)
class IqImbalance:
    """Settings of an imbalance between the rails of a quadrature modulator.

    Parameters
    ----------
    gain_db : float
        Gain of the I rail over that of the Q rail, dB.
    phase_deg : float
        By how much more than a quarter turn Q is ahead of I, degrees.

    Notes
    -----
    The image at ``-f`` of what stands at ``f`` has ``(1 + g^2 - 2 g cos phi) / (1 + g^2 + 2 g
    cos phi)`` of its power, ``g`` the ratio of the gains (derivation). The output has the mean
    power of the input; the change that was undone is told.
    """

    treats_rails_apart: ClassVar[bool] = True

    gain_db: Annotated[float, Ge(-20), Le(20)] = 0.0
    phase_deg: Annotated[float, Ge(-45), Le(45)] = 0.0

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the signal with its image at the mean power it had.

        Parameters
        ----------
        site : Site
            Where it is built. Told the image ratio and the change of mean power.
        source : Signal
            What is modulated.

        Returns
        -------
        Signal
            ``source`` itself where both are zero.

        Raises
        ------
        RecipeError
            The signal is zero.
        """
        if not self.gain_db and not self.phase_deg:
            return source
        signal, image = image_factors(self.gain_db, self.phase_deg)
        made = _imbalanced(source, signal, image)
        pilot = look(source, oversampling=1.0, halo=0)
        if pilot is None:
            raise refuse_silence(site)
        ratio = pilot.try_out(made, peaks=False).mean_ratio
        text = (
            f"the image stands {-20 * math.log10(abs(image / signal)):.2f} dB below the signal; "
            f"the change of mean power, {10 * math.log10(ratio):+.4f} dB, is undone, found on "
            f"{pilot.origin}"
        )
        site.notes.append(Note(kind="info", where=site.path, text=text))
        return _imbalanced(source, signal / math.sqrt(ratio), image / math.sqrt(ratio))

    def law(self, site: Site, source: Law) -> Law | NoLaw:
        """Return the law of complex Gaussian noise with its image: Hoyt's; see :meth:`term`."""
        return rails_law(self, site, source, "with its image")

    def term(self, site: Site, source: Term) -> Term | NoLaw:
        """Return what a part is with its image: lawful where the part is isotropic."""
        if not self.gain_db and not self.phase_deg:
            return source
        return image_term(source, *image_factors(self.gain_db, self.phase_deg))


def _imbalanced(source: Signal, signal: complex, image: complex) -> Imbalanced:
    return Imbalanced(
        sample_rate_hz=source.sample_rate_hz,
        n_samples=source.n_samples,
        inputs=(source,),
        mean_power=source.mean_power,
        signal=signal,
        image=image,
    )
