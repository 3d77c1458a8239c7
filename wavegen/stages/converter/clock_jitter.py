"""Converter clock whose edges are not quite in time."""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache
from typing import Annotated

import numpy as np
from annotated_types import Ge, Le
from numpy.typing import NDArray

from wavegen.core.rng import stream_key
from wavegen.core.signal import Samples, Signal
from wavegen.core.site import Note, Site
from wavegen.core.units import format_hz, format_s
from wavegen.dsp.overlap_save import Filtered
from wavegen.dsp.pilot import power_beyond
from wavegen.dsp.response_design import derivative_taps
from wavegen.dsp.white_noise import WhiteNoise

PASSBAND = 0.45
"""Derivatives hold up to this part of the sample rate."""
HALF_LENGTH = 256
MOST_TURN_RAD = 0.1
"""Turn at half the sample rate by the RMS jitter: what the third order of the series leaves out
then stands 40 dB below the jitter noise itself."""
MOST_CENTRE_RAD = 1.0
"""Turn at the centre, which is taken exactly: beyond, little is left of the signal."""
DOUBTFUL_SHARE = 1e-6
BLOCK_SAMPLES = 1 << 13


@dataclass(frozen=True, eq=False, kw_only=True)
class Jittered(Signal):
    """A signal sampled at times that scatter; inputs are signal, derivatives and noise.

    Parameters
    ----------
    rms_samples : float
        RMS of the scatter, samples.
    turn_rad : float
        Turn of the carrier frequency in one sample, radians.
    """

    rms_samples: float
    turn_rad: float

    @property
    def acts_on(self) -> Signal:
        """The input that decides when it is on."""
        return self.inputs[0]

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Follow the series in time at each sample, and turn the carrier."""
        out = np.empty(stop - start, np.complex64)
        x, slope, bend, noise = arrays
        scale = math.sqrt(2) * self.rms_samples
        for low in range(0, out.size, BLOCK_SAMPLES):
            part = slice(low, low + BLOCK_SAMPLES)
            late = scale * noise[part].real.astype(np.float64)
            square = 0.5 * late * late
            i = x[part].real + late * slope[part].real + square * bend[part].real
            q = x[part].imag + late * slope[part].imag + square * bend[part].imag
            if self.turn_rad:
                angle = self.turn_rad * late
                cosine, sine = np.cos(angle), np.sin(angle)
                i, q = i * cosine - q * sine, i * sine + q * cosine
            out.real[part], out.imag[part] = i, q
        return out


@lru_cache(maxsize=2)
def _taps(order: int) -> NDArray[np.float64]:
    return derivative_taps(order, HALF_LENGTH, passband=PASSBAND)


@dataclass(frozen=True, slots=True, kw_only=True)
class ClockJitter:
    """Settings of white clock jitter.

    Parameters
    ----------
    rms_s : float
        RMS error of the sampling instants, seconds; Gaussian, independent from sample to sample.
    centre_hz : Fraction
        Frequency at which the converter makes the centre of the signal, Hz; 0 for two converters
        at baseband.

    Notes
    -----
    ``y[n] = x(t_n + tau_n) exp(j 2 pi centre tau_n)``, with ``x`` in its second-order Taylor
    series. A tone at ``f`` from zero has a signal to noise ratio of ``-20 log10(2 pi f sigma)``
    (first order; common practice). The errors come from the seed by index, so that the loop
    repeats them.
    """

    rms_s: Annotated[float, Ge(0), Le(1)]
    centre_hz: Fraction = Fraction(0)

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the signal as the jittered clock takes it; its mean power stays.

        Parameters
        ----------
        site : Site
            Where it is built. Warned of power beyond 0.45 of the sample rate.
        source : Signal
            What is converted.

        Returns
        -------
        Signal
            ``source`` itself without jitter.

        Raises
        ------
        RecipeError
            Jitter that turns half the sample rate by more than 0.1 radians, or the centre by
            more than one.
        """
        if not self.rms_s:
            return source
        rate = float(source.sample_rate_hz)
        centre = abs(float(self.centre_hz))
        most_s = MOST_TURN_RAD / (math.pi * rate)
        if centre:
            most_s = min(most_s, MOST_CENTRE_RAD / (2 * math.pi * centre))
        if self.rms_s > most_s:
            raise site.error(
                key="rms",
                problem=f"{format_s(self.rms_s)} are too large a part of a sample, or of a period "
                "of the centre",
                allowed=f"up to {format_s(most_s)} here",
                remedy="Lower the jitter.",
            )
        self._tell(site, source)
        place = site.path.rpartition(".")[2]
        noise = WhiteNoise(
            sample_rate_hz=source.sample_rate_hz,
            n_samples=source.n_samples,
            key=stream_key(site.seed, f"{site.label}, {place}, clock jitter"),
        )
        return Jittered(
            sample_rate_hz=source.sample_rate_hz,
            n_samples=source.n_samples,
            inputs=(source, Filtered.of(source, _taps(1)), Filtered.of(source, _taps(2)), noise),
            mean_power=source.mean_power,
            rms_samples=self.rms_s * rate,
            turn_rad=2 * math.pi * float(self.centre_hz) / rate,
        )

    def _tell(self, site: Site, source: Signal) -> None:
        centre = abs(float(self.centre_hz))
        if centre:
            ratio_db = -20 * math.log10(2 * math.pi * centre * self.rms_s)
            text = f"noise of the jitter {ratio_db:.2f} dB below a tone at {format_hz(centre)}"
            site.notes.append(Note(kind="info", where=site.path, text=text))
        beyond = power_beyond(source, PASSBAND)
        if beyond > DOUBTFUL_SHARE:
            edge = format_hz(PASSBAND * float(source.sample_rate_hz))
            text = f"{beyond:.2g} of the power lies beyond {edge}, where slopes are taken too low"
            site.notes.append(Note(kind="warning", where=site.path, text=text))
