"""A signal driven into a memoryless amplifier at a stated back-off."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import RecipeError, SignalError
from wavegen.core.signal import Samples, Signal
from wavegen.core.site import Note, Site
from wavegen.core.units import format_hz
from wavegen.dsp.aliasing import folded_share
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw, Term
from wavegen.stages.amplifier import (
    WORDS,
    Amplifier,
    BackOffFrom,
    Complexes,
    Reals,
    rms_amplitude,
)
from wavegen.stages.ceiling import PILOT_SAMPLES, STRETCH_SAMPLES, pilot_power
from wavegen.stages.channel.gate import on_time
from wavegen.stages.driven_law import driven_law, driven_term

BLOCK_SAMPLES = 1 << 13
"""Samples worked on at once, in double precision."""
DOUBTFUL_FOLDED_DB = -50.0
"""Distortion that folds back is warned of from here on: it adds an EVM of 0.3 %."""
LINEAR = 2e-8
"""Changes of gain below this are lost in float32."""


@dataclass(frozen=True, eq=False, kw_only=True)
class Amplified(Signal):
    """A signal behind a memoryless amplifier.

    Parameters
    ----------
    amplifier : Amplifier
        The model.
    drive : float
        Amplitude at the model's input over that of the source.
    scale : float
        Output of this signal over the gain of the model.
    where : str
        Path in the recipe, for errors.
    """

    amplifier: Amplifier
    drive: float
    scale: float
    where: str

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Multiply each sample by the gain at its amplitude.

        Raises
        ------
        SignalError
            An amplitude beyond those at which the model is known.
        """
        out = np.empty(stop - start, np.complex64)
        for low in range(0, out.size, BLOCK_SAMPLES):
            block = arrays[0][low : low + BLOCK_SAMPLES]
            i, q = block.real.astype(np.float64), block.imag.astype(np.float64)
            amplitude = np.sqrt(i * i + q * q)
            amplitude *= self.drive
            refuse_beyond(self.where, self.amplifier, float(amplitude.max()))
            gain = self.amplifier.gain(amplitude)
            a, b = gain.real * self.scale, gain.imag * self.scale
            # In real arithmetic: complex products may be fused differently at a block's end.
            part = out[low : low + BLOCK_SAMPLES]
            part.real = i * a - q * b
            part.imag = i * b + q * a
        return out


def refuse_beyond(where: str, amplifier: Amplifier, amplitude: float) -> None:
    """Refuse an amplitude at which a model is not known.

    Raises
    ------
    SignalError
        With how far it stands beyond.
    """
    if amplitude > amplifier.largest * (1 + 1e-6):
        raise SignalError(**_beyond(where, amplifier, amplitude))


def refuse_peak(site: Site, amplifier: Amplifier, amplitude: float) -> None:
    """Refuse a signal whose peak stands where a model is not known.

    Raises
    ------
    RecipeError
        With how far it stands beyond.
    """
    if amplitude > amplifier.largest * (1 + 1e-6):
        raise RecipeError(**_beyond(site.path, amplifier, amplitude))


def _beyond(where: str, amplifier: Amplifier, amplitude: float) -> dict[str, str]:
    over_db = 20 * math.log10(amplitude / amplifier.largest)
    return {
        "where": where,
        "problem": f"the signal peaks {over_db:.2f} dB beyond the largest input of "
        f"{amplifier.name}, which is not extrapolated",
        "allowed": "peaks up to the largest input at which the model is known",
        "remedy": f"Lower the mean input power by {over_db + 0.01:.2f} dB, reduce the peaks, or "
        "extend the model.",
    }


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class _Look:
    """What a pilot tells: gain of the mean power, complex gain fitted, share of small samples."""

    output: float
    fitted: complex
    share_small: float


def drive(site: Site, source: Signal, amplifier: Amplifier, rms: float, *, told: str) -> Signal:
    """Return a signal behind an amplifier at the mean power it had.

    Parameters
    ----------
    site : Site
        Where it is built. Told of the back-off from both landmarks, input and output, of the
        change of gain, the fitted error, and of how much distortion folds back at the sample
        rate; warned where that is -50 dBc or more.
    source : Signal
        What is driven into it. Its period is read here (up to 2^22 samples whole, else 64
        stretches of 2^16); of a gated signal only the on-time, whose mean counts.
    amplifier : Amplifier
        The model.
    rms : float
        RMS amplitude at the model's input.
    told : str
        What was asked for, in words.

    Returns
    -------
    Signal
        ``source`` itself where the model is linear at all its amplitudes.

    Raises
    ------
    RecipeError
        The source is zero, or reaches amplitudes at which the model is not known.
    """
    pilot = list(pilot_power(source, on_time(source)))
    mean = math.fsum(float(p.sum(dtype=np.float64)) for p in pilot) / sum(p.size for p in pilot)
    if not mean:
        raise refuse_silence(site)
    factor = rms / math.sqrt(mean)
    peak = factor * math.sqrt(max(float(piece.max()) for piece in pilot))
    refuse_peak(site, amplifier, peak)
    look = _look(pilot, amplifier, factor)
    scale = 1 / math.sqrt(look.output)
    _tell(site, source, amplifier, f"{told}: {_landmarks(amplifier, rms, rms / scale)}", look)
    bends = np.abs(scale * amplifier.gain(np.linspace(0.0, peak, 257)) - 1)
    if source.n_samples <= PILOT_SAMPLES and float(bends.max()) < LINEAR:
        return source
    _tell_folded(site, source, amplifier, factor)
    return Amplified(
        sample_rate_hz=source.sample_rate_hz,
        n_samples=source.n_samples,
        inputs=(source,),
        mean_power=source.mean_power,
        amplifier=amplifier,
        drive=factor,
        scale=scale,
        where=site.path,
    )


