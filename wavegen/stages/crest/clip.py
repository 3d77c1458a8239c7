"""Polar clipping: the envelope is limited, the phase kept."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Annotated, ClassVar

import numpy as np
from annotated_types import Ge, Le
from numpy.typing import NDArray

from wavegen.core.signal import Samples, Signal
from wavegen.core.site import Note, Site
from wavegen.dsp.clipped_gaussian import clip_gaussian
from wavegen.laws.inversion import law_of_term
from wavegen.laws.law import Law
from wavegen.laws.mapped import clip_law
from wavegen.laws.operations import EnvelopeTerm
from wavegen.laws.own_samples import clip_samples, own_samples
from wavegen.laws.term import NoLaw, Term
from wavegen.stages.ceiling import PILOT_SAMPLES, STRETCH_SAMPLES, pilot_power
from wavegen.stages.channel.gate import on_time
from wavegen.stages.searchable import Searchable

BLOCK_SAMPLES = 1 << 14
"""Samples worked on at once: 128 kB in, 128 kB out, 128 kB between."""


@dataclass(frozen=True, slots=True, kw_only=True)
class ClipLevel:
    """The amplitude that gives a wanted ceiling, and what it does.

    Parameters
    ----------
    power : float
        Clip amplitude squared, on the scale of the input.
    input_mean, output_mean : float
        Mean power before and after clipping at ``power``, before anything is scaled back.
    share_clipped : float
        Fraction of samples above ``power``.
    gain : float
        Amplitude of the input in the output before anything is scaled back, least squares.
    """

    power: float
    input_mean: float
    output_mean: float
    share_clipped: float
    gain: float

    @property
    def fitted_error(self) -> float:
        """RMS error of the waveform, the gain fitted, over RMS of the input."""
        left = self.output_mean / self.input_mean - self.gain**2
        return math.sqrt(max(left, 0.0)) / self.gain


def find_clip_level(pilot: list[NDArray[np.float32]], ceiling: float) -> ClipLevel | None:
    """Solve ``A^2 / E[min(p, A^2)] = ceiling`` on samples of the power.

    Parameters
    ----------
    pilot : list of float32 array
        Envelope power ``p``, any lengths; not all zero.
    ceiling : float
        Peak over mean of the output, a power ratio above 1.

    Returns
    -------
    ClipLevel or None
        None where no amplitude does it: the input has so many zeros that even its smallest
        non-zero envelope stands higher above the mean.

    Notes
    -----
    ``h(a) = a - ceiling E[min(p, a)]`` is convex and not negative at ``ceiling E[p]``, so
    Newton's steps from there fall to the root above zero without passing it; ``h`` is
    piecewise linear, so they end. Derivation; tested against the clipped complex Gaussian,
    ``ceiling = g / (1 - exp(-g))`` at ``A^2 = g E[p]``, in ``tests/truth/test_clipped_gaussian``.
    """
    count = sum(piece.size for piece in pilot)
    mean = math.fsum(float(piece.sum(dtype=np.float64)) for piece in pilot) / count
    power = ceiling * mean
    while True:
        limit = np.float32(power)
        limited = [float(np.minimum(piece, limit).sum(dtype=np.float64)) for piece in pilot]
        above = sum(int(np.count_nonzero(piece > limit)) for piece in pilot)
        after = math.fsum(limited) / count
        share = above / count
        excess = power - ceiling * after
        slope = 1 - ceiling * share
        if excess <= 1e-7 * power:
            kept = [_kept(piece, limit) for piece in pilot]
            return ClipLevel(
                power=power,
                input_mean=mean,
                output_mean=after,
                share_clipped=share,
                gain=math.fsum(kept) / count / mean,
            )
        step = excess / slope if slope > 0 else power
        if step >= power * (1 - 1e-12):
            return None
        power -= step


def _kept(power: NDArray[np.float32], limit: np.float32) -> float:
    """Return the sum of products of input and output: ``p`` below the limit, else ``A sqrt p``."""
    above = power[power > limit].astype(np.float64)
    whole = float(power.sum(dtype=np.float64))
    return whole - math.fsum((float(above.sum()), -math.sqrt(limit) * float(np.sqrt(above).sum())))


@dataclass(frozen=True, eq=False, kw_only=True)
class Clipped(Signal):
    """A signal with its envelope limited, scaled back to the mean it had.

    Parameters
    ----------
    amplitude : float
        Largest envelope let through, on the scale of the input.
    gain : float
        Amplitude ratio that undoes the change of mean power.
    origin : str
        What the amplitude was found on.
    """

    amplitude: float
    gain: float
    origin: str

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Multiply each sample by the smaller of the gain and (ceiling over envelope).

        Five float32 roundings lie between a sample and the ceiling: its envelope passes it by
        3e-7 of it at most.
        """
        source = arrays[0]
        out = np.empty(stop - start, np.complex64)
        factor, square = np.empty((2, min(BLOCK_SAMPLES, out.size)), np.float32)
        gain = np.float32(self.gain)
        peak = np.float32(self.amplitude * self.gain)
        for low in range(0, out.size, BLOCK_SAMPLES):
            block = source[low : low + BLOCK_SAMPLES]
            f, s = factor[: block.size], square[: block.size]
            np.multiply(block.real, block.real, out=f)
            np.multiply(block.imag, block.imag, out=s)
            np.add(f, s, out=f)
            np.maximum(f, np.float32(1e-30), out=f)  # zero stays zero instead of 0 * inf
            np.sqrt(f, out=f)
            np.divide(peak, f, out=f)
            np.minimum(f, gain, out=f)
            np.multiply(block, f, out=out[low : low + BLOCK_SAMPLES])
        return out


