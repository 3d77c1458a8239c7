"""Peak windowing: the envelope is pressed down smoothly around each peak.

M. Pauli, H.-P. Kuchenbecker, "Minimization of the intermodulation distortion of a nonlinearly
amplified OFDM signal", Wireless Personal Communications 4, 1997, 93-101; O. Vaananen, J. Vankka,
K. Halonen, "Effect of clipping in wideband CDMA system and simple algorithm for peak windowing",
World Wireless Congress, 2002 (both from memory). Where windows overlap the deepest counts, so that
nothing is pressed down twice and no feedback is needed.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Annotated, ClassVar, Literal

import numpy as np
from annotated_types import Ge, Le
from numpy.typing import NDArray

from wavegen.core.signal import Range, Samples, Signal
from wavegen.core.site import Note, Site
from wavegen.core.timespan import TimeSpan
from wavegen.core.units import QuantityError, format_s
from wavegen.dsp.envelope_excess import local_peaks, shortfall_of
from wavegen.dsp.windows import kaiser_beta, kaiser_window
from wavegen.stages.in_band import InBand, Method, reduce_in_band
from wavegen.stages.passband import FilledBand
from wavegen.stages.searchable import Choice, Searchable

DEFAULT_PER_BAND = 2.0
"""Length of the window, where none is given, over the reciprocal of the bandwidth."""
DEFAULT_SUPPRESSION_DB = 50.0
LONGEST_HALF_LENGTH = 1 << 12
PASSES = 2
"""Looks for the highest samples of each peak; what still stands above after them (flanks of a
peak that is broader than the window's top) is then pressed down sample by sample."""


def window_of(kind: str, half_length: int, suppression_db: float) -> NDArray[np.float64]:
    """Return an attenuating window, 1 in the middle.

    Parameters
    ----------
    kind : {"kaiser", "gaussian", "hann"}
        Its shape.
    half_length : int
        Points on each side of the middle one.
    suppression_db : float
        Kaiser: side lobes of its spectrum, dB; Gaussian: how far its ends lie under its
        middle, dB.

    Returns
    -------
    float64 array, shape (2 half_length + 1,)

    Examples
    --------
    >>> window_of("hann", 1, 0).round(3).tolist()
    [0.5, 1.0, 0.5]
    """
    if kind == "kaiser":
        return kaiser_window(half_length, kaiser_beta(suppression_db))
    place = np.arange(-half_length, half_length + 1)
    if kind == "gaussian":
        depth = suppression_db / 20 * math.log(10)
        return np.asarray(np.exp(-depth * (place / max(half_length, 1)) ** 2))
    return np.asarray(0.5 + 0.5 * np.cos(np.pi * place / (half_length + 1)))


def deepest_windows(
    places: NDArray[np.intp], depths: NDArray[np.float32], window: NDArray[np.float32], size: int
) -> NDArray[np.float32]:
    """Return, at each place, the largest of windows of given depths put around some places.

    Parameters
    ----------
    places : int array, shape (n,)
        Middles of the windows; each once, at least half a window inside.
    depths : float32 array, shape (n,)
        Their heights.
    window : float32 array, shape (2 h + 1,)
        Symmetric, 1 in the middle.
    size : int
        Length of the answer.

    Returns
    -------
    float32 array, shape (size,)
    """
    deepest = np.zeros(size, np.float32)
    half = window.size // 2
    for step, weight in zip(range(-half, half + 1), window, strict=True):
        there = places + step
        deepest[there] = np.maximum(deepest[there], depths * weight)
    return deepest


@dataclass(frozen=True, eq=False, kw_only=True)
class PeakWindowed(Signal):
    """A signal with its envelope pressed down around its peaks, times a gain.

    Parameters
    ----------
    amplitude : float
        Highest envelope, before ``gain``.
    window : float64 array, shape (2 h + 1,)
        Symmetric, 1 in the middle.
    gain : float
        Amplitude ratio of the whole.
    """

    amplitude: float
    window: NDArray[np.float64]
    gain: float

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the range with a halo for each look at the neighbours."""
        reach = (2 * PASSES + 1) * (self.window.size // 2)
        return ((start - reach, stop + reach),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Press down the highest samples, then what still stands above, twice; the rest last."""
        source = arrays[0]
        half = self.window.size // 2
        window = self.window.astype(np.float32)
        short = shortfall_of(source, self.amplitude)
        deepest = np.zeros(source.size, np.float32)
        for _ in range(PASSES):
            left = np.where(short > deepest, short, np.float32(0))
            peaks = local_peaks(left, over=0.0, reach=half)
            np.maximum(
                deepest, deepest_windows(peaks, short[peaks], window, source.size), out=deepest
            )
        rest = np.flatnonzero(short > deepest)
        rest = rest[(rest >= half) & (rest < source.size - half)]
        np.maximum(deepest, deepest_windows(rest, short[rest], window, source.size), out=deepest)
        reach = (source.size - (stop - start)) // 2
        factor = np.float32(1) - deepest[reach : reach + stop - start]
        np.multiply(factor, np.float32(self.gain), out=factor)
        return source[reach : reach + stop - start] * factor


@dataclass(frozen=True, slots=True, kw_only=True)
class PeakWindowing:
    """Settings of peak windowing.

    Parameters
    ----------
    ceiling_db : float
        Highest envelope power of the output, at its samples, over its mean power, dB; 0.1 to
        60. Of a gated signal, over the mean of the on-time.
    window : {"kaiser", "gaussian", "hann"}
        Shape of the attenuation around a peak.
    length : TimeSpan, optional
        Full length of the window, rounded to an odd number of samples; twice the reciprocal of
        the bandwidth if not given. Longer windows keep the adjacent channels clearer, at the
        price of EVM.
    suppression_db : float, optional
        Kaiser: side lobes of the window's spectrum, dB; Gaussian: how far its ends lie under
        its middle, dB. 21 to 120; 50 if not given; a Hann window has none.

    Notes
    -----
    The band is left: what is pressed down spreads over about the reciprocal of the length.
    """

    search: ClassVar[Searchable] = Searchable(
        choices=(
            Choice(
                field="length",
                values=(1.1, 1.5, 2, 2.5, 3, 3.5, 4, 5, 6, 8),
                in_reciprocal_bands=True,
            ),
            Choice(field="suppression_db", values=(21.0, 30.0, 40.0, 50.0, 60.0, 80.0)),
            Choice(field="window", values=("kaiser", "gaussian"), is_ordered=False),
        ),
    )

    ceiling_db: Annotated[float, Ge(0.1), Le(60)]
    window: Literal["kaiser", "gaussian", "hann"] = "kaiser"
    length: TimeSpan | None = None
    suppression_db: Annotated[float, Ge(21), Le(120)] | None = None

    def __post_init__(self) -> None:
        """Refuse what a window does not have, and lengths that are none."""
        if self.window == "hann" and self.suppression_db is not None:
            raise QuantityError(
                problem="a Hann window has no suppression to set",
                allowed="suppression beside kaiser or gaussian",
                remedy="Remove it, or choose another window.",
                key="suppression",
            )
        if self.length is not None and self.length.value <= 0:
            raise QuantityError(
                problem=f"{self.length} is no length",
                allowed="more than 0",
                remedy="Give a longer one.",
                key="length",
            )

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the signal under its ceiling, at the mean power it had before.

        Parameters
        ----------
        site : Site
            Where it is built. Told of the window, the ceiling over the mean of the input, the
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
            The source is zero, no amplitude gives the ceiling, or the window is longer than
            8193 samples.
        """

        def method(filled: FilledBand) -> Method:
            half = self._half_length(site, source, filled.oversampling)
            suppression_db = self.suppression_db or DEFAULT_SUPPRESSION_DB
            window = window_of(self.window, half, suppression_db)

            def process(amplitude: float, gain: float) -> Signal:
                return PeakWindowed(
                    sample_rate_hz=source.sample_rate_hz,
                    n_samples=source.n_samples,
                    inputs=(source,),
                    mean_power=source.mean_power,
                    amplitude=amplitude,
                    window=window,
                    gain=gain,
                )

            return Method(
                process=process,
                action=f"presses peaks down with a {self.window} window of {window.size} samples",
                halo=(2 * PASSES + 1) * half,
            )

        return reduce_in_band(site, source, InBand(ceiling_db=self.ceiling_db), method)

    def _half_length(self, site: Site, source: Signal, oversampling: float) -> int:
        rate = source.sample_rate_hz
        if self.length is None:
            wanted = DEFAULT_PER_BAND * oversampling
        else:
            wanted = float(self.length.samples(rate))
        half = max(round((wanted - 1) / 2), 1)
        if half > LONGEST_HALF_LENGTH:
            raise site.error(
                key="length",
                problem=f"a window of {wanted:.0f} samples",
                allowed=f"up to {2 * LONGEST_HALF_LENGTH + 1} samples",
                remedy="Shorten it.",
            )
        if self.length is not None and 2 * half + 1 != wanted:
            site.notes.append(
                Note(
                    kind="rounded",
                    where=f"{site.path}.length",
                    text="rounded to an odd number of samples",
                    asked=str(self.length),
                    given=f"{2 * half + 1} samples, {format_s((2 * half + 1) / rate)}",
                )
            )
        return half