def refuse_silence(site: Site) -> RecipeError:
    """Return the error of a device without an input."""
    return site.error(
        key="",
        problem="the signal is zero: it has no mean power to set",
        allowed="signals with power",
        remedy="Correct the signal.",
    )


def _look(pilot: list[NDArray[np.float32]], amplifier: Amplifier, factor: float) -> _Look:
    total = output = 0.0
    fitted = 0j
    n_small = 0
    for piece in pilot:
        for low in range(0, piece.size, 1 << 16):
            power = piece[low : low + (1 << 16)].astype(np.float64)
            amplitude = factor * np.sqrt(power)
            gain = amplifier.gain(amplitude)
            n_small += int(np.count_nonzero(amplitude < amplifier.smallest))
            total += float(power.sum())
            output += float((power * (gain.real**2 + gain.imag**2)).sum())
            fitted += complex((power * gain).sum())
    share_small = n_small / sum(piece.size for piece in pilot)
    return _Look(output=output / total, fitted=fitted / total, share_small=share_small)


def _landmarks(amplifier: Amplifier, rms: float, output: float) -> str:
    """Return how far mean input and output stand below the points of a curve."""
    points = (
        ("saturation", amplifier.saturation),
        ("1 dB compression point", amplifier.compression),
    )
    known = [
        f"{below(point / rms)} its {name}"
        for name, point in points
        if point is not None and math.isfinite(point)
    ]
    text = f"mean input power {' and '.join(known)}" if known else "mean input power as asked"
    if math.isfinite(amplifier.saturation):
        text += f", mean output power {below(amplifier.highest_output / output)} its highest"
    return text


def below(ratio: float) -> str:
    """Return a ratio of amplitudes as words: ``6.021 dB below``, or above."""
    level_db = 20 * math.log10(ratio)
    return f"{abs(level_db):.3f} dB {'below' if level_db >= 0 else 'above'}"


def _tell(site: Site, source: Signal, amplifier: Amplifier, told: str, look: _Look) -> None:
    origin = (
        "the whole period"
        if source.n_samples <= PILOT_SAMPLES
        else f"{PILOT_SAMPLES // STRETCH_SAMPLES} stretches of {STRETCH_SAMPLES} samples"
    )
    if on_time(source) is not None:
        origin += ", while it is on"
    error = math.sqrt(max(look.output / abs(look.fitted) ** 2 - 1, 0.0)) if look.fitted else 0.0
    text = (
        f"{amplifier.name}: {told}; found on {origin}: fitted error {100 * error:.2f} %; "
        f"the gain of the mean power, {10 * math.log10(look.output):.4f} dB, is undone"
    )
    if amplifier.smallest:
        text += (
            f"; {look.share_small:.3%} of the samples lie below the smallest input measured, where "
            "gain and phase are held"
        )
    site.notes.append(Note(kind="info", where=site.path, text=text))


def _tell_folded(site: Site, source: Signal, amplifier: Amplifier, factor: float) -> None:
    def process(samples: Complexes) -> Complexes:
        amplitude: Reals = np.minimum(factor * np.abs(samples), amplifier.largest)
        return np.asarray(samples * amplifier.gain(amplitude))

    tell_folded(site, source, folded_share(source, process))


def tell_folded(site: Site, source: Signal, share: float, *, spread: str = "") -> None:
    """Tell how much distortion folds back at the sample rate, as a warning where it is much.

    Parameters
    ----------
    site : Site
        Told.
    source : Signal
        For its rate.
    share : float
        From :func:`wavegen.dsp.aliasing.folded_share`.
    spread : str
        What is known of the order of the model, in words.
    """
    folded_db = 10 * math.log10(max(share, 1e-20))
    rate = format_hz(source.sample_rate_hz)
    text = (
        f"{spread}at {rate} distortion of {folded_db:.1f} dBc folds back from beyond half the rate"
    )
    if folded_db > DOUBTFUL_FOLDED_DB:
        text += "; raise the sample rate (a resample stage before it does)"
    is_much = folded_db > DOUBTFUL_FOLDED_DB
    site.notes.append(Note(kind="warning" if is_much else "info", where=site.path, text=text))


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class BackedOff:
    """An amplifier at a back-off: what the settings of every such device do.

    Parameters
    ----------
    amplifier : Amplifier
        The model.
    back_off_db, back_off_from
        As in :func:`wavegen.stages.amplifier.rms_amplitude`.
    """

    amplifier: Amplifier
    back_off_db: float
    back_off_from: BackOffFrom

    def signal(self, site: Site, source: Signal) -> Signal:
        """Return a signal behind the amplifier, as :func:`drive`."""
        return drive(site, source, self.amplifier, self.rms(site), told=self.told)

    def law(self, site: Site, source: Law) -> Law | NoLaw:
        """Return the law behind the amplifier."""
        return driven_law(source, self.amplifier, self.rms(site), n_samples=site.n_samples)

    def term(self, site: Site, source: Term) -> Term | NoLaw:
        """Return what a part of a composite is behind the amplifier."""
        return driven_term(source, self.amplifier, self.rms(site))

    @property
    def told(self) -> str:
        """What was asked for, in words."""
        return f"{self.back_off_db:g} dB back-off from the {WORDS[self.back_off_from]}"

    def rms(self, site: Site) -> float:
        """Return the RMS amplitude at the model's input."""
        return rms_amplitude(
            site, self.amplifier, back_off_db=self.back_off_db, back_off_from=self.back_off_from
        )