@dataclass(frozen=True, slots=True, kw_only=True)
class Clip:
    """Settings of a polar clip.

    Parameters
    ----------
    ceiling_db : float
        Highest envelope power of the output over the mean power of the output, dB; 0.1 to 60
        (at 0 dB nothing would be left of the envelope). Of a gated signal, over the mean of
        the on-time, ramps excluded.
    """

    search: ClassVar[Searchable] = Searchable()

    ceiling_db: Annotated[float, Ge(0.1), Le(60)]

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the clipped signal at the mean power it had before.

        Parameters
        ----------
        site : Site
            Where it is built. Told the clip ratio over the mean of the input, the change of
            mean power that is undone, the share of samples clipped, and the error beside that of
            a clipped complex Gaussian signal.
        source : Signal
            What is clipped. Its period is read here (up to 2^22 samples whole, else 64
            stretches of 2^16) to find the clip amplitude.

        Returns
        -------
        Signal
            ``source`` itself where it never reaches the ceiling.

        Raises
        ------
        RecipeError
            The source is zero, or for so much of the time that no amplitude gives the ceiling.
        """
        is_whole = source.n_samples <= PILOT_SAMPLES
        bursts = on_time(source)
        pilot = list(pilot_power(source, bursts))
        highest = max(float(piece.max()) for piece in pilot)
        ceiling = 10 ** (self.ceiling_db / 10)
        level = find_clip_level(pilot, ceiling) if highest else None
        if level is None:
            share = sum(int(np.count_nonzero(piece)) for piece in pilot) / sum(
                piece.size for piece in pilot
            )
            least_db = f"{-10 * math.log10(share):.2f} dB" if share else "no ceiling: it is zero"
            raise site.error(
                key="ceiling",
                problem=f"{self.ceiling_db:g} dB cannot be met: the signal is zero "
                f"for {1 - share:.3%} of the time",
                allowed=f"above {least_db}",
                remedy="Raise the ceiling.",
            )
        if is_whole and bursts is None and highest <= level.power:
            papr_db = 10 * math.log10(highest / level.input_mean)
            _tell(site, f"nothing to clip: the signal peaks {papr_db:.3f} dB over its mean")
            return source
        origin = (
            "the whole period"
            if is_whole
            else f"{PILOT_SAMPLES // STRETCH_SAMPLES} stretches of {STRETCH_SAMPLES} samples"
        )
        ratio_db = 10 * math.log10(level.power / level.input_mean)
        change_db = 10 * math.log10(level.output_mean / level.input_mean)
        if bursts is not None:
            origin += ", while it is on"
        _tell(
            site,
            f"clips at {ratio_db:.3f} dB over the mean of its input, found on {origin}: "
            f"{level.share_clipped:.3%} of the samples; "
            f"the change of mean power, {change_db:.4f} dB, is undone; error of the waveform, the "
            f"gain fitted, {100 * level.fitted_error:.2f} %, of a complex Gaussian one "
            f"{100 * clip_gaussian(level.power / level.input_mean).fitted_error:.2f} %",
        )
        return Clipped(
            sample_rate_hz=source.sample_rate_hz,
            n_samples=source.n_samples,
            inputs=(source,),
            mean_power=source.mean_power,
            amplitude=math.sqrt(level.power),
            gain=math.sqrt(level.input_mean / level.output_mean),
            origin=origin,
        )

    def law(self, site: Site, source: Law) -> Law | NoLaw:
        """Return the law of the clipped signal from that of its input."""
        # Where the clip amplitude is found on the whole loop, it is that of the loop's samples.
        own = own_samples(source) if site.n_samples <= PILOT_SAMPLES else None
        return (
            clip_law(source, self.ceiling_db) if own is None else clip_samples(own, self.ceiling_db)
        )

    def term(self, site: Site, source: Term) -> Term | NoLaw:
        """Return what a clipped part is to a composite: lawful if isotropic at all times."""
        if source.symmetry or source.clock_samples > 1:
            return NoLaw(reason=f"{source.name}, clipped, has no law beside others")
        before = law_of_term(source)
        after = before if isinstance(before, NoLaw) else clip_law(before, self.ceiling_db)
        if isinstance(after, NoLaw):
            return after
        return EnvelopeTerm(
            name=after.name,
            holds=after.holds,
            mean_power=source.mean_power,
            peak=math.sqrt(source.mean_power) * 10 ** (after.peak_db / 20),
            data=source.data,
            lowest_probability=source.lowest_probability,
            law=after,
        )


def _tell(site: Site, text: str) -> None:
    site.notes.append(Note(kind="info", where=f"{site.path}.ceiling", text=text))
